"""Exact phase-shift keying against integrals in high precision, Marcum's function and counted sectors."""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import mpmath
import numpy as np
import pytest
from scipy import special, stats

from linetest.theory import bit_error_rate, symbol_error_rate
from linetest.theory.phase import sector_tail
from linetest.units import FloatArray

LEVELS_DB = [-12.0, -3.0, 0.0, 4.0, 8.0, 11.0, 14.0, 17.0]


def ratio(ebn0_db: float) -> Any:
    return mpmath.mpf(10) ** (mpmath.mpf(ebn0_db) / 10)


def craig(angle: Any, esn0: Any) -> Any:
    """J. W. Craig, MILCOM 1991: one-sided tail of the phase, as a single integral."""
    edges = [0, mpmath.pi / 8, mpmath.pi / 4, mpmath.pi / 2, mpmath.pi - angle]

    def integrand(t: Any) -> Any:
        return mpmath.exp(-esn0 * mpmath.sin(angle) ** 2 / mpmath.sin(t) ** 2)

    return mpmath.quad(integrand, edges) / (2 * mpmath.pi)


def phase_density(theta: FloatArray, esn0: float) -> FloatArray:
    """Density of a received symbol's phase: Proakis, Digital Communications, 4th ed., eq. 5.2-55."""
    along = np.sqrt(2.0 * esn0) * np.cos(theta)
    bulk = np.exp(-esn0) / (2.0 * np.pi)
    return np.asarray(bulk + along / np.sqrt(2.0 * np.pi) * np.exp(-esn0 * np.sin(theta) ** 2) * stats.norm.cdf(along))


@pytest.mark.parametrize("level_db", LEVELS_DB)
def test_8psk_equals_high_precision_integrals(level_db: float) -> None:
    with mpmath.workdps(30):
        near, far = (float(craig(k * mpmath.pi / 8, 3 * ratio(level_db))) for k in (1, 3))
    assert bit_error_rate("8psk", level_db) == pytest.approx((near + far) * 2 / 3, rel=1e-12)
    assert symbol_error_rate("8psk", level_db) == pytest.approx(2 * near, rel=1e-12)


@pytest.mark.parametrize("level_db", [-2.0, 3.0, 7.0])
def test_8psk_equals_bits_counted_over_the_sectors(level_db: float) -> None:
    """Every pair of points of the reflected Gray map, its differing bits times the sector's probability."""
    gray = [k ^ (k >> 1) for k in range(8)]
    esn0 = 3.0 * 10.0 ** (level_db / 10.0)
    at, weight = np.polynomial.legendre.leggauss(80)
    bits = 0.0
    for turn in range(8):
        edges = (turn * np.pi / 4 - np.pi / 8, turn * np.pi / 4 + np.pi / 8)
        theta = (at + 1.0) * (edges[1] - edges[0]) / 2.0 + edges[0]
        chance = float((weight * phase_density(theta, esn0)).sum()) * (edges[1] - edges[0]) / 2.0
        bits += chance * float(np.mean([(gray[k] ^ gray[(k + turn) % 8]).bit_count() for k in range(8)]))
    assert bit_error_rate("8psk", level_db) == pytest.approx(bits / 3.0, rel=1e-12)


def test_8psk_tends_to_its_nearest_neighbours() -> None:
    """Textbook asymptote (2/3) Q(sqrt(6 g) sin(pi/8)), Proakis eq. 5.2-61 with Gray bits: within 1e-9 at 17 dB."""
    tail = stats.norm.sf(np.sqrt(6.0 * 10.0**1.7) * np.sin(np.pi / 8))
    assert bit_error_rate("8psk", 17.0) == pytest.approx(2.0 / 3.0 * tail, rel=1e-9)
    assert bit_error_rate("8psk", 0.0) != pytest.approx(
        2.0 / 3.0 * stats.norm.sf(np.sqrt(6.0) * np.sin(np.pi / 8)), rel=0.01
    )


def test_a_tail_and_its_mirror_make_half_planes() -> None:
    """A line through the origin cuts the plane in two: both sides' sectors add up to Q of its distance."""
    roots = np.linspace(0.1, 5.0, 30)
    for angle in (np.pi / 8, np.pi / 4, 3 * np.pi / 8):
        lower = roots * np.sqrt(2.0) * np.sin(angle)
        beyond_mirror = stats.norm.sf(lower) - sector_tail(roots, angle)
        wanted = [float(craig(mpmath.pi - angle, mpmath.mpf(root) ** 2)) for root in roots[::10]]
        np.testing.assert_allclose(beyond_mirror[::10], wanted, rtol=1e-9, atol=1e-16)


def marcum_form(level_db: float) -> Any:
    """Q1(a, b) - I0(ab) exp(-(a^2 + b^2)/2)/2, Proakis eq. 5.2-70, with Q1 as an integral over its density."""
    g = ratio(level_db)
    a, b = mpmath.sqrt(g * (2 - mpmath.sqrt(2))), mpmath.sqrt(g * (2 + mpmath.sqrt(2)))

    def density(x: Any) -> Any:
        return x * mpmath.exp(-(x**2 + a**2) / 2) * mpmath.besseli(0, a * x)

    edges = [b + step for step in (0, 1, 2, 4, 8, 16, 32)]
    tail = sum(mpmath.quad(density, piece) for piece in pairwise(edges))
    return tail - mpmath.besseli(0, a * b) * mpmath.exp(-(a**2 + b**2) / 2) / 2


@pytest.mark.parametrize("scheme", ["dqpsk", "pi4-dqpsk"])
@pytest.mark.parametrize("level_db", LEVELS_DB)
def test_dqpsk_equals_marcums_function_in_high_precision(scheme: str, level_db: float) -> None:
    with mpmath.workdps(40):
        exact = float(marcum_form(level_db))
    assert bit_error_rate(scheme, level_db) == pytest.approx(exact, rel=1e-12)


@pytest.mark.parametrize("level_db", [-5.0, 0.0, 6.0, 10.0])
def test_dqpsk_equals_a_general_library(level_db: float) -> None:
    """Marcum's Q1(a, b) is the survival function of a noncentral chi-square with two degrees of freedom."""
    g = 10.0 ** (level_db / 10.0)
    a, b = np.sqrt(g * (2.0 - np.sqrt(2.0))), np.sqrt(g * (2.0 + np.sqrt(2.0)))
    marcum = stats.ncx2.sf(b * b, 2, a * a)
    theirs = marcum - 0.5 * special.ive(0, a * b) * np.exp(-((b - a) ** 2) / 2.0)
    assert bit_error_rate("dqpsk", level_db) == pytest.approx(theirs, rel=1e-9)


@pytest.mark.parametrize("level_db", LEVELS_DB)
def test_dqpsk_symbols_equal_a_high_precision_integral(level_db: float) -> None:
    """Pawula, Rice and Roberts, IEEE Trans. Commun. 30(8), 1982."""
    with mpmath.workdps(30):
        c, esn0 = mpmath.cos(mpmath.pi / 4), 2 * ratio(level_db)

        def integrand(t: Any) -> Any:
            return mpmath.exp(-esn0 * (1 - c * mpmath.cos(t))) / (1 - c * mpmath.cos(t))

        exact = float(c / mpmath.pi * mpmath.quad(integrand, mpmath.linspace(0, mpmath.pi / 2, 5)))
    assert symbol_error_rate("dqpsk", level_db) == pytest.approx(exact, rel=1e-12)


@pytest.mark.parametrize("scheme", ["8psk", "16qam", "dqpsk"])
def test_a_symbol_error_costs_between_one_bit_and_all(scheme: str) -> None:
    bits = {"8psk": 3, "16qam": 4, "dqpsk": 2}[scheme]
    levels_db = np.linspace(-10.0, 16.0, 200)
    symbols, rate = symbol_error_rate(scheme, levels_db), bit_error_rate(scheme, levels_db)
    assert (rate >= symbols / bits * (1.0 - 1e-12)).all()
    assert (rate <= symbols).all()
