"""The operating characteristic against direct sums and simulated runs; sheets that cannot be met."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import special
from scipy.stats import norm

from linetest.errors import ParameterError
from linetest.limits import (
    LimitSheet,
    StepLimit,
    derive_all,
    load_model,
    load_sheet,
    mean_seconds,
    passing_probability,
    plan_faults,
)
from tests.limits.conftest import WriteSheet
from tests.limits.test_derive import simulated_acceptance


@pytest.fixture(scope="module")
def sheet() -> LimitSheet:
    return load_model("BW-Q4")


@pytest.fixture(scope="module")
def steps(sheet: LimitSheet) -> tuple[StepLimit, ...]:
    return derive_all(sheet, sheet.procedure.ber[0], u_db=0.06)


def test_chance_is_the_product_over_steps_averaged_over_one_shared_error(steps: tuple[StepLimit, ...]) -> None:
    """Trapezoidal sum over e on a fine grid, every step's exact acceptance, no interpolation."""
    losses = np.array([0.3, 0.5, 0.75, 0.9])
    errors = np.linspace(-5.0, 5.0, 41) * 0.06
    weights = norm.pdf(errors, scale=0.06)
    direct = []
    for loss in losses:
        product = np.ones_like(errors)
        for step in steps:
            rates = 0.5 * special.erfc(np.sqrt(10.0 ** ((step.ebn0_db + errors - loss) / 10.0)))
            product *= np.asarray(step.guarded.plan.acceptance_probability(rates))
        direct.append(float((product * weights).sum() / weights.sum()))
    assert passing_probability(steps, losses, shared_u_db=0.06) == pytest.approx(direct, rel=2e-3, abs=1e-9)


def test_chance_agrees_with_simulated_runs(steps: tuple[StepLimit, ...]) -> None:
    """20 000 runs of a unit half way between good and bad, each with one error of Eb/N0 for all its steps."""
    runs, loss_db = 20_000, 0.72
    rng = np.random.default_rng(60)
    errors_db = 0.06 * rng.standard_normal(runs)
    passed = np.ones(runs, dtype=bool)
    for step in steps:
        rates = 0.5 * special.erfc(np.sqrt(10.0 ** ((step.ebn0_db + errors_db - loss_db) / 10.0)))
        passed &= simulated_acceptance(step.guarded.plan, rates, rng)
    wanted = float(passing_probability(steps, np.array(loss_db), shared_u_db=0.06))
    assert 0.1 < wanted < 0.9
    assert abs(passed.mean() - wanted) < 4.0 * math.sqrt(wanted * (1.0 - wanted) / runs)


def test_good_units_pass_and_bad_ones_do_not(sheet: LimitSheet, steps: tuple[StepLimit, ...]) -> None:
    check = sheet.procedure.ber[0]
    losses = np.linspace(0.0, 2.0, 50)
    chances = passing_probability(steps, losses, shared_u_db=0.06)
    assert np.all(np.diff(chances) <= 1e-12)
    design, margin = passing_probability(steps, np.array([check.design_loss_db, check.margin_db]), shared_u_db=0.06)
    assert 1.0 - design <= check.producer_risk * 1.001
    assert margin <= check.consumer_risk * 1.001
    good, bad = passing_probability(steps, np.array([0.2, 1.3]), shared_u_db=0.06)
    assert good > 1.0 - 4e-4
    assert bad < 1e-5


def test_without_uncertainty_the_chance_is_the_counting_chance(steps: tuple[StepLimit, ...]) -> None:
    one = steps[:1]
    plan = one[0].guarded.plan
    rate = 0.5 * special.erfc(math.sqrt(10.0 ** ((one[0].ebn0_db - 0.7) / 10.0)))
    exact = float(plan.acceptance_probability(rate))
    assert float(passing_probability(one, np.array(0.7), shared_u_db=0.0)) == pytest.approx(exact, rel=1e-9)


def test_time_is_that_of_the_plans(steps: tuple[StepLimit, ...]) -> None:
    at_design = sum(float(step.guarded.plan.expected_bits(step.design_ber)) for step in steps) / 2.048e6
    times = mean_seconds(steps, np.array([[0.5], [0.75], [3.0]]))
    assert times.shape == (3, 1)
    assert times[0, 0] == pytest.approx(at_design, rel=1e-9)
    assert times[1, 0] > times[0, 0] > times[2, 0]


def test_shipped_sheet_can_be_met(sheet: LimitSheet) -> None:
    assert plan_faults(sheet) == ()


def test_uncertainty_that_eats_the_margin_is_a_fault(write_sheet: WriteSheet) -> None:
    sheet = load_sheet(write_sheet(("max_u_db = 0.0", "max_u_db = 0.20 # 0.0"), ("[6.8, 8.4, 9.6, 10.5]", "[8.4]")))
    (fault,) = plan_faults(sheet)
    assert (fault.key, fault.value) == ("procedure.ber[ber].steps", "8.4")
    assert "a standard uncertainty of 0.200 dB cannot carry the sheet" in fault.rule
    assert fault.rule.endswith("dB could")


def test_more_time_than_the_budget_is_a_fault(write_sheet: WriteSheet) -> None:
    sheet = load_sheet(write_sheet(("time_budget_s = 3.0", "time_budget_s = 0.1")))
    (fault,) = plan_faults(sheet)
    assert fault.key == "procedure.ber[ber].time_budget_s"
    assert fault.value == "0.1"
    assert fault.rule.startswith("must be at least the mean counting time of a unit at the design loss, 1.")


def test_wrong_input_is_named(steps: tuple[StepLimit, ...]) -> None:
    with pytest.raises(ParameterError, match="steps is 0, but must number at least 1"):
        passing_probability([], np.array(0.5), shared_u_db=0.0)
    with pytest.raises(ParameterError, match="losses_db is 'the array', but must be finite"):
        mean_seconds(steps, np.array([math.nan]))
    with pytest.raises(ParameterError, match=r"shared_u_db is -0\.1"):
        passing_probability(steps, np.array(0.5), shared_u_db=-0.1)
