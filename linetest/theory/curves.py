"""The schemes by name, and the three questions asked of them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cache, partial
from types import MappingProxyType
from typing import Literal, overload

import numpy as np
import numpy.typing as npt

from linetest.errors import ParameterError
from linetest.theory import convolutional, phase, uncoded
from linetest.theory.gaussian import (
    ArrayFunction,
    as_float_array,
    checked_ebn0_db,
    first_where,
    in_shape_of,
)
from linetest.theory.inverse import CurveInverse
from linetest.units import FloatArray

SymbolForm = Literal["exact", "no-square-term", "union-bound"]


@dataclass(frozen=True)
class Curve:
    """What is known of one scheme.

    Attributes:
        ber: Bit error rate at Eb/N0 in dB, per information bit.
        ebn0_db: Closed inverse of `ber`, or None where it has none.
        ser: Symbol error rates by form; empty where the scheme has no symbol decision of its own.
        trusted: Least and greatest bit error rate for which the curve may carry a limit.
        why_not_beyond: Why not outside `trusted`, as the end of a sentence.
    """

    ber: ArrayFunction
    ebn0_db: ArrayFunction | None = None
    ser: Mapping[str, ArrayFunction] = field(default_factory=dict)
    trusted: tuple[float, float] = (0.0, 0.5)
    why_not_beyond: str = ""


# Simulated with soft decisions: the bound is 0.03 dB above the truth at 2e-5, 0.15 dB at 3e-4.
_BOUND_TRUSTED = {"conv-1/2": (0.0, 2e-5)}


def _coded(code: str) -> Curve:
    return Curve(
        ber=partial(convolutional.soft_decision_bound, convolutional.SPECTRA[code]),
        trusted=_BOUND_TRUSTED[code],
        why_not_beyond="above it the union bound lies more than 0.03 dB above the truth",
    )


_QUADRATURE_SER: Mapping[str, ArrayFunction] = MappingProxyType(
    {
        "exact": uncoded.quadrature_ser,
        "no-square-term": uncoded.quadrature_ser_no_square_term,
        "union-bound": uncoded.quadrature_ser_union_bound,
    }
)


def _binary(ber: ArrayFunction, ebn0_db: ArrayFunction) -> Curve:
    return Curve(ber, ebn0_db, {"exact": ber})


_QPSK = Curve(uncoded.antipodal_ber, uncoded.antipodal_ebn0_db, _QUADRATURE_SER)
_DQPSK = Curve(phase.dqpsk_ber, None, {"exact": phase.dqpsk_ser})

_CURVES: Mapping[str, Curve] = MappingProxyType(
    {
        "bpsk": _binary(uncoded.antipodal_ber, uncoded.antipodal_ebn0_db),
        "qpsk": _QPSK,
        # Half a symbol between the rails changes nothing for a coherent receiver; MSK is OQPSK with
        # half-sine pulses, here with the precoder that lets each decision be a bit.
        "oqpsk": _QPSK,
        "msk": _binary(uncoded.antipodal_ber, uncoded.antipodal_ebn0_db),
        "de-bpsk": _binary(uncoded.de_antipodal_ber, uncoded.de_antipodal_ebn0_db),
        "de-qpsk": Curve(uncoded.de_antipodal_ber, uncoded.de_antipodal_ebn0_db, {"exact": uncoded.de_quadrature_ser}),
        "dbpsk": _binary(uncoded.dbpsk_ber, uncoded.dbpsk_ebn0_db),
        "dqpsk": _DQPSK,
        # The turn of pi/4 that every symbol adds is known to the receiver and drops out.
        "pi4-dqpsk": _DQPSK,
        "8psk": Curve(phase.octal_ber, None, {"exact": phase.octal_ser}),
        "16qam": Curve(uncoded.square_16_ber, None, {"exact": uncoded.square_16_ser}),
        "fsk-coherent": _binary(uncoded.fsk_coherent_ber, uncoded.fsk_coherent_ebn0_db),
        "fsk-noncoherent": _binary(uncoded.fsk_noncoherent_ber, uncoded.fsk_noncoherent_ebn0_db),
        "qpsk+conv-1/2": _coded("conv-1/2"),
    }
)

# A rate exactly at the edge stays inside when it comes back from its own inverse.
_EDGE = 1.0 + 1e-9

SCHEMES: tuple[str, ...] = tuple(_CURVES)


def _curve(scheme: str) -> Curve:
    if scheme not in SCHEMES:
        raise ParameterError("scheme", scheme, f"be one of {', '.join(SCHEMES)}")
    return _CURVES[scheme]


@cache
def _inverse(scheme: str) -> ArrayFunction:
    curve = _curve(scheme)
    return curve.ebn0_db if curve.ebn0_db is not None else CurveInverse(curve.ber)


def trusted_ber_range(scheme: str) -> tuple[float, float]:
    """Bit error rates for which the scheme's curve may carry a limit.

    Args:
        scheme: Name of the scheme.

    Returns:
        Least and greatest bit error rate. (0, 0.5) for exact closed forms.

    Raises:
        ParameterError: The scheme is unknown.
    """
    return _curve(scheme).trusted


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
        ParameterError: The scheme is unknown, an Eb/N0 is not finite, or the rate there is outside the
            scheme's trusted range.
    """
    curve = _curve(scheme)
    levels = checked_ebn0_db(ebn0_db)
    rates = curve.ber(levels)
    wrong = rates > curve.trusted[1] * _EDGE
    if wrong.any():
        raise ParameterError(
            "ebn0_db",
            first_where(levels, wrong),
            f"be at least {_inverse(scheme)(np.asarray(curve.trusted[1])):.3f} dB for {scheme}, "
            f"where its bit error rate falls to {curve.trusted[1]:g}: {curve.why_not_beyond}",
        )
    return in_shape_of(ebn0_db, rates)


@overload
def union_bound(scheme: str, ebn0_db: float) -> float: ...
@overload
def union_bound(scheme: str, ebn0_db: FloatArray) -> FloatArray: ...
def union_bound(scheme: str, ebn0_db: float | FloatArray) -> float | FloatArray:
    """Union bound of a coded scheme's bit error rate, also where it is too loose to carry a limit.

    Args:
        scheme: A scheme with a code, such as ``qpsk+conv-1/2``.
        ebn0_db: Eb/N0 per information bit in dB, scalar or array of any shape.

    Returns:
        Upper bound of the bit error rate of the same shape; may exceed 0.5.

    Raises:
        ParameterError: The scheme is unknown or has no code, or an Eb/N0 is not finite.
    """
    curve = _curve(scheme)
    if "+" not in scheme:
        raise ParameterError("scheme", scheme, "name a code after a plus sign, such as qpsk+conv-1/2")
    return in_shape_of(ebn0_db, curve.ber(checked_ebn0_db(ebn0_db)))


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
    forms = _curve(scheme).ser
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
    curve = _curve(scheme)
    rates = as_float_array("bit_error_rate", bit_error_rate)
    _check_rates(rates, scheme, curve)
    return in_shape_of(bit_error_rate, _inverse(scheme)(rates))


def _check_rates(rates: FloatArray, scheme: str, curve: Curve) -> None:
    def refuse(wrong: npt.NDArray[np.bool_], rule: str) -> None:
        if wrong.any():
            raise ParameterError("bit_error_rate", first_where(rates, wrong), rule)

    refuse(~(rates > 0.0), "be above 0")
    refuse(rates >= 0.5, "be below 0.5, the rate of guessing")
    least, most = curve.trusted
    refuse(
        (rates < least) | (rates > most),
        f"lie between {least:g} and {most:g} for {scheme}: {curve.why_not_beyond}",
    )
