"""Gray maps: bits to points of unit mean energy, and received points back to bits.

Bits of a symbol are taken first bit first. On the rails of QPSK and 16QAM a ZERO is positive.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
import numpy.typing as npt

from linetest.errors import ParameterError

BitArray = npt.NDArray[np.uint8]
ComplexArray = npt.NDArray[np.complex128]

MAPPED_SCHEMES = ("bpsk", "qpsk", "oqpsk", "8psk", "16qam")

# Reflected Gray code of two bits on a rail, from the most positive level down: 00, 01, 11, 10.
_RAIL_16 = {0b00: 3.0, 0b01: 1.0, 0b11: -1.0, 0b10: -3.0}


@dataclass(frozen=True)
class Constellation:
    """Points of one modulation.

    Attributes:
        bits_per_symbol: Bits that choose a point.
        points: Point of each bit pattern (first bit most significant), unit mean energy; shape (2**bits,).
    """

    bits_per_symbol: int
    points: ComplexArray


@cache
def constellation(scheme: str) -> Constellation:
    """Points of a scheme with its Gray map.

    Args:
        scheme: One of `MAPPED_SCHEMES`.

    Returns:
        The constellation. 8PSK has a point at phase 0, as the reflected Gray code counts up with the phase.

    Raises:
        ParameterError: The scheme has no map here.
    """
    if scheme not in MAPPED_SCHEMES:
        raise ParameterError("scheme", scheme, f"be one of {', '.join(MAPPED_SCHEMES)}")
    if scheme == "bpsk":
        return Constellation(1, np.array([1.0, -1.0], dtype=np.complex128))
    if scheme == "8psk":
        points = np.empty(8, dtype=np.complex128)
        for sector in range(8):
            points[sector ^ (sector >> 1)] = np.exp(1j * np.pi / 4 * sector)
        return Constellation(3, points)
    if scheme == "16qam":
        rails = [(_RAIL_16[pattern >> 2], _RAIL_16[pattern & 3]) for pattern in range(16)]
        return Constellation(4, np.array([complex(i, q) for i, q in rails]) / np.sqrt(10.0))
    rails_4 = [(1.0 - 2.0 * (pattern >> 1), 1.0 - 2.0 * (pattern & 1)) for pattern in range(4)]
    return Constellation(2, np.array([complex(i, q) for i, q in rails_4]) / np.sqrt(2.0))


def map_bits(scheme: str, bits: BitArray) -> ComplexArray:
    """Symbols of bits.

    Args:
        scheme: One of `MAPPED_SCHEMES`.
        bits: Bits, 0 or 1, whole symbols; shape (n * bits per symbol,).

    Returns:
        Points of unit mean energy, shape (n,).

    Raises:
        ParameterError: The scheme has no map, or the bits do not fill whole symbols.
    """
    found = constellation(scheme)
    if bits.ndim != 1 or bits.size % found.bits_per_symbol:
        rule = f"be one row of whole symbols of {found.bits_per_symbol} bits"
        raise ParameterError("bits", f"an array of shape {bits.shape}", rule)
    patterns = np.zeros(bits.size // found.bits_per_symbol, dtype=np.intp)
    for place in range(found.bits_per_symbol):
        patterns = patterns << 1 | bits[place :: found.bits_per_symbol]
    return found.points[patterns]


def decide_bits(scheme: str, received: ComplexArray) -> BitArray:
    """Bits of the nearest points.

    Args:
        scheme: One of `MAPPED_SCHEMES`.
        received: Received points, scaled to unit mean energy without noise; shape (n,).

    Returns:
        Decided bits, shape (n * bits per symbol,).

    Raises:
        ParameterError: The scheme has no map.
    """
    per_symbol = constellation(scheme).bits_per_symbol
    if scheme == "8psk":
        columns = _octal_bits(received)
    elif scheme == "16qam":
        edge = 2.0 / np.sqrt(10.0)
        i, q = received.real, received.imag
        columns = [i < 0.0, np.abs(i) < edge, q < 0.0, np.abs(q) < edge]
    else:
        columns = [received.real < 0.0, received.imag < 0.0][:per_symbol]
    return np.stack(columns, axis=1).reshape(-1).astype(np.uint8)


def octal_axes() -> ComplexArray:
    """Normals of the four lines through the origin that part the eight sectors.

    The first bit is the side of the first line, the second bit that of the second, at a right angle to it;
    the third bit tells whether the sides of the third and fourth line, again at right angles, differ.

    Returns:
        Unit normals as complex numbers, pointing to the side of a ZERO; shape (4,).
    """
    return np.asarray(np.exp(1j * np.pi / 8 * np.array([3.0, -1.0, 1.0, -3.0])), dtype=np.complex128)


def _octal_bits(received: ComplexArray) -> list[npt.NDArray[np.bool_]]:
    first, second, third, fourth = ((received * np.conj(axis)).real < 0.0 for axis in octal_axes())
    return [first, second, third ^ fourth]
