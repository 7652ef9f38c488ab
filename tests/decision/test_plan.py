"""A plan as a value: decisions, exact curves, JSON."""

from __future__ import annotations

import json
from dataclasses import FrozenInstanceError
from itertools import pairwise

import numpy as np
import pytest
from scipy import stats

from linetest.decision import Outcome, Plan, design_plan
from linetest.errors import ParameterError


@pytest.fixture(scope="module")
def plan() -> Plan:
    return design_plan(
        good_ber=1e-5, limit_ber=3e-5, producer_risk=0.01, consumer_risk=0.02, look_bits=20_000, max_bits=3_000_000
    )


def single_sample(bits: int, allowed: int) -> Plan:
    """A plan of one look: accept at ``allowed`` errors or fewer."""
    return Plan(
        good_ber=0.01,
        limit_ber=0.2,
        look_bits=bits,
        looks=1,
        slope=0.05,
        accept_gap=1.0,
        reject_gap=1.0,
        last_accept_errors=allowed,
        producer_risk=0.0,
        consumer_risk=0.0,
    )


def test_single_sample_plan_has_the_published_acceptance_probabilities() -> None:
    """Plan n = 10, c = 3: A. Kiermeier, AcceptanceSampling (R) manual, section 4.1.2."""
    found = single_sample(10, 3).acceptance_probability(np.array([0.05, 0.10]))
    assert found == pytest.approx([0.9989715, 0.9872048], abs=0.5e-7)


def test_single_sample_plan_of_the_handbook() -> None:
    """Plan n = 52, c = 3 at 1 to 12 %: NIST e-Handbook 6.2.3.2, from memory (third decimal not sure)."""
    printed = [0.998, 0.980, 0.930, 0.845, 0.739, 0.620, 0.502, 0.394, 0.300, 0.223, 0.162, 0.115]
    found = single_sample(52, 3).acceptance_probability(np.arange(1, 13) / 100)
    assert found == pytest.approx(printed, abs=1.5e-3)
    assert found == pytest.approx(stats.binom.cdf(3, 52, np.arange(1, 13) / 100), rel=1e-12)


def test_decisions_at_every_look_are_those_of_the_integer_boundaries(plan: Plan) -> None:
    """The risks are computed for the boundaries; decide() must draw exactly the same lines."""
    for look, (accept, reject) in enumerate(zip(plan.accept_errors, plan.reject_errors, strict=True), start=1):
        bits = look * plan.look_bits
        for errors in range(max(0, accept - 2), reject + 3):
            expected = Outcome.ACCEPT if errors <= accept else Outcome.REJECT if errors >= reject else Outcome.CONTINUE
            assert plan.decide(bits, errors) is expected


def test_late_look_uses_the_lines_at_its_real_bits(plan: Plan) -> None:
    first_accept = next(look for look, count in enumerate(plan.accept_errors, start=1) if count >= 0)
    needed = int(np.ceil(plan.accept_gap / plan.slope))
    assert (first_accept - 1) * plan.look_bits < needed <= first_accept * plan.look_bits
    assert plan.decide(needed, 0) is Outcome.ACCEPT
    assert plan.decide(needed - 1, 0) is Outcome.CONTINUE


def test_last_look_and_beyond_always_decide(plan: Plan) -> None:
    for bits in (plan.max_bits, plan.max_bits + 1, plan.max_bits + 777_777, 3 * plan.max_bits):
        assert Outcome.CONTINUE not in {plan.decide(bits, errors) for errors in range(300)}


def test_late_looks_do_not_raise_the_risks(plan: Plan) -> None:
    """Counters are read late by up to a look and a half; both risks stay below the plan's."""
    rng = np.random.default_rng(3)
    tests = 4_000
    wrong = {plan.good_ber: 0, plan.limit_ber: 0}
    for ber in wrong:
        for _ in range(tests):
            bits = errors = 0
            outcome = Outcome.CONTINUE
            while outcome is Outcome.CONTINUE:
                step = int(plan.look_bits * rng.uniform(1.0, 2.5))
                bits, errors = bits + step, errors + int(rng.binomial(step, ber))
                outcome = plan.decide(bits, errors)
            wrong[ber] += (outcome is Outcome.REJECT) == (ber == plan.good_ber)
    for ber, risk in ((plan.good_ber, plan.producer_risk), (plan.limit_ber, plan.consumer_risk)):
        assert wrong[ber] <= stats.binom.ppf(0.9999, tests, risk)
        assert wrong[ber] > 0


def test_nearness_runs_from_the_rejecting_to_the_accepting_line(plan: Plan) -> None:
    bits = 40 * plan.look_bits
    errors = range(plan.accept_errors[39], plan.reject_errors[39] + 1)
    near = [plan.nearness(bits, count) for count in errors]
    assert near[0] == 1.0
    assert near[-1] == -1.0
    assert all(later < earlier for earlier, later in pairwise(near))


def test_acceptance_falls_with_the_rate_and_ends_at_one_and_zero(plan: Plan) -> None:
    rates = np.concatenate([[0.0], np.geomspace(1e-9, 0.5, 200)])
    accepted = plan.acceptance_probability(rates)
    assert accepted[0] == pytest.approx(1.0, abs=1e-12)
    assert accepted[-1] == pytest.approx(0.0, abs=1e-12)
    assert np.all(np.diff(accepted) <= 1e-9)


def test_mean_bits_at_the_ends_are_those_of_the_first_decisions_possible(plan: Plan) -> None:
    """No error: the first look that accepts on none. Every second bit wrong: the first look rejects."""
    first_accept = next(look for look, count in enumerate(plan.accept_errors, start=1) if count >= 0)
    assert plan.expected_bits(0.0) == pytest.approx(first_accept * plan.look_bits, rel=1e-12)
    assert plan.expected_bits(0.5) == pytest.approx(plan.look_bits, rel=1e-12)
    worst = plan.expected_bits(np.geomspace(plan.good_ber, plan.limit_ber, 41))
    assert plan.expected_bits(plan.good_ber) < worst.max() < plan.max_bits


def test_arrays_keep_their_shape_and_scalars_stay_scalars(plan: Plan) -> None:
    rates = np.array([[1e-6, 1e-5, 2e-5], [3e-5, 1e-4, 1e-3]])
    together = plan.acceptance_probability(rates)
    assert together.shape == (2, 3)
    assert isinstance(plan.expected_bits(1e-5), float)
    # The matrix product sums in another order for one row than for six.
    assert together[1, 0] == pytest.approx(plan.acceptance_probability(3e-5), rel=1e-12)


@pytest.mark.parametrize("ber", [-1e-9, 0.51, float("nan")])
def test_rates_that_cannot_be_are_refused(plan: Plan, ber: float) -> None:
    with pytest.raises(ParameterError, match=r"ber is .* must lie between 0 and 0\.5"):
        plan.acceptance_probability(ber)


@pytest.mark.parametrize(("bits", "errors"), [(0, 0), (-20_000, 0), (20_000, -1), (5, 6)])
def test_counts_that_cannot_be_are_refused(plan: Plan, bits: int, errors: int) -> None:
    with pytest.raises(ParameterError, match=r"(bits|errors) is"):
        plan.decide(bits, errors)


def test_plans_are_frozen_hashable_values(plan: Plan) -> None:
    with pytest.raises(FrozenInstanceError):
        plan.looks = 3  # type: ignore[misc]  # wrong on purpose
    assert len({plan, Plan.from_json(plan.to_json())}) == 1


def test_json_brings_back_the_equal_plan_and_the_same_bytes(plan: Plan) -> None:
    paired = design_plan(
        good_ber=1e-5,
        limit_ber=3e-5,
        producer_risk=0.01,
        consumer_risk=0.02,
        look_bits=50_000,
        max_bits=6_000_000,
        burst_weights=((1, 0.25), (2, 0.75)),
    )
    for one in (plan, paired):
        again = Plan.from_json(one.to_json())
        assert again == one
        assert again.to_json() == one.to_json()
        assert again.digest() == one.digest()
        keys = list(json.loads(one.to_json()))
        assert keys == sorted(keys)
    assert plan.digest() != paired.digest()


@pytest.mark.parametrize("text", ["", "nonsense", "[]", "3", "{}", '{"good_ber": 1}', '{"burst_weights": [[1, 1.0]]}'])
def test_text_that_is_no_plan_is_refused(text: str) -> None:
    with pytest.raises(ParameterError, match="must be the JSON of a plan"):
        Plan.from_json(text)
