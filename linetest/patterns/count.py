"""Bit errors counted on packed bytes, chunk by chunk, so that memory stays flat."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TypeAlias

import numpy as np
import numpy.typing as npt

from linetest.errors import ParameterError
from linetest.patterns.generate import ByteArray, PatternStream

PackedBits: TypeAlias = bytes | bytearray | memoryview | ByteArray

# Two operands of this size stay in a core's second-level cache together with their difference.
_CHUNK_BYTES = 64 * 1024


def count_errors(
    received: PackedBits, reference: PackedBits | str, start: int = 0, *, inverted: bool | None = None
) -> int:
    """Number of bits in which received bytes differ from a reference.

    Args:
        received: Packed bits, first bit in the most significant place.
        reference: As many packed bits, or the name of a pattern (one of `PATTERNS`).
        start: With a pattern's name: the position in bits of the first received bit in the pattern.
        inverted: With a pattern's name: polarity, as in `prbs_bytes`.

    Returns:
        Number of differing bits.

    Raises:
        ParameterError: An argument is not packed bytes, the lengths differ, or the pattern is unknown.
    """
    data = packed_view("received", received)
    if isinstance(reference, str):
        return _against_pattern(data, reference, start, inverted)
    expected = packed_view("reference", reference)
    if expected.size != data.size:
        raise ParameterError("reference", f"{expected.size} bytes", f"be as long as received: {data.size} bytes")
    return _CompareFirst().count(data, _stored_chunks(expected))


def _against_pattern(data: ByteArray, name: str, start: int, inverted: bool | None) -> int:
    stream = PatternStream(name, _CHUNK_BYTES, start, inverted=inverted)
    return _CompareFirst().count(data, _streamed_chunks(stream))


def _stored_chunks(expected: ByteArray) -> Iterator[bytearray]:
    chunk = bytearray(_CHUNK_BYTES)
    view = np.frombuffer(chunk, dtype=np.uint8)
    for at in range(0, expected.size, _CHUNK_BYTES):
        piece = expected[at : at + _CHUNK_BYTES]
        view[: piece.size] = piece
        yield chunk


def _streamed_chunks(stream: PatternStream) -> Iterator[bytearray]:
    while True:
        yield stream.chunk
        stream.advance()


class _CompareFirst:
    """Counts chunk by chunk, looking first whether a chunk has any error while that pays.

    Comparing two chunks is a third of the work of counting their differences; where most chunks have errors
    it is work for nothing, so after some disappointments the next chunks are counted straight away.
    """

    _PATIENCE = 4
    _STRAIGHT_COUNTS = 32

    def __init__(self) -> None:
        self._patience = self._PATIENCE
        self._straight = 0

    def count(self, data: ByteArray, references: Iterator[bytearray]) -> int:
        """Differing bits of all chunks.

        Args:
            data: Received bytes.
            references: Reference chunks of `_CHUNK_BYTES`, the last one perhaps longer than what is left.

        Returns:
            Number of differing bits.
        """
        errors = 0
        for at in range(0, data.size, _CHUNK_BYTES):
            piece = data[at : at + _CHUNK_BYTES]
            reference = next(references)
            if not self._equal(piece, reference):
                errors += _differing_bits(piece, np.frombuffer(reference, dtype=np.uint8)[: piece.size])
        return errors

    def _equal(self, piece: ByteArray, reference: bytearray) -> bool:
        if self._straight > 0:
            self._straight -= 1
            return False
        if piece.size == _CHUNK_BYTES and reference == piece.data:
            self._patience = min(self._patience + 1, self._PATIENCE)
            return True
        self._patience -= 1
        if self._patience <= 0:
            self._patience, self._straight = 1, self._STRAIGHT_COUNTS
        return False


def _differing_bits(left: ByteArray, right: ByteArray) -> int:
    whole = left.size // 8 * 8
    difference = np.bitwise_xor(left[:whole].view(np.uint64), right[:whole].view(np.uint64))
    ones = np.bitwise_count(difference)
    # Three counts of at most 64 fit a byte: adding them first leaves a third of the slow widening sum.
    third = ones.size // 3
    lanes = ones[:third]
    lanes += ones[third : 2 * third]
    lanes += ones[2 * third : 3 * third]
    rest = int(ones[3 * third :].sum(dtype=np.int64))
    tail = int(np.bitwise_count(left[whole:] ^ right[whole:]).sum(dtype=np.int64))
    return int(lanes.sum(dtype=np.int64)) + rest + tail


def packed_view(parameter: str, packed: PackedBits) -> ByteArray:
    """Packed bits as an array of bytes, without a copy where they lie together in memory.

    Args:
        parameter: The argument's name, for the error.
        packed: Packed bits.

    Returns:
        The bytes, shape (n,).

    Raises:
        ParameterError: The argument is not made of bytes.
    """
    if isinstance(packed, np.ndarray):
        view: npt.NDArray[np.uint8] = packed
    elif isinstance(packed, bytes | bytearray | memoryview):
        view = np.frombuffer(packed, dtype=np.uint8)
    else:
        raise ParameterError(parameter, type(packed).__name__, "be packed bytes")
    if view.dtype != np.uint8 or view.ndim != 1:
        raise ParameterError(parameter, f"{view.dtype} of shape {view.shape}", "be one row of packed bytes (uint8)")
    return np.ascontiguousarray(view)
