"""Union bounds of convolutional codes with Viterbi decoding, from their distance spectra.

BER <= 1/k * sum over d of c_d * P_d, with c_d the information weight of all error events at distance d, k the
information bits of one period of the puncturing and P_d the chance that noise prefers a path d bits away.

To add a code, add its `Spectrum` to `SPECTRA` under the name that follows the plus sign of a scheme.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import special

from linetest.errors import ParameterError
from linetest.theory.gaussian import amplitude
from linetest.theory.uncoded import antipodal_ber
from linetest.units import FloatArray

_LEAST_TERMS = 5


@dataclass(frozen=True, slots=True)
class Spectrum:
    """Information-weight spectrum of a convolutional code.

    Attributes:
        information_bits: Information bits k that enter the coder in one period of the puncturing.
        channel_bits: Bits that leave it in the same period.
        free_distance: Least distance of an error event.
        distance_step: Distance between neighbouring entries of `weights`.
        weights: Sum of the information weights of all error events at each distance, from the free
            distance: one term of the bound each.
        source: Where the integers come from.

    Raises:
        ParameterError: The spectrum has fewer than five terms, a weight that is not positive, or a rate
            outside 0 to 1.
    """

    information_bits: int
    channel_bits: int
    free_distance: int
    distance_step: int
    weights: tuple[int, ...]
    source: str

    def __post_init__(self) -> None:
        if len(self.weights) < _LEAST_TERMS:
            rule = f"have at least {_LEAST_TERMS} terms: fewer leave out more than the bound can bear"
            raise ParameterError("weights", self.weights, rule)
        if min(self.weights) <= 0:
            raise ParameterError("weights", self.weights, "be above 0, each")
        if not 0 < self.information_bits < self.channel_bits:
            rule = f"be above 0 and below channel_bits, {self.channel_bits}"
            raise ParameterError("information_bits", self.information_bits, rule)

    @property
    def rate(self) -> float:
        """Code rate, information bits per channel bit."""
        return self.information_bits / self.channel_bits

    @property
    def distances(self) -> tuple[int, ...]:
        """Distance of each entry of `weights`."""
        last = self.free_distance + self.distance_step * len(self.weights)
        return tuple(range(self.free_distance, last, self.distance_step))


# The first ten of each are published there for rates 1/2, 2/3 and 3/4; all are enumerated from the generators
# by a script kept with the tests.
_SOURCE = "D. Haccoun and G. Begin, IEEE Trans. Commun. 37(11), 1989, pp. 1113-1125, M = 6; continued by enumeration"

# Generators 171 and 133 (octal), punctured as ETSI EN 300 421, table 2 says.
SPECTRA: dict[str, Spectrum] = {
    "conv-1/2": Spectrum(
        information_bits=1,
        channel_bits=2,
        free_distance=10,
        distance_step=2,
        weights=(
            36,
            211,
            1404,
            11633,
            77433,
            502690,
            3322763,
            21292910,
            134365911,
            843425871,
            5245283348,
            32372937519,
            198723833069,
            1213657958889,
            7378557447583,
            44686304667721,
        ),
        source=_SOURCE,
    ),
    "conv-2/3": Spectrum(
        information_bits=2,
        channel_bits=3,
        free_distance=6,
        distance_step=1,
        weights=(
            3,
            70,
            285,
            1276,
            6160,
            27128,
            117019,
            498860,
            2103891,
            8784123,
            36328084,
            149215136,
            609374214,
            2475565587,
            10011487814,
        ),
        source=_SOURCE,
    ),
    "conv-3/4": Spectrum(
        information_bits=3,
        channel_bits=4,
        free_distance=5,
        distance_step=1,
        weights=(
            42,
            201,
            1492,
            10469,
            62935,
            379644,
            2253373,
            13073811,
            75152755,
            428005675,
            2415121123,
            13534984705,
            75422690722,
            418134779192,
            2307775877171,
        ),
        source=_SOURCE,
    ),
    "conv-5/6": Spectrum(
        information_bits=5,
        channel_bits=6,
        free_distance=4,
        distance_step=1,
        weights=(
            92,
            528,
            8694,
            79453,
            792114,
            7375573,
            67884974,
            610875423,
            5427275376,
            47664215639,
            414847451604,
            3583040670062,
            30748409619146,
            262418568123539,
            2228895012849046,
        ),
        source=_SOURCE,
    ),
    "conv-7/8": Spectrum(
        information_bits=7,
        channel_bits=8,
        free_distance=3,
        distance_step=1,
        weights=(
            9,
            500,
            7437,
            105707,
            1402743,
            17909268,
            222292299,
            2706822556,
            32434972565,
            383973015410,
            4500355965429,
            52316757931192,
            603989760691166,
            6932118224436308,
        ),
        source=_SOURCE,
    ),
}


def soft_decision_bound(spectrum: Spectrum, ebn0_db: FloatArray) -> FloatArray:
    """Union bound of the bit error rate with unquantised decisions: P_d = Q(sqrt(2 d R Eb/N0)).

    The bound lies above the truth, the more so the higher the rate, and may exceed 0.5.

    Args:
        spectrum: Spectrum of the code.
        ebn0_db: Eb/N0 per information bit in dB, any shape.

    Returns:
        Upper bound of the bit error rate.

    Source:
        A. J. Viterbi, IEEE Trans. Commun. Technol. 19(5), 1971, pp. 751-772, section IV.
    """
    root = amplitude(ebn0_db)
    total = np.zeros_like(root)
    for distance, weight in zip(spectrum.distances, spectrum.weights, strict=True):
        total += 0.5 * weight * special.erfc(np.sqrt(distance * spectrum.rate) * root)
    return np.asarray(total / spectrum.information_bits, dtype=np.float64)


def hard_decision_bound(spectrum: Spectrum, ebn0_db: FloatArray) -> FloatArray:
    """Union bound of the bit error rate with hard decisions ahead of the decoder.

    P_d is the chance that more than half of d channel bits are wrong, half of that of exactly half of them.

    Args:
        spectrum: Spectrum of the code.
        ebn0_db: Eb/N0 per information bit in dB, any shape.

    Returns:
        Upper bound of the bit error rate.

    Source:
        A. J. Viterbi, IEEE Trans. Commun. Technol. 19(5), 1971, pp. 751-772, section III.
    """
    wrong = antipodal_ber(ebn0_db + 10.0 * np.log10(spectrum.rate))
    total = np.zeros_like(wrong)
    for distance, weight in zip(spectrum.distances, spectrum.weights, strict=True):
        # For even d the half of the middle term makes P_d equal to that of d - 1.
        odd = distance - 1 + distance % 2
        total += weight * special.betainc((odd + 1) // 2, odd - (odd + 1) // 2 + 1, wrong)
    return np.asarray(total / spectrum.information_bits, dtype=np.float64)
