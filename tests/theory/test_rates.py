"""Rate bookkeeping against a library's documented example and a textbook's worked code."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest

from linetest.errors import ParameterError
from linetest.theory import SCHEMES, required_ebn0_db, scheme_rates
from linetest.theory.rates import SchemeRates
from linetest.units import esn0_db


def test_conversion_is_the_documented_example() -> None:
    """Documentation of the Python library sdr: QPSK, r = 2/3, one sample a symbol: 5 dB is 6.249387... dB."""
    rates = SchemeRates(2, Fraction(2, 3), Fraction(1))
    assert rates.esn0_db(5.0) == pytest.approx(6.249387366082999, abs=1e-12)
    assert rates.esn0_db(3.7506126339170005) == pytest.approx(5.0, abs=1e-12)


def test_hamming_code_needs_the_worked_ebn0() -> None:
    """Roddy, Satellite Communications, 4th ed., section 11.8: (7, 4), 9.0 dB at 1e-5, coding gain 0.6 dB."""
    rates = SchemeRates(1, Fraction(4, 7), Fraction(1))
    channel_rate = float(np.sqrt(1e-5 / 6.0))
    needed_db = required_ebn0_db("bpsk", channel_rate) - rates.channel_ebn0_db(0.0)
    assert needed_db == pytest.approx(9.0, abs=0.06)
    assert needed_db == pytest.approx(9.0017, abs=5e-5)
    assert required_ebn0_db("bpsk", 1e-5) - needed_db == pytest.approx(0.6, abs=0.06)


def test_rates_multiply_over_both_codes() -> None:
    rates = scheme_rates("qpsk+conv-1/2+rs-204-188")
    assert rates == SchemeRates(2, Fraction(1, 2), Fraction(188, 204))
    assert rates.code_rate == Fraction(94, 204)
    assert rates.symbol_rate_bd(1.88e6) == pytest.approx(2.04e6)
    assert rates.channel_bit_rate_bps(1.88e6) == pytest.approx(4.08e6)


@pytest.mark.parametrize("scheme", SCHEMES)
def test_symbol_energy_agrees_with_the_two_rates(scheme: str) -> None:
    """Es/N0 = Eb/N0 * Rb / Rs, whichever way it is computed."""
    rates = scheme_rates(scheme)
    assert rates.esn0_db(7.0) == pytest.approx(esn0_db(7.0, 64e3, rates.symbol_rate_bd(64e3)), abs=1e-12)


def test_unknown_scheme_is_named() -> None:
    with pytest.raises(ParameterError, match=r"scheme is 'qpsk\+none', but must be one of the schemes"):
        scheme_rates("qpsk+none")
