"""Quantities as the GUM makes them of limits and readings."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats

from linetest.errors import ParameterError
from linetest.noise import Quantity, evaluate
from linetest.noise.quantities import log10, power_ratio, power_ratio_db


@pytest.mark.parametrize(("distribution", "divisor"), [("rectangular", 3.0), ("triangular", 6.0), ("arcsine", 2.0)])
def test_half_widths_become_standard_uncertainties(distribution: str, divisor: float) -> None:
    """JCGM 100:2008, 4.3.7 and 4.3.9: a/sqrt(3), a/sqrt(6); U-shaped a/sqrt(2), here against scipy's arcsine."""
    made = Quantity.within("x", 0.3, "dB", distribution=distribution)  # type: ignore[arg-type]  # parametrized
    assert made.u == pytest.approx(0.3 / math.sqrt(divisor))
    if distribution == "arcsine":
        assert made.u == pytest.approx(stats.arcsine(loc=-0.3, scale=0.6).std())


def test_mean_of_readings_is_type_a() -> None:
    readings = [10.00, 10.02, 9.99, 10.03]
    made = Quantity.mean_of("r", readings, "dBm")
    assert made.value == pytest.approx(np.mean(readings))
    assert made.u == pytest.approx(stats.sem(readings))
    assert made.dof == 3.0
    with pytest.raises(ParameterError, match="readings is 1, but must number at least 2"):
        Quantity.mean_of("r", [1.0], "dBm")


def test_functions_pass_uncertain_numbers_arrays_and_floats() -> None:
    levels = np.array([-20.0, 3.0])
    assert power_ratio_db(power_ratio(levels)) == pytest.approx(levels)
    assert log10(100.0) == pytest.approx(2.0)
    found = evaluate(lambda g: power_ratio_db(g["p"]), [Quantity("p", 100.0, 1.0, "mW")])
    assert found.value == pytest.approx(20.0)
    # One percent of power is 10/ln(10) hundredths of a dB.
    assert found.u == pytest.approx(0.0434294, abs=1e-7)


def test_half_width_must_be_one() -> None:
    with pytest.raises(ParameterError, match=r"half_width is -0\.1"):
        Quantity.within("x", -0.1, "dB")
    with pytest.raises(ParameterError, match="distribution is 'normal', but must be one of rectangular"):
        Quantity.within("x", 0.1, "dB", distribution="normal")
