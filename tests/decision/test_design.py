"""Designed plans against simulation, Wald's bound, published plans and brute force."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from scipy import stats

from linetest.decision import Plan, design_plan, fixed_test_bits, wald_bound
from linetest.errors import ParameterError, PlanError
from tests.decision.simulate import allowed_error, simulate

PAIRS = ((2, 1.0),)


def designed(limit_ber: float, ratio: float, risk: float, **changes: Any) -> tuple[Plan, int]:
    """A plan with looks of 1/60 of the best fixed test and at most three times its bits; and that test's bits."""
    asked = {
        "good_ber": limit_ber / ratio,
        "limit_ber": limit_ber,
        "producer_risk": risk,
        "consumer_risk": risk,
    } | changes
    fixed = fixed_test_bits(**asked)
    return design_plan(**asked, look_bits=fixed // 60, max_bits=3 * fixed), fixed


@pytest.mark.parametrize(
    ("limit_ber", "ratio", "risk"),
    [(1e-2, 1.7, 0.01), (1e-3, 3.0, 0.05), (1e-4, 9.0, 0.01), (1e-6, 2.1, 0.05), (1e-8, 5.0, 0.001)],
)
def test_exact_risks_and_mean_bits_agree_with_100_000_simulated_tests(
    limit_ber: float, ratio: float, risk: float
) -> None:
    rng = np.random.default_rng(20260302)
    plan, _ = designed(limit_ber, ratio, risk)
    for ber in (plan.good_ber, float(np.sqrt(plan.good_ber * limit_ber)), limit_ber, 1.5 * limit_ber):
        seen = simulate(plan, ber, 100_000, rng)
        exact = plan.acceptance_probability(ber)
        assert seen.share_accepted == pytest.approx(exact, abs=allowed_error(exact, 100_000))
        standard_error = float(seen.bits.std()) / np.sqrt(100_000)
        assert seen.bits.mean() == pytest.approx(plan.expected_bits(ber), abs=3.9 * standard_error)
    assert plan.producer_risk == pytest.approx(1.0 - plan.acceptance_probability(plan.good_ber), rel=1e-9)
    assert plan.consumer_risk == pytest.approx(plan.acceptance_probability(limit_ber), rel=1e-9)


def test_exact_risks_agree_with_a_million_simulated_tests() -> None:
    """99.9 % binomial intervals of both risks."""
    rng = np.random.default_rng(41)
    plan, _ = designed(1e-5, 4.9, 0.01)
    for ber, risk in ((plan.good_ber, plan.producer_risk), (plan.limit_ber, plan.consumer_risk)):
        accepted = int(simulate(plan, ber, 1_000_000, rng).accepted.sum())
        wrong = 1_000_000 - accepted if ber == plan.good_ber else accepted
        inside = stats.binomtest(wrong, 1_000_000).proportion_ci(0.999, method="exact")
        assert inside.low <= risk <= inside.high


@pytest.mark.parametrize("risk", [0.001, 0.01, 0.05])
@pytest.mark.parametrize("ratio", [1.5, 1.7, 2.6, 3.1, 6.0, 9.0])
@pytest.mark.parametrize("limit_ber", [1e-3, 1e-8])
def test_mean_bits_stay_near_the_least_any_test_can_need(limit_ber: float, ratio: float, risk: float) -> None:
    """Wald's bound at the exact risks, 1 % above it at the good rate and 8 % at the limit."""
    plan, fixed = designed(limit_ber, ratio, risk)
    assert 0.0 < plan.producer_risk <= risk
    assert 0.0 < plan.consumer_risk <= risk
    at_good, at_limit = wald_bound(
        good_ber=plan.good_ber,
        limit_ber=limit_ber,
        producer_risk=plan.producer_risk,
        consumer_risk=plan.consumer_risk,
    )
    mean_good, mean_limit = plan.expected_bits(plan.good_ber), plan.expected_bits(limit_ber)
    assert 1.0 <= mean_good / at_good <= 1.01
    assert 1.0 <= mean_limit / at_limit <= 1.08
    assert mean_good / fixed <= (0.55 if risk <= 0.01 else 0.70)
    assert mean_limit / fixed <= 0.70


def test_lines_of_the_handbook_example() -> None:
    """Slope 0.0397, gaps 0.939 and 1.205 for 1 % against 10 %: NIST e-Handbook 6.2.6, from memory.

    Whole counts overshoot lines, so lines that just meet the exact risks lie no further out than the asymptotic ones.
    """
    plan = design_plan(good_ber=0.01, limit_ber=0.10, producer_risk=0.05, consumer_risk=0.10, look_bits=1, max_bits=400)
    assert plan.slope == pytest.approx(0.0397, abs=0.5e-4)
    assert 0.5 < plan.accept_gap <= 0.939 + 0.5e-3
    assert 0.5 < plan.reject_gap <= 1.205 + 0.5e-3
    assert plan.producer_risk <= 0.05
    assert plan.consumer_risk <= 0.10


def test_wald_bound_is_a_ratio_of_divergences() -> None:
    at_good, at_limit = wald_bound(good_ber=1e-4, limit_ber=3e-4, producer_risk=0.01, consumer_risk=0.05)
    good, limit = [1e-4, 1 - 1e-4], [3e-4, 1 - 3e-4]
    assert at_good == pytest.approx(stats.entropy([0.01, 0.99], [0.95, 0.05]) / stats.entropy(good, limit), rel=1e-9)
    assert at_limit == pytest.approx(stats.entropy([0.05, 0.95], [0.99, 0.01]) / stats.entropy(limit, good), rel=1e-9)


@pytest.mark.parametrize(("ratio", "risk"), [(1.7, 0.01), (3.0, 0.05), (9.0, 0.001), (40.0, 0.01)])
def test_best_fixed_test_is_the_shortest_by_brute_force(ratio: float, risk: float) -> None:
    limit = 1e-5
    bits = fixed_test_bits(good_ber=limit / ratio, limit_ber=limit, producer_risk=risk, consumer_risk=risk)
    allowed = np.arange(500)

    def possible(length: int) -> bool:
        consumer = stats.poisson.cdf(allowed, length * limit)
        producer = stats.poisson.sf(allowed, length * limit / ratio)
        return bool(np.any((consumer <= risk) & (producer <= risk)))

    assert possible(bits)
    assert not possible(bits - 1)


@pytest.mark.parametrize(("ratio", "printed"), [(1e3, 2.996), (20.0, 4.744), (10.0, 6.296), (6.5, 7.754)])
def test_fixed_tests_that_allow_no_error_up_to_three_need_the_published_bits(ratio: float, printed: float) -> None:
    """Bits times BER for 95 % with 0, 1, 2, 3 errors: J. Redd, Lightwave, April 2000 (formula)."""
    bits = fixed_test_bits(good_ber=1e-9 / ratio, limit_ber=1e-9, producer_risk=0.05, consumer_risk=0.05)
    assert bits * 1e-9 == pytest.approx(printed, abs=0.6e-3)


def test_pairs_of_errors_keep_the_risk_where_the_naive_plan_breaks_it() -> None:
    """Differential encoding makes pairs; a plan for independent errors then accepts about 9 % of units at the limit."""
    rng = np.random.default_rng(7)
    naive, _ = designed(1e-5, 3.0, 0.01)
    paired, _ = designed(1e-5, 3.0, 0.01, burst_weights=PAIRS)
    broken = simulate(naive, 1e-5, 100_000, rng, errors_per_event=2).share_accepted
    kept = simulate(paired, 1e-5, 100_000, rng, errors_per_event=2).share_accepted
    assert 0.07 < broken < 0.11
    assert kept == pytest.approx(paired.consumer_risk, abs=allowed_error(0.01, 100_000))
    assert paired.consumer_risk <= 0.01
    rejected = 1.0 - simulate(paired, paired.good_ber, 100_000, rng, errors_per_event=2).share_accepted
    assert rejected == pytest.approx(paired.producer_risk, abs=allowed_error(0.01, 100_000))
    assert paired.producer_risk <= 0.01


SOUND = {
    "good_ber": 1e-5,
    "limit_ber": 3e-5,
    "producer_risk": 0.01,
    "consumer_risk": 0.01,
    "look_bits": 20_000,
    "max_bits": 3_000_000,
}


def test_equal_arguments_give_equal_plans() -> None:
    assert design_plan(**SOUND) == design_plan(**SOUND)  # type: ignore[arg-type]  # a dict of mixed numbers
    assert design_plan(**SOUND).max_bits <= 3_000_000  # type: ignore[arg-type]  # a dict of mixed numbers


@pytest.mark.parametrize(
    ("name", "value", "rule"),
    [
        ("producer_risk", 0.0, "lie between 0 and 1"),
        ("producer_risk", 1.0, "lie between 0 and 1"),
        ("consumer_risk", 0.0, "lie between 0 and 1"),
        ("consumer_risk", 0.6, "be below 0.5"),
        ("consumer_risk", float("nan"), "lie between 0 and 1"),
        ("good_ber", 3e-5, "lie above 0 and below the limit"),
        ("good_ber", 0.0, "lie above 0 and below the limit"),
        ("limit_ber", 0.5, "lie between 0 and 0.5"),
        ("look_bits", 0, "be 1 or more"),
        ("look_bits", -3, "be 1 or more"),
        ("look_bits", 1, "give at most 20000 looks"),
        ("max_bits", 10, "be at least one look"),
        ("burst_weights", (), "shares summing to 1"),
        ("burst_weights", ((1, 0.5), (2, 0.6)), "shares summing to 1"),
        ("burst_weights", ((0, 1.0),), "errors of 1 or more"),
        ("burst_weights", ((1.5, 1.0),), "whole errors"),
    ],
)
def test_values_outside_their_rule_are_refused_by_name(name: str, value: object, rule: str) -> None:
    with pytest.raises(ParameterError, match=rf"{name} is .* must .*{rule}"):
        design_plan(**(SOUND | {name: value}))  # type: ignore[arg-type]  # wrong on purpose


def test_too_few_bits_are_refused_with_what_the_best_fixed_test_needs() -> None:
    fixed = fixed_test_bits(good_ber=1e-5, limit_ber=3e-5, producer_risk=0.01, consumer_risk=0.01)
    with pytest.raises(PlanError, match=f"within 200000 bits; the best fixed test needs {fixed}"):
        design_plan(**(SOUND | {"max_bits": 200_000}))  # type: ignore[arg-type]  # a dict of mixed numbers
