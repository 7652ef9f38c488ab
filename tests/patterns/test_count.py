"""Errors counted on packed bytes against a plain count on single bits."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from linetest.errors import ParameterError
from linetest.patterns import PATTERNS, count_errors, prbs_bytes


@given(left=st.binary(max_size=400), seed=st.integers(0, 2**32 - 1))
@settings(max_examples=150, deadline=None)
def test_count_is_the_number_of_differing_bits(left: bytes, seed: int) -> None:
    right = np.random.default_rng(seed).bytes(len(left))
    expected = (int.from_bytes(left) ^ int.from_bytes(right)).bit_count()
    assert count_errors(left, right) == expected


@pytest.mark.parametrize("size", [1_000_003, 3 * 262_144, 262_143])
def test_every_bit_wrong_is_counted_across_chunks(size: int) -> None:
    ones = np.full(size, 0xFF, dtype=np.uint8)
    assert count_errors(ones, np.zeros_like(ones)) == 8 * size


@given(
    name=st.sampled_from(sorted(PATTERNS)),
    start=st.integers(0, 10**10),
    positions=st.sets(st.integers(0, 8 * 600_000 - 1), max_size=50),
)
@settings(max_examples=40, deadline=None)
def test_planted_errors_are_counted_against_a_pattern(name: str, start: int, positions: set[int]) -> None:
    received = prbs_bytes(name, 600_000, start)
    for position in positions:
        received[position // 8] ^= 0x80 >> position % 8
    assert count_errors(received, name, start) == len(positions)


def test_opposite_polarity_has_every_bit_wrong() -> None:
    received = prbs_bytes("prbs15", 1000)
    assert count_errors(received, "prbs15", inverted=False) == 8000
    assert count_errors(received, "prbs15", inverted=True) == 0


@pytest.mark.parametrize("offset", range(8))
def test_memory_that_is_not_aligned_counts_the_same(offset: int) -> None:
    store = bytearray(offset) + bytearray(prbs_bytes("prbs23", 5000).tobytes())
    store[offset + 4321] ^= 0x81
    assert count_errors(memoryview(store)[offset:], "prbs23") == 2


def test_nothing_received_has_no_errors() -> None:
    assert count_errors(b"", b"") == 0
    assert count_errors(b"", "prbs9") == 0


def test_wrong_arguments_are_named() -> None:
    with pytest.raises(ParameterError, match=r"reference is '2 bytes', but must be as long as received: 3 bytes"):
        count_errors(b"abc", b"ab")
    with pytest.raises(ParameterError, match=r"name is 'prbs8', but must be one of"):
        count_errors(b"abc", "prbs8")
    with pytest.raises(ParameterError, match=r"name is 'prbs8', but must be one of"):
        count_errors(b"", "prbs8")
    with pytest.raises(ParameterError, match=r"received is .*float64.*, but must be one row of packed bytes"):
        count_errors(np.zeros(3), "prbs9")  # type: ignore[arg-type]  # the wrong type is the point
    with pytest.raises(ParameterError, match=r"received is 'list', but must be packed bytes"):
        count_errors([1, 2], "prbs9")  # type: ignore[arg-type]  # the wrong type is the point


@pytest.mark.parametrize("per_chunk", [0.0, 0.3, 1.0, 20.0])
def test_density_of_errors_does_not_change_the_count(per_chunk: float) -> None:
    """Looking first for any difference, or not, is a matter of speed only."""
    size = 60 * 65_536 + 1001
    rng = np.random.default_rng(5)
    positions = rng.choice(8 * size, int(60 * per_chunk), replace=False)
    received = prbs_bytes("prbs31", size)
    np.bitwise_xor.at(received, positions // 8, (0x80 >> positions % 8).astype(np.uint8))
    assert count_errors(received, "prbs31") == positions.size
    assert count_errors(received, prbs_bytes("prbs31", size)) == positions.size
