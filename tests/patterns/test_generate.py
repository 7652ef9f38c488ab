"""Pattern bytes against published bytes, the bit-serial register and a general-purpose library."""

from __future__ import annotations

import hashlib

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.signal import max_len_seq

from linetest.errors import ParameterError
from linetest.patterns import PATTERNS, ByteArray, Pattern, PatternStream, prbs_bytes

# First bytes, most significant bit first, register all ONE, inverted where O.150 asks for it.
PUBLISHED = {
    # Test-pattern tables of ITU-T O.153 (511-bit pattern); ETSI TS 102 361-1 starts with the same 12 bytes.
    "prbs9": "FF 83 DF 17 32 09 4E D1 E7 CD 8A 91 C6 D5 C4 C4 40 21 18 4E 55 86 F4 DC 8A 15 A7 EC 92 DF 93 53"
    " 30 18 CA 34 BF A2 C7 59 67 8F BA 0D 6D D8 2D 7D 54 0A 57 97 70 39 D2 7A EA 24 33 85 ED 9A 1D E1",
    # Worked by hand from the register definitions of ITU-T O.150 (05/96) and, for 2^7-1, common practice.
    "prbs7": "FE 04 18 51 E4 59 D4 FA",
    "prbs15": "00 01 FF FB FF E7 FF AF",
    "prbs23": "00 00 01 FF FF 83 FF E0",
}

# ITU-T O.150 (05/96) table 1: stages, second stage fed back, longest run of ZEROs at the output.
O150_TABLE = {
    "prbs9": (9, 5, 8),
    "prbs11": (11, 9, 10),
    "prbs15": (15, 14, 15),
    "prbs20": (20, 3, 19),
    "prbs20-qrss": (20, 17, 14),
    "prbs23": (23, 18, 23),
    "prbs29": (29, 27, 29),
    "prbs31": (31, 28, 31),
}

every_pattern = pytest.mark.parametrize("pattern", PATTERNS.values(), ids=list(PATTERNS))


def serial_bits(pattern: Pattern, count: int) -> ByteArray:
    """The register as the standard draws it: all ONE at first, last stage out, no inversion."""
    stages = [1] * pattern.stages
    out = []
    for _ in range(count):
        forced = pattern.zero_suppressed and not any(stages[5:19])
        out.append(1 if forced else stages[-1])
        stages = [stages[pattern.tap - 1] ^ stages[-1], *stages[:-1]]
    return np.array(out, dtype=np.uint8)


def longest_zero_run(bits: ByteArray) -> int:
    ones = np.flatnonzero(np.concatenate([bits, bits]))
    return int(np.diff(ones).max()) - 1


@pytest.mark.parametrize("name", PUBLISHED)
def test_bytes_are_the_published_ones(name: str) -> None:
    expected = bytes.fromhex(PUBLISHED[name])
    assert prbs_bytes(name, len(expected)).tobytes() == expected


def test_known_polarity_starts_with_as_many_zeros_as_stages() -> None:
    for name in ("prbs15", "prbs23", "prbs29", "prbs31"):
        bits = np.unpackbits(prbs_bytes(name, 5))
        assert not bits[: O150_TABLE[name][0]].any()
        assert bits[O150_TABLE[name][0]] == 1


@pytest.mark.parametrize("name", [name for name, (stages, _, _) in O150_TABLE.items() if stages <= 23])
def test_period_ones_and_longest_run_of_zeros(name: str) -> None:
    """A maximal sequence has 2^(n-1) ONEs in a period; the zero-suppressed one has 31 more (O.150, 5.5)."""
    pattern = PATTERNS[name]
    period = pattern.period_bits
    bits = np.unpackbits(prbs_bytes(name, -(-2 * period // 8)))[: 2 * period]
    assert (bits[:period] == bits[period:]).all()
    ones = 2 ** (pattern.stages - 1)
    expected = {"prbs20-qrss": 524319}.get(name, ones - 1 if pattern.inverted else ones)
    assert int(bits[:period].sum()) == expected
    assert longest_zero_run(bits[:period]) == O150_TABLE[name][2]


@every_pattern
def test_equals_the_register_shifted_bit_by_bit(pattern: Pattern) -> None:
    count = 1500
    serial = np.packbits(serial_bits(pattern, 8 * count))
    assert prbs_bytes(pattern.name, count, inverted=False).tobytes() == serial.tobytes()
    assert prbs_bytes(pattern.name, count, inverted=True).tobytes() == (~serial).tobytes()


@pytest.mark.parametrize("name", ["prbs7", "prbs9", "prbs15", "prbs23"])
def test_equals_a_general_library_read_backwards(name: str) -> None:
    """The library's default taps are of the reciprocal polynomial: its sequence is ours reversed in time."""
    pattern = PATTERNS[name]
    theirs, _ = max_len_seq(pattern.stages)
    ours = np.unpackbits(prbs_bytes(name, -(-pattern.period_bits // 8), inverted=False))[: pattern.period_bits]
    backwards = theirs[::-1].astype(np.uint8)
    # Both start anywhere in the cycle: line them up at the only run of `stages` ONEs.
    doubled = np.concatenate([backwards, backwards])
    runs = np.flatnonzero(np.convolve(doubled, np.ones(pattern.stages), "valid") == pattern.stages)
    lined_up = doubled[runs[0] : runs[0] + pattern.period_bits]
    assert (lined_up == ours).all()


@given(
    name=st.sampled_from(sorted(PATTERNS)),
    start=st.integers(0, 4000),
    count=st.integers(0, 700),
)
@settings(max_examples=150, deadline=None)
def test_any_position_is_a_piece_of_the_whole(name: str, start: int, count: int) -> None:
    whole = np.unpackbits(prbs_bytes(name, 1200))
    wanted = whole[start : start + 8 * count]
    got = np.unpackbits(prbs_bytes(name, count, start))[: wanted.size]
    assert (got == wanted).all()


@given(name=st.sampled_from(sorted(PATTERNS)), start=st.integers(-(10**13), 10**13), turns=st.integers(-3, 3))
@settings(max_examples=100, deadline=None)
def test_position_counts_modulo_the_period(name: str, start: int, turns: int) -> None:
    there = prbs_bytes(name, 40, start + turns * PATTERNS[name].period_bits)
    assert there.tobytes() == prbs_bytes(name, 40, start).tobytes()


@every_pattern
def test_far_jump_obeys_the_recursion(pattern: Pattern) -> None:
    """After 10^12 bits every bit is still the sum of the two that the register feeds back."""
    if pattern.zero_suppressed:
        start = 10**12 % pattern.period_bits
        expected = np.unpackbits(prbs_bytes(pattern.name, start // 8 + 40))[start : start + 160]
        assert (np.unpackbits(prbs_bytes(pattern.name, 20, 10**12)) == expected).all()
        return
    bits = np.unpackbits(prbs_bytes(pattern.name, 100, 10**12, inverted=False))
    n, k = pattern.stages, pattern.tap
    assert (bits[n:] == bits[n - k : -k] ^ bits[:-n]).all()
    assert bits.any()


def test_large_request_equals_joined_small_ones() -> None:
    """The block that one exclusive-or makes grows with the request: its size must not show."""
    whole = hashlib.sha256(prbs_bytes("prbs31", 600_000, 77).tobytes()).hexdigest()
    pieces = hashlib.sha256()
    for at in range(0, 600_000, 1999):
        pieces.update(prbs_bytes("prbs31", min(1999, 600_000 - at), 77 + 8 * at).tobytes())
    assert pieces.hexdigest() == whole


def test_answers_do_not_share_memory() -> None:
    first = prbs_bytes("prbs9", 16)
    first[:] = 0
    assert prbs_bytes("prbs9", 4).tobytes() == bytes.fromhex("FF 83 DF 17")


@pytest.mark.parametrize(
    ("name", "count", "start", "sentence"),
    [
        ("prbs8", 1, 0, r"name is 'prbs8', but must be one of prbs7, prbs9"),
        ("prbs9", -1, 0, r"count is -1, but must be a whole number of bytes, 0 or more"),
        ("prbs9", 1.5, 0, r"count is 1.5, but must be a whole number of bytes"),
        ("prbs9", True, 0, r"count is True, but must be a whole number of bytes"),
        ("prbs9", 1, 0.5, r"start is 0.5, but must be a whole number of bits"),
    ],
)
def test_wrong_arguments_are_named(name: str, count: int, start: int, sentence: str) -> None:
    with pytest.raises(ParameterError, match=sentence):
        prbs_bytes(name, count, start)


@given(
    name=st.sampled_from(sorted(PATTERNS)),
    start=st.integers(0, 10**9),
    words=st.integers(1, 3000),
    inverted=st.sampled_from([None, False, True]),
)
@settings(max_examples=60, deadline=None)
def test_chunks_follow_one_another(name: str, start: int, words: int, inverted: bool | None) -> None:
    """Chunks made from the one before equal one long answer, whatever the chunk's size."""
    stream = PatternStream(name, 8 * words, start, inverted=inverted)
    whole = prbs_bytes(name, 4 * 8 * words, start, inverted=inverted).tobytes()
    for turn in range(4):
        assert bytes(stream.chunk) == whole[turn * 8 * words : (turn + 1) * 8 * words]
        stream.advance()


def test_a_chunk_of_odd_size_is_refused() -> None:
    with pytest.raises(ParameterError, match=r"chunk_bytes is 12, but must be a multiple of 8 above 0"):
        PatternStream("prbs9", 12)
