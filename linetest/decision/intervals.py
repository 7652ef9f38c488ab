"""Intervals for a fixed number of bits."""

from __future__ import annotations

from scipy import special

from linetest.errors import ParameterError


def check_counts(bits: int, errors: int) -> None:
    """Refuse counts that cannot be.

    Args:
        bits: Bits counted.
        errors: Errors among them.

    Raises:
        ParameterError: No bits, negative errors, or more errors than bits.
    """
    if bits < 1:
        raise ParameterError("bits", bits, "be 1 or more")
    if not 0 <= errors <= bits:
        raise ParameterError("errors", errors, f"lie between 0 and the {bits} bits counted")


def check_probability(name: str, value: float) -> None:
    """Refuse a probability of 0, 1 or beyond.

    Args:
        name: Name of the parameter.
        value: Its value.

    Raises:
        ParameterError: It does not lie strictly between 0 and 1.
    """
    if not 0.0 < value < 1.0:
        raise ParameterError(name, value, "lie between 0 and 1, without the ends")


def interval(bits: int, errors: int, confidence: float = 0.95) -> tuple[float, float]:
    """Exact (Clopper-Pearson) two-sided interval of a bit error rate from a fixed number of bits.

    Args:
        bits: Bits counted, fixed before counting.
        errors: Errors among them, independent of each other.
        confidence: Confidence level, between 0 and 1.

    Returns:
        Lower and upper limit.

    Raises:
        ParameterError: Counts or level that cannot be.

    Source:
        C. J. Clopper, E. S. Pearson, The use of confidence or fiducial limits illustrated in the case of the
        binomial, Biometrika 26 (1934).
    """
    check_counts(bits, errors)
    check_probability("confidence", confidence)
    tail = 0.5 * (1.0 - confidence)
    low = float(special.betaincinv(errors, bits - errors + 1, tail)) if errors else 0.0
    high = float(special.betainccinv(errors + 1, bits - errors, tail)) if errors < bits else 1.0
    return low, high
