"""What may be said of the bit error rate after a sequential stop.

An ordinary interval is biased there, because the stop depends on the errors. The outcomes are ordered instead: early
ACCEPTs lowest, then later ones, then late REJECTs, early REJECTs highest, by errors within a look; the limits are the
rates at which the observed outcome or a more extreme one has probability (1 - confidence)/2.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt

from linetest.decision.intervals import check_counts, check_probability
from linetest.decision.outcomes import INDEPENDENT, Stops
from linetest.decision.plan import Outcome, Plan
from linetest.errors import ParameterError

HALVINGS = 44
LOWEST_RATE = 1e-18


def sequential_interval(plan: Plan, bits: int, errors: int, confidence: float = 0.95) -> tuple[float, float]:
    """Two-sided interval of the bit error rate after a plan's stop, by stage-wise ordering of its outcomes.

    A stop at bits between two looks is placed at the later one.

    Args:
        plan: The plan.
        bits: Bits at the stop.
        errors: Errors among them.
        confidence: Confidence level.

    Returns:
        Lower and upper limit; coverage is at least the level.

    Raises:
        ParameterError: Counts at which the plan does not stop, or a level that cannot be.

    Source:
        P. Armitage, Numerical studies in the sequential estimation of a binomial parameter, Biometrika 45 (1958);
        C. Jennison, B. W. Turnbull, Group Sequential Methods, chapter on analysis following a test (from memory).
    """
    check_counts(bits, errors)
    check_probability("confidence", confidence)
    outcome = plan.decide(bits, errors)
    if outcome is Outcome.CONTINUE:
        raise ParameterError("errors", errors, f"be a stop of the plan at {bits} bits")
    tail = 0.5 * (1.0 - confidence)
    low_tail, high_tail = _tails(plan, bits, errors, accepted=outcome is Outcome.ACCEPT)
    low = 0.0 if errors == 0 else _solve(high_tail, tail, rising=True)
    return low, _solve(low_tail, tail, rising=False)


def median_unbiased_ber(plan: Plan, bits: int, errors: int) -> float:
    """Bit error rate at which the observed stop is the median of the plan's outcomes.

    Errors by bits is biased after a sequential stop; this lies above the truth as often as below, and always inside
    :func:`sequential_interval`.

    Args:
        plan: The plan.
        bits: Bits at the stop.
        errors: Errors among them.

    Returns:
        The estimate; 0 where no error was counted.

    Raises:
        ParameterError: Counts at which the plan does not stop.
    """
    if errors == 0:
        check_counts(bits, errors)
        return 0.0
    # The two sides differ by the probability of the outcome itself; their geometric mean splits it.
    low, high = sequential_interval(plan, bits, errors, confidence=1e-9)
    return float(np.sqrt(low * high))


def _tails(
    plan: Plan, bits: int, errors: int, *, accepted: bool
) -> tuple[Callable[[float], float], Callable[[float], float]]:
    """Probability of an outcome at or below, and at or above, the observed one, as functions of the rate."""
    look = min(-(-bits // plan.look_bits), plan.looks)
    position = _order(np.array([look]), np.array([errors]), np.array([accepted]))[0]

    def probability(rate: float, *, above: bool) -> float:
        stops = plan.stops() if plan.burst_weights == INDEPENDENT else plan.stops(rate)
        order = _order(stops.bits // plan.look_bits, stops.errors, stops.accepted)
        chances = _chances(plan, stops, rate)
        if not above:
            return float(chances[_at_or_above(-order, -position)].sum())
        # By the complement: at rates far above, outcomes too unlikely for the pass carry all the weight.
        return 1.0 - float(chances[~_at_or_above(order, position)].sum())

    return lambda rate: probability(rate, above=False), lambda rate: probability(rate, above=True)


def _chances(plan: Plan, stops: Stops, rate: float) -> npt.NDArray[np.float64]:
    return stops.at(np.array([rate]))[0] if plan.burst_weights == INDEPENDENT else stops.probability


def _order(
    look: npt.NDArray[np.int64], errors: npt.NDArray[np.int64], accepted: npt.NDArray[np.bool_]
) -> npt.NDArray[np.float64]:
    """A key that sorts outcomes: rows of (side times lateness, errors)."""
    side = np.where(accepted, -1.0, 1.0)
    return np.stack([side * 1e9 - side * look, errors.astype(np.float64)], axis=1)


def _at_or_above(order: npt.NDArray[np.float64], position: npt.NDArray[np.float64]) -> npt.NDArray[np.bool_]:
    first, second = order[:, 0], order[:, 1]
    return np.asarray((first > position[0]) | ((first == position[0]) & (second >= position[1])))


def _solve(tail: Callable[[float], float], wanted: float, *, rising: bool) -> float:
    low, high = np.log(LOWEST_RATE), np.log(0.5)
    for _ in range(HALVINGS):
        middle = 0.5 * (low + high)
        if (tail(float(np.exp(middle))) < wanted) == rising:
            low = middle
        else:
            high = middle
    return float(np.exp(low if rising else high))
