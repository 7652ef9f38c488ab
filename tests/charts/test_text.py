"""Text and numbers of charts."""

from __future__ import annotations

from xml.etree import ElementTree as ET

import pytest
from hypothesis import given
from hypothesis import strategies as st

from linetest.charts import escaped, visible
from linetest.charts.text import number, plain_scientific, power_of_ten, shortened


@pytest.mark.parametrize(
    ("given_text", "seen"),
    [
        ("BQ4-000123", "BQ4-000123"),
        ("a\u202etxt", "a<U+202E>txt"),
        ("a\u200bb", "a<U+200B>b"),
        ("bell\x07", "bell<U+0007>"),
        ("מודם", "מודם"),
    ],
)
def test_direction_and_control_characters_are_shown_and_letters_are_kept(given_text: str, seen: str) -> None:
    assert visible(given_text) == seen


def test_markup_and_quotes_are_escaped() -> None:
    assert escaped("<b a='1' b=\"2\">&") == "&lt;b a=&#x27;1&#x27; b=&quot;2&quot;&gt;&amp;"


@given(st.text())
def test_any_text_makes_well_formed_xml_in_content_and_attribute(text: str) -> None:
    """Judged by Python's XML parser, which knows nothing of ours."""
    element = ET.fromstring(f'<a b="{escaped(text)}">{escaped(text)}</a>')  # noqa: S314  (our own text)
    flattened = visible(text).replace("\r\n", "\n").replace("\r", "\n")
    assert (element.text or "") == flattened


def test_a_long_text_is_cut_with_an_ellipsis() -> None:
    assert shortened("implementation", 6) == "imple…"
    assert shortened("short", 5) == "short"


@pytest.mark.parametrize(
    ("value", "written"), [(12.0, "12"), (12.04, "12"), (12.06, "12.1"), (-0.01, "0"), (-3.25, "-3.2"), (100.0, "100")]
)
def test_coordinates_are_written_to_a_tenth_without_ballast(value: float, written: str) -> None:
    assert number(value) == written


def test_decades_are_raised_powers_of_ten() -> None:
    assert power_of_ten(-6) == '10<tspan dy="-4.5" font-size="8.5">−6</tspan>'
    assert power_of_ten(0) == "1"


def test_small_numbers_in_words() -> None:
    assert plain_scientific(0.0000213) == "2.1 × 10^-5"
    assert plain_scientific(0.0) == "0"
