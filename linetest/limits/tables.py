"""What every table of a limit sheet has in common, and the mode: one way a unit works."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Annotated, ClassVar

from pydantic import AfterValidator, BaseModel, ConfigDict, Field, ValidationInfo, field_validator

from linetest.patterns import PATTERNS
from linetest.theory import SCHEMES, scheme_rates
from linetest.units import esn0_db

Number = Annotated[float, Field(allow_inf_nan=False)]
Positive = Annotated[float, Field(gt=0, allow_inf_nan=False)]
NotNegative = Annotated[float, Field(ge=0, allow_inf_nan=False)]
Risk = Annotated[float, Field(gt=0, lt=0.5, allow_inf_nan=False)]
Name = Annotated[str, Field(pattern=r"^[A-Za-z0-9][A-Za-z0-9 ._/-]{0,39}$")]
BurstWeights = tuple[tuple[int, float], ...]

# Rates may be rounded to the bit, not to the percent.
ESN0_AGREEMENT_DB = 0.001


def _not_empty(entries: tuple[object, ...]) -> tuple[object, ...]:
    if not entries:
        raise ValueError("must have at least one entry")
    return entries


# Not a length on the field: that would call a list empty whose only entry is wrong.
NOT_EMPTY = AfterValidator(_not_empty)


class Strict(BaseModel):
    """Base of every table: frozen, no unknown keys, no silent conversion."""

    model_config = ConfigDict(frozen=True, extra="forbid", strict=True)


class Sourced(Strict):
    """A table whose numbers each have a source.

    Attributes:
        source: Where each number comes from, by key.
    """

    # Keys that name something instead of limiting it need no source.
    UNSOURCED: ClassVar[frozenset[str]] = frozenset()

    # Validated although it has a default, so that a missing table names every missing source.
    source: Annotated[dict[str, str], Field(default_factory=dict, validate_default=True)]

    @field_validator("source")
    @classmethod
    def _complete(cls, source: dict[str, str]) -> dict[str, str]:
        wanted = [key for key in cls.model_fields if key != "source" and key not in cls.UNSOURCED]
        missing = [key for key in wanted if not source.get(key, "").strip()]
        unknown = [key for key in source if key not in wanted]
        if missing:
            raise ValueError(f"must say where {', '.join(missing)} comes from")
        if unknown:
            raise ValueError(f"must name keys of its own table only, not {', '.join(unknown)}")
        return source


class Mode(Sourced):
    """One way the unit works.

    Attributes:
        name: Its name, as the unit's port knows it.
        scheme: Modulation and coding, a scheme of the theory.
        bit_rate_bps: Information bit rate: bits that the error counter counts, per second.
        symbol_rate_bd: Symbols on air per second.
        pattern: Test pattern.
        burst_weights: How errors come: (bit errors of one event, share of the events), shares summing to 1.
    """

    UNSOURCED = frozenset({"name"})

    name: Name
    scheme: str
    bit_rate_bps: Positive
    symbol_rate_bd: Positive
    pattern: str
    burst_weights: Annotated[tuple[Annotated[tuple[int, float], Field(strict=False)], ...], Field(strict=False)]

    @field_validator("scheme")
    @classmethod
    def _known_scheme(cls, scheme: str) -> str:
        if scheme not in SCHEMES:
            raise ValueError(f"must be one of {', '.join(SCHEMES)}")
        return scheme

    @field_validator("pattern")
    @classmethod
    def _known_pattern(cls, pattern: str) -> str:
        if pattern not in PATTERNS:
            raise ValueError(f"must be one of {', '.join(PATTERNS)}")
        return pattern

    @field_validator("symbol_rate_bd")
    @classmethod
    def _agrees(cls, symbol_rate_bd: float, info: ValidationInfo) -> float:
        scheme, bit_rate_bps = info.data.get("scheme"), info.data.get("bit_rate_bps")
        if scheme is None or bit_rate_bps is None:
            return symbol_rate_bd
        error_db = esn0_db(0.0, bit_rate_bps, symbol_rate_bd) - scheme_rates(scheme).esn0_db(0.0)
        if abs(error_db) > ESN0_AGREEMENT_DB:
            raise ValueError(
                f"must carry {bit_rate_bps:g} bit/s with {scheme}: Es/N0 - Eb/N0 is {error_db:+.3f} dB off what "
                f"modulation and coding give, more than {ESN0_AGREEMENT_DB:g} dB"
            )
        return symbol_rate_bd

    @field_validator("burst_weights")
    @classmethod
    def _distribution(cls, weights: BurstWeights, info: ValidationInfo) -> BurstWeights:
        sizes = [size for size, _ in weights]
        if not weights or any(size < 1 for size in sizes) or sizes != sorted(set(sizes)):
            raise ValueError("must list bit errors per event from 1 up, ascending, each once")
        if any(not share > 0.0 for _, share in weights):
            raise ValueError("must give every listed burst size a share above 0")
        total = math.fsum(share for _, share in weights)
        if abs(total - 1.0) > 1e-9:
            raise ValueError(f"must have shares that sum to 1; they sum to {total:.9g}")
        scheme = info.data.get("scheme", "")
        if sizes == [1] and (scheme.startswith("de-") or "+" in scheme):
            raise ValueError(f"must say how errors come in groups: {scheme} never makes single errors only")
        return weights

    @property
    def dispersion(self) -> float:
        """Variance over mean of the bit error count: second over first moment of the burst sizes."""
        first = math.fsum(size * share for size, share in self.burst_weights)
        return math.fsum(size * size * share for size, share in self.burst_weights) / first


def named(entries: object, index: int) -> str:
    """How a fault calls an entry of a list: its name where it has one, else its number from 1, as people count.

    Args:
        entries: The list as it stands in the file.
        index: Number of the entry from 0.

    Returns:
        Text to put into square brackets.
    """
    entry = entries[index] if isinstance(entries, list) and index < len(entries) else None
    name = entry.get("name") if isinstance(entry, Mapping) else None
    return name if isinstance(name, str) else str(index + 1)
