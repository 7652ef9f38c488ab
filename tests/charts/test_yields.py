"""The yield chart, read back with a ruler."""

from __future__ import annotations

import pytest

from linetest.charts import YieldRow, yield_chart
from linetest.errors import ParameterError
from tests.charts.drawing import Ruler, by_class, parse, words

ROWS = (YieldRow("2026-03-02", 21, 24, 0.676, 0.973), YieldRow("<b>&\u202e", 36, 36, 0.903, 1.0))


def test_dots_stand_at_their_share_on_the_percent_scale() -> None:
    root = parse(yield_chart(ROWS, overall=YieldRow("all", 57, 60, 0.861, 0.99)))
    ticks = sorted(
        (float(text.get("x", "nan")), float(said.removesuffix(" %")))
        for text in by_class(root, "mid")
        if (said := "".join(text.itertext())).endswith(" %")
    )
    percent = Ruler(*ticks[0], *ticks[-1])
    shares = [percent(float(dot.get("cx", "nan"))) for dot in by_class(root, "dot")]
    assert shares == pytest.approx([87.5, 100.0], abs=0.05)


def test_counts_and_percent_are_written_and_told() -> None:
    root = parse(yield_chart(ROWS))
    assert {"21 of 24", "87.5 %", "36 of 36", "100.0 %"} <= set(words(root))
    assert "2026-03-02: 21 of 24 passed, 87.5 % (67.6 to 97.3 %)" in (root[1].text or "")


def test_hostile_names_stay_text() -> None:
    drawn = yield_chart(ROWS)
    assert "<b>" not in drawn
    assert "\u202e" not in drawn
    assert "<b>&<U+202E>" in words(parse(drawn))


def test_no_row_and_impossible_rows_are_refused() -> None:
    with pytest.raises(ParameterError, match="hold one group or more"):
        yield_chart([])
    with pytest.raises(ParameterError, match="units counted"):
        YieldRow("x", 3, 2, 0.0, 1.0)
    with pytest.raises(ParameterError, match="hold the share passed"):
        YieldRow("x", 1, 2, 0.6, 1.0)
