"""Guard bands and the risks of a decision on one measured value (JCGM 106).

Three different things are called risk; here each has its name. The specific risk asks: given this result, how likely
is the true value beyond the limit? The global risks ask, before anything is measured: how likely is an item to be bad
and accepted (consumer's), or good and rejected (producer's)? They need the distribution of the line, and its source.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy import integrate, optimize, special

from linetest.errors import ParameterError
from linetest.units import FloatArray

Density = Callable[[FloatArray], FloatArray]

# The measurement's normal distribution holds less than 1e-15 beyond this.
_REACH_SIGMA = 8.0


@dataclass(frozen=True, slots=True)
class GlobalRisks:
    """Risks of a decision rule on a line of items.

    Attributes:
        consumer: Probability that an item is beyond the limit and accepted.
        producer: Probability that an item is within the limit and rejected.
    """

    consumer: float
    producer: float


def guard_band(u: float, most_specific_risk: float) -> float:
    """Least distance between result and upper limit that keeps the specific risk.

    Args:
        u: Standard uncertainty of the result (normal), any unit.
        most_specific_risk: Largest probability that the true value lies beyond the limit, above 0, at most 0.5.

    Returns:
        The distance, in the unit of `u`.

    Raises:
        ParameterError: A value is outside its rule.

    Source: JCGM 106:2012, 8.3.2 and ILAC-G8:09/2019, table 1 (1.65 u, that is 0.83 U with U = 2u, for 5 %).
    """
    _check_u(u)
    if not 0.0 < most_specific_risk <= 0.5:
        raise ParameterError("most_specific_risk", most_specific_risk, "lie above 0 and at most at 0.5")
    return float(-special.ndtri(most_specific_risk)) * u


def specific_risk(value: float, u: float, upper_limit: float) -> float:
    """Probability that the true value lies beyond an upper limit, given a result and nothing else known.

    Args:
        value: The result.
        u: Its standard uncertainty (normal), same unit.
        upper_limit: The limit, same unit.

    Returns:
        The probability.

    Raises:
        ParameterError: A value is outside its rule.

    Source: JCGM 106:2012, 7.2.
    """
    _check_u(u)
    return float(special.ndtr((value - upper_limit) / u))


def global_risks(
    density: Density, support: tuple[float, float], *, u: float, upper_limit: float, acceptance_limit: float
) -> GlobalRisks:
    """Global risks of accepting items whose result does not exceed an acceptance limit.

    Args:
        density: Probability density of the line's true values, arrays in and out.
        support: Least and greatest true value.
        u: Standard uncertainty of a result (normal), unit of the values.
        upper_limit: Greatest value of a good item.
        acceptance_limit: Greatest result that is accepted.

    Returns:
        The risks.

    Raises:
        ParameterError: A value is outside its rule.

    Source: JCGM 106:2012, 9.5.
    """
    _check_u(u)
    low, high = support
    if not low < upper_limit < high:
        raise ParameterError("upper_limit", upper_limit, f"lie between {low:g} and {high:g}, the line's ends")

    def accepted(values: FloatArray) -> FloatArray:
        return np.asarray(density(values) * special.ndtr((acceptance_limit - values) / u), dtype=np.float64)

    def rejected(values: FloatArray) -> FloatArray:
        return np.asarray(density(values) * special.ndtr((values - acceptance_limit) / u), dtype=np.float64)

    return GlobalRisks(
        consumer=_integral(accepted, upper_limit, min(high, max(acceptance_limit + _REACH_SIGMA * u, upper_limit))),
        producer=_integral(rejected, max(low, min(acceptance_limit - _REACH_SIGMA * u, upper_limit)), upper_limit),
    )


def acceptance_limit_for(
    density: Density, support: tuple[float, float], *, u: float, upper_limit: float, most_consumer_risk: float
) -> float:
    """Greatest acceptance limit that keeps the global consumer's risk.

    Args:
        density: Probability density of the line's true values.
        support: Least and greatest true value.
        u: Standard uncertainty of a result (normal).
        upper_limit: Greatest value of a good item.
        most_consumer_risk: Largest global consumer's risk.

    Returns:
        The acceptance limit, at most `upper_limit`.

    Raises:
        ParameterError: A value is outside its rule, or no acceptance limit within eight u keeps the risk.
    """

    def excess(limit: float) -> float:
        risks = global_risks(density, support, u=u, upper_limit=upper_limit, acceptance_limit=limit)
        return risks.consumer - most_consumer_risk

    if excess(upper_limit) <= 0.0:
        return upper_limit
    least = upper_limit - _REACH_SIGMA * u
    if not most_consumer_risk > 0.0 or excess(least) > 0.0:
        raise ParameterError("most_consumer_risk", most_consumer_risk, "be one that some acceptance limit keeps")
    return float(optimize.brentq(excess, least, upper_limit, xtol=1e-9 * u))


def _check_u(u: float) -> None:
    if not (math.isfinite(u) and u > 0.0):
        raise ParameterError("u", u, "be finite and above 0")


def _integral(function: Density, low: float, high: float) -> float:
    if high <= low:
        return 0.0
    value, _ = integrate.quad(lambda x: float(function(np.array([x]))[0]), low, high, epsabs=1e-12, epsrel=1e-10)
    return float(value)
