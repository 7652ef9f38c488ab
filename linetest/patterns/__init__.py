"""Test patterns of ITU-T O.150 on packed bytes, and bit errors counted against them.

The map: `registers` holds each pattern's facts, `generate` makes its bytes from any position, `count`
compares received bytes with them. Bits are packed eight to a byte, the first in the most significant place.
"""

from linetest.patterns.count import PackedBits, count_errors
from linetest.patterns.generate import ByteArray, PatternStream, prbs_bytes
from linetest.patterns.registers import PATTERNS, Pattern

__all__ = ["PATTERNS", "ByteArray", "PackedBits", "Pattern", "PatternStream", "count_errors", "prbs_bytes"]
