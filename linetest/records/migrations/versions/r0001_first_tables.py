"""First tables: calibrations, runs and what belongs to a run.

Revision ID: 0001
Revises:
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None


def _run_key() -> sa.Column[str]:
    return sa.Column("run_id", sa.String(64), nullable=False)


def _of_run(table: str, *key: str) -> tuple[sa.Constraint, ...]:
    return (
        sa.PrimaryKeyConstraint("run_id", *key, name=f"pk_{table}"),
        sa.ForeignKeyConstraint(["run_id"], ["runs.run_id"], name=f"fk_{table}_run_id_runs"),
    )


def upgrade() -> None:
    """Create the tables."""
    op.create_table(
        "calibrations",
        sa.Column("calibration_id", sa.String(64), nullable=False),
        sa.Column("station", sa.String(64), nullable=False),
        sa.Column("started_at", sa.DateTime(), nullable=False),
        sa.Column("valid_until", sa.DateTime(), nullable=False),
        sa.Column("enbw_hz", sa.Float(), nullable=False),
        sa.Column("digest", sa.String(64), nullable=False),
        sa.Column("content", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("calibration_id", name="pk_calibrations"),
    )
    op.create_index("ix_calibrations_station_started_at", "calibrations", ["station", "started_at"])
    op.create_table(
        "runs",
        _run_key(),
        sa.Column("serial", sa.String(128), nullable=False),
        sa.Column("model", sa.String(64), nullable=False),
        sa.Column("lot", sa.String(64), nullable=False),
        sa.Column("station", sa.String(64), nullable=False),
        sa.Column("operator", sa.String(128), nullable=False),
        sa.Column("started_at", sa.DateTime(), nullable=False),
        sa.Column("ended_at", sa.DateTime()),
        sa.Column("disposition", sa.String(8)),
        sa.Column("cause", sa.String(128), nullable=False, server_default=""),
        sa.Column("sentence", sa.Text(), nullable=False, server_default=""),
        sa.Column("firmware", sa.String(64), nullable=False, server_default=""),
        sa.Column("sheet_revision", sa.String(64), nullable=False),
        sa.Column("sheet_digest", sa.String(64), nullable=False),
        sa.Column("software_version", sa.String(64), nullable=False),
        sa.Column("calibration_id", sa.String(64)),
        sa.PrimaryKeyConstraint("run_id", name="pk_runs"),
        sa.ForeignKeyConstraint(
            ["calibration_id"], ["calibrations.calibration_id"], name="fk_runs_calibration_id_calibrations"
        ),
    )
    op.create_index("ix_runs_serial_started_at", "runs", ["serial", "started_at"])
    op.create_index("ix_runs_station_ended_at", "runs", ["station", "ended_at"])
    op.create_table(
        "run_instruments",
        _run_key(),
        sa.Column("role", sa.String(32), nullable=False),
        sa.Column("identity", sa.String(256), nullable=False),
        sa.Column("serial", sa.String(128), nullable=False),
        sa.Column("calibration_due", sa.String(10), nullable=False),
        sa.Column("certificate", sa.String(128), nullable=False),
        sa.Column("dialect", sa.String(64), nullable=False),
        sa.Column("dialect_digest", sa.String(64), nullable=False),
        *_of_run("run_instruments", "role"),
    )
    op.create_table(
        "readings",
        _run_key(),
        sa.Column("seq", sa.Integer(), nullable=False),
        sa.Column("check_name", sa.String(64), nullable=False),
        sa.Column("name", sa.String(64), nullable=False),
        sa.Column("value", sa.Float()),
        sa.Column("text_value", sa.String(256)),
        sa.Column("unit", sa.String(16), nullable=False),
        sa.Column("standard_uncertainty", sa.Float()),
        sa.Column("lower", sa.Float()),
        sa.Column("upper", sa.Float()),
        sa.Column("at", sa.DateTime(), nullable=False),
        *_of_run("readings", "seq"),
    )
    op.create_table(
        "step_counts",
        _run_key(),
        sa.Column("check_name", sa.String(64), nullable=False),
        sa.Column("step", sa.Integer(), nullable=False),
        sa.Column("ebn0_db", sa.Float(), nullable=False),
        sa.Column("bits", sa.BigInteger(), nullable=False),
        sa.Column("errors", sa.BigInteger(), nullable=False),
        sa.Column("at", sa.DateTime(), nullable=False),
        *_of_run("step_counts", "check_name", "step"),
    )
    op.create_table(
        "judgements",
        _run_key(),
        sa.Column("seq", sa.Integer(), nullable=False),
        sa.Column("check_name", sa.String(64), nullable=False),
        sa.Column("step", sa.Integer()),
        sa.Column("judgement", sa.String(16), nullable=False),
        sa.Column("sentence", sa.Text(), nullable=False),
        sa.Column("facts", sa.JSON(), nullable=False),
        sa.Column("at", sa.DateTime(), nullable=False),
        *_of_run("judgements", "seq"),
    )


def downgrade() -> None:
    """Drop the tables, youngest first."""
    for table in ("judgements", "step_counts", "readings", "run_instruments", "runs", "calibrations"):
        op.drop_table(table)
