"""Designing a plan: two lines whose exact risks meet the sheet.

The lines have the slope of the likelihood ratio of the two rates (A. Wald, Sequential Analysis, 1947). Their gaps start
at Wald's asymptotic values and shrink until both exact risks, for the looks really taken, just meet what is asked: that
is the least mean number of bits at the good rate among plans of this shape.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from scipy import special

from linetest.decision.intervals import check_probability
from linetest.decision.outcomes import INDEPENDENT, BurstWeights, walk
from linetest.decision.plan import Plan, boundary_counts
from linetest.errors import ParameterError, PlanError

ROUNDS = 12
HALVINGS = 5
MOST_LOOKS = 20_000
CLOSE = 0.004


def design_plan(
    *,
    good_ber: float,
    limit_ber: float,
    producer_risk: float,
    consumer_risk: float,
    look_bits: int,
    max_bits: int,
    burst_weights: BurstWeights = INDEPENDENT,
) -> Plan:
    """Design a plan whose exact risks meet those asked.

    Args:
        good_ber: Bit error rate of a good unit.
        limit_ber: Bit error rate of a unit at the limit, above ``good_ber``.
        producer_risk: Largest probability of REJECT at ``good_ber``, below 0.5.
        consumer_risk: Largest probability of ACCEPT at ``limit_ber``, below 0.5.
        look_bits: Bits from look to look.
        max_bits: Most bits; the last look is at or before them and decides.
        burst_weights: (errors of an event, probability) pairs that sum to 1.

    Returns:
        The plan; equal arguments give equal plans.

    Raises:
        ParameterError: A value outside its rule.
        PlanError: The risks cannot be met within the most bits.
    """
    for name, risk in (("producer_risk", producer_risk), ("consumer_risk", consumer_risk)):
        check_probability(name, risk)
        if risk >= 0.5:
            raise ParameterError(name, risk, "be below 0.5")
    _check_rates(good_ber, limit_ber)
    if look_bits < 1:
        raise ParameterError("look_bits", look_bits, "be 1 or more")
    if max_bits < look_bits:
        raise ParameterError("max_bits", max_bits, f"be at least one look of {look_bits} bits")
    if max_bits // look_bits > MOST_LOOKS:
        raise ParameterError("look_bits", look_bits, f"give at most {MOST_LOOKS} looks within {max_bits} bits")
    weights = _checked_weights(burst_weights)
    return _designed(good_ber, limit_ber, producer_risk, consumer_risk, look_bits, max_bits // look_bits, weights)


@lru_cache(maxsize=8192)
def _designed(
    good: float, limit: float, alpha: float, beta: float, look_bits: int, looks: int, weights: BurstWeights
) -> Plan:
    unit = np.log(limit / good) + np.log1p(-good) - np.log1p(-limit)  # likelihood ratio of one error, in nats
    slope = float((np.log1p(-good) - np.log1p(-limit)) / unit)
    scale = float(_dispersion(weights) / unit)
    gap_a, gap_r = np.log((1.0 - alpha) / beta) * scale, np.log((1.0 - beta) / alpha) * scale
    last = int(np.floor(slope * look_bits * looks))
    best: Plan | None = None
    beyond: tuple[float, float] | None = None
    for turn in range(ROUNDS):
        plan = _plan(good, limit, look_bits, looks, slope, gap_a, gap_r, last, weights)
        met = plan.producer_risk <= alpha and plan.consumer_risk <= beta
        if met and (best is None or gap_a + gap_r < best.accept_gap + best.reject_gap):
            best = plan
        elif not met:
            beyond = gap_a, gap_r
        short_a = np.log(max(plan.consumer_risk, 1e-12) / beta)
        short_r = np.log(max(plan.producer_risk, 1e-12) / alpha)
        if met and max(-short_a, -short_r) < CLOSE:
            break
        # Each risk falls about exponentially with its own gap; stay a hair inside, more so when late.
        hair = CLOSE * 0.5 * (1.0 + turn)
        gap_a = max(gap_a + scale * float(np.clip(short_a + hair, -0.5, 0.5)), 1e-3)
        gap_r = max(gap_r + scale * float(np.clip(short_r + hair, -0.5, 0.5)), 1e-3)
    if best is None:
        needed = fixed_test_bits(
            good_ber=good, limit_ber=limit, producer_risk=alpha, consumer_risk=beta, burst_weights=weights
        )
        raise PlanError(
            f"risks {alpha:g} (producer) and {beta:g} (consumer) cannot be met between BER {good:.3g} and {limit:.3g} "
            f"within {look_bits * looks} bits; the best fixed test needs {needed}"
        )
    if beyond is not None and min(best.consumer_risk / beta, best.producer_risk / alpha) < 1.0 - CLOSE:
        # Risks jump with whole counts and the search may have stopped far inside: walk towards the nearest miss.
        for _ in range(HALVINGS):
            middle = 0.5 * (best.accept_gap + beyond[0]), 0.5 * (best.reject_gap + beyond[1])
            plan = _plan(good, limit, look_bits, looks, slope, *middle, last, weights)
            if plan.producer_risk <= alpha and plan.consumer_risk <= beta:
                best = plan
            else:
                beyond = middle
    return best


def _plan(
    good: float,
    limit: float,
    look_bits: int,
    looks: int,
    slope: float,
    gap_a: float,
    gap_r: float,
    last: int,
    weights: BurstWeights,
) -> Plan:
    accept, reject = boundary_counts(look_bits, looks, slope, gap_a, gap_r, last)
    if weights == INDEPENDENT:
        stops = walk(look_bits, accept, reject, float(np.sqrt(good * limit)), weights)
        accepted = stops.at(np.array([good, limit])) @ stops.accepted.astype(np.float64)
    else:
        passes = [walk(look_bits, accept, reject, ber, weights) for ber in (good, limit)]
        accepted = np.array([stops.probability @ stops.accepted.astype(np.float64) for stops in passes])
    return Plan(
        good_ber=good,
        limit_ber=limit,
        look_bits=look_bits,
        looks=looks,
        slope=slope,
        accept_gap=float(gap_a),
        reject_gap=float(gap_r),
        last_accept_errors=last,
        producer_risk=float(1.0 - accepted[0]),
        consumer_risk=float(accepted[1]),
        burst_weights=weights,
    )


def fixed_test_bits(
    *,
    good_ber: float,
    limit_ber: float,
    producer_risk: float,
    consumer_risk: float,
    burst_weights: BurstWeights = INDEPENDENT,
) -> int:
    """Bits of the shortest test of fixed length that meets both risks.

    Errors are Poisson distributed; for bursts the length is that of independent errors times the dispersion of the
    burst weights, an approximation.

    Args:
        good_ber: Bit error rate of a good unit.
        limit_ber: Bit error rate of a unit at the limit.
        producer_risk: Largest probability of REJECT at ``good_ber``.
        consumer_risk: Largest probability of ACCEPT at ``limit_ber``.
        burst_weights: (errors of an event, probability) pairs.

    Returns:
        Number of bits.

    Raises:
        ParameterError: A value outside its rule.
        PlanError: The two rates are so close that more than a million errors would be needed.
    """
    check_probability("producer_risk", producer_risk)
    check_probability("consumer_risk", consumer_risk)
    _check_rates(good_ber, limit_ber)
    allowed = np.arange(1_000_000, dtype=np.float64)
    limit_mean = special.gammainccinv(allowed[:4096] + 1.0, consumer_risk)
    accepts = special.gammaincc(allowed[:4096] + 1.0, limit_mean * good_ber / limit_ber)
    if not np.any(accepts >= 1.0 - producer_risk):
        limit_mean = special.gammainccinv(allowed + 1.0, consumer_risk)
        accepts = special.gammaincc(allowed + 1.0, limit_mean * good_ber / limit_ber)
        if not np.any(accepts >= 1.0 - producer_risk):
            raise PlanError(f"BER {good_ber:.6g} and {limit_ber:.6g} are too close to be told apart")
    first = int(np.argmax(accepts >= 1.0 - producer_risk))
    return int(np.ceil(float(limit_mean[first]) / limit_ber * _dispersion(_checked_weights(burst_weights))))


def wald_bound(*, good_ber: float, limit_ber: float, producer_risk: float, consumer_risk: float) -> tuple[float, float]:
    """Wald's lower bounds of the mean number of bits of any test with these exact risks, for independent errors.

    Args:
        good_ber: Bit error rate of a good unit.
        limit_ber: Bit error rate of a unit at the limit.
        producer_risk: Exact probability of REJECT at ``good_ber``.
        consumer_risk: Exact probability of ACCEPT at ``limit_ber``.

    Returns:
        Least mean bits at the good rate and at the limit.

    Raises:
        ParameterError: A value outside its rule.

    Source:
        A. Wald, Sequential tests of statistical hypotheses, Annals of Mathematical Statistics 16 (1945).
    """
    check_probability("producer_risk", producer_risk)
    check_probability("consumer_risk", consumer_risk)
    _check_rates(good_ber, limit_ber)

    def divergence(p: float, q: float) -> float:
        return float(p * np.log(p / q) + (1.0 - p) * np.log((1.0 - p) / (1.0 - q)))

    at_good = divergence(producer_risk, 1.0 - consumer_risk) / divergence(good_ber, limit_ber)
    at_limit = divergence(consumer_risk, 1.0 - producer_risk) / divergence(limit_ber, good_ber)
    return at_good, at_limit


def _check_rates(good_ber: float, limit_ber: float) -> None:
    if not 0.0 < limit_ber < 0.5:
        raise ParameterError("limit_ber", limit_ber, "lie between 0 and 0.5, without the ends")
    if not 0.0 < good_ber < limit_ber:
        raise ParameterError("good_ber", good_ber, f"lie above 0 and below the limit's {limit_ber:.6g}")


def _checked_weights(weights: BurstWeights) -> BurstWeights:
    total = sum(share for _, share in weights)
    if (
        not weights
        or any(size < 1 or size != int(size) or not share > 0.0 for size, share in weights)
        or abs(total - 1.0) > 1e-9
    ):
        raise ParameterError(
            "burst_weights", weights, "be (whole errors of 1 or more, share above 0) pairs, shares summing to 1"
        )
    merged = tuple((int(size), float(share)) for size, share in weights)
    return INDEPENDENT if merged == ((1, total),) else merged


def _dispersion(weights: BurstWeights) -> float:
    mean = sum(size * share for size, share in weights)
    return sum(size * size * share for size, share in weights) / mean
