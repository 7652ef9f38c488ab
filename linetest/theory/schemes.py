"""The schemes by name: a modulation and, after plus signs, an inner and an outer code."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from functools import cache
from types import MappingProxyType

import numpy as np

from linetest.errors import ParameterError
from linetest.theory import phase, uncoded
from linetest.theory.coded import DecodedCurve
from linetest.theory.decoder_tables import DECODER_ROWS
from linetest.theory.gaussian import ArrayFunction
from linetest.theory.inverse import CurveInverse
from linetest.theory.reed_solomon import OUTER_CODES, ReedSolomon, output_bit_error_rate
from linetest.units import FloatArray


@dataclass(frozen=True)
class Curve:
    """What is known of one scheme.

    Attributes:
        ber: Bit error rate at Eb/N0 in dB, per information bit.
        ebn0_db: Inverse of `ber`.
        ser: Symbol error rates by form; empty where a decoder decides bits, not symbols.
        least_ebn0_db: Eb/N0 below which the curve is not known, in dB.
        uncertainty_db: Standard uncertainty of the curve along Eb/N0; None for closed forms.
        bound: Union bound, where a convolutional code has one.
    """

    ber: ArrayFunction
    ebn0_db: ArrayFunction
    ser: Mapping[str, ArrayFunction] = field(default_factory=dict)
    least_ebn0_db: float = -np.inf
    uncertainty_db: ArrayFunction | None = None
    bound: ArrayFunction | None = None


_QUADRATURE_SER: Mapping[str, ArrayFunction] = MappingProxyType(
    {
        "exact": uncoded.quadrature_ser,
        "no-square-term": uncoded.quadrature_ser_no_square_term,
        "union-bound": uncoded.quadrature_ser_union_bound,
    }
)


def _binary(ber: ArrayFunction, ebn0_db: ArrayFunction) -> Curve:
    return Curve(ber, ebn0_db, {"exact": ber})


def _bpsk() -> Curve:
    return _binary(uncoded.antipodal_ber, uncoded.antipodal_ebn0_db)


def _qpsk() -> Curve:
    return Curve(uncoded.antipodal_ber, uncoded.antipodal_ebn0_db, _QUADRATURE_SER)


def _de_qpsk() -> Curve:
    symbols = {"exact": uncoded.de_quadrature_ser}
    return Curve(uncoded.de_antipodal_ber, uncoded.de_antipodal_ebn0_db, symbols)


def _dqpsk() -> Curve:
    return Curve(phase.dqpsk_ber, CurveInverse(phase.dqpsk_ber), {"exact": phase.dqpsk_ser})


_MODULATIONS: Mapping[str, Callable[[], Curve]] = MappingProxyType(
    {
        "bpsk": _bpsk,
        "qpsk": _qpsk,
        # Half a symbol between the rails changes nothing for a coherent receiver; MSK is OQPSK with
        # half-sine pulses, here with the precoder that lets each decision be a bit.
        "oqpsk": _qpsk,
        "msk": _bpsk,
        "de-bpsk": lambda: _binary(uncoded.de_antipodal_ber, uncoded.de_antipodal_ebn0_db),
        "de-qpsk": _de_qpsk,
        "dbpsk": lambda: _binary(uncoded.dbpsk_ber, uncoded.dbpsk_ebn0_db),
        "dqpsk": _dqpsk,
        # The turn of pi/4 that every symbol adds is known to the receiver and drops out.
        "pi4-dqpsk": _dqpsk,
        "8psk": lambda: Curve(phase.octal_ber, CurveInverse(phase.octal_ber), {"exact": phase.octal_ser}),
        "16qam": lambda: Curve(
            uncoded.square_16_ber, CurveInverse(uncoded.square_16_ber), {"exact": uncoded.square_16_ser}
        ),
        "fsk-coherent": lambda: _binary(uncoded.fsk_coherent_ber, uncoded.fsk_coherent_ebn0_db),
        "fsk-noncoherent": lambda: _binary(uncoded.fsk_noncoherent_ber, uncoded.fsk_noncoherent_ebn0_db),
    }
)

# A code sees independent antipodal channel bits only on these.
_ANTIPODAL = ("bpsk", "qpsk", "oqpsk")


def _all_schemes() -> tuple[str, ...]:
    inner = tuple(DECODER_ROWS)
    codes = [*inner, *OUTER_CODES, *(f"{code}+{outer}" for code in inner for outer in OUTER_CODES)]
    return (*_MODULATIONS, *(f"{modulation}+{code}" for modulation in _ANTIPODAL for code in codes))


SCHEMES: tuple[str, ...] = _all_schemes()


@cache
def _decoded(code: str) -> Curve:
    curve = DecodedCurve(code)
    inverse = CurveInverse(curve, lowest_db=curve.first_db)
    return Curve(
        curve,
        inverse,
        least_ebn0_db=curve.first_db,
        uncertainty_db=curve.uncertainty_db,
        bound=curve.bound,
    )


def _with_outer_code(inner: Curve, code: ReedSolomon) -> Curve:
    """The inner scheme's bits spend their share of Eb/N0 on the outer code's parity."""
    shift_db = 10.0 * np.log10(code.rate)

    def ber(ebn0_db: FloatArray) -> FloatArray:
        return output_bit_error_rate(code, inner.ber(ebn0_db + shift_db))

    def shifted(of_inner: ArrayFunction) -> ArrayFunction:
        return lambda ebn0_db: of_inner(ebn0_db + shift_db)

    least_db = inner.least_ebn0_db - shift_db
    return Curve(
        ber,
        CurveInverse(ber) if np.isinf(least_db) else CurveInverse(ber, lowest_db=least_db),
        least_ebn0_db=least_db,
        uncertainty_db=None if inner.uncertainty_db is None else shifted(inner.uncertainty_db),
    )


@cache
def find_curve(scheme: str) -> Curve:
    """Curve of a scheme.

    Args:
        scheme: One of `SCHEMES`.

    Returns:
        What is known of it.

    Raises:
        ParameterError: The scheme is unknown.
    """
    if scheme not in SCHEMES:
        codes = ", ".join([*DECODER_ROWS, *OUTER_CODES])
        rule = (
            f"be one of {', '.join(_MODULATIONS)}; or one of {', '.join(_ANTIPODAL)} with, after a plus sign "
            f"each, an inner code, an outer code or both, of {codes}"
        )
        raise ParameterError("scheme", scheme, rule)
    modulation, *codes_after = scheme.split("+")
    curve = _MODULATIONS[modulation]()
    for code in codes_after:
        curve = _with_outer_code(curve, OUTER_CODES[code]) if code in OUTER_CODES else _decoded(code)
    return curve if not codes_after else replace(curve, ser={})
