"""The numerical inverse on a curve whose inverse is known in closed form."""

from __future__ import annotations

import numpy as np

from linetest.theory.inverse import CurveInverse, straightened
from linetest.theory.uncoded import antipodal_ber, antipodal_ebn0_db
from linetest.units import FloatArray


def test_it_finds_what_the_closed_form_finds() -> None:
    rates = np.logspace(-290, np.log10(0.4999), 4000)
    np.testing.assert_allclose(CurveInverse(antipodal_ber)(rates), antipodal_ebn0_db(rates), rtol=0.0, atol=1e-9)


def test_few_evaluations_of_the_curve_suffice() -> None:
    """Each evaluation on all points costs a pass: the first Newton step must already end nearly all."""
    evaluated = []

    def counted(levels_db: FloatArray) -> FloatArray:
        evaluated.append(levels_db.size)
        return antipodal_ber(levels_db)

    inverse = CurveInverse(counted)
    table = sum(evaluated)
    inverse(np.logspace(-15, np.log10(0.3), 10_000))
    assert sum(evaluated) - table <= 20_000


def test_straightened_rates_are_nearly_straight_lines_in_db() -> None:
    levels_db = np.linspace(-20.0, 15.0, 200)
    bend = np.diff(straightened(antipodal_ber(levels_db)), 2) / np.diff(levels_db)[0] ** 2
    assert np.abs(bend).max() < 0.02


def test_shapes_and_nothing_pass_through() -> None:
    inverse = CurveInverse(antipodal_ber)
    assert inverse(np.array(1e-3)).shape == ()
    assert inverse(np.full((2, 3), 1e-3)).shape == (2, 3)
    assert inverse(np.zeros(0)).shape == (0,)
