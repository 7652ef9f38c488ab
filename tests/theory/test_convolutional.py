"""Spectra against published integers and an enumeration; bounds against the sums they stand for."""

from __future__ import annotations

from functools import partial
from typing import Any

import mpmath
import numpy as np
import pytest
from scipy import stats

from linetest.errors import ParameterError
from linetest.theory import bit_error_rate
from linetest.theory.convolutional import SPECTRA, Spectrum, hard_decision_bound, soft_decision_bound
from linetest.theory.inverse import CurveInverse
from tests.theory.enumerate_spectra import spectrum

# Information weights: D. Haccoun and G. Begin, IEEE Trans. Commun. 37(11), 1989, pp. 1113-1125, tables for
# M = 6; also P. Frenger et al., tables 3.1.1 and 3.1.2.
PUBLISHED_WEIGHTS = {
    "1/2": (36, 211, 1404, 11633, 77433, 502690, 3322763, 21292910, 134365911, 843425871),
    "2/3": (3, 70, 285, 1276, 6160, 27128, 117019, 498860, 2103891, 8784123),
    "3/4": (42, 201, 1492, 10469, 62935, 379644, 2253373, 13073811, 75152755, 428005675),
}
# Numbers of events. Rate 1/2: reference test of the IT++ library. The others: Haccoun and Begin, from memory.
PUBLISHED_EVENTS = {
    "1/2": (11, 38, 193, 1331, 7275),
    "2/3": (1, 16, 48, 158, 642, 2435, 9174),
    "3/4": (8, 31, 160, 892, 4512, 23307, 121077, 625059, 3234886, 16753077),
    "5/6": (14, 69, 654, 4996, 39699),
    "7/8": (2, 46, 499, 5291, 56179),
}
# ETSI EN 300 421, clause 4.4.3, table 2, from memory.
FREE_DISTANCES = {"1/2": 10, "2/3": 6, "3/4": 5, "5/6": 4, "7/8": 3}
MOST_DISTANCE = {"1/2": 40, "2/3": 20, "3/4": 19, "5/6": 18, "7/8": 16}


@pytest.mark.parametrize("rate", FREE_DISTANCES)
def test_enumerated_spectra_are_the_published_and_the_packaged_ones(rate: str) -> None:
    events, weights = spectrum(rate, MOST_DISTANCE[rate])
    packaged = SPECTRA[f"conv-{rate}"]
    free = int(np.flatnonzero(events)[0])
    assert free == FREE_DISTANCES[rate] == packaged.free_distance
    seen_events, seen_weights = (found[free :: packaged.distance_step].tolist() for found in (events, weights))
    published = PUBLISHED_EVENTS[rate]
    assert tuple(seen_events[: len(published)]) == published
    assert tuple(seen_weights[:10]) == PUBLISHED_WEIGHTS.get(rate, tuple(seen_weights[:10]))
    assert packaged.weights == tuple(seen_weights)
    if packaged.distance_step == 2:
        assert not weights[free + 1 :: 2].any()


# Printed Eb/N0 of the IF loop at 2e-4 after the inner decoder: ETSI EN 300 421 V1.1.2, table 5.
@pytest.mark.parametrize(("rate", "printed_db"), [("1/2", 4.5), ("3/4", 5.5), ("7/8", 6.4)])
def test_bound_meets_the_satellite_standards_loop_table(rate: str, printed_db: float) -> None:
    """Bound at 2e-4, plus the outer code's rate, plus 0.8 dB of modem margin (from memory), is the table."""
    bound = CurveInverse(partial(soft_decision_bound, SPECTRA[f"conv-{rate}"]))
    outer_db = 10.0 * np.log10(204 / 188)
    assert outer_db == pytest.approx(0.36, abs=0.006)  # as the same table's note prints it
    assert float(bound(np.asarray(2e-4))) + outer_db + 0.8 == pytest.approx(printed_db, abs=0.1)


@pytest.mark.parametrize(("rate", "gap_db"), [(1e-5, 1.85), (1e-7, 1.954)])
def test_gap_between_rates_one_half_and_seven_eighths(rate: float, gap_db: float) -> None:
    """CCSDS 130.1-G-1, section 4.6, says "about 2.4 dB"; the bound gives 1.85 dB at 1e-5, EN 300 421 1.9 dB."""
    needed = [
        float(CurveInverse(partial(soft_decision_bound, SPECTRA[f"conv-{code}"]))(np.asarray(rate)))
        for code in ("7/8", "1/2")
    ]
    assert needed[0] - needed[1] == pytest.approx(2.4, abs=0.6)
    assert needed[0] - needed[1] == pytest.approx(gap_db, abs=0.01)


@pytest.mark.parametrize("code", SPECTRA)
@pytest.mark.parametrize("level_db", [4.0, 6.5, 9.0])
def test_soft_bound_is_the_sum_over_the_spectrum(code: str, level_db: float) -> None:
    distances = np.array(SPECTRA[code].distances)
    chances = stats.norm.sf(np.sqrt(2.0 * distances * SPECTRA[code].rate * 10.0 ** (level_db / 10.0)))
    expected = float((np.array(SPECTRA[code].weights) * chances).sum()) / SPECTRA[code].information_bits
    assert soft_decision_bound(SPECTRA[code], np.asarray(level_db)) == pytest.approx(expected, rel=1e-12)


def pairwise_hard(distance: int, wrong: Any) -> Any:
    """Viterbi 1971: more than half of the bits wrong, or half of the cases with exactly half wrong."""
    chance = mpmath.mpf(0)
    for errors in range(distance + 1):
        share = mpmath.mpf(1) if 2 * errors > distance else mpmath.mpf("0.5") * (2 * errors == distance)
        chance += share * mpmath.binomial(distance, errors) * wrong**errors * (1 - wrong) ** (distance - errors)
    return chance


@pytest.mark.parametrize("code", SPECTRA)
@pytest.mark.parametrize("level_db", [5.0, 8.0, 11.0])
def test_hard_bound_is_the_sum_of_binomial_tails(code: str, level_db: float) -> None:
    with mpmath.workdps(40):
        ratio = mpmath.mpf(10) ** (mpmath.mpf(level_db) / 10)
        rate = mpmath.mpf(SPECTRA[code].information_bits) / SPECTRA[code].channel_bits
        wrong = mpmath.erfc(mpmath.sqrt(rate * ratio)) / 2
        pairs = zip(SPECTRA[code].distances, SPECTRA[code].weights, strict=True)
        total = sum(weight * pairwise_hard(distance, wrong) for distance, weight in pairs)
        expected = float(total / SPECTRA[code].information_bits)
    assert hard_decision_bound(SPECTRA[code], np.asarray(level_db)) == pytest.approx(expected, rel=1e-11)


def test_hard_decisions_cost_about_two_db() -> None:
    """Common practice: hard decisions lose about 2 dB against soft ones."""
    soft, hard = (
        float(CurveInverse(partial(bound, SPECTRA["conv-1/2"]))(np.asarray(1e-5)))
        for bound in (soft_decision_bound, hard_decision_bound)
    )
    assert hard - soft == pytest.approx(2.0, abs=0.4)


def test_a_code_is_better_than_none_where_it_is_used() -> None:
    for found in SPECTRA.values():
        assert soft_decision_bound(found, np.asarray(7.0)) < bit_error_rate("qpsk", 7.0)


@pytest.mark.parametrize(
    ("change", "sentence"),
    [
        ({"weights": (36, 211)}, r"weights is \(36, 211\), but must have at least 5 terms"),
        ({"weights": (36, 211, 0, 1, 1)}, r"weights is .* must be above 0, each"),
        ({"information_bits": 2}, r"information_bits is 2, but must be above 0 and below channel_bits, 2"),
    ],
)
def test_a_spectrum_that_cannot_be_is_refused(change: dict[str, Any], sentence: str) -> None:
    facts: dict[str, Any] = {
        "information_bits": 1,
        "channel_bits": 2,
        "free_distance": 10,
        "distance_step": 2,
        "weights": (36, 211, 1404, 11633, 77433),
        "source": "test",
    }
    with pytest.raises(ParameterError, match=sentence):
        Spectrum(**(facts | change))
