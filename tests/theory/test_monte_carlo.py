"""Every uncoded scheme counted on simulated symbols, and two of them by a general-purpose library."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt
import pytest
from commpy.modulation import PSKModem, QAMModem
from scipy import stats

from linetest.theory import bit_error_rate, symbol_error_rate

Bits = npt.NDArray[np.uint8]
Complex = npt.NDArray[np.complex128]

COUNT = 200_000
LEVELS_DB = (2.0, 6.0)


def noise(
    rng: np.random.Generator, energy: float, level_db: float, bits_per_symbol: int, shape: tuple[int, ...]
) -> Complex:
    """Complex white noise for symbols of the given energy: variance N0/2 a dimension."""
    sigma = np.sqrt(energy / (2.0 * bits_per_symbol * 10.0 ** (level_db / 10.0)))
    return np.asarray(rng.normal(0.0, sigma, shape) + 1j * rng.normal(0.0, sigma, shape))


def gray_errors(turned: npt.NDArray[np.intp], size: int) -> Bits:
    """Wrong bits of phase decisions that are off by some steps, on a circle of `size` Gray-coded phases."""
    rng = np.random.default_rng(0)
    gray = np.array([k ^ (k >> 1) for k in range(size)])
    sent = rng.integers(0, size, turned.size)
    different = gray[sent] ^ gray[(sent + turned) % size]
    return np.asarray(np.bitwise_count(different), dtype=np.uint8)


def coherent_rails(rng: np.random.Generator, level_db: float, rails: int) -> Bits:
    sent = rng.integers(0, 2, (COUNT, rails))
    seen = (1.0 - 2.0 * sent) + noise(rng, 1.0, level_db, 1, (COUNT, rails)).real
    return np.asarray(((seen < 0.0) != sent).sum(axis=1), dtype=np.uint8)


def encoded_bpsk(rng: np.random.Generator, level_db: float) -> Bits:
    wrong = coherent_rails(rng, level_db, 1)
    return wrong ^ np.roll(wrong, 1)


def encoded_qpsk(rng: np.random.Generator, level_db: float) -> Bits:
    """Quadrant decisions; data sit in the turn from one to the next."""
    quadrant = rng.integers(0, 4, COUNT)
    received = np.exp(1j * (np.pi / 4 + np.pi / 2 * quadrant)) + noise(rng, 1.0, level_db, 2, (COUNT,))
    decided = np.floor(np.angle(received) / (np.pi / 2)).astype(np.intp) % 4
    return gray_errors((np.diff(decided) - np.diff(quadrant)) % 4, 4)


def compared_phases(rng: np.random.Generator, level_db: float, phases: int, offset: float) -> Bits:
    """The angle between neighbouring received symbols decides."""
    bits = int(np.log2(phases))
    step = rng.integers(0, phases, COUNT)
    sent = np.exp(1j * np.cumsum(2 * np.pi / phases * step + offset))
    received = sent + noise(rng, 1.0, level_db, bits, (COUNT,))
    angle = np.angle(received[1:] * np.conj(received[:-1])) - offset
    decided = np.rint(angle / (2 * np.pi / phases)).astype(np.intp)
    return gray_errors((decided - step[1:]) % phases, phases)


def coherent_8psk(rng: np.random.Generator, level_db: float) -> Bits:
    received = 1.0 + noise(rng, 1.0, level_db, 3, (COUNT,))
    return gray_errors(np.rint(np.angle(received) / (np.pi / 4)).astype(np.intp) % 8, 8)


def square_16(rng: np.random.Generator, level_db: float) -> Bits:
    gray = np.array([0b00, 0b01, 0b11, 0b10])
    sent = rng.integers(0, 4, (COUNT, 2))
    seen = (2.0 * sent - 3.0) + noise(rng, 10.0, level_db, 4, (COUNT, 2)).real
    decided = np.clip(np.rint((seen + 3.0) / 2.0), 0, 3).astype(np.intp)
    return np.asarray(np.bitwise_count(gray[sent] ^ gray[decided]).sum(axis=1), dtype=np.uint8)


def minimum_shift(rng: np.random.Generator, level_db: float) -> Bits:
    """Samples of the phase ramp, detected by correlating I and Q with half sines over two bits each."""
    per_bit, bits = 8, 40_000
    data = 1.0 - 2.0 * rng.integers(0, 2, bits + 2)
    at = (np.arange(2 * per_bit) + 0.5) / (2 * per_bit)
    shape = np.sin(np.pi * at) / np.sqrt((np.sin(np.pi * at) ** 2).sum())
    wave = np.zeros((bits + 4) * per_bit, dtype=np.complex128)
    for place in range(bits):
        wave[place * per_bit : (place + 2) * per_bit] += data[place] * shape * (1.0 if place % 2 == 0 else 1j)
    wave += noise(rng, 1.0, level_db, 1, wave.shape)
    wrong = np.empty(bits, dtype=np.uint8)
    for place in range(bits):
        seen = wave[place * per_bit : (place + 2) * per_bit] @ shape
        wrong[place] = ((seen.real if place % 2 == 0 else seen.imag) < 0.0) != (data[place] < 0.0)
    return wrong


def two_tones(rng: np.random.Generator, level_db: float, *, coherent: bool) -> Bits:
    """Correlators on both orthogonal tones; the sent one has the signal, of any phase if its phase is not used."""
    seen = noise(rng, 1.0, level_db, 1, (COUNT, 2))
    seen[:, 0] += 1.0 if coherent else np.exp(2j * np.pi * rng.random(COUNT))
    level = seen.real if coherent else np.abs(seen)
    return np.asarray(level[:, 1] > level[:, 0], dtype=np.uint8)


SIMULATED: dict[str, tuple[int, Callable[[np.random.Generator, float], Bits]]] = {
    "bpsk": (1, lambda rng, x: coherent_rails(rng, x, 1)),
    "qpsk": (2, lambda rng, x: coherent_rails(rng, x, 2)),
    "oqpsk": (2, lambda rng, x: coherent_rails(rng, x, 2)),
    "msk": (1, minimum_shift),
    "de-bpsk": (1, encoded_bpsk),
    "de-qpsk": (2, encoded_qpsk),
    "dbpsk": (1, lambda rng, x: compared_phases(rng, x, 2, 0.0)),
    "dqpsk": (2, lambda rng, x: compared_phases(rng, x, 4, 0.0)),
    "pi4-dqpsk": (2, lambda rng, x: compared_phases(rng, x, 4, np.pi / 4)),
    "8psk": (3, coherent_8psk),
    "16qam": (4, square_16),
    "fsk-coherent": (1, lambda rng, x: two_tones(rng, x, coherent=True)),
    "fsk-noncoherent": (1, lambda rng, x: two_tones(rng, x, coherent=False)),
}
# 99 % for all counts of this module together: 13 schemes and 2 library modems, bits and symbols, at 2 levels.
SHARE = 0.01 / (15 * 2 * 2)


def inside(values: npt.NDArray[np.float64], expected: float) -> bool:
    """Mean of values that come in runs of two at most, within its normal interval."""
    pairs = values[: values.size // 2 * 2].reshape(-1, 2).mean(axis=1)
    # Differential decisions share a symbol with each neighbour: groups of 20 leave 5 % of that out.
    groups = values[: values.size // 20 * 20].reshape(-1, 20).mean(axis=1)
    spread = max(pairs.std() / np.sqrt(pairs.size), groups.std() / np.sqrt(groups.size))
    return bool(abs(values.mean() - expected) <= stats.norm.isf(SHARE / 2) * spread)


@pytest.mark.parametrize("scheme", SIMULATED)
@pytest.mark.parametrize("level_db", LEVELS_DB)
def test_counts_agree_with_the_closed_forms(scheme: str, level_db: float) -> None:
    bits, simulate = SIMULATED[scheme]
    rng = np.random.default_rng([20_250_601, list(SIMULATED).index(scheme), int(level_db)])
    wrong = simulate(rng, level_db)
    assert inside(wrong / bits, bit_error_rate(scheme, level_db))
    assert inside((wrong > 0).astype(np.float64), symbol_error_rate(scheme, level_db))


@pytest.mark.parametrize(("scheme", "modem"), [("8psk", PSKModem(8)), ("16qam", QAMModem(16))])
@pytest.mark.parametrize("level_db", LEVELS_DB)
def test_counts_of_a_general_library_agree(scheme: str, modem: PSKModem, level_db: float) -> None:
    """Gray modems of scikit-commpy, hard decisions, noise of our own."""
    rng = np.random.default_rng([20_250_602, int(level_db)])
    per_symbol = {"8psk": 3, "16qam": 4}[scheme]
    bits = rng.integers(0, 2, 60_000 * per_symbol)
    energy = float(np.mean(np.abs(modem.constellation) ** 2))
    received = modem.modulate(bits) + noise(rng, energy, level_db, per_symbol, (60_000,))
    wrong = (modem.demodulate(received, "hard") != bits).reshape(-1, per_symbol)
    assert inside(wrong.mean(axis=1), bit_error_rate(scheme, level_db))
    assert inside(wrong.any(axis=1).astype(np.float64), symbol_error_rate(scheme, level_db))
