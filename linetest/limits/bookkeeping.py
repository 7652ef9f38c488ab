"""What stands between information bits and symbols: bits per symbol and code rate of a scheme."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction
from types import MappingProxyType

from linetest.errors import ParameterError
from linetest.units import esn0_db

# A sheet's rates may be rounded to the bit, not to the percent.
ESN0_AGREEMENT_DB = 0.001

BITS_PER_SYMBOL: Mapping[str, int] = MappingProxyType(
    {
        "bpsk": 1,
        "de-bpsk": 1,
        "dbpsk": 1,
        "msk": 1,
        "fsk-coherent": 1,
        "fsk-noncoherent": 1,
        "qpsk": 2,
        "oqpsk": 2,
        "de-qpsk": 2,
        "dqpsk": 2,
        "pi4-dqpsk": 2,
        "8psk": 3,
        "16qam": 4,
    }
)


def information_bits_per_symbol(scheme: str) -> Fraction:
    """Information bits that one symbol carries: bits per symbol times the rate of every code.

    Args:
        scheme: Modulation, with codes after plus signs: ``conv-<k>/<n>`` or ``rs-<n>-<k>``.

    Returns:
        The exact ratio.

    Raises:
        ParameterError: The modulation or a code is unknown.
    """
    modulation, *codes = scheme.split("+")
    if modulation not in BITS_PER_SYMBOL:
        raise ParameterError("scheme", scheme, f"begin with one of {', '.join(BITS_PER_SYMBOL)}")
    bits = Fraction(BITS_PER_SYMBOL[modulation])
    for code in codes:
        bits *= code_rate(code)
    return bits


def code_rate(code: str) -> Fraction:
    """Information bits per channel bit of a code.

    Args:
        code: ``conv-<k>/<n>`` or ``rs-<n>-<k>``.

    Returns:
        The exact ratio, between 0 and 1.

    Raises:
        ParameterError: The name says no rate.
    """
    family, _, numbers = code.partition("-")
    try:
        if family == "conv":
            rate = Fraction(numbers)
        else:
            length, information = numbers.split("-")
            rate = Fraction(int(information), int(length))
    except (ValueError, ZeroDivisionError):
        raise ParameterError("code", code, "be conv-<k>/<n> or rs-<n>-<k>") from None
    if family not in {"conv", "rs"} or not 0 < rate <= 1:
        raise ParameterError("code", code, "be conv-<k>/<n> or rs-<n>-<k> with a rate between 0 and 1")
    return rate


def bookkeeping_error_db(scheme: str, bit_rate_bps: float, symbol_rate_bd: float) -> float:
    """How far stated rates are from what modulation and coding give.

    Es/N0 = Eb/N0 * Rb / Rs, and a symbol carries a known number of information bits, so that both rates
    together must give that number.

    Args:
        scheme: Modulation and codes.
        bit_rate_bps: Information bit rate Rb, bit/s, above 0.
        symbol_rate_bd: Symbol rate Rs, Bd, above 0.

    Returns:
        Es/N0 - Eb/N0 by the rates less the same by modulation and coding, dB.

    Raises:
        ParameterError: The scheme names a modulation or code without a known rate.
    """
    by_scheme = information_bits_per_symbol(scheme)
    return esn0_db(0.0, bit_rate_bps, symbol_rate_bd) - esn0_db(0.0, float(by_scheme), 1.0)
