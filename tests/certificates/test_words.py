"""Numbers on a certificate."""

from __future__ import annotations

from datetime import datetime, timedelta, timezone

import pytest

from linetest.certificates import words


@pytest.mark.parametrize(
    ("value", "standard_uncertainty", "printed"),
    [
        (10.05762, 0.027, "10.058"),  # JCGM 100:2008, 7.2.6
        (100.0214712, 0.00035, "100.02147"),  # JCGM 100:2008, 7.2.2
        (-20.13172, 0.1204, "−20.13"),
        (-20.13172, 0.0996, "−20.13"),  # 0.0996 is 0.10 with two digits
        (1234.5, 120.0, "1234"),
        (12.004, None, "12.00"),
        (0.5531, None, "0.553"),
        (0.0800, None, "0.080"),
        (-0.0071, None, "−0.0071"),
        (0.00006901, None, "0.000069"),
        (22_528.0, None, "22\u202f528"),
        (0.0, None, "0"),
        ("2.4.1", None, "2.4.1"),
        (float("nan"), None, "not a number"),
    ],
)
def test_values_are_rounded_to_the_place_of_their_uncertainty(
    value: float | str, standard_uncertainty: float | None, printed: str
) -> None:
    assert words.measured(value, standard_uncertainty) == printed


@pytest.mark.parametrize(
    ("u", "printed"), [(0.1204, "0.12"), (0.0996, "0.10"), (0.058, "0.058"), (None, "–"), (0.0, "–")]
)
def test_uncertainties_have_two_significant_digits(u: float | None, printed: str) -> None:
    """JCGM 100:2008, 7.2.6: it usually suffices to quote an uncertainty to at most two significant digits."""
    assert words.spread(u) == printed


def test_rates_are_powers_of_ten_with_a_real_minus() -> None:
    assert words.rate(3.872e-6) == "3.87\u202f×\u202f10<sup>−6</sup>"
    assert words.rate(0.0) == "0"


@pytest.mark.parametrize(("share", "printed"), [(0.0099, "0.99"), (0.00002, "< 0.01"), (0.0, "0.00"), (1.0, "100.00")])
def test_small_risks_are_never_printed_as_none(share: float, printed: str) -> None:
    assert words.percent(share) == f"{printed}\u202f%"


@pytest.mark.parametrize(
    ("lower", "upper", "printed"),
    [
        (-22.0, -18.0, "−22 to −18"),
        (0.4, None, "at least 0.4"),
        (None, 2.0, "at most 2"),
        (None, None, "–"),
        (0.0, 0.0, "0 to 0"),
    ],
)
def test_limits_in_words(lower: float | None, upper: float | None, printed: str) -> None:
    assert words.limits(lower, upper) == printed


def test_groups_of_three_from_five_digits_on() -> None:
    """ISO 80000-1, 7.3.1: digits may be in groups of three; with four digits the gap is commonly left out."""
    assert words.grouped(4_489_216) == "4\u202f489\u202f216"
    assert words.grouped(9999) == "9999"
    assert words.grouped(-12_345) == "−12\u202f345"


def test_times_are_in_utc() -> None:
    at = datetime(2026, 3, 2, 10, 14, 5, tzinfo=timezone(timedelta(hours=1)))
    assert words.utc(at) == "2026-03-02 09:14:05 UTC"
