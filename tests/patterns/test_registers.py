"""Facts of the patterns against the standard's table."""

from __future__ import annotations

import pytest

from linetest.errors import ParameterError
from linetest.patterns import PATTERNS
from linetest.patterns.registers import find_pattern

# ITU-T O.150 (05/96), clause 5 and table 1: stages, second stage fed back, period, output inverted.
O150 = {
    "prbs9": (9, 5, 511, False),
    "prbs11": (11, 9, 2047, False),
    "prbs15": (15, 14, 32767, True),
    "prbs20": (20, 3, 1048575, False),
    "prbs20-qrss": (20, 17, 1048575, False),
    "prbs23": (23, 18, 8388607, True),
    "prbs29": (29, 27, 536870911, True),
    "prbs31": (31, 28, 2147483647, True),
}


@pytest.mark.parametrize("name", O150)
def test_registers_are_those_of_the_table(name: str) -> None:
    found = PATTERNS[name]
    assert (found.stages, found.tap, found.period_bits, found.inverted) == O150[name]
    assert found.zero_suppressed == (name == "prbs20-qrss")
    assert "O.150" in found.source


def test_every_register_runs_through_all_its_states() -> None:
    """The order of x modulo the register's polynomial is 2^n - 1: tried at every largest proper divisor."""
    for pattern in PATTERNS.values():
        modulus = 1 << pattern.stages | 1 << (pattern.stages - pattern.tap) | 1
        assert power_of_x(pattern.period_bits, modulus) == 1
        for factor in prime_factors(pattern.period_bits):
            assert power_of_x(pattern.period_bits // factor, modulus) != 1


def prime_factors(number: int) -> set[int]:
    found, factor = set(), 2
    while factor * factor <= number:
        while number % factor == 0:
            found.add(factor)
            number //= factor
        factor += 1
    return found | {number} - {1}


def power_of_x(exponent: int, modulus: int) -> int:
    result = 1
    for digit in f"{exponent:b}":
        result = remainder(product(result, result), modulus)
        if digit == "1":
            result = remainder(result << 1, modulus)
    return result


def product(one: int, other: int) -> int:
    total = 0
    while other:
        total ^= one * (other & 1)
        one, other = one << 1, other >> 1
    return total


def remainder(value: int, modulus: int) -> int:
    while value.bit_length() >= modulus.bit_length():
        value ^= modulus << (value.bit_length() - modulus.bit_length())
    return value


def test_unknown_names_are_refused_with_those_that_exist() -> None:
    with pytest.raises(ParameterError, match=r"name is 'PRBS9', but must be one of prbs7, prbs9, .*prbs31"):
        find_pattern("PRBS9")
