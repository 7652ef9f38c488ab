"""What is kept of a run, as values: made by the store, read by certificates and trends."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass, field
from datetime import datetime
from typing import Any


@dataclass(frozen=True, slots=True)
class InstrumentRecord:
    """One instrument as it stood when the run began.

    Attributes:
        role: What it did for us.
        identity: Its answer to the identity query.
        serial: Its serial.
        calibration_due: ISO date, empty where it needs none.
        certificate: Number of its calibration certificate.
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
class CalibrationRecord:
    """A noise calibration.

    Attributes:
        calibration_id: Its identity.
        started_at: When it began, aware.
        valid_until: Until when it holds, aware.
        digest: SHA-256 of its content.
        enbw_hz: Noise-equivalent bandwidth it was made with, Hz.
    """

    calibration_id: str
    started_at: datetime
    valid_until: datetime
    digest: str
    enbw_hz: float


@dataclass(frozen=True, slots=True)
class ReadingRecord:
    """A measured value.

    Attributes:
        check: Check it belongs to.
        name: What was measured.
        value: Number, or text where the unit said one.
        unit: Unit, empty where there is none.
        standard_uncertainty: In that unit, or None.
        lower: Lower limit, or None.
        upper: Upper limit, or None.
        at: When, aware.
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
    """What a check, or a step of it, concluded.

    Attributes:
        check: The check.
        step: Number of the step, or None.
        judgement: ACCEPT, REJECT or UNDECIDED.
        sentence: Why, for a person.
        facts: The numbers that led there, of a BER step.
    """

    check: str
    step: int | None
    judgement: str
    sentence: str
    facts: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class StepCountRecord:
    """Counts of a step as last shown.

    Attributes:
        check: The BER check.
        step: Number of the step.
        ebn0_db: Eb/N0 set, dB.
        bits: Bits counted.
        errors: Errors among them.
    """

    check: str
    step: int
    ebn0_db: float
    bits: int
    errors: int


@dataclass(frozen=True, slots=True)
class RunRecord:
    """Everything kept of one run. ``ended_at`` is None and ``disposition`` empty while it is open."""

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
    sentence: str
    firmware: str
    sheet_revision: str
    sheet_digest: str
    software_version: str
    instruments: tuple[InstrumentRecord, ...]
    calibration: CalibrationRecord | None
    readings: tuple[ReadingRecord, ...]
    judgements: tuple[JudgementRecord, ...]
    step_counts: tuple[StepCountRecord, ...]


@dataclass(frozen=True, slots=True)
class RunSummary:
    """What yield needs of a run.

    Attributes:
        run_id: Its identity.
        serial: Serial of the unit.
        model: Its model.
        lot: Its lot.
        station: Station.
        started_at: When it began, aware.
        disposition: PASS, FAIL, HOLD, VOID, or empty while it is open.
        cause: The rejected check, or the kind of trouble.
    """

    run_id: str
    serial: str
    model: str
    lot: str
    station: str
    started_at: datetime
    disposition: str
    cause: str


def run_as_dict(run: RunRecord) -> dict[str, Any]:
    """A run as plain data for JSON; times as ISO text.

    Args:
        run: The run.

    Returns:
        Nested dictionaries and lists.
    """
    return {key: _plain(value) for key, value in asdict(run).items()}


def _plain(value: Any) -> Any:
    if isinstance(value, datetime):
        return value.isoformat()
    if isinstance(value, Mapping):
        return {key: _plain(inner) for key, inner in value.items()}
    if isinstance(value, (list, tuple)):
        return [_plain(inner) for inner in value]
    return value
