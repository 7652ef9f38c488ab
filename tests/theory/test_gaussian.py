"""The tail in high precision, and what comes in and goes out."""

from __future__ import annotations

from typing import Any

import mpmath
import numpy as np
import pytest

from linetest.errors import ParameterError
from linetest.theory.gaussian import (
    amplitude,
    as_float_array,
    checked_ebn0_db,
    first_where,
    gaussian_tail,
    in_shape_of,
)


def test_tail_keeps_its_digits_down_to_the_smallest_doubles() -> None:
    thresholds = np.array([-8.0, -1.0, 0.0, 1.0, 3.09, 6.0, 8.0, 20.0, 35.0])
    with mpmath.workdps(30):
        exact = [float(mpmath.erfc(mpmath.mpf(x) / mpmath.sqrt(2)) / 2) for x in thresholds]
    np.testing.assert_allclose(gaussian_tail(thresholds), exact, rtol=1e-12)


def test_tail_is_the_tabulated_one() -> None:
    """Abramowitz and Stegun, table 26.1, as 1 - P(x), from memory: Q(1) = 0.15866, Q(2) = 0.02275, Q(3) = 0.00135."""
    assert gaussian_tail(np.array([1.0, 2.0, 3.0])) == pytest.approx([0.15866, 0.02275, 0.00135], abs=5e-6)


def test_amplitude_squared_is_the_ratio() -> None:
    levels_db = np.linspace(-60.0, 40.0, 101)
    np.testing.assert_allclose(amplitude(levels_db) ** 2, 10.0 ** (levels_db / 10.0), rtol=1e-13)


def test_forms_come_back_as_they_went_in() -> None:
    assert type(in_shape_of(3.0, np.asarray(2.0))) is float
    assert isinstance(in_shape_of(np.asarray(3.0), np.asarray(2.0)), np.ndarray)
    assert as_float_array("x", [1, 2]).dtype == np.float64
    assert as_float_array("x", np.float32(1.5)) == 1.5
    assert first_where(np.array([1.0, 7.0, 8.0]), np.array([False, True, True])) == 7.0


@pytest.mark.parametrize("wrong", [float("nan"), float("inf"), -float("inf"), np.array([0.0, np.nan])])
def test_levels_that_are_not_finite_are_refused(wrong: Any) -> None:
    with pytest.raises(ParameterError, match=r"ebn0_db is (nan|-?inf), but must be a finite number of dB"):
        checked_ebn0_db(wrong)
