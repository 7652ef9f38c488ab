"""Bit errors counted on packed bytes, chunk by chunk, so that memory stays flat."""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
import numpy.typing as npt

from linetest.errors import ParameterError
from linetest.patterns.generate import ByteArray, prbs_bytes
from linetest.patterns.registers import find_pattern

PackedBits: TypeAlias = bytes | bytearray | memoryview | ByteArray

# Two operands of this size stay in a core's second-level cache together with their difference.
_CHUNK_BYTES = 256 * 1024


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
        raise ParameterError(
            "reference", f"{expected.size} bytes", f"be as long as received: {data.size} bytes"
        )
    errors = 0
    for at in range(0, data.size, _CHUNK_BYTES):
        errors += _differing_bits(data[at : at + _CHUNK_BYTES], expected[at : at + _CHUNK_BYTES])
    return errors


def _against_pattern(data: ByteArray, name: str, start: int, inverted: bool | None) -> int:
    find_pattern(name)
    errors = 0
    for at in range(0, data.size, _CHUNK_BYTES):
        chunk = data[at : at + _CHUNK_BYTES]
        errors += _differing_bits(chunk, prbs_bytes(name, chunk.size, start + 8 * at, inverted=inverted))
    return errors


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
        raise ParameterError(
            parameter, f"{view.dtype} of shape {view.shape}", "be one row of packed bytes (uint8)"
        )
    return np.ascontiguousarray(view)
