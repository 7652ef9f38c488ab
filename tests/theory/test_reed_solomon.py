"""Outer codes against the binomial sum in high precision and the satellite standard's operating point."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest

from linetest.theory import bit_error_rate
from linetest.theory.reed_solomon import OUTER_CODES, ReedSolomon, output_bit_error_rate


@pytest.mark.parametrize("code", OUTER_CODES.values(), ids=list(OUTER_CODES))
@pytest.mark.parametrize("rate", [1e-6, 1e-4, 2e-3, 1e-2, 0.1])
def test_output_rate_is_the_sum_over_words_that_stay_wrong(code: ReedSolomon, rate: float) -> None:
    with mpmath.workdps(40):
        symbol = 1 - (1 - mpmath.mpf(rate)) ** 8
        wrong_words = sum(
            mpmath.mpf(i)
            / code.length
            * mpmath.binomial(code.length, i)
            * symbol**i
            * (1 - symbol) ** (code.length - i)
            for i in range(code.corrected + 1, code.length + 1)
        )
        expected = float(wrong_words * mpmath.mpf(rate) / symbol)
    assert output_bit_error_rate(code, np.asarray(rate)) == pytest.approx(expected, rel=1e-10)


def test_satellite_operating_point_is_quasi_error_free() -> None:
    """ETSI EN 300 421 calls 2e-4 ahead of RS (204, 188) quasi error free, 1e-10 to 1e-11 (from memory).

    With ideal interleaving and independent bit errors the rate is 4e-13: the standard's point is on the safe
    side of that.
    """
    after = float(output_bit_error_rate(OUTER_CODES["rs-204-188"], np.asarray(2e-4)))
    assert after == pytest.approx(4e-13, rel=0.02)
    assert after < 1e-11


@pytest.mark.parametrize(("name", "corrected"), [("rs-204-188", 8), ("rs-255-223", 16)])
def test_codes_correct_what_their_standards_say(name: str, corrected: int) -> None:
    """ETSI EN 300 421, clause 4.4.2: T = 8; CCSDS 131.0-B, section 4: E = 16."""
    assert OUTER_CODES[name].corrected == corrected


def test_words_of_random_symbols_fail_as_often_as_computed() -> None:
    """Binomial symbol errors drawn 200 000 times; failures compared within 4 standard deviations."""
    code, symbol_rate = OUTER_CODES["rs-204-188"], 0.03
    rng = np.random.default_rng(77)
    errors = rng.binomial(code.length, symbol_rate, 200_000)
    left = np.where(errors > code.corrected, errors, 0)
    bit_rate = 1.0 - (1.0 - symbol_rate) ** (1.0 / 8.0)
    share = float(output_bit_error_rate(code, np.asarray(bit_rate))) / bit_rate
    found = left / (code.length * symbol_rate)
    assert abs(found.mean() - share) < 4.0 * found.std() / np.sqrt(found.size)


def test_outer_code_spends_its_rate_on_parity() -> None:
    """At 6 dB the inner decision has 6 dB less 10 log10(204/188) dB; so do the bits that RS then corrects."""
    inner = bit_error_rate("qpsk", 6.0 + 10.0 * np.log10(188 / 204))
    expected = float(output_bit_error_rate(OUTER_CODES["rs-204-188"], np.asarray(inner)))
    assert bit_error_rate("qpsk+rs-204-188", 6.0) == pytest.approx(expected, rel=1e-12)
