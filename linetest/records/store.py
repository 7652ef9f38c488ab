"""The store: opens the database, brings it up to date, keeps what a run says, hands it back.

Each event is one transaction, durable (SQLite with write-ahead log and full synchronisation) before ``keep``
returns. What the screen shows after that is never lost.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import asdict
from datetime import datetime
from pathlib import Path
from typing import Any

from sqlalchemy import Connection, Engine, create_engine, event, func, insert, make_url, select, update
from sqlalchemy.exc import ArgumentError, SQLAlchemyError

from linetest.errors import RecordError
from linetest.procedure.events import (
    CheckStarted,
    Disposition,
    Event,
    Judged,
    ReadingTaken,
    RunEnded,
    RunStarted,
    StepProgress,
    StepStarted,
)
from linetest.records import tables
from linetest.records.document import CalibrationRecord

DIED_CAUSE = "program died"
DIED_SENTENCE = "the program ended without closing this run (power loss, or killed); test the unit again"

_RUN_FACTS = (
    "run_id",
    "serial",
    "model",
    "lot",
    "station",
    "operator",
    "sheet_revision",
    "sheet_digest",
    "software_version",
)

_HINTS = {
    "readonly": "the file or its folder is read-only: give this user the right to write there",
    "database or disk is full": "the disk is full: free some space",
    "disk i/o error": "the disk refused: check its space and health",
    "unable to open": "the file or its folder cannot be opened: check the path and the rights",
    "not a database": "the file is not a database of linetest: name another one",
    "locked": "another program holds the database too long: close it",
}


class Store:
    """One open database of records.

    Args:
        url: SQLAlchemy URL; a SQLite file is created with its folder where it is missing.

    Raises:
        RecordError: The database cannot be opened or brought up to date.
    """

    def __init__(self, url: str) -> None:
        self.url = url
        self._run_id = ""
        self._sequence: dict[str, int] = {}
        try:
            self._engine = _engine(url)
        except (ArgumentError, ImportError) as reason:
            raise RecordError(f"the database address {url!r} cannot be used: {reason}") from reason
        try:
            with _told(url):
                _migrate(self._engine)
        except RecordError:
            self._engine.dispose()
            raise

    def close(self) -> None:
        """Close the database; the object is of no further use."""
        self._engine.dispose()

    def __enter__(self) -> Store:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    @contextmanager
    def reading(self) -> Iterator[Connection]:
        """A connection for reading.

        Yields:
            The connection.

        Raises:
            RecordError: The database cannot be read.
        """
        with _told(self.url), self._engine.connect() as connection:
            yield connection

    @contextmanager
    def _writing(self) -> Iterator[Connection]:
        with _told(self.url), self._engine.begin() as connection:
            yield connection

    def keep(self, happening: Event) -> None:
        """Make one event durable.

        Args:
            happening: The event, of a run whose ``RunStarted`` was kept before.

        Raises:
            RecordError: It could not be kept; what was kept before is whole.
        """
        match happening:
            case RunStarted():
                self._run_started(happening)
            case ReadingTaken():
                self._add(tables.readings, _reading_row(happening))
            case Judged():
                self._add(tables.judgements, _judgement_row(happening))
            case StepStarted():
                self._step_started(happening)
            case StepProgress():
                self._step_progress(happening)
            case RunEnded():
                self._run_ended(happening)
            case CheckStarted():
                pass  # said for the screen only: it holds no reading and no judgement

    def close_dead_runs(self, station: str, at: datetime) -> list[tuple[str, str]]:
        """Close as VOID every run of a station that a dead program left open.

        To be called only while holding the station's lock: no other program then has an open run there.

        Args:
            station: Name of the station.
            at: When they are found.

        Returns:
            (run id, serial) of each run closed, oldest first.

        Raises:
            RecordError: The database cannot be written.
        """
        open_runs = (tables.runs.c.station == station) & tables.runs.c.ended_at.is_(None)
        with self._writing() as connection:
            found = connection.execute(
                select(tables.runs.c.run_id, tables.runs.c.serial).where(open_runs).order_by(tables.runs.c.started_at)
            ).all()
            connection.execute(
                update(tables.runs)
                .where(open_runs)
                .values(ended_at=at, disposition=Disposition.VOID, cause=DIED_CAUSE, sentence=DIED_SENTENCE)
            )
        return [(run_id, serial) for run_id, serial in found]

    def keep_calibration(self, record: CalibrationRecord, station: str, content: str) -> None:
        """Keep a noise calibration.

        Args:
            record: Its identity, times, digest and noise bandwidth.
            station: The station it belongs to.
            content: The whole calibration as JSON text.

        Raises:
            RecordError: It could not be kept.
        """
        with self._writing() as connection:
            connection.execute(insert(tables.calibrations).values(**asdict(record), station=station, content=content))

    def latest_calibration(self, station: str) -> tuple[CalibrationRecord, str] | None:
        """The newest noise calibration of a station.

        Args:
            station: Name of the station.

        Returns:
            Its record and its content as JSON text, or None where the station has none.

        Raises:
            RecordError: The database cannot be read.
        """
        columns = tables.calibrations.c
        query = (
            select(tables.calibrations).where(columns.station == station).order_by(columns.started_at.desc()).limit(1)
        )
        with self.reading() as connection:
            row = connection.execute(query).mappings().first()
        return None if row is None else (calibration_record(row), str(row["content"]))

    def _run_started(self, started: RunStarted) -> None:
        facts = {name: getattr(started, name) for name in _RUN_FACTS}
        with self._writing() as connection:
            connection.execute(
                insert(tables.runs).values(
                    **facts, started_at=started.at, calibration_id=started.calibration_id or None
                )
            )
            rows = [asdict(used) | {"run_id": started.run_id} for used in started.instruments]
            if rows:
                connection.execute(insert(tables.run_instruments), rows)
        self._run_id = started.run_id
        self._sequence = {}

    def _add(self, table: Any, row: dict[str, Any]) -> None:
        sequence = self._sequence.get(table.name, 0) + 1
        with self._writing() as connection:
            connection.execute(insert(table).values(run_id=self._run_id, seq=sequence, **row))
            if row.get("name") == "firmware":
                connection.execute(
                    update(tables.runs).where(tables.runs.c.run_id == self._run_id).values(firmware=row["text_value"])
                )
        self._sequence[table.name] = sequence

    def _step_started(self, started: StepStarted) -> None:
        with self._writing() as connection:
            connection.execute(
                insert(tables.step_counts).values(
                    run_id=self._run_id,
                    check_name=started.check,
                    step=started.step,
                    ebn0_db=started.ebn0_db,
                    bits=0,
                    errors=0,
                    at=started.at,
                )
            )

    def _step_progress(self, progress: StepProgress) -> None:
        columns = tables.step_counts.c
        with self._writing() as connection:
            connection.execute(
                update(tables.step_counts)
                .where(
                    columns.run_id == self._run_id,
                    columns.check_name == progress.check,
                    columns.step == progress.step,
                )
                .values(bits=progress.bits, errors=progress.errors, at=progress.at)
            )

    def _run_ended(self, ended: RunEnded) -> None:
        unsafe = "".join(f"; {role} could not be made safe: {why}" for role, why in ended.unsafe.items())
        with self._writing() as connection:
            connection.execute(
                update(tables.runs)
                .where(tables.runs.c.run_id == self._run_id)
                .values(
                    ended_at=ended.at,
                    disposition=ended.disposition,
                    cause=ended.cause,
                    sentence=ended.sentence + unsafe,
                )
            )

    def check_integrity(self) -> str:
        """The database's own check of itself.

        Returns:
            ``ok``, or what SQLite found; ``ok`` for other databases, which check themselves.

        Raises:
            RecordError: The database cannot be read.
        """
        if self._engine.dialect.name != "sqlite":
            return "ok"
        with self.reading() as connection:
            return str(connection.exec_driver_sql("PRAGMA integrity_check").scalar_one())

    def count_runs(self) -> int:
        """Number of runs kept.

        Returns:
            The number.

        Raises:
            RecordError: The database cannot be read.
        """
        with self.reading() as connection:
            return int(connection.execute(select(func.count()).select_from(tables.runs)).scalar_one())


def calibration_record(row: Any) -> CalibrationRecord:
    """A row of the calibrations table as a value.

    Args:
        row: Mapping of the table's columns.

    Returns:
        The calibration's record.
    """
    return CalibrationRecord(
        calibration_id=row["calibration_id"],
        started_at=row["started_at"],
        valid_until=row["valid_until"],
        digest=row["digest"],
        enbw_hz=row["enbw_hz"],
    )


def _reading_row(taken: ReadingTaken) -> dict[str, Any]:
    is_text = isinstance(taken.value, str)
    return {
        "check_name": taken.check,
        "name": taken.name,
        "value": None if is_text else taken.value,
        "text_value": taken.value if is_text else None,
        "unit": taken.unit,
        "standard_uncertainty": taken.standard_uncertainty,
        "lower": taken.lower,
        "upper": taken.upper,
        "at": taken.at,
    }


def _judgement_row(judged: Judged) -> dict[str, Any]:
    return {
        "check_name": judged.check,
        "step": judged.step,
        "judgement": judged.judgement,
        "sentence": judged.sentence,
        "facts": dict(judged.facts),
        "at": judged.at,
    }


def _engine(url: str) -> Engine:
    parsed = make_url(url)
    database = parsed.database or ":memory:"
    # A name that begins with "file:" is a URI with options of its own: SQLite makes of it what it says.
    if parsed.get_backend_name() == "sqlite" and not database.startswith((":memory:", "file:")):
        folder = Path(database).expanduser().resolve().parent
        try:
            folder.mkdir(parents=True, exist_ok=True)
        except OSError as reason:
            raise RecordError(f"the folder {folder} for the database cannot be made: {reason.strerror}") from reason
    engine = create_engine(parsed)
    if engine.dialect.name == "sqlite":
        event.listen(engine, "connect", _prepare_sqlite)
    return engine


def _prepare_sqlite(connection: Any, _: object) -> None:
    cursor = connection.cursor()
    # FULL: a commit is on the disk, not in a cache of the system, before anyone is told.
    for pragma in ("busy_timeout=5000", "journal_mode=WAL", "synchronous=FULL", "foreign_keys=ON"):
        cursor.execute(f"PRAGMA {pragma}")
    cursor.close()


def _migrate(engine: Engine) -> None:
    from alembic import command
    from alembic.config import Config
    from alembic.runtime.migration import MigrationContext
    from alembic.script import ScriptDirectory
    from alembic.util import CommandError

    config = Config()
    config.set_main_option("script_location", "linetest:records/migrations")
    config.set_main_option("path_separator", "os")
    script = ScriptDirectory.from_config(config)
    with engine.connect() as connection:
        current = MigrationContext.configure(connection).get_current_revision()
        if current == script.get_current_head():
            return
        config.attributes["connection"] = connection
        try:
            command.upgrade(config, "head")
        except CommandError as reason:
            raise RecordError(
                f"the database {engine.url.render_as_string()} was written by another version of linetest "
                f"(revision {current}); use that version or a newer one"
            ) from reason
        connection.commit()


@contextmanager
def _told(url: str) -> Iterator[None]:
    """Turn what the database says into one sentence."""
    try:
        yield
    except SQLAlchemyError as reason:
        said = str(getattr(reason, "orig", None) or reason)
        hint = next((hint for word, hint in _HINTS.items() if word in said.lower()), "see what it said")
        shown = make_url(url).render_as_string(hide_password=True)
        raise RecordError(f"the database {shown} refused ({said}): {hint}") from reason
