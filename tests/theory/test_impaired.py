"""Impaired rates against high-precision integrals, simulation and what must hold for any impairment."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import integrate, special, stats

from linetest.errors import ParameterError
from linetest.theory import (
    IMPAIRED_SCHEMES,
    Impairments,
    bit_error_rate,
    impaired_bit_error_rate,
    impaired_ebn0_db,
    required_ebn0_db,
)
from linetest.theory.impairments import PhaseDensity
from linetest.theory.symbols import constellation, decide_bits, map_bits
from tests.theory.test_symbols import symbolwise_interval


def tail(x: Any) -> Any:
    return mpmath.erfc(x / mpmath.sqrt(2)) / 2


def turned_qpsk(angle: Any, ebn0_db: float) -> Any:
    scale = mpmath.sqrt(2 * mpmath.mpf(10) ** (mpmath.mpf(ebn0_db) / 10))
    return (
        tail(scale * (mpmath.cos(angle) + mpmath.sin(angle))) + tail(scale * (mpmath.cos(angle) - mpmath.sin(angle)))
    ) / 2


@pytest.mark.parametrize("scheme", IMPAIRED_SCHEMES)
def test_nothing_impaired_is_the_closed_form(scheme: str) -> None:
    levels_db = np.linspace(-5.0, 14.0, 60)
    perfect = impaired_bit_error_rate(scheme, levels_db, Impairments())
    np.testing.assert_allclose(perfect, bit_error_rate(scheme, levels_db), rtol=1e-12)


@pytest.mark.parametrize("angle_deg", [1.0, 10.0, 40.0])
@pytest.mark.parametrize("level_db", [0.0, 6.8, 10.5, 13.0])
def test_fixed_phase_error_of_qpsk_is_the_textbook_form(angle_deg: float, level_db: float) -> None:
    """Two rails at cos +- sin of the angle: Lindsey and Simon, Telecommunication Systems Engineering, 6-2."""
    with mpmath.workdps(30):
        exact = float(turned_qpsk(mpmath.radians(angle_deg), level_db))
    found = impaired_bit_error_rate("qpsk", level_db, Impairments(phase_error_deg=angle_deg))
    assert found == pytest.approx(exact, rel=1e-12)


def test_fixed_phase_error_of_bpsk_costs_its_cosine() -> None:
    levels_db = np.linspace(0.0, 12.0, 30)
    loss_db = -20.0 * np.log10(np.cos(np.deg2rad(20.0)))
    found = impaired_bit_error_rate("bpsk", levels_db, Impairments(phase_error_deg=20.0))
    np.testing.assert_allclose(found, bit_error_rate("bpsk", levels_db - loss_db), rtol=1e-12)


@pytest.mark.parametrize(("level_db", "jitter_deg"), [(10.5, 5.7), (13.0, 11.0), (20.0, 6.0), (8.0, 25.0)])
def test_gaussian_jitter_equals_a_high_precision_integral(level_db: float, jitter_deg: float) -> None:
    with mpmath.workdps(30):
        sigma, centre = mpmath.radians(jitter_deg), mpmath.radians(4)

        def integrand(angle: Any) -> Any:
            density = mpmath.exp(-((angle - centre) ** 2) / (2 * sigma**2)) / (sigma * mpmath.sqrt(2 * mpmath.pi))
            return density * turned_qpsk(angle, level_db)

        exact = float(mpmath.quad(integrand, mpmath.linspace(centre - 12 * sigma, centre + 12 * sigma, 17)))
    impairments = Impairments(phase_error_deg=4.0, phase_jitter_deg=jitter_deg)
    assert impaired_bit_error_rate("qpsk", level_db, impairments) == pytest.approx(exact, rel=1e-12)


@pytest.mark.parametrize(("level_db", "jitter_deg"), [(10.5, 5.7), (20.0, 6.0), (8.0, 40.0)])
def test_tikhonov_jitter_equals_a_high_precision_integral(level_db: float, jitter_deg: float) -> None:
    """Density exp(k cos)/(2 pi I0(k)): Lindsey and Simon, Telecommunication Systems Engineering, 2-65."""
    with mpmath.workdps(30):
        kappa = 1 / mpmath.radians(jitter_deg) ** 2
        reach = min(mpmath.pi, 13 * mpmath.radians(jitter_deg))
        norm = 2 * mpmath.pi * mpmath.besseli(0, kappa) * mpmath.exp(-kappa)

        def integrand(angle: Any) -> Any:
            density = mpmath.exp(kappa * (mpmath.cos(angle) - 1)) / norm
            return density * turned_qpsk(angle, level_db)

        exact = float(mpmath.quad(integrand, mpmath.linspace(-reach, reach, 17)))
    impairments = Impairments(phase_jitter_deg=jitter_deg, phase_density="tikhonov")
    assert impaired_bit_error_rate("qpsk", level_db, impairments) == pytest.approx(exact, rel=1e-12)


def test_jitter_agrees_with_a_general_quadrature_library() -> None:
    sigma, scale = np.deg2rad(5.7), np.sqrt(2.0 * 10.0**1.05)

    def integrand(angle: float) -> float:
        rails = special.erfc(scale * np.cos(angle + np.pi / 4)) + special.erfc(scale * np.cos(angle - np.pi / 4))
        return float(stats.norm.pdf(angle, 0.0, sigma) * rails / 4.0)

    expected, _ = integrate.quad(integrand, -9 * sigma, 9 * sigma, epsabs=0.0, epsrel=1e-11, limit=200)
    found = impaired_bit_error_rate("qpsk", 10.5, Impairments(phase_jitter_deg=5.7))
    assert found == pytest.approx(expected, rel=1e-9)


def test_phase_error_and_gain_imbalance_of_equal_effect_have_the_same_curve() -> None:
    """Amplitudes sqrt(1 +- sin 2 angle) on the rails either way: counts alone cannot tell them apart."""
    angle_deg = 6.0
    ratio = np.sqrt((1.0 + np.sin(2 * np.deg2rad(angle_deg))) / (1.0 - np.sin(2 * np.deg2rad(angle_deg))))
    levels_db = np.linspace(0.0, 13.0, 40)
    turned = impaired_bit_error_rate("qpsk", levels_db, Impairments(phase_error_deg=angle_deg))
    unequal = impaired_bit_error_rate("qpsk", levels_db, Impairments(gain_imbalance_db=20.0 * np.log10(ratio)))
    np.testing.assert_allclose(turned, unequal, rtol=1e-10)


def test_leaked_carrier_takes_power_and_shifts_the_points() -> None:
    """BPSK with leakage L on its axis: levels (+-1 + sqrt L)/sqrt(1 + L) from a fixed total power."""
    leak = 10.0**-1.5
    scale = np.sqrt(2.0 * 10.0**0.8)
    edges = (np.array([1.0, -1.0]) + np.sqrt(leak)) / np.sqrt(1.0 + leak)
    expected = stats.norm.sf(scale * np.abs(edges)).mean()
    assert impaired_bit_error_rate("bpsk", 8.0, Impairments(leakage_db=-15.0)) == pytest.approx(expected, rel=1e-12)


def test_total_power_stays_what_the_meter_reads() -> None:
    impairments = Impairments(gain_imbalance_db=2.0, quadrature_skew_deg=7.0, leakage_db=-12.0, leakage_phase_deg=30.0)
    i_axis, q_axis, leak = impairments.axes()
    signs = np.array([1.0, -1.0])
    points = signs[:, None] * i_axis + signs[None, :] * q_axis + leak
    assert np.mean(np.abs(points) ** 2) == pytest.approx(2.0, rel=1e-12)
    assert np.angle(q_axis / i_axis, deg=True) == pytest.approx(83.0)


def test_timing_offset_equals_all_patterns_of_the_nearest_neighbours() -> None:
    """Raised cosine, 0.1 symbols off: the 2^16 patterns of eight neighbours either side carry all but 1e-3."""
    at = np.concatenate([np.arange(-8, 0), np.arange(1, 9)]) + 0.1

    def pulse(t: Any) -> Any:
        return np.sinc(t) * np.cos(0.35 * np.pi * t) / (1.0 - (0.7 * t) ** 2)

    taps = pulse(at)
    patterns = (np.arange(2**16)[:, None] >> np.arange(16) & 1) * 2.0 - 1.0
    expected = stats.norm.sf(np.sqrt(2.0 * 10.0**0.9) * (pulse(0.1) + patterns @ taps)).mean()
    for scheme in ("bpsk", "qpsk"):
        found = impaired_bit_error_rate(scheme, 9.0, Impairments(timing_offset=0.1, rolloff=0.35))
        assert found == pytest.approx(expected, rel=1e-3)


def test_floor_loss_and_slips_add_as_documented() -> None:
    noisy = bit_error_rate("qpsk", 9.0)
    loss = Impairments(loss_db=1.0)
    assert impaired_bit_error_rate("qpsk", 10.0, loss) == pytest.approx(noisy, rel=1e-12)
    floor = Impairments(error_floor=1e-3)
    assert impaired_bit_error_rate("qpsk", 9.0, floor) == pytest.approx(noisy + 1e-3 - 2e-3 * noisy, rel=1e-12)
    slips = Impairments(cycle_slips_per_s=0.1, errors_per_slip=500.0)
    slipping = impaired_bit_error_rate("qpsk", 9.0, slips, bit_rate_bps=1e6)
    assert slipping == pytest.approx(noisy + 5e-5, rel=1e-12)


def test_differential_decoding_doubles_what_a_turned_carrier_leaves() -> None:
    turned = Impairments(phase_error_deg=8.0)
    single = impaired_bit_error_rate("bpsk", 9.0, turned)
    assert impaired_bit_error_rate("de-bpsk", 9.0, turned) == pytest.approx(2 * single * (1 - single), rel=1e-12)


EVERYTHING = Impairments(
    loss_db=0.3,
    phase_error_deg=4.0,
    phase_jitter_deg=4.0,
    gain_imbalance_db=0.8,
    quadrature_skew_deg=3.0,
    leakage_db=-20.0,
    leakage_phase_deg=70.0,
    error_floor=2e-4,
)


@pytest.mark.parametrize("scheme", ["bpsk", "qpsk", "8psk", "16qam", "de-bpsk"])
@pytest.mark.parametrize("density", ["gaussian", "tikhonov"])
def test_everything_at_once_agrees_with_symbol_level_simulation(scheme: str, density: PhaseDensity) -> None:
    """Independent simulation on symbols, one count each, in the 99 % interval that 20 such counts share."""
    impairments = replace(EVERYTHING, phase_density=density)
    rng = np.random.default_rng(sum(map(ord, scheme + density)))
    modulation = scheme.removeprefix("de-")
    per_symbol, count, level_db = constellation(modulation).bits_per_symbol, 300_000, 6.0
    bits = rng.integers(0, 2, count * per_symbol, dtype=np.uint8)
    points = impair_points(map_bits(modulation, bits), modulation, impairments, rng)
    n0 = 10.0 ** (-(level_db - impairments.loss_db) / 10.0) / per_symbol
    noise = rng.normal(0.0, np.sqrt(n0 / 2.0), (2, count))
    decided = decide_bits(modulation, points + noise[0] + 1j * noise[1])
    if scheme == "de-bpsk":
        # Neighbours at the same phase: the second of each pair gets the phase of the first.
        pairs = impair_points(map_bits(modulation, bits), modulation, impairments, rng, pairs=True)
        decided = decide_bits(modulation, pairs + noise[0] + 1j * noise[1]).reshape(-1, 2)
        wrong = (decided[:, 0] ^ decided[:, 1]) != (bits.reshape(-1, 2)[:, 0] ^ bits.reshape(-1, 2)[:, 1])
    else:
        wrong = decided != bits
    wrong = wrong ^ (rng.random(wrong.size) < impairments.error_floor)
    low, high = symbolwise_interval(wrong, per_symbol, impaired_bit_error_rate(scheme, level_db, impairments))
    assert low <= wrong.mean() <= high


def impair_points(
    points: np.ndarray, scheme: str, impairments: Impairments, rng: np.random.Generator, *, pairs: bool = False
) -> np.ndarray:
    """The definitions in `Impairments`, written out a second time for single symbols of unit energy."""
    leak_power = 10.0 ** (impairments.leakage_db / 10.0)
    leak = np.sqrt(leak_power) * np.exp(1j * np.deg2rad(impairments.leakage_phase_deg))
    if scheme != "bpsk":
        i_gain = 10.0 ** (impairments.gain_imbalance_db / 40.0)
        skew = np.deg2rad(impairments.quadrature_skew_deg)
        made = points.real * i_gain + 1j * points.imag / i_gain * np.exp(-1j * skew)
        made = made * np.exp(1j * skew / 2.0)
        points = made / np.sqrt((i_gain**2 + i_gain**-2) / 2.0)
    count = points.size // 2 if pairs else points.size
    sigma = np.deg2rad(impairments.phase_jitter_deg)
    if impairments.phase_density == "gaussian":
        jitter = rng.normal(0.0, sigma, count)
    else:
        jitter = rng.vonmises(0.0, 1.0 / sigma**2, count)
    if pairs:
        jitter = np.repeat(jitter, 2)
    turned = np.exp(1j * (np.deg2rad(impairments.phase_error_deg) + jitter))
    return np.asarray((points + leak) / np.sqrt(1.0 + leak_power) * turned)


@given(
    scheme=st.sampled_from(["bpsk", "qpsk", "oqpsk", "8psk", "16qam"]),
    level_db=st.floats(4.0, 12.0),
    phase_error_deg=st.floats(-8.0, 8.0),
    phase_jitter_deg=st.floats(0.0, 6.0),
    gain_imbalance_db=st.floats(-1.0, 1.0),
    quadrature_skew_deg=st.floats(-5.0, 5.0),
    leakage_db=st.floats(-40.0, -15.0),
    timing_offset=st.floats(-0.1, 0.1),
    loss_db=st.floats(0.0, 1.0),
)
@settings(max_examples=60, deadline=None)
def test_impaired_is_never_better_than_perfect(scheme: str, level_db: float, **parameters: float) -> None:
    if scheme == "8psk":
        parameters["timing_offset"] = 0.0
    impaired = impaired_bit_error_rate(scheme, level_db, Impairments(**parameters))  # type: ignore[arg-type]  # all floats
    assert impaired >= bit_error_rate(scheme, level_db) * (1.0 - 1e-9)


@pytest.mark.parametrize("scheme", ["qpsk", "16qam", "de-bpsk"])
def test_inverse_comes_back(scheme: str) -> None:
    impairments = Impairments(phase_jitter_deg=3.0, gain_imbalance_db=0.4, loss_db=0.2)
    rates = np.array([0.1, 1e-3, 1e-7])
    levels_db = impaired_ebn0_db(scheme, rates, impairments)
    np.testing.assert_allclose(impaired_bit_error_rate(scheme, levels_db, impairments), rates, rtol=1e-9)
    assert (levels_db > required_ebn0_db(scheme, rates)).all()
    assert type(impaired_ebn0_db(scheme, 1e-4, Impairments(loss_db=0.5))) is float
    assert impaired_ebn0_db("qpsk", 1e-4, Impairments(loss_db=0.5)) == pytest.approx(
        required_ebn0_db("qpsk", 1e-4) + 0.5, abs=1e-9
    )


@pytest.mark.parametrize(
    ("facts", "sentence"),
    [
        ({"loss_db": -0.1}, r"loss_db is -0.1, but must lie within 0 and 100"),
        ({"loss_db": float("nan")}, r"loss_db is nan, but must be a number"),
        ({"timing_offset": 0.6}, r"timing_offset is 0.6, but must lie within -0.5 and 0.5"),
        ({"rolloff": 0.0}, r"rolloff is 0.0, but must be above 0 and at most 1"),
        ({"phase_density": "uniform"}, r"phase_density is 'uniform', but must be gaussian or tikhonov"),
        ({"error_floor": 0.7}, r"error_floor is 0.7, but must lie within 0 and 0.5"),
    ],
)
def test_impossible_impairments_are_named(facts: dict[str, Any], sentence: str) -> None:
    with pytest.raises(ParameterError, match=sentence):
        Impairments(**facts)


def test_questions_without_an_answer_are_named() -> None:
    with pytest.raises(ParameterError, match=r"scheme is 'msk', but must be one of bpsk, .* to be impaired"):
        impaired_bit_error_rate("msk", 5.0, Impairments())
    with pytest.raises(ParameterError, match=r"timing_offset is 0.1, but must be 0 for 8psk"):
        impaired_bit_error_rate("8psk", 5.0, Impairments(timing_offset=0.1))
    with pytest.raises(ParameterError, match=r"bit_rate_bps is None, but must be above 0 where carrier cycles slip"):
        impaired_bit_error_rate("qpsk", 5.0, Impairments(cycle_slips_per_s=1.0))
    with pytest.raises(ParameterError, match=r"bit_error_rate is 1e-06, but must be above 0.0001: that much remains"):
        impaired_ebn0_db("qpsk", 1e-6, Impairments(error_floor=1e-4))
