"""Noise-equivalent bandwidth against filters whose bandwidth is known in closed form."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from scipy.stats import norm

from linetest.errors import ParameterError
from linetest.noise import SweptResponse, noise_bandwidth
from linetest.units import FloatArray

F0_HZ = 70e6


def gaussian_db(frequencies_hz: FloatArray) -> FloatArray:
    """Gaussian filter of 10 MHz at 3 dB."""
    return np.asarray(-10.0 * math.log10(2.0) * ((frequencies_hz - F0_HZ) / 5e6) ** 2)


def butterworth_db(frequencies_hz: FloatArray) -> FloatArray:
    """Band-pass Butterworth of order 4 by its low-pass prototype, 10 MHz at 3 dB."""
    return np.asarray(-10.0 * np.log10(1.0 + ((frequencies_hz - F0_HZ) / 5e6) ** 8))


def swept(response: Callable[[FloatArray], FloatArray], points: int, reach_hz: float) -> SweptResponse:
    frequencies = np.linspace(F0_HZ - reach_hz, F0_HZ + reach_hz, points)
    return SweptResponse(tuple(frequencies), tuple(response(frequencies)), F0_HZ, 0.01, 0.5)


def test_gaussian_filter() -> None:
    """Bandwidth of a Gaussian filter: sqrt(pi / ln 2) / 2 = 1.0645 times that at 3 dB."""
    found = noise_bandwidth(swept(gaussian_db, 201, 18e6))
    exact_hz = 10e6 * math.sqrt(math.pi / math.log(2.0)) / 2.0
    assert found.value == pytest.approx(exact_hz, rel=3e-4)
    assert abs(found.value - exact_hz) < 2.0 * found.u


def test_butterworth_filter() -> None:
    """Bandwidth of an n-pole Butterworth: (pi/2n) / sin(pi/2n) times that at 3 dB; 1.026 for four poles."""
    found = noise_bandwidth(swept(butterworth_db, 401, 25e6))
    exact_hz = 10e6 * (math.pi / 8.0) / math.sin(math.pi / 8.0)
    assert exact_hz == pytest.approx(1.026e7, abs=5e3)
    assert found.value == pytest.approx(exact_hz, rel=1e-3)
    assert abs(found.value - exact_hz) < 2.0 * found.u


def test_coarse_sweep_says_how_far_it_may_be_out() -> None:
    exact_hz = 10e6 * (math.pi / 8.0) / math.sin(math.pi / 8.0)
    for points in (21, 31, 41, 61):
        found = noise_bandwidth(swept(butterworth_db, points, 25e6))
        assert abs(found.value - exact_hz) < 2.0 * found.u


def test_interval_holds_the_bandwidth_of_sweeps_with_noise_and_scale_error() -> None:
    """400 sweeps with drawn errors: 95 % within binomial scatter (rectangular parts make it a little more)."""
    rng = np.random.default_rng(70)
    exact_hz = 10e6 * math.sqrt(math.pi / math.log(2.0)) / 2.0
    frequencies = np.linspace(F0_HZ - 18e6, F0_HZ + 18e6, 73)
    hits, sweeps = 0, 400
    for _ in range(sweeps):
        scale = 1.0 + rng.uniform(-0.02, 0.02)
        response = gaussian_db(frequencies) * scale + 0.05 * rng.standard_normal(frequencies.size)
        sweep = SweptResponse(tuple(frequencies), tuple(response), F0_HZ, 0.05, 2.0)
        low, high = noise_bandwidth(sweep).interval
        hits += low <= exact_hz <= high
    low_hits, high_hits = (0.95 + sign * norm.ppf(0.9995) * math.sqrt(0.95 * 0.05 / sweeps) for sign in (-1.0, 1.0))
    assert low_hits < hits / sweeps < min(1.0, high_hits)


def test_common_reference_level_cancels() -> None:
    sweep = swept(gaussian_db, 201, 18e6)
    lifted = SweptResponse(sweep.frequencies_hz, [x + 37.0 for x in sweep.response_db], F0_HZ, 0.01, 0.5)
    assert noise_bandwidth(lifted).value == pytest.approx(noise_bandwidth(sweep).value, rel=1e-12)


@pytest.mark.parametrize(
    ("change", "sentence"),
    [
        ({"frequencies_hz": (1.0, 2.0)}, "frequencies_hz is 2, but must number at least 11"),
        ({"reference_hz": 1.0}, "reference_hz is 1.0, but must lie inside the sweep"),
        ({"reading_u_db": -1.0}, "must be 0 or more"),
        ({"response_db": (0.0,) * 201}, "response_db is 0.0, but must fall by 20 dB at both ends"),
        ({"response_db": (math.nan,) * 201}, "response_db is 'the list', but must be finite"),
        ({"frequencies_hz": (1.0,) * 201}, "frequencies_hz is 'the list', but must be finite and ascend"),
    ],
)
def test_wrong_sweep_is_named(change: dict[str, object], sentence: str) -> None:
    sweep = swept(gaussian_db, 201, 18e6)
    facts = {name: getattr(sweep, name) for name in SweptResponse.__dataclass_fields__}
    with pytest.raises(ParameterError) as caught:
        noise_bandwidth(SweptResponse(**(facts | change)))
    assert sentence in str(caught.value)
