"""Closed forms of bit and symbol error rates in white Gaussian noise, and their closed inverses.

Every function takes Eb/N0 per information bit in dB and returns a rate of the same shape.
"""

from __future__ import annotations

import numpy as np
from scipy import special

from linetest.theory.gaussian import amplitude
from linetest.units import FloatArray


def antipodal_ber(ebn0_db: FloatArray) -> FloatArray:
    """Bit error rate of coherent BPSK and of each rail of Gray QPSK: Q(sqrt(2 Eb/N0)).

    Args:
        ebn0_db: Eb/N0 in dB.

    Returns:
        Bit error rate.

    Source:
        J. G. Proakis, Digital Communications, 4th ed., eq. 5.2-5.
    """
    rate = special.erfc(amplitude(ebn0_db))
    return np.asarray(0.5 * rate, dtype=np.float64)


def antipodal_ebn0_db(bit_error_rate: FloatArray) -> FloatArray:
    """Inverse of `antipodal_ber`.

    Args:
        bit_error_rate: Bit error rate between 0 and 0.5.

    Returns:
        Eb/N0 in dB.
    """
    threshold = -special.ndtri(bit_error_rate)
    return np.asarray(20.0 * np.log10(threshold) - 10.0 * np.log10(2.0), dtype=np.float64)


def differentially_encoded(decision_error_rate: FloatArray) -> FloatArray:
    """Bit error rate after differential decoding of coherent decisions: 2p(1-p).

    A decoded bit is wrong when exactly one of two neighbouring decisions is wrong.

    Args:
        decision_error_rate: Error rate p of the decisions.

    Returns:
        Bit error rate.

    Source:
        W. C. Lindsey and M. K. Simon, Telecommunication Systems Engineering, section 5-4.
    """
    return 2.0 * decision_error_rate * (1.0 - decision_error_rate)


def differential_decision_rate(bit_error_rate: FloatArray) -> FloatArray:
    """Inverse of `differentially_encoded`, in the form that does not cancel for small rates.

    Args:
        bit_error_rate: Bit error rate between 0 and 0.5.

    Returns:
        Error rate of the decisions.
    """
    return bit_error_rate / (1.0 + np.sqrt(1.0 - 2.0 * bit_error_rate))


def de_antipodal_ber(ebn0_db: FloatArray) -> FloatArray:
    """Bit error rate of differentially encoded BPSK or QPSK with coherent detection.

    Args:
        ebn0_db: Eb/N0 in dB.

    Returns:
        Bit error rate.
    """
    return differentially_encoded(antipodal_ber(ebn0_db))


def de_antipodal_ebn0_db(bit_error_rate: FloatArray) -> FloatArray:
    """Inverse of `de_antipodal_ber`.

    Args:
        bit_error_rate: Bit error rate between 0 and 0.5.

    Returns:
        Eb/N0 in dB.
    """
    return antipodal_ebn0_db(differential_decision_rate(bit_error_rate))


def quadrature_ser(ebn0_db: FloatArray) -> FloatArray:
    """Symbol error rate of QPSK, exact: 2Q - Q**2 with Q = Q(sqrt(2 Eb/N0)).

    Args:
        ebn0_db: Eb/N0 per bit in dB.

    Returns:
        Symbol error rate.

    Source:
        J. G. Proakis, Digital Communications, 4th ed., eq. 5.2-59.
    """
    rail = antipodal_ber(ebn0_db)
    return rail * (2.0 - rail)


def quadrature_ser_no_square_term(ebn0_db: FloatArray) -> FloatArray:
    """Simplification of `quadrature_ser` that drops the square term: 2Q(sqrt(2 Eb/N0)).

    Args:
        ebn0_db: Eb/N0 per bit in dB.

    Returns:
        Symbol error rate, too high by Q**2.
    """
    return 2.0 * antipodal_ber(ebn0_db)


def quadrature_ser_union_bound(ebn0_db: FloatArray) -> FloatArray:
    """Union bound of the QPSK symbol error rate over the other three points.

    Two neighbours at distance 2 sqrt(Eb) and one opposite at 2 sqrt(2 Eb):
    2Q(sqrt(2 Eb/N0)) + Q(sqrt(4 Eb/N0)).

    Args:
        ebn0_db: Eb/N0 per bit in dB.

    Returns:
        Upper bound of the symbol error rate.
    """
    root = amplitude(ebn0_db)
    opposite = 0.5 * special.erfc(np.sqrt(2.0) * root)
    return np.asarray(special.erfc(root) + opposite, dtype=np.float64)


def de_quadrature_ser(ebn0_db: FloatArray) -> FloatArray:
    """Dibit error rate of differentially encoded QPSK with coherent detection, exact.

    A dibit is right when two neighbouring decisions are turned by the same quarter turns:
    1 - ((1-p)**2 + p**2)**2 = 4p - 8p**2 + 8p**3 - 4p**4, in factors that do not cancel.

    Args:
        ebn0_db: Eb/N0 per bit in dB.

    Returns:
        Symbol error rate.

    Source:
        W. C. Lindsey and M. K. Simon, Telecommunication Systems Engineering, section 5-4.
    """
    pair = de_antipodal_ber(ebn0_db)
    return pair * (2.0 - pair)
