"""The small rule against the full list of patterns."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from scipy import stats

from linetest.theory.interference import NOTHING, Levels, sum_of_terms

BINARY = np.array([1.0, -1.0])
QUATERNARY = np.array([3.0, 1.0, -1.0, -3.0]) / np.sqrt(5.0)


@pytest.mark.parametrize("alphabet", [BINARY, QUATERNARY], ids=["binary", "quaternary"])
@pytest.mark.parametrize("threshold", [0.0, 3.0, 7.5])
def test_average_of_a_tail_equals_the_sum_over_all_patterns(alphabet: np.ndarray, threshold: float) -> None:
    factors = np.array([0.3, -0.2, 0.11, 0.07, -0.05, 0.02, 0.01])
    patterns = np.array(list(product(alphabet, repeat=factors.size))) @ factors
    expected = stats.norm.sf(threshold + 4.0 * patterns).mean()
    rule = sum_of_terms(alphabet, factors)
    assert rule.values.size <= 20
    found = float(rule.weights @ stats.norm.sf(threshold + 4.0 * rule.values))
    assert found == pytest.approx(expected, rel=1e-11)


def test_moments_survive_many_terms() -> None:
    """Variance and fourth moment of a sum of 300 independent signs, in closed form."""
    factors = 0.3 / np.arange(1, 301) ** 2
    rule = sum_of_terms(BINARY, factors)
    variance = float(np.square(factors).sum())
    fourth = 3.0 * variance**2 - 2.0 * float((factors**4).sum())
    assert rule.weights.sum() == pytest.approx(1.0, abs=1e-12)
    assert float(rule.weights @ rule.values**2) == pytest.approx(variance, rel=1e-10)
    assert float(rule.weights @ rule.values**4) == pytest.approx(fourth, rel=1e-7)
    assert abs(float(rule.weights @ rule.values**3)) < 1e-12


def test_few_levels_stay_as_they_are() -> None:
    assert sum_of_terms(BINARY, np.zeros(0)) == NOTHING
    two = Levels(np.array([0.0, 1.0]), np.array([0.25, 0.75]))
    assert two.condensed() is two
    assert two.plus(two).values.tolist() == [0.0, 1.0, 1.0, 2.0]
