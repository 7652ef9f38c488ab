"""The interval of a fixed count against published values, scipy and statsmodels."""

from __future__ import annotations

import pytest
from scipy import stats
from statsmodels.stats.proportion import proportion_confint

from linetest.decision import interval
from linetest.errors import ParameterError

NEWCOMBE = "R. G. Newcombe, Two-sided confidence intervals for the single proportion, Stat. Med. 17 (1998)"


@pytest.mark.parametrize(
    ("errors", "bits", "low", "high", "source"),
    [
        (15, 148, 0.0578, 0.1617, NEWCOMBE),
        (0, 20, 0.0, 0.1684, NEWCOMBE),
        (81, 263, 0.2527, 0.3676, NEWCOMBE + " table I, from memory"),
    ],
)
def test_published_intervals_to_the_printed_precision(
    errors: int, bits: int, low: float, high: float, source: str
) -> None:
    found = interval(bits, errors)
    assert found == pytest.approx((low, high), abs=0.5e-4 + 1e-6), source


def test_no_error_in_many_bits_has_the_upper_limit_of_a_poisson_count_of_none() -> None:
    """3.689 counts: F. Garwood, Fiducial limits for the Poisson distribution, Biometrika 28 (1936), from memory."""
    low, high = interval(10**9, 0)
    assert low == 0.0
    assert high * 1e9 == pytest.approx(3.689, abs=0.5e-3)


@pytest.mark.parametrize(("bits", "errors"), [(20, 0), (148, 15), (148, 148), (1, 0), (2_000_000, 37), (10**10, 3)])
@pytest.mark.parametrize("confidence", [0.5, 0.9, 0.95, 0.999])
def test_agrees_with_scipy_and_statsmodels(bits: int, errors: int, confidence: float) -> None:
    found = interval(bits, errors, confidence)
    of_scipy = stats.binomtest(errors, bits).proportion_ci(confidence, method="exact")
    # scipy's root finder stops within 2e-12.
    assert found == pytest.approx((of_scipy.low, of_scipy.high), rel=1e-9, abs=4e-12)
    assert found == pytest.approx(proportion_confint(errors, bits, 1.0 - confidence, method="beta"), rel=1e-9)


@pytest.mark.parametrize(("bits", "errors"), [(0, 0), (-5, 0), (10, -1), (10, 11)])
def test_counts_that_cannot_be_are_refused(bits: int, errors: int) -> None:
    with pytest.raises(ParameterError, match=r"but must (be 1 or more|lie between 0 and the 10 bits counted)"):
        interval(bits, errors)


@pytest.mark.parametrize("confidence", [0.0, 1.0, -0.1, 1.5, float("nan")])
def test_levels_that_cannot_be_are_refused(confidence: float) -> None:
    with pytest.raises(ParameterError, match=r"confidence is .* must lie between 0 and 1"):
        interval(100, 1, confidence)
