"""Reading the records back as values."""

from __future__ import annotations

from typing import Any

from sqlalchemy import Connection, Table, select

from linetest.records import tables
from linetest.records.document import (
    CalibrationRecord,
    InstrumentRecord,
    JudgementRecord,
    ReadingRecord,
    RunRecord,
    RunSummary,
    StepCountRecord,
)
from linetest.records.store import Store, calibration_record


def runs_of(store: Store, serial: str) -> list[RunRecord]:
    """Every run of a serial, oldest first.

    Args:
        store: The open records.
        serial: The serial.

    Returns:
        The runs.

    Raises:
        RecordError: The database cannot be read.
    """
    columns = tables.runs.c
    query = select(tables.runs).where(columns.serial == serial).order_by(columns.started_at, columns.run_id)
    with store.reading() as connection:
        return [_run(connection, row) for row in connection.execute(query).mappings().all()]


def run_summaries(store: Store) -> list[RunSummary]:
    """What yield needs of every run, oldest first.

    Args:
        store: The open records.

    Returns:
        The summaries.

    Raises:
        RecordError: The database cannot be read.
    """
    columns = tables.runs.c
    query = select(
        columns.run_id,
        columns.serial,
        columns.model,
        columns.lot,
        columns.station,
        columns.started_at,
        columns.disposition,
        columns.cause,
    ).order_by(columns.started_at, columns.run_id)
    with store.reading() as connection:
        rows = connection.execute(query).all()
    return [RunSummary(*row[:6], row.disposition or "", row.cause) for row in rows]


def _run(connection: Connection, row: Any) -> RunRecord:
    run_id = row["run_id"]

    def of_run(table: Table, *order: str) -> list[Any]:
        query = select(table).where(table.c.run_id == run_id).order_by(*(table.c[name] for name in order))
        return list(connection.execute(query).mappings().all())

    return RunRecord(
        run_id=run_id,
        serial=row["serial"],
        model=row["model"],
        lot=row["lot"],
        station=row["station"],
        operator=row["operator"],
        started_at=row["started_at"],
        ended_at=row["ended_at"],
        disposition=row["disposition"] or "",
        cause=row["cause"],
        sentence=row["sentence"],
        firmware=row["firmware"],
        sheet_revision=row["sheet_revision"],
        sheet_digest=row["sheet_digest"],
        software_version=row["software_version"],
        instruments=tuple(_instrument(entry) for entry in of_run(tables.run_instruments, "role")),
        calibration=_calibration(connection, row["calibration_id"]),
        readings=tuple(_reading(entry) for entry in of_run(tables.readings, "seq")),
        judgements=tuple(_judgement(entry) for entry in of_run(tables.judgements, "seq")),
        step_counts=tuple(_counts(entry) for entry in of_run(tables.step_counts, "check_name", "step")),
    )


def _instrument(row: Any) -> InstrumentRecord:
    return InstrumentRecord(**{key: value for key, value in row.items() if key != "run_id"})


def _calibration(connection: Connection, calibration_id: str | None) -> CalibrationRecord | None:
    if calibration_id is None:
        return None
    query = select(tables.calibrations).where(tables.calibrations.c.calibration_id == calibration_id)
    return calibration_record(connection.execute(query).mappings().one())


def _reading(row: Any) -> ReadingRecord:
    return ReadingRecord(
        check=row["check_name"],
        name=row["name"],
        value=row["text_value"] if row["value"] is None else row["value"],
        unit=row["unit"],
        standard_uncertainty=row["standard_uncertainty"],
        lower=row["lower"],
        upper=row["upper"],
        at=row["at"],
    )


def _judgement(row: Any) -> JudgementRecord:
    return JudgementRecord(
        check=row["check_name"],
        step=row["step"],
        judgement=row["judgement"],
        sentence=row["sentence"],
        facts=row["facts"],
    )


def _counts(row: Any) -> StepCountRecord:
    return StepCountRecord(
        check=row["check_name"], step=row["step"], ebn0_db=row["ebn0_db"], bits=row["bits"], errors=row["errors"]
    )
