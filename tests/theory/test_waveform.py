"""Waveform level: pulses against their definitions, and all three levels against each other."""

from __future__ import annotations

import numpy as np
import pytest
from commpy.filters import rrcosfilter
from scipy import stats

from linetest.errors import ParameterError
from linetest.theory import Impairments, bit_error_rate, impaired_bit_error_rate
from linetest.theory.symbols import MAPPED_SCHEMES, constellation, decide_bits, map_bits
from linetest.theory.waveform import (
    Pulse,
    add_noise,
    demodulate,
    modulate,
    raised_cosine,
    root_raised_cosine,
)
from tests.theory.test_symbols import symbolwise_interval

PULSE = Pulse(rolloff=0.35, samples_per_symbol=4, span_symbols=16)


@pytest.mark.parametrize("rolloff", [0.2, 0.25, 0.35, 0.5, 1.0])
def test_pulse_equals_a_general_library(rolloff: float) -> None:
    """Root-raised-cosine filter of scikit-commpy, up to the scale; its middle sample sits half way."""
    time_s, theirs = rrcosfilter(129, rolloff, 1.0, 8.0)
    ours = root_raised_cosine(np.asarray(time_s), rolloff)
    np.testing.assert_allclose(ours, theirs, atol=1e-9)


@pytest.mark.parametrize("rolloff", [0.2, 0.35, 0.75])
def test_two_pulses_make_a_raised_cosine(rolloff: float) -> None:
    t = np.arange(-400, 401) / 8.0
    both = np.convolve(root_raised_cosine(t, rolloff), root_raised_cosine(t, rolloff), "same") / 8.0
    np.testing.assert_allclose(both[300:501], raised_cosine(t[300:501], rolloff), atol=1e-3)


@pytest.mark.parametrize("rolloff", [0.2, 0.35, 0.5, 1.0])
def test_raised_cosine_vanishes_at_every_other_instant(rolloff: float) -> None:
    at = np.arange(-20.0, 21.0)
    np.testing.assert_allclose(raised_cosine(at, rolloff), at == 0.0, atol=1e-12)
    edge = 1.0 / (2.0 * rolloff)
    beside = raised_cosine(np.array([edge - 1e-6, edge, edge + 1e-6]), rolloff)
    assert beside == pytest.approx(beside[1], abs=1e-5)


@pytest.mark.parametrize("scheme", MAPPED_SCHEMES)
def test_noiseless_waveform_gives_the_symbols_back(scheme: str) -> None:
    rng = np.random.default_rng(8)
    bits = rng.integers(0, 2, 300 * constellation(scheme).bits_per_symbol, dtype=np.uint8)
    points = demodulate(scheme, modulate(scheme, bits, PULSE), 300, PULSE)
    np.testing.assert_allclose(points, map_bits(scheme, bits), atol=0.01)
    assert (decide_bits(scheme, points) == bits).all()


@pytest.mark.parametrize("scheme", MAPPED_SCHEMES)
def test_waveform_level_agrees_with_the_closed_form(scheme: str) -> None:
    """One count a scheme at 4 dB, within the 99 % interval that the whole suite's 20 such counts share."""
    rng = np.random.default_rng(9)
    per_symbol = constellation(scheme).bits_per_symbol
    bits = rng.integers(0, 2, 40_000 * per_symbol, dtype=np.uint8)
    received = add_noise(modulate(scheme, bits, PULSE), scheme, 4.0, rng)
    wrong = decide_bits(scheme, demodulate(scheme, received, 40_000, PULSE)) != bits
    low, high = symbolwise_interval(wrong, per_symbol, bit_error_rate(scheme, 4.0))
    assert low <= wrong.mean() <= high


@pytest.mark.parametrize("scheme", ["bpsk", "qpsk", "oqpsk", "16qam"])
def test_late_sampling_and_turned_carrier_agree_with_quadrature(scheme: str) -> None:
    """An eighth of a symbol late and 6 degrees off: waveform simulation against the exact average."""
    pulse = Pulse(rolloff=0.35, samples_per_symbol=8, span_symbols=16)
    rng = np.random.default_rng(10)
    per_symbol, level_db = constellation(scheme).bits_per_symbol, 6.0
    bits = rng.integers(0, 2, 40_000 * per_symbol, dtype=np.uint8)
    received = add_noise(modulate(scheme, bits, pulse), scheme, level_db, rng)
    points = demodulate(scheme, received, 40_000, pulse, timing_offset_samples=1, phase_error_rad=np.deg2rad(6.0))
    wrong = decide_bits(scheme, points) != bits
    expected = impaired_bit_error_rate(
        scheme, level_db, Impairments(timing_offset=1 / 8, phase_error_deg=6.0, rolloff=0.35)
    )
    assert expected > 1.3 * bit_error_rate(scheme, level_db)
    low, high = symbolwise_interval(wrong, per_symbol, expected)
    assert low <= wrong.mean() <= high


def test_noise_has_the_density_that_was_asked_for() -> None:
    """Power of noise alone against N0 times the sample bandwidth: chi-square interval of 99.9 %."""
    noise = add_noise(np.zeros(50_000, dtype=np.complex128), "qpsk", 7.0, np.random.default_rng(11))
    n0 = 1.0 / (2.0 * 10.0**0.7)
    low, high = stats.chi2.interval(0.999, 100_000)
    assert low <= np.square(np.abs(noise)).sum() / (n0 / 2.0) <= high


@pytest.mark.parametrize(
    ("facts", "sentence"),
    [
        ({"rolloff": 0.0}, r"rolloff is 0.0, but must be above 0 and at most 1"),
        ({"samples_per_symbol": 3}, r"samples_per_symbol is 3, but must be even and 2 or more"),
        ({"span_symbols": 0}, r"span_symbols is 0, but must be 1 or more"),
    ],
)
def test_wrong_pulses_are_named(facts: dict[str, float], sentence: str) -> None:
    with pytest.raises(ParameterError, match=sentence):
        Pulse(**facts)  # type: ignore[arg-type]  # the table mixes float and int
