"""What a limit sheet holds: one product's modes, procedure and limits, frozen, each number with its source."""

from __future__ import annotations

import math
import re
from itertools import pairwise
from typing import Annotated, Literal

from pydantic import Field, ValidationInfo, field_validator

from linetest.errors import ParameterError
from linetest.limits.tables import NOT_EMPTY, Mode, Name, NotNegative, Number, Positive, Risk, Sourced, Strict

# Serials become file names, printed text and words to instruments, so a pattern may be built of these only: letters,
# digits, - and _; classes of them; counts; groups; alternatives. No pattern of these matches a path or markup.
_SERIAL_PATTERN = re.compile(
    r"(?:[A-Za-z0-9_-]|\[(?:[0-9]-[0-9]|[A-Z]-[A-Z]|[a-z]-[a-z]|[A-Za-z0-9_])+\]|\{[0-9]+(?:,[0-9]+)?\}|\(\?:|[()|?])+"
)


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
