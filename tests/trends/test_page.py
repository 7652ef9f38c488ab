"""The page of the line's yield."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import pytest

from linetest.records import RunSummary
from linetest.settings import shipped_folder
from linetest.trends import first_pass_yield, render_yield_page
from tests.trends.test_first_pass import LINE, run

TEMPLATES = shipped_folder("templates")
HOSTILE = '"><script>window.pwned=1</script><img src=x onerror="window.pwned=1">\u202e'


def page_of(runs: Sequence[RunSummary] = LINE) -> str:
    return render_yield_page(first_pass_yield(runs), templates_folder=TEMPLATES)


def test_the_yield_and_its_interval_stand_at_the_top() -> None:
    """3 of 7; Clopper-Pearson 9.9 to 81.6 % (scipy.stats.binomtest(3, 7).proportion_ci())."""
    page = page_of()
    assert "<b>3</b> of <b>7</b> units passed" in page
    assert "<b>42.9 %</b><span>exact 95 % interval 9.9 to 81.6 %</span>" in page


def test_each_grouping_is_drawn_and_told_in_words() -> None:
    page = page_of()
    for kind in ("day", "lot", "model", "station"):
        assert f"<h2>By {kind}</h2>" in page
        assert f'<title id="yield-{kind}-t">First-pass yield by {kind}</title>' in page
    assert "A1: 2 of 6 passed, 33.3 %" in page


def test_causes_are_listed_most_frequent_first_with_their_running_share() -> None:
    page = page_of()
    described = re.search(r'<desc id="rejects-d">([^<]*)', page)
    assert described is not None
    assert described.group(1) == "ber: 2, together 50 %; ber (HOLD): 1, together 75 %; supply: 1, together 100 %."
    assert re.search(r"link</td><td class=\"n\">2</td>", page)


def test_a_line_without_units_or_without_trouble_says_so() -> None:
    assert "No unit has been judged yet" in page_of([])
    clean = page_of([run(1, "S1", "PASS")])
    assert "Every unit judged has passed." in clean
    assert "No run was VOID." in clean


@pytest.mark.parametrize("field", ["lot", "model", "station", "cause"])
def test_hostile_text_stays_text(field: str) -> None:
    changes: dict[str, Any] = {field: HOSTILE}
    page = page_of([replace(item, **changes) for item in LINE])
    assert "<script" not in page
    assert "<img" not in page
    assert "\u202e" not in page


def test_the_same_records_give_the_same_bytes() -> None:
    assert page_of() == page_of(tuple(reversed(LINE)))


def test_nothing_in_the_file_can_run_or_fetch() -> None:
    page = page_of()
    assert "default-src &#39;none&#39;; style-src &#39;sha256-" in page
    assert not re.search(r"<(script|img|link|iframe|form|a)\b", page)
    assert not re.search(r"\s(on\w+|href|src|style)=", page)
