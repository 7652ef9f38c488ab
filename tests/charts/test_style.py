"""Colours can be read, by light and by dark, without colour vision."""

from __future__ import annotations

import re

import pytest

from linetest.charts import CHART_STYLE


def relative_luminance(colour: str) -> float:
    """Relative luminance of a hexadecimal sRGB colour (WCAG 2.1)."""
    digits = colour.lstrip("#")
    digits = "".join(2 * digit for digit in digits) if len(digits) == 3 else digits
    channels = [int(digits[place : place + 2], 16) / 255.0 for place in (0, 2, 4)]
    linear = [value / 12.92 if value <= 0.03928 else ((value + 0.055) / 1.055) ** 2.4 for value in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    """Contrast ratio of two colours, 1 to 21 (WCAG 2.1)."""
    darker, lighter = sorted((relative_luminance(one), relative_luminance(other)))
    return (lighter + 0.05) / (darker + 0.05)


def palettes() -> dict[str, dict[str, str]]:
    light, dark = CHART_STYLE.split("@media screen and (prefers-color-scheme:dark)")
    return {name: dict(re.findall(r"--(\w+):(#\w+)", text)) for name, text in (("light", light), ("dark", dark))}


def test_the_measure_itself_agrees_with_published_values() -> None:
    """WCAG 2.1: black on white is 21; #767676 on white is the known lightest grey of 4.5 (from memory: 4.54)."""
    assert contrast("#000", "#fff") == pytest.approx(21.0)
    assert contrast("#767676", "#ffffff") == pytest.approx(4.54, abs=0.005)


@pytest.mark.parametrize("mode", ["light", "dark"])
@pytest.mark.parametrize("ink", ["ink", "mid", "theory", "limit"])
def test_words_stand_out_from_the_ground(mode: str, ink: str) -> None:
    """WCAG 2.1, 1.4.3: at least 4.5 for text."""
    palette = palettes()[mode]
    assert contrast(palette[ink], palette["ground"]) >= 4.5


@pytest.mark.parametrize("mode", ["light", "dark"])
@pytest.mark.parametrize("mark", ["point", "theory", "limit", "mid"])
def test_marks_stand_out_from_the_ground(mode: str, mark: str) -> None:
    """WCAG 2.1, 1.4.11: at least 3 for graphics that carry meaning."""
    palette = palettes()[mode]
    assert contrast(palette[mark], palette["ground"]) >= 3.0


def test_dark_is_for_screens_only_and_the_limit_is_told_by_its_stroke() -> None:
    assert CHART_STYLE.count("prefers-color-scheme") == CHART_STYLE.count("@media screen and (prefers-color-scheme")
    assert re.search(r"\.lc \.limit\{[^}]*stroke-dasharray", CHART_STYLE)
    assert not re.search(r"\.lc \.theory\{[^}]*stroke-dasharray", CHART_STYLE)
