"""Waveform level: bits to Gray symbols, root-raised-cosine pulses, I and Q, matched filter.

A waveform is the complex envelope: I is its real part, Q its imaginary part. Pulses have unit energy in
samples, so that a symbol of unit energy adds unit energy to the samples and the matched filter's output at
the right instants is the symbol again. OQPSK sends Q half a symbol later.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy import signal

from linetest.errors import ParameterError
from linetest.theory.symbols import BitArray, ComplexArray, constellation, map_bits
from linetest.units import FloatArray


@dataclass(frozen=True)
class Pulse:
    """Root-raised-cosine pulse, the same at both ends of the link.

    Attributes:
        rolloff: Excess bandwidth, above 0, at most 1.
        samples_per_symbol: Even number of samples of a symbol, 2 or more.
        span_symbols: Symbols that the truncated pulse lasts to either side.
    """

    rolloff: float = 0.35
    samples_per_symbol: int = 8
    span_symbols: int = 24

    def __post_init__(self) -> None:
        if not 0.0 < self.rolloff <= 1.0:
            raise ParameterError("rolloff", self.rolloff, "be above 0 and at most 1")
        if self.samples_per_symbol < 2 or self.samples_per_symbol % 2:
            raise ParameterError("samples_per_symbol", self.samples_per_symbol, "be even and 2 or more")
        if self.span_symbols < 1:
            raise ParameterError("span_symbols", self.span_symbols, "be 1 or more")

    @cached_property
    def taps(self) -> FloatArray:
        """Samples of the pulse, unit energy, shape (2 * span_symbols * samples_per_symbol + 1,)."""
        reach = self.span_symbols * self.samples_per_symbol
        shape = root_raised_cosine(np.arange(-reach, reach + 1) / self.samples_per_symbol, self.rolloff)
        return np.asarray(shape / np.sqrt(np.square(shape).sum()), dtype=np.float64)

    @property
    def delay_samples(self) -> int:
        """Samples from a symbol's instant to the end of its pulse."""
        return self.span_symbols * self.samples_per_symbol


def root_raised_cosine(t_symbols: FloatArray, rolloff: float) -> FloatArray:
    """Root-raised-cosine pulse, one at both ends of a link making a raised cosine.

    Args:
        t_symbols: Time in symbols, any shape.
        rolloff: Excess bandwidth, above 0, at most 1.

    Returns:
        The pulse, energy 1 per symbol time.

    Source:
        ETSI EN 300 421, annex A, in the time domain; Proakis, Digital Communications, 4th ed., section 9.2.
    """
    t, b = np.asarray(t_symbols, dtype=np.float64), rolloff
    with np.errstate(divide="ignore", invalid="ignore"):
        top = np.sin(np.pi * t * (1.0 - b)) + 4.0 * b * t * np.cos(np.pi * t * (1.0 + b))
        shape = top / (np.pi * t * (1.0 - np.square(4.0 * b * t)))
    edge = (
        b
        / np.sqrt(2.0)
        * ((1.0 + 2.0 / np.pi) * np.sin(np.pi / (4.0 * b)) + (1.0 - 2.0 / np.pi) * np.cos(np.pi / (4.0 * b)))
    )
    shape = np.where(np.isclose(t, 0.0, atol=1e-12), 1.0 - b + 4.0 * b / np.pi, shape)
    return np.asarray(np.where(np.isclose(np.abs(t), 1.0 / (4.0 * b), atol=1e-9), edge, shape))


def raised_cosine(t_symbols: FloatArray, rolloff: float) -> FloatArray:
    """Raised-cosine pulse: what a symbol adds to the matched filter's output at a time from its instant.

    Args:
        t_symbols: Time in symbols, any shape.
        rolloff: Excess bandwidth, above 0, at most 1.

    Returns:
        The pulse, 1 at its own instant, 0 at every other symbol's.

    Source:
        J. G. Proakis, Digital Communications, 4th ed., eq. 9.2-27.
    """
    t = np.asarray(t_symbols, dtype=np.float64)
    below = 1.0 - np.square(2.0 * rolloff * t)
    edge = np.isclose(below, 0.0, atol=1e-9)
    shape = np.sinc(t) * np.cos(np.pi * rolloff * t) / np.where(edge, 1.0, below)
    return np.asarray(np.where(edge, np.pi / 4.0 * np.sinc(1.0 / (2.0 * rolloff)), shape))


def modulate(scheme: str, bits: BitArray, pulse: Pulse) -> ComplexArray:
    """Transmitted waveform of bits.

    Args:
        scheme: One of `symbols.MAPPED_SCHEMES`.
        bits: Bits, 0 or 1, whole symbols.
        pulse: The pulse.

    Returns:
        Complex envelope, shape (symbols * samples_per_symbol + len(taps) - 1 + half a symbol,); the
        instant of symbol n is sample `delay_samples` + n * samples_per_symbol.

    Raises:
        ParameterError: The scheme has no map, or the bits do not fill whole symbols.
    """
    symbols = map_bits(scheme, bits)
    half = pulse.samples_per_symbol // 2
    train = np.zeros(symbols.size * pulse.samples_per_symbol + half, dtype=np.complex128)
    train[: -half : pulse.samples_per_symbol] = symbols
    if scheme == "oqpsk":
        later = np.roll(train.imag, half)
        train = train.real + 1j * later
    return np.asarray(signal.oaconvolve(train, pulse.taps), dtype=np.complex128)


def add_noise(waveform: ComplexArray, scheme: str, ebn0_db: float, rng: np.random.Generator) -> ComplexArray:
    """Waveform with white Gaussian noise, for symbols of unit mean energy.

    Args:
        waveform: Complex envelope from `modulate`.
        scheme: Its scheme.
        ebn0_db: Eb/N0 per bit in dB.
        rng: Source of chance.

    Returns:
        Noisy envelope of the same shape; the noise has variance N0/2 on each of I and Q.
    """
    n0 = 1.0 / (constellation(scheme).bits_per_symbol * 10.0 ** (ebn0_db / 10.0))
    noise = rng.normal(0.0, np.sqrt(n0 / 2.0), (2, waveform.size))
    return np.asarray(waveform + noise[0] + 1j * noise[1], dtype=np.complex128)


def demodulate(
    scheme: str,
    received: ComplexArray,
    count: int,
    pulse: Pulse,
    *,
    timing_offset_samples: int = 0,
    phase_error_rad: float = 0.0,
) -> ComplexArray:
    """Matched filter and sampling at the symbol instants.

    Args:
        scheme: The scheme.
        received: Complex envelope of the shape that `modulate` gives.
        count: Number of symbols.
        pulse: The pulse.
        timing_offset_samples: Samples by which the receiver samples late.
        phase_error_rad: Angle by which the receiver's carrier lags, in rad.

    Returns:
        Received points, shape (count,).
    """
    filtered = signal.oaconvolve(received * np.exp(1j * phase_error_rad), pulse.taps)
    first = 2 * pulse.delay_samples + timing_offset_samples
    stop = first + count * pulse.samples_per_symbol
    points = filtered[first : stop : pulse.samples_per_symbol]
    if scheme == "oqpsk":
        half = pulse.samples_per_symbol // 2
        points = points.real + 1j * filtered[first + half : stop + half : pulse.samples_per_symbol].imag
    return np.asarray(points, dtype=np.complex128)
