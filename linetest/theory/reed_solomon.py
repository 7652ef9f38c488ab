"""Reed-Solomon outer codes over bytes, with ideal interleaving."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import special

from linetest.units import FloatArray

_BITS_PER_SYMBOL = 8


@dataclass(frozen=True, slots=True)
class ReedSolomon:
    """A Reed-Solomon code over bytes with bounded-distance decoding.

    Attributes:
        length: Symbols of a code word.
        information: Information symbols of a code word.
        source: Where the code is used.
    """

    length: int
    information: int
    source: str

    @property
    def rate(self) -> float:
        """Code rate, information bits per coded bit."""
        return self.information / self.length

    @property
    def corrected(self) -> int:
        """Symbol errors of a word that the decoder corrects."""
        return (self.length - self.information) // 2


OUTER_CODES: dict[str, ReedSolomon] = {
    "rs-204-188": ReedSolomon(204, 188, "ETSI EN 300 421, clause 4.4.2"),
    "rs-255-223": ReedSolomon(255, 223, "CCSDS 131.0-B, section 4"),
}


def output_bit_error_rate(code: ReedSolomon, input_rate: FloatArray) -> FloatArray:
    """Bit error rate after the outer decoder, for bit errors that come independently.

    With symbol error rate s = 1 - (1 - p)**8 a word with more than t symbol errors stays as it is, so that
    the symbol error rate becomes sum over i > t of (i/n) C(n, i) s**i (1-s)**(n-i) = s I_s(t, n - t), and
    bits keep their share of it: p I_s(t, n - t), with I the regularised incomplete beta function. Wrong
    corrections, rarer by 1/t!, are left out. Bursts that fill a byte, as a Viterbi decoder makes them, give
    fewer wrong bytes for the same p: the rate here is then too high.

    Args:
        code: The code.
        input_rate: Bit error rate p at the decoder's input.

    Returns:
        Bit error rate at its output.

    Source:
        J. G. Proakis, Digital Communications, 4th ed., eq. 8.1-111 and 8.1-113.
    """
    symbol_rate = -np.expm1(_BITS_PER_SYMBOL * np.log1p(-input_rate))
    t = code.corrected
    return np.asarray(input_rate * special.betainc(t, code.length - t, symbol_rate), dtype=np.float64)
