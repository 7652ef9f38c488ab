"""Bars of contributions and causes."""

from __future__ import annotations

import math

import pytest

from linetest.charts import bar_chart, contributions_chart
from linetest.errors import ParameterError
from tests.charts.drawing import by_class, parse, words


def test_an_end_gauge_budget_combines_as_published() -> None:
    """JCGM 100:2008, H.1.4: contributions 25, 9.7, 2.9 and 16.6 nm combine to 32 nm (second-order terms apart)."""
    parts = [("standard", 25.0), ("difference", 9.7), ("expansion", 2.9), ("temperature", -16.6)]
    root = parse(contributions_chart(parts))
    (combined,) = by_class(root, "sum")
    longest = float(combined.get("width", "nan"))
    assert longest > 0.0
    drawn = [float(bar.get("width", "nan")) for bar in by_class(root, "bar")]
    total = math.sqrt(25.0**2 + 9.7**2 + 2.9**2 + 16.6**2)
    assert round(total) == 32
    assert drawn == pytest.approx([longest * part / total for part in (25.0, 16.6, 9.7, 2.9)], abs=0.1)


def test_contributions_are_told_largest_first_with_their_share() -> None:
    root = parse(contributions_chart([("small", 0.03), ("large", -0.04)]))
    said = root[1].text or ""
    assert said == "combined: 0.050 dB; large: 0.040 dB, 64 %; small: 0.030 dB, 36 %."


def test_contributions_that_are_all_zero_can_be_drawn() -> None:
    root = parse(contributions_chart([("nothing", 0.0)]))
    assert "0.000 dB" in words(root)


def test_bars_of_nothing_or_of_negative_length_are_refused() -> None:
    with pytest.raises(ParameterError, match="hold one row or more"):
        bar_chart([], title="t", ident="i")
    with pytest.raises(ParameterError, match="be finite and 0 or more"):
        bar_chart([("x", -1.0, "-1")], title="t", ident="i")
    with pytest.raises(ParameterError, match="hold one contribution or more"):
        contributions_chart([])
