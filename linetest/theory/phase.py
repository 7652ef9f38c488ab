"""Exact error rates of phase-shift keying: coherent 8PSK and phase comparison of neighbouring symbols.

Every form here is a sum or an integral of positive terms, so that nothing cancels in the tail.
"""

from __future__ import annotations

import numpy as np
from scipy import special

from linetest.theory.gaussian import amplitude
from linetest.units import FloatArray

# Both integrands below are as smooth as exp(z cos t): this many nodes carry them to 1e-12 for z <= 200.
_NODES = 96


def sector_tail(esn0_root: FloatArray, angle_rad: float) -> FloatArray:
    """Chance that noise turns a symbol's phase beyond an angle, to one side.

    P(angle < phase error < pi) = Q(h)/2 + T(h, cot(angle)) with h = sqrt(2 Es/N0) sin(angle) and Owen's T,
    which is Craig's integral 1/(2 pi) * integral from 0 to pi - angle of exp(-h^2 / (2 sin^2 t)) dt.

    Args:
        esn0_root: Square root of Es/N0, a ratio, any shape.
        angle_rad: Angle above 0 and below pi/2.

    Returns:
        Probability of the same shape.

    Source:
        J. W. Craig, MILCOM 1991, 25.5.1; D. B. Owen, Ann. Math. Statist. 27, 1956, p. 1075.
    """
    distance = np.sqrt(2.0) * np.sin(angle_rad) * esn0_root
    half_tail = 0.25 * special.erfc(distance / np.sqrt(2.0))
    return np.asarray(half_tail + special.owens_t(distance, 1.0 / np.tan(angle_rad)), dtype=np.float64)


def octal_ber(ebn0_db: FloatArray) -> FloatArray:
    """Bit error rate of coherent 8PSK with the reflected Gray map, exact.

    Averaged over the points, a decision one, two, three or four sectors away costs 1, 2, 2 or 2 bits; the
    sectors' chances then add up to (2/3) * (S(pi/8) + S(3 pi/8)) with S the one-sided tail.

    Args:
        ebn0_db: Eb/N0 per bit in dB.

    Returns:
        Bit error rate.

    Source:
        P. J. Lee, IEEE Trans. Commun. 34(5), 1986, pp. 488-491, with the tails in Owen's form.
    """
    root = np.sqrt(3.0) * amplitude(ebn0_db)
    return (sector_tail(root, np.pi / 8) + sector_tail(root, 3 * np.pi / 8)) * (2.0 / 3.0)


def octal_ser(ebn0_db: FloatArray) -> FloatArray:
    """Symbol error rate of coherent 8PSK, exact: twice the one-sided tail beyond pi/8.

    Args:
        ebn0_db: Eb/N0 per bit in dB.

    Returns:
        Symbol error rate.
    """
    return 2.0 * sector_tail(np.sqrt(3.0) * amplitude(ebn0_db), np.pi / 8)


def _dqpsk_nodes() -> tuple[FloatArray, FloatArray]:
    ratio_squared = (2.0 - np.sqrt(2.0)) / (2.0 + np.sqrt(2.0))
    # The integrand depends on sin t only: half the circle suffices, with the trapezium's halved ends.
    sine = -np.cos(np.pi * np.arange(_NODES + 1) / _NODES)
    spread = 1.0 + 2.0 * np.sqrt(ratio_squared) * sine + ratio_squared
    weight = np.full(_NODES + 1, 0.5 / _NODES)
    weight[[0, -1]] *= 0.5
    exponent = (1.0 + np.sqrt(0.5)) * spread
    return exponent, weight * (1.0 - ratio_squared) / spread


def _dqpsk_symbol_nodes() -> tuple[FloatArray, FloatArray]:
    at, weight = np.polynomial.legendre.leggauss(_NODES)
    angle = (at + 1.0) * (np.pi / 4)
    cosine = np.cos(np.pi / 4) * np.cos(angle)
    return 2.0 * (1.0 - cosine), weight * (np.pi / 4) * np.sin(np.pi / 4) / np.pi / (1.0 - cosine)


_DQPSK_BIT = _dqpsk_nodes()
_DQPSK_SYMBOL = _dqpsk_symbol_nodes()


def _sum_of_exponentials(ebn0_db: FloatArray, nodes: tuple[FloatArray, FloatArray]) -> FloatArray:
    """Sum of weight * exp(-exponent * Eb/N0) over the nodes; memory stays that of the levels."""
    ratio = np.square(amplitude(ebn0_db))
    total = np.zeros_like(ratio)
    for exponent, weight in zip(*nodes, strict=True):
        total += weight * np.exp(-exponent * ratio)
    return total


def dqpsk_ber(ebn0_db: FloatArray) -> FloatArray:
    """Bit error rate of Gray DQPSK by phase comparison, exact; pi/4-DQPSK has the same.

    Q1(a, b) - I0(ab) exp(-(a^2 + b^2)/2)/2 with a^2, b^2 = Eb/N0 (2 -+ sqrt 2), written as the positive
    integral 1/(4 pi) over the circle of (1 - r^2)/(1 + 2 r sin t + r^2) exp(-b^2 (1 + 2 r sin t + r^2)/2) dt,
    r = a/b, that the trapezium rule sums to full precision.

    Args:
        ebn0_db: Eb/N0 per bit in dB.

    Returns:
        Bit error rate.

    Source:
        J. G. Proakis, Digital Communications, 4th ed., eq. 5.2-70; M. K. Simon and M.-S. Alouini, Digital
        Communication over Fading Channels, eq. 8.86 (Marcum's function as an integral with finite limits).
    """
    return _sum_of_exponentials(ebn0_db, _DQPSK_BIT)


def dqpsk_ser(ebn0_db: FloatArray) -> FloatArray:
    """Symbol error rate of DQPSK by phase comparison, exact.

    sin(pi/4)/pi * integral from 0 to pi/2 of exp(-Es/N0 (1 - cos(pi/4) cos t))/(1 - cos(pi/4) cos t) dt.

    Args:
        ebn0_db: Eb/N0 per bit in dB.

    Returns:
        Symbol error rate.

    Source:
        R. F. Pawula, S. O. Rice and J. H. Roberts, IEEE Trans. Commun. 30(8), 1982, pp. 1828-1841.
    """
    return _sum_of_exponentials(ebn0_db, _DQPSK_SYMBOL)
