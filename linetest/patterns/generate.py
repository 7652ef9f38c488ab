"""Word-parallel generation of pseudo-random patterns on packed bytes, from any position.

A register's recursion s[i] = s[i-k] + s[i-n] holds for s[i] = s[i - k*2**j] + s[i - n*2**j] too, for every j,
because squaring a polynomial over GF(2) only doubles its exponents. With 2**j >= 64 all shifts are whole
64-bit words, so a block of k*2**(j-6) words is one exclusive-or of two earlier blocks.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
import numpy.typing as npt

from linetest.errors import ParameterError
from linetest.patterns.registers import Pattern, find_pattern

ByteArray = npt.NDArray[np.uint8]
_WordArray = npt.NDArray[np.uint64]

_WORD_BITS = 64
# Blocks of 32 KiB: two operands and the result stay in a core's second-level cache.
_MOST_BLOCK_WORDS = 4096
# Four shifts in a row spoil the end of what they look at: two bytes of bits to come and two of margin.
_LOOKAHEAD_BYTES = 4


def prbs_bytes(name: str, count: int, start: int = 0, *, inverted: bool | None = None) -> ByteArray:
    """Bytes of a pseudo-random pattern, eight bits each, first bit in the most significant place.

    Bit 0 is the first of the register's run of ONEs before any inversion (all stages ONE).

    Args:
        name: One of `PATTERNS`.
        count: Number of bytes, 0 or more.
        start: Position of the first bit in the pattern, in bits; any integer, also beyond one period.
        inverted: True or False to choose the polarity; None for the polarity that O.150 prescribes.

    Returns:
        The packed bytes, shape (count,).

    Raises:
        ParameterError: The name is unknown, or the count is negative or not a whole number.

    Source:
        ITU-T O.150 (05/96), clause 5 and table 1.
    """
    pattern = find_pattern(name)
    length = whole_number("count", count, "be a whole number of bytes, 0 or more")
    if length < 0:
        raise ParameterError("count", count, "be a whole number of bytes, 0 or more")
    output = _register_output(pattern, length, whole_number("start", start, "be a whole number of bits"))
    if pattern.inverted if inverted is None else inverted:
        np.invert(output, out=output)
    return output


def whole_number(parameter: str, given: object, rule: str) -> int:
    """An argument that must be a whole number.

    Args:
        parameter: The argument's name, for the error.
        given: What the caller passed.
        rule: The rule, as a clause that follows "must".

    Returns:
        The number.

    Raises:
        ParameterError: It is not a whole number.
    """
    if isinstance(given, bool) or not isinstance(given, int | np.integer):
        raise ParameterError(parameter, given, rule)
    return int(given)


def _register_output(pattern: Pattern, count: int, start: int) -> ByteArray:
    if not pattern.zero_suppressed:
        return _recursion(pattern, count, start)
    bare = _recursion(pattern, count + _LOOKAHEAD_BYTES, start)
    # O.150 clause 5.5 forces a ONE while stages 6 to 19 are all ZERO; they hold the 14 bits to come.
    next_2 = _later(bare, 1) | _later(bare, 2)
    next_4 = next_2 | _later(next_2, 2)
    next_8 = next_4 | _later(next_4, 4)
    next_14 = next_8 | _later(next_8, 6)
    return np.asarray((bare | ~next_14)[:count], dtype=np.uint8)


def _later(packed: ByteArray, bits: int) -> ByteArray:
    """The same bits seen from a position that is one to seven bits later; the last byte is not whole."""
    moved = packed << bits
    moved[:-1] |= packed[1:] >> (8 - bits)
    return np.asarray(moved, dtype=np.uint8)


def _recursion(pattern: Pattern, count: int, start: int) -> ByteArray:
    words = -(-count // 8)
    seed = _seed_words(pattern, start % pattern.period_bits)
    if words <= seed.size:
        return seed.view(np.uint8)[:count].copy()
    output = np.empty(words, dtype=np.uint64)
    output[: seed.size] = seed
    _leapfrog(output, seed.size, pattern)
    return output.view(np.uint8)[:count]


def _leapfrog(output: _WordArray, done: int, pattern: Pattern) -> None:
    far, near = pattern.stages, pattern.tap
    while done < output.size:
        while 2 * far <= done and 2 * near <= _MOST_BLOCK_WORDS:
            far, near = 2 * far, 2 * near
        block = min(near, output.size - done)
        np.bitwise_xor(
            output[done - far : done - far + block],
            output[done - near : done - near + block],
            out=output[done : done + block],
        )
        done += block


@lru_cache(maxsize=256)
def _seed_words(pattern: Pattern, start: int) -> _WordArray:
    """First stages x 64 bits from a position, as words whose bytes in memory are in the pattern's order."""
    bits, known = _bits_at(pattern, start), pattern.stages
    wanted = pattern.stages * _WORD_BITS
    far, near = pattern.stages, pattern.tap
    while known < wanted:
        while 2 * far <= known:
            far, near = 2 * far, 2 * near
        # Of the next bits, `near` are sums of bits that are known: those far back and those near back.
        block = min(near, wanted - known)
        mask = (1 << block) - 1
        new = (bits >> (far - block) if far >= block else 0) ^ (bits >> (near - block))
        bits = (bits << block) | (new & mask)
        known += block
    words = np.frombuffer(bits.to_bytes(wanted // 8, "big"), dtype=np.uint64)
    words.flags.writeable = False
    return words


def _bits_at(pattern: Pattern, start: int) -> int:
    """The register's next `stages` output bits at a position, the first as the most significant."""
    stages, tap = pattern.stages, pattern.tap
    chosen = _power_of_x(pattern, start)
    first = [1] * stages
    for i in range(stages, 2 * stages):
        first.append(first[i - tap] ^ first[i - stages])
    # s[start + i] is the sum of s[j + i] over the exponents j of x**start mod the register's polynomial.
    bits = 0
    for i in range(stages):
        bit = 0
        for j in range(stages):
            bit ^= (chosen >> j) & first[i + j]
        bits = (bits << 1) | bit
    return bits


def _power_of_x(pattern: Pattern, exponent: int) -> int:
    """x**exponent modulo x**n + x**(n-tap) + 1, bit j of the answer the coefficient of x**j."""
    stages = pattern.stages
    modulus = (1 << stages) | (1 << (stages - pattern.tap)) | 1
    power = 1
    for digit in f"{exponent:b}":
        # Squaring over GF(2) puts a zero between neighbouring coefficients: read the bits in base 4.
        squared = int(f"{power:b}", 4)
        power = _reduced(squared << (digit == "1"), modulus, stages)
    return power


def _reduced(value: int, modulus: int, stages: int) -> int:
    while (excess := value.bit_length() - stages - 1) >= 0:
        value ^= modulus << excess
    return value


class PatternStream:
    """A pattern in chunks of one size, each made from the one before in the same memory.

    Attributes:
        chunk: The current chunk; its bytes change with every `advance`.
    """

    def __init__(self, name: str, chunk_bytes: int, start: int = 0, *, inverted: bool | None = None) -> None:
        """Prepares the first chunk.

        Args:
            name: One of `PATTERNS`.
            chunk_bytes: Bytes of a chunk, a multiple of 8.
            start: Position of the first bit in the pattern, in bits.
            inverted: Polarity, as in `prbs_bytes`.

        Raises:
            ParameterError: The name is unknown, or the chunk is no multiple of 8 bytes.
        """
        pattern = find_pattern(name)
        if chunk_bytes <= 0 or chunk_bytes % 8:
            raise ParameterError("chunk_bytes", chunk_bytes, "be a multiple of 8 above 0")
        self._pattern, self._start = pattern, whole_number("start", start, "be a whole number of bits")
        self._inverted = pattern.inverted if inverted is None else inverted
        # A bytearray, because comparing one with an array is a plain memory comparison without a copy.
        self.chunk = bytearray(chunk_bytes)
        self._words = np.frombuffer(self.chunk, dtype=np.uint64)
        self._bytes = np.frombuffer(self.chunk, dtype=np.uint8)
        self._far, self._near = pattern.stages, pattern.tap
        while 2 * self._near <= _MOST_BLOCK_WORDS and 4 * self._far <= self._words.size:
            self._far, self._near = 2 * self._far, 2 * self._near
        self._jump()

    def advance(self) -> None:
        """Replaces the chunk by the next one."""
        self._start += 8 * len(self.chunk)
        if self._pattern.zero_suppressed or 2 * self._far > self._words.size:
            self._jump()
            return
        done = 0
        while done < self._far:
            block = min(self._near, self._far - done)
            far_back = self._words[done - self._far :][:block]
            near_back = self._words[done - self._near :][:block]
            self._sum(far_back, near_back, self._words[done : done + block])
            done += block
        while done < self._words.size:
            block = min(self._near, self._words.size - done)
            far_back = self._words[done - self._far : done - self._far + block]
            near_back = self._words[done - self._near : done - self._near + block]
            self._sum(far_back, near_back, self._words[done : done + block])
            done += block

    def _sum(self, one: _WordArray, other: _WordArray, out: _WordArray) -> None:
        np.bitwise_xor(one, other, out=out)
        if self._inverted:
            # The sum of two inverted bits is the bit that is not inverted.
            np.invert(out, out=out)

    def _jump(self) -> None:
        self._bytes[:] = prbs_bytes(self._pattern.name, len(self.chunk), self._start, inverted=self._inverted)
