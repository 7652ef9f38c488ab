"""The pseudo-random test patterns of ITU-T O.150, as facts about their shift registers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

from linetest.errors import ParameterError


@dataclass(frozen=True, slots=True)
class Pattern:
    """One pseudo-random pattern.

    The register has `stages` stages, all ONE at the start; the outputs of stages `tap` and `stages` are
    added modulo 2 into the first stage; the last stage is the output. Bit i of the uninverted pattern
    therefore is bit i - tap plus bit i - stages.

    Attributes:
        name: Name of the pattern, such as ``prbs15``.
        stages: Stages n of the register; the period is 2**n - 1 bits.
        tap: Stage fed back beside the last one.
        inverted: True where O.150 inverts the output.
        zero_suppressed: True where the output is forced to ONE while the next 14 bits are all ZERO.
        source: Where the pattern is defined.
    """

    name: str
    stages: int
    tap: int
    inverted: bool
    source: str
    zero_suppressed: bool = False

    @property
    def period_bits(self) -> int:
        """Length of the pattern's period in bits: 2**stages - 1."""
        return (1 << self.stages) - 1


_O150 = "ITU-T O.150 (05/96)"

_ALL = (
    Pattern("prbs7", 7, 6, inverted=False, source="x^7 + x^6 + 1, common practice; not in O.150"),
    Pattern("prbs9", 9, 5, inverted=False, source=f"{_O150}, clause 5.1"),
    Pattern("prbs11", 11, 9, inverted=False, source=f"{_O150}, clause 5.2"),
    Pattern("prbs15", 15, 14, inverted=True, source=f"{_O150}, clause 5.3"),
    Pattern("prbs20", 20, 3, inverted=False, source=f"{_O150}, clause 5.4; ITU-T O.153"),
    Pattern(
        "prbs20-qrss",
        20,
        17,
        inverted=False,
        source=f"{_O150}, clause 5.5; ITU-T O.151",
        zero_suppressed=True,
    ),
    Pattern("prbs23", 23, 18, inverted=True, source=f"{_O150}, clause 5.6"),
    Pattern("prbs29", 29, 27, inverted=True, source=f"{_O150}, clause 5.7"),
    Pattern("prbs31", 31, 28, inverted=True, source=f"{_O150}, clause 5.8"),
)

PATTERNS: Mapping[str, Pattern] = MappingProxyType({pattern.name: pattern for pattern in _ALL})


def find_pattern(name: str) -> Pattern:
    """Pattern of a name.

    Args:
        name: One of `PATTERNS`.

    Returns:
        Its facts.

    Raises:
        ParameterError: The name is unknown.
    """
    if name not in PATTERNS:
        raise ParameterError("name", name, f"be one of {', '.join(PATTERNS)}")
    return PATTERNS[name]
