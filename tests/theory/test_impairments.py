"""The averages over carrier phase that impaired rates are made of."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import special

from linetest.theory import Impairments


@pytest.mark.parametrize("jitter_deg", [0.3, 2.0, 10.0, 30.0])
def test_gaussian_phases_have_the_moments_of_a_normal_variable(jitter_deg: float) -> None:
    angles, weights = Impairments(phase_jitter_deg=jitter_deg, phase_error_deg=5.0).phases()
    sigma, centre = np.deg2rad(jitter_deg), np.deg2rad(5.0)
    assert weights.sum() == pytest.approx(1.0, abs=1e-13)
    assert float(weights @ angles) == pytest.approx(centre, abs=1e-13)
    assert float(weights @ (angles - centre) ** 2) == pytest.approx(sigma**2, rel=1e-12)
    assert float(weights @ np.cos(angles)) == pytest.approx(np.cos(centre) * np.exp(-(sigma**2) / 2), rel=1e-12)


@pytest.mark.parametrize("jitter_deg", [0.3, 2.0, 5.8, 10.0, 20.0, 60.0])
def test_tikhonov_phases_have_bessels_mean_cosine(jitter_deg: float) -> None:
    """E cos = I1(k)/I0(k): A. J. Viterbi, Principles of Coherent Communication, section 4-3."""
    angles, weights = Impairments(phase_jitter_deg=jitter_deg, phase_density="tikhonov").phases()
    kappa = 1.0 / np.deg2rad(jitter_deg) ** 2
    assert weights.sum() == pytest.approx(1.0, abs=1e-13)
    expected = special.ive(1, kappa) / special.ive(0, kappa)
    assert float(weights @ np.cos(angles)) == pytest.approx(expected, rel=1e-12)


def test_perfect_axes_are_one_and_j() -> None:
    i_axis, q_axis, leak = Impairments().axes()
    assert i_axis == pytest.approx(1.0)
    assert q_axis == pytest.approx(1j)
    assert leak == 0j


def test_gain_imbalance_is_an_amplitude_ratio_in_db() -> None:
    i_axis, q_axis, _ = Impairments(gain_imbalance_db=1.5).axes()
    assert 20.0 * np.log10(abs(i_axis) / abs(q_axis)) == pytest.approx(1.5)
    assert abs(i_axis) ** 2 + abs(q_axis) ** 2 == pytest.approx(2.0)
