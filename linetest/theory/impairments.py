"""What a real modem adds to the noise, each with its parameter and unit.

The order of events, which is also the order in which combined impairments act:

1. The transmitter makes I and Q with unequal gains and off a right angle, and leaks carrier; total power,
   leakage included, stays what the power meter reads.
2. Root-raised-cosine pulses at both ends; sampling off the instant leaves part of the neighbours.
3. The receiver's carrier is turned by a fixed angle and jitters about it.
4. Noise is added; an implementation loss stands for everything that acts like more of it.
5. Decisions against fixed thresholds; a share of the bits is wrong whatever the noise (the floor), and
   cycle slips add their errors.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Literal

import numpy as np

from linetest.errors import ParameterError
from linetest.units import FloatArray

PhaseDensity = Literal["gaussian", "tikhonov"]

# Beyond ten standard deviations a Gaussian phase holds less than 1e-22 of the chances.
_REACH_SIGMAS = 10.0
_PHASE_NODES = 161
_CIRCLE_NODES = 512


@dataclass(frozen=True, slots=True, kw_only=True)
class Impairments:
    """Imperfections of a modem link; the defaults are a perfect one.

    Attributes:
        loss_db: Implementation loss that acts as so much less Eb/N0, dB.
        phase_error_deg: Fixed angle between the received carrier and the receiver's, degrees.
        phase_jitter_deg: Standard deviation of the jitter about it, degrees; a Tikhonov density has loop
            signal-to-noise ratio 1/jitter**2 (in rad).
        phase_density: Density of the jitter.
        gain_imbalance_db: Amplitude of I over that of Q at the transmitter, dB (20 log10).
        quadrature_skew_deg: Angle by which the transmitter's I and Q axes are closer than 90 degrees.
        leakage_db: Power of the leaked carrier over that of the modulated signal, dB; minus infinity: none.
        leakage_phase_deg: Phase of the leaked carrier from the I axis, degrees.
        timing_offset: Sampling instant off the right one, in symbols, within +-0.5.
        rolloff: Excess bandwidth of the raised cosine, above 0, at most 1; matters with a timing offset.
        error_floor: Share of bits that are wrong whatever the noise, independent of it.
        cycle_slips_per_s: Carrier slips per second.
        errors_per_slip: Bit errors that one slip leaves in the count.
    """

    loss_db: float = 0.0
    phase_error_deg: float = 0.0
    phase_jitter_deg: float = 0.0
    phase_density: PhaseDensity = "gaussian"
    gain_imbalance_db: float = 0.0
    quadrature_skew_deg: float = 0.0
    leakage_db: float = -np.inf
    leakage_phase_deg: float = 0.0
    timing_offset: float = 0.0
    rolloff: float = 0.35
    error_floor: float = 0.0
    cycle_slips_per_s: float = 0.0
    errors_per_slip: float = 1.0

    def __post_init__(self) -> None:
        for field in fields(self):
            value = getattr(self, field.name)
            if field.name != "phase_density" and np.isnan(value):
                raise ParameterError(field.name, value, "be a number")
        if self.phase_density not in {"gaussian", "tikhonov"}:
            raise ParameterError("phase_density", self.phase_density, "be gaussian or tikhonov")
        for name, least, greatest in _RANGES:
            value = getattr(self, name)
            if not least <= value <= greatest:
                raise ParameterError(name, value, f"lie within {least:g} and {greatest:g}")
        if not 0.0 < self.rolloff <= 1.0:
            raise ParameterError("rolloff", self.rolloff, "be above 0 and at most 1")

    @property
    def leakage_power(self) -> float:
        """Power of the leaked carrier over that of the modulated signal."""
        return float(10.0 ** (self.leakage_db / 10.0))

    def axes(self) -> tuple[complex, complex, complex]:
        """Transmitted phasors of a unit on I, of a unit on Q, and of the leaked carrier.

        Returns:
            The three, scaled so that two independent rails of unit mean square have power 2 with leakage.
        """
        ratio = 10.0 ** (self.gain_imbalance_db / 20.0)
        half_skew = np.deg2rad(self.quadrature_skew_deg) / 2.0
        share = 1.0 / np.sqrt(1.0 + self.leakage_power)
        gain_q = share * np.sqrt(2.0 / (1.0 + ratio**2))
        leak = share * np.sqrt(2.0 * self.leakage_power) * np.exp(1j * np.deg2rad(self.leakage_phase_deg))
        i_axis = ratio * gain_q * np.exp(1j * half_skew)
        q_axis = 1j * gain_q * np.exp(-1j * half_skew)
        return complex(i_axis), complex(q_axis), complex(leak)

    def phases(self) -> tuple[FloatArray, FloatArray]:
        """Nodes and weights that average over the carrier phase.

        Smooth densities that vanish at both ends, or close on themselves, are summed by the trapezium rule
        to full precision with evenly spaced nodes.

        Returns:
            Angles in rad and their weights, which add up to 1; shape (n,) each.
        """
        centre = np.deg2rad(self.phase_error_deg)
        sigma = np.deg2rad(self.phase_jitter_deg)
        if sigma == 0.0:
            return np.array([centre]), np.ones(1)
        reach = _REACH_SIGMAS * sigma
        if self.phase_density == "gaussian":
            nodes = _PHASE_NODES if reach < np.pi else _CIRCLE_NODES
            off = np.linspace(-reach, reach, nodes)
            weight = np.exp(-0.5 * np.square(off / sigma))
        else:
            reach = min(1.1 * reach, np.pi)
            whole = reach == np.pi
            off = np.linspace(-reach, reach, _CIRCLE_NODES if whole else _PHASE_NODES, endpoint=not whole)
            weight = np.exp((np.cos(off) - 1.0) / sigma**2)
        return np.asarray(centre + off), np.asarray(weight / weight.sum())


_RANGES = (
    ("loss_db", 0.0, 100.0),
    ("phase_error_deg", -180.0, 180.0),
    ("phase_jitter_deg", 0.0, 90.0),
    ("gain_imbalance_db", -40.0, 40.0),
    ("quadrature_skew_deg", -89.0, 89.0),
    ("leakage_db", -np.inf, 20.0),
    ("leakage_phase_deg", -360.0, 360.0),
    ("timing_offset", -0.5, 0.5),
    ("error_floor", 0.0, 0.5),
    ("cycle_slips_per_s", 0.0, np.inf),
    ("errors_per_slip", 0.0, np.inf),
)
