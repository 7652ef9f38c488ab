"""What a limit sheet holds: one product's modes, procedure and limits, frozen, each number with its source."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from itertools import pairwise
from typing import Annotated, ClassVar, Literal

from pydantic import AfterValidator, BaseModel, ConfigDict, Field, ValidationInfo, field_validator

from linetest.errors import ParameterError
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

# Serials become file names, printed text and words to instruments, so a pattern may be built of these only: letters,
# digits, - and _; classes of them; counts; groups; alternatives. No pattern of these matches a path or markup.
_SERIAL_PATTERN = re.compile(
    r"(?:[A-Za-z0-9_-]|\[(?:[0-9]-[0-9]|[A-Z]-[A-Z]|[a-z]-[a-z]|[A-Za-z0-9_])+\]|\{[0-9]+(?:,[0-9]+)?\}|\(\?:|[()|?])+"
)


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


class SupplyLimits(Sourced):
    """How the unit is powered, and what it may draw.

    Attributes:
        voltage_v: Supply voltage, V.
        current_limit_a: Current limit set at the supply, A.
        min_current_a: Least current of a sound unit, A.
        max_current_a: Greatest, A.
        settle_s: Pause between switching on and reading, s.
    """

    voltage_v: Positive
    current_limit_a: Positive
    min_current_a: NotNegative
    max_current_a: Positive
    settle_s: NotNegative

    @field_validator("max_current_a")
    @classmethod
    def _between(cls, max_current_a: float, info: ValidationInfo) -> float:
        least_a = info.data.get("min_current_a", 0.0)
        most_a = info.data.get("current_limit_a", math.inf)
        if not least_a < max_current_a <= most_a:
            raise ValueError(f"must lie above min_current_a ({least_a:g}) and not above current_limit_a ({most_a:g})")
        return max_current_a


class CarrierLimits(Sourced):
    """What the unit's carrier may be, read with the noise off.

    Attributes:
        mode: Mode in which it is read.
        min_dbm: Least power, dBm.
        max_dbm: Greatest power, dBm.
        max_change_db: Greatest change between the readings before the first and after the last step, dB.
    """

    UNSOURCED = frozenset({"mode"})

    mode: str
    min_dbm: Number
    max_dbm: Number
    max_change_db: Positive

    @field_validator("max_dbm")
    @classmethod
    def _above(cls, max_dbm: float, info: ValidationInfo) -> float:
        least_dbm = info.data.get("min_dbm", -math.inf)
        if not max_dbm > least_dbm:
            raise ValueError(f"must lie above min_dbm ({least_dbm:g})")
        return max_dbm


class LockLimits(Sourced):
    """How long the receiver may take to lock.

    Attributes:
        timeout_s: Longest time, s.
    """

    timeout_s: Positive


class BerCheck(Sourced):
    """A check of the bit error rate at a list of Eb/N0 steps.

    Attributes:
        name: Its name in readings and judgements.
        mode: Mode of the unit.
        steps: Nominal Eb/N0 of each step, dB, ascending.
        setting_rule: Which calibrated attenuator setting serves a step.
        tolerance_db: How far the Eb/N0 really set may be from the nominal one, dB.
        margin_db: Implementation loss that a unit must not exceed, dB.
        design_loss_db: Implementation loss of a good unit, dB.
        producer_risk: Chance that a unit at the design loss is rejected, for the whole check.
        consumer_risk: Chance that a unit at the margin in some step is accepted.
        guard_rule: How the guard bands follow from the uncertainty of Eb/N0.
        max_u_db: Greatest standard uncertainty of Eb/N0 that the check carries, dB.
        max_bits: Most bits of a step.
        max_fixed_tests: Most bits of a step in units of the best fixed test of the same rates and risks.
        max_lost_fraction: Greatest share of a step's bits that may fall into lost alignment.
        stop_at_first_reject: Whether the check ends at its first rejecting step.
        time_budget_s: Longest mean counting time of a unit at the design loss, all steps together, s.
    """

    UNSOURCED = frozenset({"name", "mode"})

    name: Name
    mode: str
    steps: Annotated[tuple[Number, ...], Field(strict=False), NOT_EMPTY]
    setting_rule: Literal["nearest", "from-below", "from-above"]
    tolerance_db: Positive
    margin_db: Positive
    design_loss_db: NotNegative
    producer_risk: Risk
    consumer_risk: Risk
    guard_rule: Literal["least", "U", "0.83U", "none"]
    max_u_db: Positive
    max_bits: Annotated[int, Field(gt=0)]
    max_fixed_tests: Annotated[float, Field(ge=1, le=20, allow_inf_nan=False)]
    max_lost_fraction: Annotated[float, Field(ge=0, lt=1, allow_inf_nan=False)]
    stop_at_first_reject: bool
    time_budget_s: Positive

    @field_validator("steps")
    @classmethod
    def _ascending(cls, steps: tuple[float, ...]) -> tuple[float, ...]:
        if any(later <= sooner for sooner, later in pairwise(steps)):
            raise ValueError("must ascend, each step once")
        return steps

    @field_validator("design_loss_db")
    @classmethod
    def _below_margin(cls, design_loss_db: float, info: ValidationInfo) -> float:
        margin_db = info.data.get("margin_db", math.inf)
        if not design_loss_db < margin_db:
            raise ValueError(f"must be less than margin_db ({margin_db:g}): no plan tells equal losses apart")
        return design_loss_db

    @property
    def step_producer_risk(self) -> float:
        """Producer's risk of one step: the check's shared out evenly, so that the sum bounds the unit's."""
        return self.producer_risk / len(self.steps)


class Procedure(Strict):
    """The ordered checks of a unit.

    Attributes:
        supply: Power and current.
        carrier: The unit's carrier.
        lock: The receiver's lock.
        ber: Bit error rate checks, in their order.
    """

    supply: SupplyLimits
    carrier: CarrierLimits
    lock: LockLimits
    ber: Annotated[tuple[BerCheck, ...], Field(strict=False), NOT_EMPTY]


class LimitSheet(Sourced):
    """One product's limits.

    Attributes:
        model: The product.
        title: What it is, for people.
        revision: Revision of the sheet.
        serial_pattern: Regular expression that a whole serial must match.
        firmware: Firmware versions that may be shipped.
        modes: The product's modes.
        procedure: What is judged, in order.
        digest: SHA-256 of the file's bytes, in hexadecimal.
    """

    UNSOURCED = frozenset({"model", "title", "revision", "modes", "procedure", "digest"})

    model: Annotated[str, Field(pattern=r"^[A-Z0-9][A-Z0-9-]{0,31}$")]
    title: Annotated[str, Field(min_length=1, max_length=120)]
    revision: Annotated[str, Field(pattern=r"^[A-Za-z0-9][A-Za-z0-9._-]{0,15}$")]
    serial_pattern: str
    firmware: Annotated[tuple[Annotated[str, Field(min_length=1)], ...], Field(strict=False), NOT_EMPTY]
    modes: Annotated[tuple[Mode, ...], Field(alias="mode", strict=False), NOT_EMPTY]
    procedure: Procedure
    digest: Annotated[str, Field(pattern=r"^[0-9a-f]{64}$")]

    @field_validator("serial_pattern")
    @classmethod
    def _narrow(cls, serial_pattern: str) -> str:
        if not _SERIAL_PATTERN.fullmatch(serial_pattern):
            raise ValueError(
                "must be built of letters, digits, - and _, classes of them such as [0-9], counts such as {6}, groups "
                "and |: serials become file names and printed text"
            )
        try:
            compiled = re.compile(serial_pattern)
        except re.error as reason:
            raise ValueError(f"must be a regular expression: {reason}") from None
        if compiled.fullmatch(""):
            raise ValueError("must not match an empty serial")
        return serial_pattern

    def mode(self, name: str) -> Mode:
        """The mode of a name.

        Args:
            name: Its name.

        Returns:
            The mode.

        Raises:
            ParameterError: The sheet has no such mode.
        """
        for mode in self.modes:
            if mode.name == name:
                return mode
        raise ParameterError("name", name, f"be one of {', '.join(mode.name for mode in self.modes)}")

    def check(self, name: str) -> BerCheck:
        """The BER check of a name.

        Args:
            name: Its name.

        Returns:
            The check.

        Raises:
            ParameterError: The sheet has no such check.
        """
        for check in self.procedure.ber:
            if check.name == name:
                return check
        raise ParameterError("name", name, f"be one of {', '.join(check.name for check in self.procedure.ber)}")


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
