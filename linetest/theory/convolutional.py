"""Union bound of the K=7 (171, 133) convolutional code with Viterbi decoding.

BER <= 1/k * sum over d of c_d * Q(sqrt(2 d R Eb/N0)), with c_d the information weight of all error events
at distance d, k the information bits of one branch of the punctured code and R its rate.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import special

from linetest.theory.gaussian import amplitude
from linetest.units import FloatArray


@dataclass(frozen=True, slots=True)
class Spectrum:
    """Information-weight spectrum of a convolutional code.

    Attributes:
        information_bits: Information bits k that enter the coder in one period of the puncturing.
        channel_bits: Bits that leave it in the same period.
        free_distance: Least distance of an error event.
        distance_step: Distance between neighbouring entries of `weights`.
        weights: Sum of the information weights of all error events at each distance, from the free distance.
        source: Where the integers were published.
    """

    information_bits: int
    channel_bits: int
    free_distance: int
    distance_step: int
    weights: tuple[int, ...]
    source: str

    @property
    def rate(self) -> float:
        """Code rate, information bits per channel bit."""
        return self.information_bits / self.channel_bits

    @property
    def distances(self) -> tuple[int, ...]:
        """Distance of each entry of `weights`."""
        last = self.free_distance + self.distance_step * len(self.weights)
        return tuple(range(self.free_distance, last, self.distance_step))


_HACCOUN_BEGIN = "D. Haccoun and G. Begin, IEEE Trans. Commun. 37(11), 1989, pp. 1113-1125, tables for M = 6"

SPECTRA: dict[str, Spectrum] = {
    "conv-1/2": Spectrum(
        information_bits=1,
        channel_bits=2,
        free_distance=10,
        distance_step=2,
        weights=(36, 211, 1404, 11633, 77433, 502690, 3322763, 21292910, 134365911, 843425871),
        source=_HACCOUN_BEGIN,
    ),
}


def soft_decision_bound(spectrum: Spectrum, ebn0_db: FloatArray) -> FloatArray:
    """Union bound of the bit error rate with soft decisions on antipodal channel bits.

    The sum has as many terms as the published spectrum; the bound lies above the truth, the more so the
    higher the rate, and may exceed 0.5.

    Args:
        spectrum: Spectrum of the code.
        ebn0_db: Eb/N0 per information bit in dB, any shape.

    Returns:
        Upper bound of the bit error rate.
    """
    root = amplitude(ebn0_db)
    total = np.zeros_like(root)
    for distance, weight in zip(spectrum.distances, spectrum.weights, strict=True):
        total += 0.5 * weight * special.erfc(np.sqrt(distance * spectrum.rate) * root)
    return np.asarray(total / spectrum.information_bits, dtype=np.float64)
