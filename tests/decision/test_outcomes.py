"""The distribution of errors in a look against scipy and against drawn bursts."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from linetest.decision.outcomes import INDEPENDENT, increments


@pytest.mark.parametrize(
    ("bits", "ber"), [(10, 0.2), (600, 1e-2), (50_000, 1e-3), (4_000_000, 1e-5), (10**9, 1e-8), (10**11, 1e-10)]
)
def test_independent_errors_are_binomial(bits: int, ber: float) -> None:
    chances = increments(bits, ber, INDEPENDENT)
    assert chances.sum() == pytest.approx(1.0, abs=1e-12)
    # scipy's own probabilities of very many bits lose digits; the Poisson limit is then exact to bits * ber**2.
    count = np.arange(chances.size)
    exact = stats.binom.pmf(count, bits, ber) if bits < 10**6 else stats.poisson.pmf(count, bits * ber)
    assert chances == pytest.approx(exact, rel=1e-9 if bits < 10**6 else 1e-3, abs=1e-15)
    assert (np.arange(chances.size) @ chances) == pytest.approx(bits * ber, rel=1e-9)


def test_ways_of_very_many_bits_keep_their_digits() -> None:
    """Neighbouring probabilities of a binomial have the ratio (n - k) p / ((k + 1)(1 - p)), exactly."""
    bits, ber = 3 * 10**8, 3e-8
    chances = increments(bits, ber, INDEPENDENT)
    count = np.arange(chances.size - 1)
    exact = (bits - count) * ber / ((count + 1) * (1.0 - ber))
    assert chances[1:] / chances[:-1] == pytest.approx(exact, rel=1e-11)


def test_pairs_put_all_probability_on_even_counts() -> None:
    chances = increments(100_000, 1e-4, ((2, 1.0),))
    assert chances[1::2].sum() == pytest.approx(0.0, abs=1e-13)
    assert chances[::2] == pytest.approx(stats.poisson.pmf(np.arange(chances[::2].size), 5.0), abs=1e-13)


def test_bursts_agree_with_drawn_ones_and_have_their_mean_and_dispersion() -> None:
    weights = ((1, 0.2), (3, 0.5), (6, 0.3))
    sizes, shares = np.array([1, 3, 6]), np.array([0.2, 0.5, 0.3])
    chances = increments(200_000, 1e-4, weights)
    count = np.arange(chances.size)
    mean = float(count @ chances)
    variance = float((count - mean) ** 2 @ chances)
    assert mean == pytest.approx(20.0, rel=1e-9)
    assert variance / mean == pytest.approx(float(sizes**2 @ shares / (sizes @ shares)), rel=1e-9)
    rng = np.random.default_rng(17)
    events = rng.poisson(20.0 / float(sizes @ shares), 200_000)
    totals = rng.multinomial(events, shares) @ sizes
    for upper in (5, 12, 20, 30, 45):
        below = float(chances[: upper + 1].sum())
        assert np.mean(totals <= upper) == pytest.approx(below, abs=3.9 * np.sqrt(below * (1 - below) / 200_000))
