"""The unit at symbol level: points, impairments, white noise, coherent detection with two correlators.

Two ways to the same error counts. :func:`count_by_symbols` draws the noise of every symbol. :class:`ErrorProcess`
draws only the symbols whose noise leaves the largest circle that cannot cause an error, which is exact and, at low
error rates, thousands to millions of times faster: the number outside the circle is binomial with probability
exp(-r**2 / (2 sigma**2)), and the radius beyond it is a shifted exponential in r**2.

The circle is the smallest over the *impaired* points at the phases drawn; with the ideal circle most errors of a
unit with a phase error would vanish.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
import numpy.typing as npt

from linetest.bench.units import UnitTruth
from linetest.patterns import prbs_bytes
from linetest.theory import bit_error_rate
from linetest.units import FloatArray, db_to_ratio

IntArray = npt.NDArray[np.int64]

MOST_BLOCKS = 1 << 16
MOST_DRAWN = 1 << 21
FOREVER = 1 << 50
CHUNK = 1 << 15
# Information bits in error per decoder error event, K=7 rate 1/2 soft decision near BER 1e-5: a stand-in with mean
# 4.2 and dispersion 5.1, set from simulated dispersion; not a measured distribution.
DECODER_EVENT_WEIGHTS = ((1, 0.12), (2, 0.22), (3, 0.17), (4, 0.16), (5, 0.12), (6, 0.08), (8, 0.09), (12, 0.04))
PATTERN_STAGES = {"prbs9": 9, "prbs15": 15, "prbs23": 23}


@lru_cache(maxsize=4)
def pattern_bits(name: str) -> npt.NDArray[np.uint8]:
    """One period of a test pattern, a bit a byte.

    Args:
        name: ``prbs9``, ``prbs15`` or ``prbs23``.

    Returns:
        Array of 2**n - 1 values 0 or 1.
    """
    stages = PATTERN_STAGES[name]
    return np.unpackbits(prbs_bytes(name, 1 << (stages - 3)))[: (1 << stages) - 1]


@dataclass(frozen=True)
class Constellation:
    """Impaired points of one unit; rails of the ideal unit are +1 and -1.

    Attributes:
        points: Complex points, shape (4,) for QPSK with index 2*i + q, or (2,) for BPSK; bit 0 is +1.
        quaternary: Whether there are two rails.
    """

    points: npt.NDArray[np.complex128]
    quaternary: bool

    @classmethod
    def of(cls, unit: UnitTruth) -> Constellation:
        """Points of a unit, at the ideal unit's total power.

        Args:
            unit: The unit.

        Returns:
            Its points.
        """
        turn = np.exp(1j * unit.phase_rad)
        if unit.model.modulation == "bpsk":
            return cls(np.array([1.0, -1.0]) * turn, quaternary=False)
        rail_i, rail_q = np.sqrt(1.0 + unit.gain), np.sqrt(1.0 - unit.gain)
        signs = np.array([(1.0, 1.0), (1.0, -1.0), (-1.0, 1.0), (-1.0, -1.0)])
        in_phase = rail_i * signs[:, 0] + rail_q * signs[:, 1] * np.sin(unit.skew_rad)
        quadrature = rail_q * signs[:, 1] * np.cos(unit.skew_rad)
        return cls((in_phase + 1j * quadrature) * turn, quaternary=True)

    def bits_of(self, received: npt.NDArray[np.complex128]) -> npt.NDArray[np.uint8]:
        """Decisions of the correlators, threshold zero.

        Args:
            received: Received samples, shape (n,).

        Returns:
            Bits, shape (n, rails).
        """
        rails = [received.real, received.imag] if self.quaternary else [received.real]
        return np.stack([rail < 0.0 for rail in rails], axis=1).astype(np.uint8)

    def safe_radius(self, phases_rad: FloatArray) -> float:
        """Largest noise amplitude that cannot cause an error at any of the points and phases.

        Args:
            phases_rad: Phases that occur, shape (n,).

        Returns:
            Radius, 0 where some point is already on the wrong side.
        """
        low, high = float(phases_rad.min()), float(phases_rad.max())
        if high - low >= np.pi:
            return 0.0
        # A rail's margin is a sinusoid of the phase: over less than half a turn it is smallest at an end.
        turned = self.points[:, None] * np.exp(1j * np.array([low, high]))[None, :]
        signs = 1.0 - 2.0 * self.sent_bits(np.arange(self.points.size)).astype(np.float64)
        margins = turned.real * signs[:, :1]
        if self.quaternary:
            margins = np.minimum(margins, turned.imag * signs[:, 1:])
        return max(0.0, float(margins.min()))

    def sent_bits(self, index: IntArray) -> npt.NDArray[np.uint8]:
        """Bits that a point stands for.

        Args:
            index: Indices of points, shape (n,).

        Returns:
            Bits, shape (n, rails).
        """
        if self.quaternary:
            return np.stack([index >> 1, index & 1], axis=1).astype(np.uint8)
        return index[:, None].astype(np.uint8)


class PhaseProcess:
    """Carrier phase as a first-order process, constant over blocks of at most a tenth of its time constant.

    Args:
        unit: The unit.
        symbol_rate_bd: Symbol rate, Bd.
        rng: Where chance comes from.
    """

    def __init__(self, unit: UnitTruth, symbol_rate_bd: float, rng: np.random.Generator) -> None:
        self._sigma_rad = unit.jitter_rad
        self._rng = rng
        still = unit.jitter_rad == 0.0
        self.block_symbols = FOREVER if still else max(1, int(0.1 * symbol_rate_bd / unit.jitter_bandwidth_hz))
        step_s = self.block_symbols / symbol_rate_bd
        self._keep = float(np.exp(-2.0 * np.pi * unit.jitter_bandwidth_hz * step_s))
        self._now_rad = self._sigma_rad * float(rng.standard_normal())

    def next(self, blocks: int) -> FloatArray:
        """Phases of the next blocks.

        Args:
            blocks: How many.

        Returns:
            Phases in rad, shape (blocks,).
        """
        if self._sigma_rad == 0.0:
            return np.zeros(blocks)
        from scipy.signal import lfilter

        kick = self._sigma_rad * np.sqrt(1.0 - self._keep**2)
        noise = kick * self._rng.standard_normal(blocks)
        phases, _ = lfilter([1.0], [1.0, -self._keep], noise, zi=[self._keep * self._now_rad])
        self._now_rad = float(phases[-1])
        return np.asarray(phases, dtype=np.float64)


class ErrorProcess:
    """Bit errors of a unit while it counts, at whatever Eb/N0 there is.

    Args:
        unit: The unit.
        pattern: Name of the test pattern.
        rng: Where chance comes from.
    """

    def __init__(self, unit: UnitTruth, pattern: str, rng: np.random.Generator) -> None:
        self._unit = unit
        self._rng = rng
        self._points = Constellation.of(unit)
        self._bits_per_symbol = 2 if self._points.quaternary else 1
        self._phase = PhaseProcess(unit, unit.model.bit_rate_bps / self._bits_per_symbol, rng)
        self._pattern = pattern_bits(pattern)
        self._symbol = 0
        self._odd_bits = 0
        self._carried = False
        self._held: IntArray = np.empty(0, dtype=np.int64)

    def advance(self, bits: int, ebn0_db: float) -> IntArray:
        """Let a number of bits pass.

        Args:
            bits: How many.
            ebn0_db: Eb/N0 at the unit's input, dB; minus infinity where there is no carrier.

        Returns:
            Positions of the bits in error, from 0, sorted.
        """
        effective_db = ebn0_db - self._unit.loss_db
        if self._unit.model.coded:
            return self._decoder_errors(bits, effective_db)
        positions = self._decision_errors(bits, float(db_to_ratio(effective_db)))
        if self._unit.model.differential:
            positions = self._differences(positions, bits)
        if self._unit.floor_ber > 0.0:
            extra = self._scattered(bits, self._unit.floor_ber)
            positions = np.setxor1d(positions, extra, assume_unique=True)
        return positions

    def _scattered(self, bits: int, rate: float) -> IntArray:
        count = int(self._rng.binomial(bits, rate))
        return np.unique(self._rng.integers(0, bits, count)) if count else np.empty(0, dtype=np.int64)

    def _decoder_errors(self, bits: int, effective_db: float) -> IntArray:
        """Error events of the decoder: their rate from theory, their sizes from a stated distribution."""
        weights, chances = np.array([w for w, _ in DECODER_EVENT_WEIGHTS]), [p for _, p in DECODER_EVENT_WEIGHTS]
        ber = bit_error_rate("qpsk+conv-1/2", effective_db) if effective_db > 0.0 else 0.5
        events = int(self._rng.poisson(bits * ber / float(weights @ np.array(chances))))
        starts = self._rng.integers(0, bits, events)
        sizes = self._rng.choice(weights, events, p=chances)
        if not events:
            return np.empty(0, dtype=np.int64)
        offsets = np.concatenate([np.arange(size) for size in sizes])
        return np.unique(np.minimum(np.repeat(starts, sizes) + offsets, bits - 1))

    def _decision_errors(self, bits: int, ebn0: float) -> IntArray:
        found = []
        done = 0
        sigma = float(np.sqrt(0.5 / ebn0)) if ebn0 > 0.0 else np.inf
        # A look may end inside a symbol: its other bit belongs to the next look and is drawn with it.
        symbols = -(-(bits - self._odd_bits) // self._bits_per_symbol)
        most = MOST_BLOCKS * self._phase.block_symbols
        while done < symbols:
            # Memory goes with the symbols outside the circle, not with those that pass.
            count = min(most, symbols - done, self._drawable(sigma))
            found.append(self._batch(count, sigma) + done * self._bits_per_symbol + self._odd_bits)
            done += count
        spill = symbols * self._bits_per_symbol + self._odd_bits - bits
        positions = np.concatenate(found) if found else np.empty(0, dtype=np.int64)
        here = np.concatenate([self._held, positions[positions < bits]])
        self._held = positions[positions >= bits] - bits
        self._odd_bits = spill
        return here

    def _drawable(self, sigma: float) -> int:
        """Symbols of which about ``MOST_DRAWN`` leave the still unit's circle."""
        radius = self._points.safe_radius(np.zeros(1))
        share = float(np.exp(-(radius**2) / (2.0 * sigma**2))) if np.isfinite(sigma) else 1.0
        return int(MOST_DRAWN / max(share, MOST_DRAWN / FOREVER))

    def _batch(self, count: int, sigma: float) -> IntArray:
        size = self._phase.block_symbols
        phases = self._phase.next(-(-count // size))
        if not np.isfinite(sigma):
            self._symbol += count
            return np.flatnonzero(self._rng.random(count * self._bits_per_symbol) < 0.5).astype(np.int64)
        radius = self._points.safe_radius(phases)
        outside = int(self._rng.binomial(count, np.exp(-(radius**2) / (2.0 * sigma**2))))
        if outside == 0:
            self._symbol += count
            return np.empty(0, dtype=np.int64)
        where = _distinct(self._rng, count, outside)
        amplitude = np.sqrt(radius**2 + 2.0 * sigma**2 * self._rng.standard_exponential(outside))
        angle = self._rng.uniform(0.0, 2.0 * np.pi, outside)
        noise = amplitude * np.cos(angle) + 1j * (amplitude * np.sin(angle))
        index = self._sent(where)
        turns = np.exp(1j * phases)
        received = self._points.points[index] * (turns[where // size] if turns.size > 1 else turns[0]) + noise
        wrong = self._points.bits_of(received) != self._points.sent_bits(index)
        self._symbol += count
        at = where[:, None] * self._bits_per_symbol + np.arange(self._bits_per_symbol)
        return np.asarray(at[wrong], dtype=np.int64)

    def _sent(self, where: IntArray) -> IntArray:
        first = (self._symbol + where) * self._bits_per_symbol
        bits = self._pattern[first % self._pattern.size].astype(np.int64)
        if not self._points.quaternary:
            return bits
        return 2 * bits + self._pattern[(first + 1) % self._pattern.size]

    def _differences(self, decisions: IntArray, bits: int) -> IntArray:
        """A bit is wrong when exactly one of two decisions in a row is; the last decision is carried over."""
        after = decisions + 1
        if self._carried:
            after = np.concatenate([np.zeros(1, dtype=np.int64), after])
        self._carried = bool(decisions.size and decisions[-1] == bits - 1)
        return np.setxor1d(decisions, after[after < bits], assume_unique=True)


def _distinct(rng: np.random.Generator, count: int, wanted: int) -> IntArray:
    """Sorted distinct positions, every set of them equally likely."""
    if wanted * 4 > count:
        return np.sort(rng.permutation(count)[:wanted])
    found = _sorted_once(rng.integers(0, count, wanted))
    while found.size < wanted:
        found = _sorted_once(np.concatenate([found, rng.integers(0, count, wanted - found.size)]))
    return found


def _sorted_once(values: IntArray) -> IntArray:
    """Sorted values, each once; by sorting, because numpy's own way goes through a hash table ten times as slowly."""
    ordered = np.sort(values)
    return np.asarray(ordered[np.concatenate([[True], np.diff(ordered) > 0])], dtype=np.int64)


def count_by_symbols(
    unit: UnitTruth, symbols: int, ebn0_db: float, rng: np.random.Generator, pattern: str = "prbs15"
) -> IntArray:
    """Bit errors of a unit, each symbol's noise drawn.

    Args:
        unit: The unit.
        symbols: How many symbols.
        ebn0_db: Eb/N0 at the unit's input, dB.
        rng: Where chance comes from.
        pattern: Name of the test pattern.

    Returns:
        Number of errors by rail, shape (rails,).
    """
    points = Constellation.of(unit)
    rails = 2 if points.quaternary else 1
    sigma = float(np.sqrt(0.5 / db_to_ratio(ebn0_db - unit.loss_db)))
    phase = PhaseProcess(unit, unit.model.bit_rate_bps / rails, rng)
    sent = _sent_points(pattern, rails, CHUNK)
    period = sent.size - CHUNK
    errors = np.zeros(rails, dtype=np.int64)
    block = phase.block_symbols
    chunk = CHUNK if block > CHUNK else CHUNK // block * block
    for done in range(0, symbols, chunk):
        count = min(chunk, symbols - done)
        margins = _margins(points, sent[done % period :][:count], phase, count)
        for rail, noise in enumerate(_noise(count, sigma, rng)[:rails]):
            errors[rail] += np.count_nonzero(margins[rail] + noise < 0.0)
    return errors


@lru_cache(maxsize=8)
def _sent_points(pattern: str, rails: int, beyond: int) -> IntArray:
    """Point indices over one period of symbols, and some symbols more so that a chunk never wraps."""
    bits = pattern_bits(pattern).astype(np.int64)
    first = (np.arange(bits.size) * rails) % bits.size
    index = bits[first] if rails == 1 else 2 * bits[first] + bits[(first + 1) % bits.size]
    return np.asarray(np.resize(index, bits.size + beyond), dtype=np.int64)


def _margins(
    points: Constellation, sent: IntArray, phase: PhaseProcess, count: int
) -> list[npt.NDArray[np.float32] | np.float32]:
    """How far each rail of each symbol lies on its right side; the noise that is added is symmetric."""
    signs = 1.0 - 2.0 * points.sent_bits(np.arange(points.points.size)).astype(np.float64)
    rails = [points.points.real * signs[:, 0]]
    across = [points.points.imag * signs[:, 0]]
    if points.quaternary:
        rails.append(points.points.imag * signs[:, 1])
        across.append(-points.points.real * signs[:, 1])
    phases = phase.next(-(-count // phase.block_symbols))
    if np.any(phases != 0.0):
        turned = np.repeat(phases, min(phase.block_symbols, count))[:count].astype(np.float32)
        cosine, sine = np.cos(turned), np.sin(turned)
        return [
            rail.astype(np.float32)[sent] * cosine - other.astype(np.float32)[sent] * sine
            for rail, other in zip(rails, across, strict=True)
        ]
    return [np.float32(rail[0]) if np.ptp(rail) == 0.0 else rail.astype(np.float32)[sent] for rail in rails]


def _noise(count: int, sigma: float, rng: np.random.Generator) -> list[npt.NDArray[np.float32]]:
    """Two independent normal samples a symbol, by the Box-Muller transform of raw random words.

    The radius ends at 6.7 standard deviations (32 bits), which symbol-by-symbol counts never reach.
    """
    words = rng.bit_generator.random_raw(count).view(np.uint32)
    uniform = words[::2].astype(np.float32)
    uniform += np.float32(0.5)
    uniform *= np.float32(2.0**-32)
    radius = np.sqrt(np.log(uniform) * np.float32(-2.0 * sigma * sigma))
    angle = words[1::2].astype(np.float32) * np.float32(2.0 * np.pi * 2.0**-32)
    return [radius * np.cos(angle), radius * np.sin(angle)]
