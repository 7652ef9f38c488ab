"""Gray maps against the definition of Gray codes and of the nearest point."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from scipy import stats

from linetest.errors import ParameterError
from linetest.theory import bit_error_rate
from linetest.theory.symbols import MAPPED_SCHEMES, constellation, decide_bits, map_bits

every_scheme = pytest.mark.parametrize("scheme", MAPPED_SCHEMES)


@every_scheme
def test_points_have_unit_mean_energy(scheme: str) -> None:
    assert np.mean(np.abs(constellation(scheme).points) ** 2) == pytest.approx(1.0, abs=1e-12)


@every_scheme
def test_nearest_neighbours_differ_in_one_bit(scheme: str) -> None:
    points = constellation(scheme).points
    distance = np.abs(points[:, None] - points[None, :])
    least = distance[distance > 0.0].min()
    for one, other in zip(*np.nonzero(np.isclose(distance, least)), strict=True):
        assert (int(one) ^ int(other)).bit_count() == 1


@every_scheme
def test_decisions_take_the_nearest_point(scheme: str) -> None:
    found = constellation(scheme)
    rng = np.random.default_rng(1)
    received = rng.normal(0.0, 1.0, 20_000) + 1j * rng.normal(0.0, 1.0, 20_000)
    nearest = np.abs(received[:, None] - found.points[None, :]).argmin(axis=1)
    places = np.arange(found.bits_per_symbol - 1, -1, -1)
    expected = (nearest[:, None] >> places & 1).reshape(-1)
    assert (decide_bits(scheme, received) == expected).all()


@every_scheme
def test_symbol_level_simulation_agrees_with_theory(scheme: str) -> None:
    """Counts at four levels within the 99 % interval that all of them share (Bonferroni over 20 counts)."""
    rng = np.random.default_rng(2_024)
    per_symbol = constellation(scheme).bits_per_symbol
    for level_db in (0.0, 3.0, 6.0, 9.0):
        bits = rng.integers(0, 2, 60_000 * per_symbol, dtype=np.uint8)
        sigma = np.sqrt(0.5 / (per_symbol * 10.0 ** (level_db / 10.0)))
        noise = rng.normal(0.0, sigma, (2, 60_000))
        wrong = decide_bits(scheme, map_bits(scheme, bits) + noise[0] + 1j * noise[1]) != bits
        low, high = symbolwise_interval(wrong, per_symbol, bit_error_rate(scheme, level_db))
        assert low <= wrong.mean() <= high


def symbolwise_interval(wrong: Any, per_symbol: int, rate: float) -> tuple[float, float]:
    """Errors of one symbol go together: normal interval with the spread of whole symbols, or exact if few."""
    by_symbol = wrong.reshape(-1, per_symbol).mean(axis=1)
    if wrong.sum() < 100:
        low, high = stats.binom.interval(1.0 - 0.01 / 20, wrong.size, rate)
        return float(low) / wrong.size, float(high) / wrong.size
    half = stats.norm.isf(0.005 / 20) * by_symbol.std() / np.sqrt(by_symbol.size)
    return rate - float(half), rate + float(half)


def test_wrong_arguments_are_named() -> None:
    with pytest.raises(ParameterError, match=r"scheme is '32apsk', but must be one of bpsk, qpsk"):
        constellation("32apsk")
    with pytest.raises(ParameterError, match=r"bits is 'an array of shape \(7,\)', but must be one row of whole sym"):
        map_bits("8psk", np.zeros(7, dtype=np.uint8))
