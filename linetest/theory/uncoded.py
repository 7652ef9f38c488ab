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


def dbpsk_ber(ebn0_db: FloatArray) -> FloatArray:
    """Bit error rate of DBPSK by phase comparison: exp(-Eb/N0)/2.

    Args:
        ebn0_db: Eb/N0 in dB.

    Returns:
        Bit error rate.

    Source:
        J. G. Proakis, Digital Communications, 4th ed., eq. 5.2-69.
    """
    return np.asarray(0.5 * np.exp(-np.square(amplitude(ebn0_db))), dtype=np.float64)


def dbpsk_ebn0_db(bit_error_rate: FloatArray) -> FloatArray:
    """Inverse of `dbpsk_ber`.

    Args:
        bit_error_rate: Bit error rate between 0 and 0.5.

    Returns:
        Eb/N0 in dB.
    """
    return np.asarray(10.0 * np.log10(-np.log(2.0 * bit_error_rate)), dtype=np.float64)


_HALF_POWER_DB = float(10.0 * np.log10(2.0))


def fsk_coherent_ber(ebn0_db: FloatArray) -> FloatArray:
    """Bit error rate of coherent binary FSK with orthogonal tones: Q(sqrt(Eb/N0)).

    Args:
        ebn0_db: Eb/N0 in dB.

    Returns:
        Bit error rate.

    Source:
        J. G. Proakis, Digital Communications, 4th ed., eq. 5.2-8.
    """
    return antipodal_ber(ebn0_db - _HALF_POWER_DB)


def fsk_coherent_ebn0_db(bit_error_rate: FloatArray) -> FloatArray:
    """Inverse of `fsk_coherent_ber`.

    Args:
        bit_error_rate: Bit error rate between 0 and 0.5.

    Returns:
        Eb/N0 in dB.
    """
    return antipodal_ebn0_db(bit_error_rate) + _HALF_POWER_DB


def fsk_noncoherent_ber(ebn0_db: FloatArray) -> FloatArray:
    """Bit error rate of binary FSK with orthogonal tones and envelope detection: exp(-Eb/(2 N0))/2.

    Args:
        ebn0_db: Eb/N0 in dB.

    Returns:
        Bit error rate.

    Source:
        J. G. Proakis, Digital Communications, 4th ed., eq. 5.4-47 with M = 2.
    """
    return dbpsk_ber(ebn0_db - _HALF_POWER_DB)


def fsk_noncoherent_ebn0_db(bit_error_rate: FloatArray) -> FloatArray:
    """Inverse of `fsk_noncoherent_ber`.

    Args:
        bit_error_rate: Bit error rate between 0 and 0.5.

    Returns:
        Eb/N0 in dB.
    """
    return dbpsk_ebn0_db(bit_error_rate) + _HALF_POWER_DB


def square_16_ber(ebn0_db: FloatArray) -> FloatArray:
    """Bit error rate of 16QAM with the reflected Gray map on each rail, exact.

    (3 Q(d) + 2 Q(3d) - Q(5d))/4 with d = sqrt(4/5 Eb/N0), the noise-scaled half distance of neighbours.

    Args:
        ebn0_db: Eb/N0 per bit in dB.

    Returns:
        Bit error rate.

    Source:
        K. Cho and D. Yoon, IEEE Trans. Commun. 50(7), 2002, pp. 1074-1080.
    """
    root = np.sqrt(0.4) * amplitude(ebn0_db)
    tails = 3.0 * special.erfc(root) + 2.0 * special.erfc(3.0 * root) - special.erfc(5.0 * root)
    return np.asarray(tails * 0.125, dtype=np.float64)


def square_16_ser(ebn0_db: FloatArray) -> FloatArray:
    """Symbol error rate of 16QAM, exact: 1 - (1 - 3/2 Q(d))**2 with d = sqrt(4/5 Eb/N0).

    Args:
        ebn0_db: Eb/N0 per bit in dB.

    Returns:
        Symbol error rate.

    Source:
        J. G. Proakis, Digital Communications, 4th ed., eq. 5.2-78 and 5.2-79.
    """
    rail = 0.75 * special.erfc(np.sqrt(0.4) * amplitude(ebn0_db))
    return np.asarray(rail * (2.0 - rail), dtype=np.float64)
