"""Guarded plans: both averaged risks by drawing the error of Eb/N0, and refusals that help."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from scipy import special

from linetest.decision import GuardedPlan, design_guarded_plan, fixed_test_bits
from linetest.errors import ParameterError, PlanError
from linetest.units import FloatArray
from tests.decision.simulate import allowed_error, simulate

EBN0_DB = 8.4
TESTS = 100_000


def curve(ebn0_db: FloatArray) -> FloatArray:
    """Coherent BPSK and Gray-coded QPSK in white Gaussian noise."""
    return np.asarray(0.5 * special.erfc(np.sqrt(10.0 ** (ebn0_db / 10.0))), dtype=np.float64)


def guarded(u_db: float, **changes: Any) -> GuardedPlan:
    good, limit = (float(curve(np.array([EBN0_DB - loss]))[0]) for loss in (0.5, 1.0))
    fixed = fixed_test_bits(good_ber=good, limit_ber=limit, producer_risk=0.01, consumer_risk=0.01)
    asked: dict[str, Any] = {
        "curve": curve,
        "ebn0_db": EBN0_DB,
        "u_db": u_db,
        "margin_db": 1.0,
        "design_loss_db": 0.5,
        "producer_risk": 0.01,
        "consumer_risk": 0.01,
        "look_bits": fixed // 30,
        "max_bits": 4 * fixed,
    }
    return design_guarded_plan(**(asked | changes))


def drawn_acceptance(found: GuardedPlan, loss_db: float, rng: np.random.Generator) -> float:
    """Share accepted of units of a loss, each with an error of Eb/N0 of its own."""
    rates = curve(EBN0_DB - loss_db + found.u_db * rng.standard_normal(TESTS))
    return simulate(found.plan, rates, TESTS, rng).share_accepted


@pytest.mark.parametrize(("u_db", "rule"), [(0.05, "least"), (0.07, "least"), (0.10, "none"), (0.05, "U")])
def test_averaged_risks_agree_with_drawn_errors_of_ebn0(u_db: float, rule: str) -> None:
    rng = np.random.default_rng(99)
    found = guarded(u_db, rule=rule)
    consumer, producer = found.averaged_consumer_risk, found.averaged_producer_risk
    assert drawn_acceptance(found, 1.0, rng) == pytest.approx(consumer, abs=allowed_error(consumer, TESTS))
    assert 1.0 - drawn_acceptance(found, 0.5, rng) == pytest.approx(producer, abs=allowed_error(producer, TESTS))


@pytest.mark.parametrize("u_db", [0.0, 0.03, 0.06])
def test_least_guard_bands_keep_both_risks_and_waste_little(u_db: float) -> None:
    found = guarded(u_db)
    assert 0.009 < found.averaged_consumer_risk <= 0.01 * 1.001
    assert 0.009 < found.averaged_producer_risk <= 0.01 * 1.001
    assert 0.0 <= found.guard_consumer_db <= 2.0 * u_db
    assert 0.0 <= found.guard_producer_db <= 2.0 * u_db
    assert found.plan.limit_ber <= found.margin_ber
    assert found.plan.good_ber >= found.design_ber


def test_rules_set_the_consumers_guard_band_and_show_what_it_costs() -> None:
    """No guard band breaks the consumer's risk; w = U protects the consumer twice and the producer not at all."""
    bands = {rule: guarded(0.05, rule=rule) for rule in ("none", "0.83U", "U")}
    assert [one.guard_consumer_db for one in bands.values()] == pytest.approx([0.0, 0.083, 0.1])
    assert all(one.expanded_u_db == pytest.approx(0.1) for one in bands.values())
    assert bands["none"].averaged_consumer_risk > 0.012
    assert bands["U"].averaged_consumer_risk < 0.005
    assert bands["U"].averaged_producer_risk > 0.012


def test_uncertainty_that_no_plan_carries_is_refused_with_one_that_could() -> None:
    with pytest.raises(PlanError, match=r"uncertainty of 0\.200 dB cannot carry the sheet .*0\.0[4-9]\d dB could"):
        guarded(0.2)


@pytest.mark.parametrize(
    ("name", "value"),
    [("u_db", -0.1), ("u_db", float("nan")), ("ebn0_db", float("inf")), ("design_loss_db", 1.0), ("rule", "2U")],
)
def test_values_outside_their_rule_are_refused_by_name(name: str, value: object) -> None:
    changed: dict[str, Any] = {"u_db": 0.05, name: value}
    with pytest.raises(ParameterError, match=rf"{name} is .* must"):
        guarded(**changed)
