"""Axes."""

from __future__ import annotations

import itertools
import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from linetest.charts.scales import DecadeScale, LinearScale, decades_around
from linetest.errors import ParameterError


def test_a_linear_scale_meets_its_ends_and_its_middle() -> None:
    scale = LinearScale(6.0, 11.0, 50.0, 650.0)
    assert [scale(value) for value in (6.0, 8.5, 11.0)] == [50.0, 350.0, 650.0]


@given(st.floats(-1e3, 1e3), st.floats(1e-3, 1e3), st.integers(2, 12))
def test_ticks_are_round_inside_evenly_spaced_and_not_too_many(low: float, span: float, most: int) -> None:
    ticks = LinearScale(low, low + span, 0.0, 1.0).ticks(most)
    assert 0 < len(ticks) <= most + 1 or span / most > 0
    assert all(low - 1e-6 * span <= tick <= low + span + 1e-6 * span for tick in ticks)
    if len(ticks) >= 2:
        step = ticks[1] - ticks[0]
        mantissa = step / 10 ** math.floor(math.log10(step) + 1e-6)
        assert min(abs(mantissa - nice) for nice in (1, 2, 5)) < 1e-3
        for before, after in itertools.pairwise(ticks):
            assert after - before == pytest.approx(step, rel=1e-6, abs=1e-9)


def test_ticks_of_a_waterfall_axis() -> None:
    assert LinearScale(6.0, 8.0, 0.0, 1.0).ticks(8) == (6.0, 6.5, 7.0, 7.5, 8.0)


def test_a_decade_scale_places_decades_evenly() -> None:
    scale = DecadeScale(-6, -2, 400.0, 0.0)
    assert [scale(value) for value in (1e-6, 1e-5, 1e-4, 1e-2)] == pytest.approx([400.0, 300.0, 200.0, 0.0])
    assert list(scale.decades) == [-6, -5, -4, -3, -2]
    assert len(scale.minor()) == 4 * 8


@given(st.lists(st.floats(1e-9, 0.5), min_size=1))
def test_decades_hold_every_value_and_no_decade_is_empty_at_both_ends(values: list[float]) -> None:
    scale = decades_around(values, 1.0, 0.0)
    assert all(-1e-6 <= scale(value) <= 1.0 + 1e-6 for value in values)
    if scale.high_exponent - scale.low_exponent > 1:
        assert min(values) < 10.0 ** (scale.low_exponent + 1)
        assert max(values) > 10.0 ** (scale.high_exponent - 1)


def test_a_scale_without_a_positive_value_is_refused() -> None:
    with pytest.raises(ParameterError, match="hold a positive, finite value"):
        decades_around([0.0], 1.0, 0.0)


def test_a_scale_that_does_not_rise_is_refused() -> None:
    with pytest.raises(ParameterError, match="be finite and rise"):
        LinearScale(2.0, 2.0, 0.0, 1.0)
    with pytest.raises(ParameterError, match="lie below"):
        DecadeScale(-2, -2, 0.0, 1.0)
