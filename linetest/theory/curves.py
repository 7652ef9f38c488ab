"""The public questions: a rate at an Eb/N0, and the Eb/N0 for a rate."""

from __future__ import annotations

from typing import Literal, overload

import numpy as np
import numpy.typing as npt

from linetest.errors import ParameterError
from linetest.theory.gaussian import as_float_array, checked_ebn0_db, first_where, in_shape_of
from linetest.theory.schemes import Curve, find_curve
from linetest.units import FloatArray

SymbolForm = Literal["exact", "no-square-term", "union-bound"]

# A level exactly at the edge stays inside when it comes back from its own inverse.
_EDGE_DB = 1e-9
_EDGE = 1.0 + 1e-9


def trusted_ber_range(scheme: str) -> tuple[float, float]:
    """Bit error rates for which the scheme's curve may carry a limit.

    Args:
        scheme: Name of the scheme.

    Returns:
        Least and greatest bit error rate: (0, 0.5) for exact forms, up to that of the first simulated point
        for schemes with a convolutional code.

    Raises:
        ParameterError: The scheme is unknown.
    """
    curve = find_curve(scheme)
    if np.isinf(curve.least_ebn0_db):
        return 0.0, 0.5
    return 0.0, float(curve.ber(np.asarray(curve.least_ebn0_db)))


@overload
def curve_uncertainty_db(scheme: str, ebn0_db: float) -> float: ...
@overload
def curve_uncertainty_db(scheme: str, ebn0_db: FloatArray) -> FloatArray: ...
def curve_uncertainty_db(scheme: str, ebn0_db: float | FloatArray) -> float | FloatArray:
    """Standard uncertainty of the theory itself, as a shift along Eb/N0.

    Args:
        scheme: One of `SCHEMES`.
        ebn0_db: Eb/N0 per information bit in dB, scalar or array of any shape.

    Returns:
        Standard uncertainty in dB of the same shape; 0 for closed forms.

    Raises:
        ParameterError: The scheme is unknown, or an Eb/N0 is not finite or below what is known.
    """
    curve = find_curve(scheme)
    levels = _known_levels(scheme, curve, ebn0_db)
    own = np.zeros_like(levels) if curve.uncertainty_db is None else curve.uncertainty_db(levels)
    return in_shape_of(ebn0_db, own)


def _known_levels(scheme: str, curve: Curve, ebn0_db: float | FloatArray) -> FloatArray:
    levels = checked_ebn0_db(ebn0_db)
    if np.isinf(curve.least_ebn0_db):
        return levels
    unknown = levels < curve.least_ebn0_db - _EDGE_DB
    if unknown.any():
        rule = f"be at least {curve.least_ebn0_db:.3f} dB for {scheme}: nothing is simulated below"
        raise ParameterError("ebn0_db", first_where(levels, unknown), rule)
    return levels


@overload
def bit_error_rate(scheme: str, ebn0_db: float) -> float: ...
@overload
def bit_error_rate(scheme: str, ebn0_db: FloatArray) -> FloatArray: ...
def bit_error_rate(scheme: str, ebn0_db: float | FloatArray) -> float | FloatArray:
    """Bit error rate of a scheme in white Gaussian noise.

    Args:
        scheme: One of `SCHEMES`.
        ebn0_db: Eb/N0 per information bit in dB, scalar or array of any shape.

    Returns:
        Bit error rate, no unit, of the same shape.

    Raises:
        ParameterError: The scheme is unknown, an Eb/N0 is not finite, or below the least that is
            known of the scheme.
    """
    curve = find_curve(scheme)
    return in_shape_of(ebn0_db, curve.ber(_known_levels(scheme, curve, ebn0_db)))


@overload
def union_bound(scheme: str, ebn0_db: float) -> float: ...
@overload
def union_bound(scheme: str, ebn0_db: FloatArray) -> FloatArray: ...
def union_bound(scheme: str, ebn0_db: float | FloatArray) -> float | FloatArray:
    """Union bound of a coded scheme's bit error rate, also where it is too loose to carry a limit.

    Args:
        scheme: A scheme that ends with a convolutional code, such as ``qpsk+conv-1/2``.
        ebn0_db: Eb/N0 per information bit in dB, scalar or array of any shape.

    Returns:
        Upper bound of the bit error rate of the same shape; may exceed 0.5.

    Raises:
        ParameterError: The scheme is unknown or has no such code, or an Eb/N0 is not finite.
    """
    curve = find_curve(scheme)
    if curve.bound is None:
        raise ParameterError("scheme", scheme, "end with a convolutional code, such as qpsk+conv-1/2")
    return in_shape_of(ebn0_db, curve.bound(checked_ebn0_db(ebn0_db)))


@overload
def symbol_error_rate(scheme: str, ebn0_db: float, *, form: SymbolForm = "exact") -> float: ...
@overload
def symbol_error_rate(scheme: str, ebn0_db: FloatArray, *, form: SymbolForm = "exact") -> FloatArray: ...
def symbol_error_rate(scheme: str, ebn0_db: float | FloatArray, *, form: SymbolForm = "exact") -> float | FloatArray:
    """Symbol error rate of a scheme in white Gaussian noise.

    Args:
        scheme: One of `SCHEMES` without a code.
        ebn0_db: Eb/N0 per information bit in dB, scalar or array of any shape.
        form: ``exact``, or for QPSK one of the usual simplifications: ``no-square-term`` (2Q instead of
            2Q - Q**2) or ``union-bound`` (over the other three points, which adds the opposite one).

    Returns:
        Symbol error rate of the same shape.

    Raises:
        ParameterError: The scheme is unknown or has no such form, or an Eb/N0 is not finite.
    """
    forms = find_curve(scheme).ser
    if not forms:
        raise ParameterError("scheme", scheme, "be a scheme without a code: a decoder decides no symbols")
    if form not in forms:
        raise ParameterError("form", form, f"be one of {', '.join(forms)} for {scheme}")
    return in_shape_of(ebn0_db, forms[form](checked_ebn0_db(ebn0_db)))


@overload
def required_ebn0_db(scheme: str, bit_error_rate: float) -> float: ...
@overload
def required_ebn0_db(scheme: str, bit_error_rate: FloatArray) -> FloatArray: ...
def required_ebn0_db(scheme: str, bit_error_rate: float | FloatArray) -> float | FloatArray:
    """Eb/N0 that a scheme needs for a bit error rate in white Gaussian noise.

    Args:
        scheme: One of `SCHEMES`.
        bit_error_rate: Wanted bit error rate, above 0, below 0.5 and inside the scheme's trusted range,
            scalar or array of any shape.

    Returns:
        Eb/N0 per information bit in dB, of the same shape, good to 1e-9 dB.

    Raises:
        ParameterError: The scheme is unknown or the rate is outside its rule.
    """
    curve = find_curve(scheme)
    if isinstance(bit_error_rate, float) and 0.0 < bit_error_rate < 0.5 and np.isinf(curve.least_ebn0_db):
        return float(curve.ebn0_db(np.asarray(bit_error_rate)))
    rates = as_float_array("bit_error_rate", bit_error_rate)
    _check_rates(rates, scheme, curve)
    return in_shape_of(bit_error_rate, curve.ebn0_db(rates))


def _check_rates(rates: FloatArray, scheme: str, curve: Curve) -> None:
    def refuse(wrong: npt.NDArray[np.bool_], rule: str) -> None:
        if wrong.any():
            raise ParameterError("bit_error_rate", first_where(rates, wrong), rule)

    refuse(~(rates > 0.0), "be above 0")
    refuse(rates >= 0.5, "be below 0.5, the rate of guessing")
    if np.isfinite(curve.least_ebn0_db):
        most = float(curve.ber(np.asarray(curve.least_ebn0_db)))
        refuse(rates > most * _EDGE, f"be at most {most:.3g} for {scheme}: nothing is simulated above")
