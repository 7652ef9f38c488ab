"""What is said after a sequential stop: coverage by enumeration and by simulation."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from linetest.decision import Plan, design_plan, fixed_test_bits, interval, median_unbiased_ber, sequential_interval
from linetest.errors import ParameterError
from tests.decision.simulate import simulate


def coarse_plan(ratio: float, risk: float = 0.01) -> Plan:
    """Looks of 1/12 of the best fixed test, so that all likely stops can be enumerated."""
    asked: dict[str, Any] = {"good_ber": 1e-4 / ratio, "limit_ber": 1e-4, "producer_risk": risk, "consumer_risk": risk}
    fixed = fixed_test_bits(**asked)
    return design_plan(**asked, look_bits=fixed // 12, max_bits=2 * fixed)


@pytest.mark.parametrize("ratio", [2.6, 9.0])
def test_each_side_misses_at_most_its_share_at_every_rate(ratio: float) -> None:
    """All stops but a millionth of the probability, rates from half of good to twice the limit."""
    plan = coarse_plan(ratio)
    rates = np.geomspace(plan.good_ber / 2.0, 2.0 * plan.limit_ber, 61)
    stops = plan.stops()
    chances = stops.at(rates)
    likely = np.flatnonzero(chances.max(axis=0) > 1e-9)
    assert chances[:, likely].sum(axis=1) == pytest.approx(1.0, abs=1e-6)
    limits = np.array([sequential_interval(plan, int(stops.bits[one]), int(stops.errors[one])) for one in likely])
    low, high = limits[:, 0], limits[:, 1]
    above = np.array([chance[likely[low > rate]].sum() for rate, chance in zip(rates, chances, strict=True)])
    below = np.array([chance[likely[high < rate]].sum() for rate, chance in zip(rates, chances, strict=True)])
    assert above.max() <= 0.025 + 1e-6
    assert below.max() <= 0.025 + 1e-6
    # Discrete counts cannot reach the level everywhere, but an interval that never missed would be useless.
    assert above.max() > 0.015
    assert below.max() > 0.015


def test_coverage_by_simulation() -> None:
    plan = coarse_plan(3.0)
    rng = np.random.default_rng(5)
    tests = 20_000
    known: dict[tuple[int, int], tuple[float, float]] = {}
    for rate in (plan.good_ber, 0.6 * plan.limit_ber, plan.limit_ber):
        ended = simulate(plan, rate, tests, rng)
        held = 0
        for stop in zip(ended.bits.tolist(), ended.errors.tolist(), strict=True):
            if stop not in known:
                known[stop] = sequential_interval(plan, *stop)
            low, high = known[stop]
            held += low <= rate <= high
        assert held / tests >= 0.95 - 3.9 * np.sqrt(0.95 * 0.05 / tests)


def test_one_look_gives_the_interval_of_a_fixed_count() -> None:
    """With a single look the ordering is that of the counts: Clopper-Pearson."""
    plan = Plan(
        good_ber=1e-3,
        limit_ber=5e-3,
        look_bits=5_000,
        looks=1,
        slope=2.5e-3,
        accept_gap=1.0,
        reject_gap=1.0,
        last_accept_errors=12,
        producer_risk=0.0,
        consumer_risk=0.0,
    )
    for errors in (0, 1, 5, 12, 13, 20):
        assert sequential_interval(plan, 5_000, errors) == pytest.approx(interval(5_000, errors), rel=1e-6)


def test_judgement_and_interval_never_contradict_each_other() -> None:
    """At risks of 0.01 every ACCEPT excludes the limit and every REJECT excludes the good rate."""
    plan = coarse_plan(3.0)
    stops = plan.stops()
    for one in np.flatnonzero(stops.probability > 1e-6):
        low, high = sequential_interval(plan, int(stops.bits[one]), int(stops.errors[one]))
        if stops.accepted[one]:
            assert high < plan.limit_ber
        else:
            assert low > plan.good_ber


def test_median_unbiased_rate_lies_in_the_interval_and_misses_evenly() -> None:
    plan = coarse_plan(2.0)
    stops = plan.stops()
    likely = np.flatnonzero(stops.probability > 1e-5)
    estimates = []
    for one in likely:
        bits, errors = int(stops.bits[one]), int(stops.errors[one])
        low, high = sequential_interval(plan, bits, errors)
        estimates.append(median_unbiased_ber(plan, bits, errors))
        assert low <= estimates[-1] <= high
    found = np.array(estimates)
    rate = stops.ber
    chances = stops.probability[likely]
    # One stop holds a few percent, so that "as often above as below" is within that.
    assert chances[found > rate].sum() == pytest.approx(0.5, abs=0.06)
    assert chances[found < rate].sum() == pytest.approx(0.5, abs=0.06)


def test_bursts_are_in_the_interval() -> None:
    asked: dict[str, Any] = {"good_ber": 1e-4 / 3.0, "limit_ber": 1e-4, "producer_risk": 0.01, "consumer_risk": 0.01}
    fixed = fixed_test_bits(**asked, burst_weights=((2, 1.0),))
    plan = design_plan(**asked, look_bits=fixed // 10, max_bits=2 * fixed, burst_weights=((2, 1.0),))
    stop = next(k for k, count in enumerate(plan.accept_errors, start=1) if count >= 0)
    low, high = sequential_interval(plan, stop * plan.look_bits, 0)
    assert low == 0.0
    # Only this stop is as low: no event of two errors in its bits.
    assert np.exp(-stop * plan.look_bits * high / 2.0) == pytest.approx(0.025, rel=1e-3)


def test_counts_at_which_the_plan_goes_on_are_refused() -> None:
    plan = coarse_plan(3.0)
    middle = round(plan.slope * 4 * plan.look_bits)
    with pytest.raises(ParameterError, match="be a stop of the plan at"):
        sequential_interval(plan, 4 * plan.look_bits, middle)
