"""The tables of the record, by SQLAlchemy.

Every constraint has a chosen name, so that a later migration can drop it on any database. Times are kept in
UTC and come back aware of it.
"""

from __future__ import annotations

from datetime import UTC, datetime
from typing import Any

from sqlalchemy import (
    JSON,
    BigInteger,
    Column,
    DateTime,
    Dialect,
    Float,
    ForeignKey,
    Index,
    Integer,
    MetaData,
    String,
    Table,
    Text,
    TypeDecorator,
)

NAMING = {
    "ix": "ix_%(table_name)s_%(column_0_N_name)s",
    "uq": "uq_%(table_name)s_%(column_0_N_name)s",
    "ck": "ck_%(table_name)s_%(constraint_name)s",
    "fk": "fk_%(table_name)s_%(column_0_N_name)s_%(referred_table_name)s",
    "pk": "pk_%(table_name)s",
}


class UtcDateTime(TypeDecorator[datetime]):
    """An aware datetime, kept as UTC: SQLite has no time zones and would hand back a naive one."""

    impl = DateTime
    cache_ok = True

    def process_bind_param(self, value: datetime | None, dialect: Dialect) -> datetime | None:  # noqa: ARG002
        """To the database: as UTC without zone."""
        return None if value is None else value.astimezone(UTC).replace(tzinfo=None)

    def process_result_value(self, value: Any | None, dialect: Dialect) -> datetime | None:  # noqa: ARG002
        """From the database: aware again."""
        return None if value is None else value.replace(tzinfo=UTC)


metadata = MetaData(naming_convention=NAMING)

calibrations = Table(
    "calibrations",
    metadata,
    Column("calibration_id", String(64), primary_key=True),
    Column("station", String(64), nullable=False),
    Column("started_at", UtcDateTime, nullable=False),
    Column("valid_until", UtcDateTime, nullable=False),
    Column("enbw_hz", Float, nullable=False),
    Column("digest", String(64), nullable=False),
    Column("content", Text, nullable=False),
    Index(None, "station", "started_at"),
)

runs = Table(
    "runs",
    metadata,
    Column("run_id", String(64), primary_key=True),
    Column("serial", String(128), nullable=False),
    Column("model", String(64), nullable=False),
    Column("lot", String(64), nullable=False),
    Column("station", String(64), nullable=False),
    Column("operator", String(128), nullable=False),
    Column("started_at", UtcDateTime, nullable=False),
    Column("ended_at", UtcDateTime),
    Column("disposition", String(8)),
    Column("cause", String(128), nullable=False, server_default=""),
    Column("sentence", Text, nullable=False, server_default=""),
    Column("firmware", String(64), nullable=False, server_default=""),
    Column("sheet_revision", String(64), nullable=False),
    Column("sheet_digest", String(64), nullable=False),
    Column("software_version", String(64), nullable=False),
    Column("calibration_id", String(64), ForeignKey("calibrations.calibration_id")),
    Index(None, "serial", "started_at"),
    Index(None, "station", "ended_at"),
)

run_instruments = Table(
    "run_instruments",
    metadata,
    Column("run_id", String(64), ForeignKey("runs.run_id"), primary_key=True),
    Column("role", String(32), primary_key=True),
    Column("identity", String(256), nullable=False),
    Column("serial", String(128), nullable=False),
    Column("calibration_due", String(10), nullable=False),
    Column("certificate", String(128), nullable=False),
    Column("dialect", String(64), nullable=False),
    Column("dialect_digest", String(64), nullable=False),
)

readings = Table(
    "readings",
    metadata,
    Column("run_id", String(64), ForeignKey("runs.run_id"), primary_key=True),
    Column("seq", Integer, primary_key=True),
    Column("check_name", String(64), nullable=False),
    Column("name", String(64), nullable=False),
    Column("value", Float),
    Column("text_value", String(256)),
    Column("unit", String(16), nullable=False),
    Column("standard_uncertainty", Float),
    Column("lower", Float),
    Column("upper", Float),
    Column("at", UtcDateTime, nullable=False),
)

step_counts = Table(
    "step_counts",
    metadata,
    Column("run_id", String(64), ForeignKey("runs.run_id"), primary_key=True),
    Column("check_name", String(64), primary_key=True),
    Column("step", Integer, primary_key=True),
    Column("ebn0_db", Float, nullable=False),
    Column("bits", BigInteger, nullable=False),
    Column("errors", BigInteger, nullable=False),
    Column("at", UtcDateTime, nullable=False),
)

judgements = Table(
    "judgements",
    metadata,
    Column("run_id", String(64), ForeignKey("runs.run_id"), primary_key=True),
    Column("seq", Integer, primary_key=True),
    Column("check_name", String(64), nullable=False),
    Column("step", Integer),
    Column("judgement", String(16), nullable=False),
    Column("sentence", Text, nullable=False),
    Column("facts", JSON, nullable=False),
    Column("at", UtcDateTime, nullable=False),
)
