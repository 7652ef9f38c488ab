"""The record of a run as plain values: what the store hands out and what pages are made from.

Every value is frozen and holds only text, numbers, aware datetimes, tuples and mappings of JSON values, so that a
record can be written as JSON, digested, sent, and compared without the database it came from.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass, field
from datetime import datetime
from typing import Any

Facts = Mapping[str, Any]
"""Numbers that led to a judgement, by name; values that JSON can hold."""


@dataclass(frozen=True, slots=True)
class InstrumentRecord:
    """One instrument as it stood when the run began.

    Attributes:
        role: What it does for us, as `noise_source`.
        identity: Its own answer to the identity query.
        serial: Its serial by the station sheet.
        calibration_due: Day its calibration falls due, ISO date; empty where it needs none.
        certificate: Number of its calibration certificate; empty where it needs none.
        dialect: Name of the dialect spoken.
        dialect_digest: SHA-256 of the dialect file, hexadecimal.
    """

    role: str
    identity: str
    serial: str
    calibration_due: str
    certificate: str
    dialect: str
    dialect_digest: str


@dataclass(frozen=True, slots=True)
class CalibrationRecord:
    """The noise calibration that a run's Eb/N0 rests on.

    Attributes:
        calibration_id: Its identity.
        started_at: When it was measured, aware.
        valid_until: When it lapses, aware.
        digest: SHA-256 of its content, hexadecimal.
        enbw_hz: Noise-equivalent bandwidth used, Hz.
    """

    calibration_id: str
    started_at: datetime
    valid_until: datetime
    digest: str
    enbw_hz: float


@dataclass(frozen=True, slots=True)
class ReadingRecord:
    """One measured value.

    Attributes:
        check: The check it was taken for.
        name: What was measured.
        value: The value, a number or, where a unit answers in words, text.
        unit: Its unit, as `dBm`; empty for text and pure numbers.
        standard_uncertainty: Standard uncertainty in the value's unit (dB for a level), None where not stated.
        lower: Lower limit where the reading is judged against one.
        upper: Upper limit where the reading is judged against one.
        at: When it was taken, aware.
    """

    check: str
    name: str
    value: float | str
    unit: str
    standard_uncertainty: float | None
    lower: float | None
    upper: float | None
    at: datetime


@dataclass(frozen=True, slots=True)
class JudgementRecord:
    """What a check, or one step of a bit error check, concluded.

    Attributes:
        check: The check.
        step: Number of the step from 1, None for a check without steps.
        judgement: `ACCEPT`, `REJECT` or `UNDECIDED`.
        sentence: The reason, for a person.
        facts: The numbers that led there, by name with unit; a bit error step holds its Eb/N0, counts, interval,
            limits, guards and risks.
        at: When it was judged, aware; None where the source does not say.
    """

    check: str
    step: int | None
    judgement: str
    sentence: str
    facts: Facts = field(default_factory=dict)
    at: datetime | None = None


@dataclass(frozen=True, slots=True)
class RunRecord:
    """Everything kept of one run.

    Attributes:
        run_id: Identity of the run.
        serial: Serial of the unit as scanned.
        model: Model of the unit.
        lot: Lot of the unit, empty where none was given.
        station: Name of the station.
        operator: Who ran it.
        started_at: When it began, aware.
        ended_at: When it ended, aware; None while it runs.
        disposition: `PASS`, `FAIL`, `HOLD`, `VOID`; empty while it runs.
        cause: Short word for lists: the rejected check or the kind of trouble; empty for PASS.
        sentence: What happened and what to do, for a person.
        firmware: Firmware read back from the unit, empty where it did not answer.
        sheet_revision: Revision of the limit sheet.
        sheet_digest: SHA-256 of the limit sheet's file, hexadecimal.
        software_version: Version of linetest that ran it.
        instruments: Instruments used, in the station sheet's order.
        calibration: Noise calibration used, None where the run ended before one was needed.
        readings: Readings in the order taken.
        judgements: Judgements in the order made.
    """

    run_id: str
    serial: str
    model: str
    lot: str
    station: str
    operator: str
    started_at: datetime
    ended_at: datetime | None
    disposition: str
    cause: str
    firmware: str
    sheet_revision: str
    sheet_digest: str
    software_version: str
    instruments: tuple[InstrumentRecord, ...] = ()
    calibration: CalibrationRecord | None = None
    readings: tuple[ReadingRecord, ...] = ()
    judgements: tuple[JudgementRecord, ...] = ()
    sentence: str = ""

    def as_dict(self) -> dict[str, Any]:
        """The record as values that JSON can hold; datetimes as ISO 8601 text with offset.

        Returns:
            A new nested dictionary.
        """
        return {name: _plain(value) for name, value in asdict(self).items()}


@dataclass(frozen=True, slots=True)
class RunSummary:
    """One run in a line: what yield and history need of it.

    Attributes:
        run_id: Identity of the run.
        serial: Serial of the unit.
        model: Model of the unit.
        lot: Lot of the unit, empty where none was given.
        station: Name of the station.
        started_at: When it began, aware.
        disposition: `PASS`, `FAIL`, `HOLD`, `VOID`; empty while it runs.
        cause: Short word for lists; empty for PASS.
        rejected_check: First check judged REJECT, empty where none was.
    """

    run_id: str
    serial: str
    model: str
    lot: str
    station: str
    started_at: datetime
    disposition: str
    cause: str
    rejected_check: str


def _plain(value: Any) -> Any:
    if isinstance(value, datetime):
        return value.isoformat()
    if isinstance(value, Mapping):
        return {str(name): _plain(inner) for name, inner in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(inner) for inner in value]
    return value
