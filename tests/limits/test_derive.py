"""From curve to limit: against scipy, published operating points, and a simulation of its own."""

from __future__ import annotations

import json

import numpy as np
import pytest
from scipy import special

from linetest.decision import Plan
from linetest.errors import ParameterError, PlanError
from linetest.limits import LimitSheet, StepLimit, derive_step, limit_curve, load_model

GATE_S = 1e-3


@pytest.fixture(scope="module")
def sheet() -> LimitSheet:
    return load_model("BW-Q4")


def derived(sheet: LimitSheet, nominal_db: float, ebn0_db: float, u_db: float) -> StepLimit:
    check = sheet.procedure.ber[0]
    return derive_step(sheet, check, nominal_db, ebn0_db=ebn0_db, u_db=u_db, shortest_gate_s=GATE_S)


@pytest.mark.parametrize(("nominal_db", "ebn0_db"), [(6.8, 6.71), (8.4, 8.4), (9.6, 9.87), (10.5, 10.3)])
def test_limit_is_theory_at_the_ebn0_really_set_less_the_margin(
    sheet: LimitSheet, nominal_db: float, ebn0_db: float
) -> None:
    """Coherent QPSK, Gray: BER = erfc(sqrt(Eb/N0))/2 (any textbook; Proakis, Digital Communications, 4th ed., 5.2)."""

    def theory(level_db: float) -> float:
        return float(0.5 * special.erfc(np.sqrt(10.0 ** (level_db / 10.0))))

    limit = derived(sheet, nominal_db, ebn0_db, 0.06)
    assert limit.theory_ber == pytest.approx(theory(ebn0_db), rel=1e-12)
    assert limit.limit_ber == pytest.approx(theory(ebn0_db - 1.0), rel=1e-12)
    assert limit.design_ber == pytest.approx(theory(ebn0_db - 0.5), rel=1e-12)
    plan, guarded = limit.guarded.plan, limit.guarded
    assert plan.limit_ber == pytest.approx(theory(ebn0_db - 1.0 + guarded.guard_consumer_db), rel=1e-9)
    assert plan.good_ber == pytest.approx(theory(ebn0_db - 0.5 - guarded.guard_producer_db), rel=1e-9)


@pytest.mark.parametrize(("needed_db", "ber"), [(8.4, 1e-4), (9.6, 1e-5)])
def test_limit_a_margin_above_a_published_point_is_the_published_rate(
    sheet: LimitSheet, needed_db: float, ber: float
) -> None:
    """Eb/N0 of coherent BPSK and Gray QPSK, printed to 0.1 dB, so that the rate is known within 0.06 dB.

    9.6 dB at 1e-5: Roddy, Satellite Communications, 4th ed., 11.8; 8.4 dB at 1e-4 as textbooks print it, from memory.
    """
    rates = limit_curve("qpsk")(np.array([needed_db + 0.06, needed_db - 0.06]))
    nominal_db = min(sheet.procedure.ber[0].steps, key=lambda step: abs(step - needed_db - 1.0))
    limit = derived(sheet, nominal_db, needed_db + 1.0, 0.06)
    assert rates[0] < ber < rates[1]
    assert rates[0] < limit.limit_ber < rates[1]


def simulated_acceptance(plan: Plan, rates: np.ndarray, rng: np.random.Generator) -> np.ndarray:
    """Which tests end in ACCEPT, one test a rate, walked look by look from the plan's lines alone."""
    errors = np.zeros(rates.size, dtype=np.int64)
    open_tests = np.ones(rates.size, dtype=bool)
    accepted = np.zeros(rates.size, dtype=bool)
    for accept, reject in zip(plan.accept_errors, plan.reject_errors, strict=True):
        errors[open_tests] += rng.binomial(plan.look_bits, rates[open_tests])
        taken = open_tests & (errors <= accept)
        accepted |= taken
        open_tests &= ~taken & (errors < reject)
    assert not open_tests.any()
    return accepted


@pytest.mark.parametrize(("nominal_db", "u_db"), [(6.8, 0.06), (8.4, 0.07)])
def test_both_risks_hold_with_the_uncertainty_of_ebn0_included(
    sheet: LimitSheet, nominal_db: float, u_db: float
) -> None:
    """40 000 tests each of a unit at the margin and of one at the design loss, Eb/N0 error drawn anew for each."""
    tests = 40_000
    limit = derived(sheet, nominal_db, nominal_db, u_db)
    rng = np.random.default_rng(20250301)
    for loss_db, printed in (
        (1.0, limit.guarded.averaged_consumer_risk),
        (0.5, 1.0 - limit.guarded.averaged_producer_risk),
    ):
        seen_db = nominal_db + limit.guarded.u_db * rng.standard_normal(tests) - loss_db
        rates = 0.5 * special.erfc(np.sqrt(10.0 ** (seen_db / 10.0)))
        share = float(simulated_acceptance(limit.guarded.plan, rates, rng).mean())
        # Binomial scatter of the simulation, four standard deviations.
        assert abs(share - printed) < 4.0 * np.sqrt(printed * (1.0 - printed) / tests)
    assert limit.guarded.averaged_consumer_risk <= 0.01 * 1.001
    assert limit.guarded.averaged_producer_risk <= 0.01 * 1.001


def test_unit_risks_are_shared_out_over_the_steps(sheet: LimitSheet) -> None:
    """All steps must ACCEPT: rejections add over steps, acceptances do not."""
    check = sheet.procedure.ber[0]
    assert check.step_producer_risk == pytest.approx(check.producer_risk / 4)
    guarded = [derived(sheet, step, step, 0.06).guarded for step in check.steps]
    assert sum(step.averaged_producer_risk for step in guarded) <= check.producer_risk * 1.001
    assert max(step.averaged_consumer_risk for step in guarded) <= check.consumer_risk * 1.001


def test_equal_content_gives_the_same_plan(sheet: LimitSheet) -> None:
    first, second = derived(sheet, 8.4, 8.42, 0.0561), derived(load_model("BW-Q4"), 8.4, 8.42, 0.0599)
    assert first.guarded is second.guarded
    assert first.guarded.u_db == pytest.approx(0.06)
    assert (first.u_db, second.u_db) == (0.0561, 0.0599)
    assert derived(sheet, 8.4, 8.43, 0.0561).guarded is not first.guarded


def test_derivation_is_plain_data_with_the_source_of_each_number(sheet: LimitSheet) -> None:
    limit = derived(sheet, 9.6, 9.52, 0.06)
    told = json.loads(json.dumps(limit.derivation, allow_nan=False))
    assert told["ebn0_db"] == 9.52
    assert told["limit_ber"] == limit.limit_ber
    assert told["guarded_limit_ber"] < told["limit_ber"]
    assert told["guarded_good_ber"] > told["design_ber"]
    assert told["sources"]["margin_db"].startswith("product specification PS-Q4")
    assert told["sources"]["scheme"].startswith("product specification PS-Q4")


def test_step_that_the_sheet_does_not_carry_is_refused(sheet: LimitSheet) -> None:
    with pytest.raises(
        PlanError, match=r"Eb/N0 would be 8\.85 dB, \+0\.45 dB off the nominal 8\.4 dB; ber allows 0\.4 dB"
    ):
        derived(sheet, 8.4, 8.85, 0.06)
    most_db = sheet.procedure.ber[0].max_u_db
    with pytest.raises(PlanError, match=f"is {most_db + 0.001:.3f} dB, more than the {most_db:g} dB that ber carries"):
        derived(sheet, 8.4, 8.4, most_db + 0.001)


def test_exactly_the_tolerance_is_allowed(sheet: LimitSheet) -> None:
    assert derived(sheet, 8.4, 8.8, 0.06).ebn0_db == 8.8


@pytest.mark.parametrize(
    ("nominal_db", "ebn0_db", "u_db", "gate_s", "named"),
    [
        (8.5, 8.5, 0.06, 1e-3, "nominal_ebn0_db is 8.5, but must be a step of ber"),
        (8.4, float("nan"), 0.06, 1e-3, "ebn0_db is nan, but must be finite"),
        (8.4, 8.4, -0.01, 1e-3, "u_db is -0.01, but must be finite and not negative"),
        (8.4, 8.4, float("nan"), 1e-3, "u_db is nan"),
        (8.4, 8.4, 0.06, 0.0, "shortest_gate_s is 0.0, but must be finite and above 0"),
    ],
)
def test_wrong_number_is_named(
    sheet: LimitSheet, nominal_db: float, ebn0_db: float, u_db: float, gate_s: float, named: str
) -> None:
    check = sheet.procedure.ber[0]
    with pytest.raises(ParameterError, match=named):
        derive_step(sheet, check, nominal_db, ebn0_db=ebn0_db, u_db=u_db, shortest_gate_s=gate_s)
