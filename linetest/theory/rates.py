"""The bookkeeping between information bits, channel bits, symbols and noise bandwidth."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from linetest.errors import ParameterError
from linetest.theory.convolutional import SPECTRA
from linetest.theory.reed_solomon import OUTER_CODES
from linetest.theory.schemes import SCHEMES

_BITS_PER_SYMBOL = {
    "bpsk": 1,
    "qpsk": 2,
    "oqpsk": 2,
    "msk": 1,
    "de-bpsk": 1,
    "de-qpsk": 2,
    "dbpsk": 1,
    "dqpsk": 2,
    "pi4-dqpsk": 2,
    "8psk": 3,
    "16qam": 4,
    "fsk-coherent": 1,
    "fsk-noncoherent": 1,
}


@dataclass(frozen=True, slots=True)
class SchemeRates:
    """How many channel bits and symbols carry an information bit.

    Attributes:
        bits_per_symbol: Channel bits of one symbol.
        inner_rate: Rate of the convolutional code, 1 without one.
        outer_rate: Rate of the outer code, 1 without one.
    """

    bits_per_symbol: int
    inner_rate: Fraction
    outer_rate: Fraction

    @property
    def code_rate(self) -> Fraction:
        """Information bits per channel bit, both codes together."""
        return self.inner_rate * self.outer_rate

    def symbol_rate_bd(self, bit_rate_bps: float) -> float:
        """Symbol rate of an information bit rate; also the noise bandwidth in Hz of its matched filter.

        Args:
            bit_rate_bps: Information bit rate in bit/s.

        Returns:
            Symbol rate in baud.
        """
        return bit_rate_bps / float(self.code_rate * self.bits_per_symbol)

    def channel_bit_rate_bps(self, bit_rate_bps: float) -> float:
        """Channel bit rate of an information bit rate.

        Args:
            bit_rate_bps: Information bit rate in bit/s.

        Returns:
            Channel bit rate in bit/s.
        """
        return bit_rate_bps / float(self.code_rate)

    def channel_ebn0_db(self, ebn0_db: float) -> float:
        """Eb/N0 per channel bit: the information bit's, spread over the bits that carry it.

        Args:
            ebn0_db: Eb/N0 per information bit in dB.

        Returns:
            Eb/N0 per channel bit in dB.
        """
        return ebn0_db + float(10.0 * np.log10(float(self.code_rate)))

    def esn0_db(self, ebn0_db: float) -> float:
        """Es/N0 of an Eb/N0 per information bit.

        Args:
            ebn0_db: Eb/N0 per information bit in dB.

        Returns:
            Es/N0 in dB.
        """
        return self.channel_ebn0_db(ebn0_db) + float(10.0 * np.log10(self.bits_per_symbol))


def scheme_rates(scheme: str) -> SchemeRates:
    """Rates of a scheme.

    Args:
        scheme: One of `SCHEMES`.

    Returns:
        Its rates.

    Raises:
        ParameterError: The scheme is unknown.
    """
    if scheme not in SCHEMES:
        raise ParameterError("scheme", scheme, "be one of the schemes of linetest.theory.SCHEMES")
    modulation, *codes = scheme.split("+")
    inner = outer = Fraction(1)
    for code in codes:
        if code in OUTER_CODES:
            outer = Fraction(OUTER_CODES[code].information, OUTER_CODES[code].length)
        else:
            spectrum = SPECTRA[code.removesuffix("-hard")]
            inner = Fraction(spectrum.information_bits, spectrum.channel_bits)
    return SchemeRates(_BITS_PER_SYMBOL[modulation], inner, outer)
