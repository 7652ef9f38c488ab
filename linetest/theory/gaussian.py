"""The Gaussian tail and how arrays, scalars and dB pass through the room."""

from __future__ import annotations

from collections.abc import Callable
from math import isfinite

import numpy as np
import numpy.typing as npt
from scipy import special

from linetest.errors import ParameterError
from linetest.units import FloatArray

ArrayFunction = Callable[[FloatArray], FloatArray]

# exp() runs several times faster than 10**x on arrays, and half the exponent gives sqrt(Eb/N0) directly.
_AMPLITUDE_PER_DB = np.log(10.0) / 20.0
_SQRT_HALF = np.sqrt(0.5)


def amplitude(level_db: FloatArray) -> FloatArray:
    """Square root of a power ratio given in dB: 10**(dB/20).

    Args:
        level_db: Levels in dB, any shape.

    Returns:
        Amplitude ratios of the same shape.
    """
    return np.asarray(np.exp(level_db * _AMPLITUDE_PER_DB), dtype=np.float64)


def gaussian_tail(x: FloatArray) -> FloatArray:
    """Q(x), the chance that a standard normal variable exceeds x.

    Written with erfc, which keeps its relative accuracy far into the tail.

    Args:
        x: Thresholds in standard deviations, any shape.

    Returns:
        Tail probabilities of the same shape.

    Source:
        Abramowitz and Stegun, Handbook of Mathematical Functions, 7.1.2 and 26.2.3.
    """
    return np.asarray(0.5 * special.erfc(x * _SQRT_HALF), dtype=np.float64)


def checked_ebn0_db(ebn0_db: float | npt.ArrayLike) -> FloatArray:
    """Eb/N0 as an array of finite dB values.

    Args:
        ebn0_db: Eb/N0 in dB, scalar or array.

    Returns:
        The same values as float64.

    Raises:
        ParameterError: A value is not a finite number.
    """
    if isinstance(ebn0_db, float) and isfinite(ebn0_db):
        # The common case of one level: a tenth of the time of the general check.
        return np.asarray(ebn0_db, dtype=np.float64)
    values = as_float_array("ebn0_db", ebn0_db)
    if not np.isfinite(values).all():
        raise ParameterError("ebn0_db", first_where(values, ~np.isfinite(values)), "be a finite number of dB")
    return values


def as_float_array(parameter: str, given: npt.ArrayLike) -> FloatArray:
    """An argument as float64.

    Args:
        parameter: The argument's name, for the error.
        given: What the caller passed.

    Returns:
        The values, 0-dimensional for a scalar.

    Raises:
        ParameterError: The argument is not made of real numbers.
    """
    try:
        raw = np.asarray(given)
    except ValueError as reason:
        raise ParameterError(parameter, given, "be a real number or an array of them, not ragged") from reason
    if raw.dtype.kind not in "fiu":
        raise ParameterError(parameter, given, "be a real number or an array of real numbers")
    return raw.astype(np.float64, copy=False)


def first_where(values: FloatArray, wrong: npt.NDArray[np.bool_]) -> float:
    """First value that breaks a rule, so that the error can show it.

    Args:
        values: The values checked.
        wrong: True where a value breaks the rule; at least one is.

    Returns:
        That value.
    """
    return float(np.atleast_1d(values)[np.atleast_1d(wrong)][0])


def in_shape_of(given: npt.ArrayLike, values: FloatArray) -> float | FloatArray:
    """A float where a scalar was given, an array where an array was given.

    Args:
        given: What the caller passed.
        values: What was computed from it.

    Returns:
        The values in the caller's form.
    """
    return values if isinstance(given, np.ndarray) or values.ndim else float(values)
