"""What a run says while it goes: frozen events, in the order they happen.

The sequencer yields them; records and screen are two listeners. The records listen first, so that nothing is
shown that is not already kept.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from enum import StrEnum
from typing import Any


class Judgement(StrEnum):
    """What a check concluded."""

    ACCEPT = "ACCEPT"
    REJECT = "REJECT"
    UNDECIDED = "UNDECIDED"


class Disposition(StrEnum):
    """What happens to the unit after its run."""

    PASS = "PASS"  # noqa: S105  (a disposition, not a password)
    FAIL = "FAIL"
    HOLD = "HOLD"
    VOID = "VOID"


@dataclass(frozen=True, slots=True)
class InstrumentUsed:
    """One instrument as it stood when the run began.

    Attributes:
        role: What it does for us.
        identity: Its own answer to the identity query.
        serial: Its serial by the station sheet.
        calibration_due: Day its calibration falls due, ISO date, empty where it needs none.
        certificate: Number of its calibration certificate, empty where it needs none.
        dialect: Name of the dialect spoken.
        dialect_digest: SHA-256 of the dialect file.
    """

    role: str
    identity: str
    serial: str
    calibration_due: str
    certificate: str
    dialect: str
    dialect_digest: str


@dataclass(frozen=True, slots=True)
class RunStarted:
    """A run began; nothing was measured yet."""

    run_id: str
    serial: str
    model: str
    lot: str
    station: str
    operator: str
    at: datetime
    sheet_revision: str
    sheet_digest: str
    software_version: str
    calibration_id: str
    instruments: tuple[InstrumentUsed, ...]


@dataclass(frozen=True, slots=True)
class CheckStarted:
    """A check of the procedure began."""

    check: str
    at: datetime


@dataclass(frozen=True, slots=True)
class ReadingTaken:
    """A measured value with unit, standard uncertainty and, where judged, its limits."""

    check: str
    name: str
    value: float | str
    unit: str
    at: datetime
    standard_uncertainty: float | None = None
    lower: float | None = None
    upper: float | None = None


@dataclass(frozen=True, slots=True)
class StepStarted:
    """One Eb/N0 setting of a BER check is in place and counting begins."""

    check: str
    step: int
    nominal_ebn0_db: float
    ebn0_db: float
    u_db: float
    limit_ber: float
    good_ber: float
    max_bits: int
    at: datetime


@dataclass(frozen=True, slots=True)
class StepProgress:
    """Counts of a running step, from one latched reading.

    Attributes:
        check: The BER check.
        step: Number of the step, from 1.
        bits: Bits counted since the step began.
        errors: Bit errors among them.
        nearness: From -1 (at the reject boundary) to +1 (at the accept boundary).
        at: When.
    """

    check: str
    step: int
    bits: int
    errors: int
    nearness: float
    at: datetime


@dataclass(frozen=True, slots=True)
class Judged:
    """A check, or one step of a BER check, was judged."""

    check: str
    step: int | None
    judgement: Judgement
    sentence: str
    at: datetime
    facts: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class RunEnded:
    """The run is over and the station is safe, or says why it is not.

    Attributes:
        disposition: What happens to the unit.
        cause: Short word for lists: the rejected check, or the kind of trouble.
        sentence: What happened and what to do, for a person.
        unsafe: Roles whose safe state could not be verified, with the reason; empty when all is safe.
        at: When.
    """

    disposition: Disposition
    cause: str
    sentence: str
    unsafe: Mapping[str, str]
    at: datetime


Event = RunStarted | CheckStarted | ReadingTaken | StepStarted | StepProgress | Judged | RunEnded
