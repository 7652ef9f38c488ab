"""What is kept is durable, whole, and comes back as it went in."""

from __future__ import annotations

import os
import resource
import sqlite3
import subprocess
import sys
from pathlib import Path

import pytest

from linetest.errors import RecordError
from linetest.procedure import Disposition, Judged, ReadingTaken, RunOrder, RunStarted, StepProgress
from linetest.procedure.sequencer import run_unit
from linetest.records import Store, run_as_dict, run_summaries, runs_of
from linetest.records.store import DIED_CAUSE
from tests.world import START, World


@pytest.fixture(scope="module")
def world(tmp_path_factory: pytest.TempPathFactory) -> World:
    return World(tmp_path_factory.mktemp("world"))


def _url(folder: Path) -> str:
    return f"sqlite:///{folder / 'sub' / 'records.db'}"


def test_a_run_comes_back_as_its_events_said(world: World, tmp_path: Path) -> None:
    events: list[object] = []
    with Store(_url(tmp_path)) as store:
        ended = run_unit(world.sequencer(), RunOrder("BQ4-000101", "L7", "anna"), [store.keep, events.append])
        (run,) = runs_of(store, "BQ4-000101")
    started = events[0]
    assert isinstance(started, RunStarted)
    assert (run.run_id, run.lot, run.operator, run.firmware) == (started.run_id, "L7", "anna", "2.4.1")
    assert (run.disposition, run.ended_at) == (ended.disposition, ended.at)
    readings = [event for event in events if isinstance(event, ReadingTaken)]
    assert [(r.name, r.value, r.unit, r.standard_uncertainty, r.at) for r in run.readings] == [
        (r.name, r.value, r.unit, r.standard_uncertainty, r.at) for r in readings
    ]
    judged = [event for event in events if isinstance(event, Judged)]
    assert [(j.check, j.step, j.judgement, j.facts) for j in run.judgements] == [
        (j.check, j.step, j.judgement, j.facts) for j in judged
    ]
    last_shown = {(p.check, p.step): (p.bits, p.errors) for p in events if isinstance(p, StepProgress)}
    assert {(c.check, c.step): (c.bits, c.errors) for c in run.step_counts} == last_shown
    assert {used.role for used in run.instruments} == set(world.bench.devices)
    assert run_as_dict(run)["started_at"] == started.at.isoformat()


def test_sqlite_is_set_to_survive_a_power_cut(tmp_path: Path) -> None:
    with Store(_url(tmp_path)) as store, store.reading() as connection:
        settings = [
            connection.exec_driver_sql(f"PRAGMA {name}").scalar_one()
            for name in ("journal_mode", "synchronous", "foreign_keys")
        ]
    assert settings == ["wal", 2, 1]  # 2 is FULL, by SQLite's documentation of PRAGMA synchronous


def test_the_first_tables_come_from_a_migration(tmp_path: Path) -> None:
    with Store(_url(tmp_path)):
        pass
    with sqlite3.connect(tmp_path / "sub" / "records.db") as raw:
        assert raw.execute("SELECT version_num FROM alembic_version").fetchall() == [("0001",)]
    raw.close()


def test_migrations_and_tables_describe_the_same_database(tmp_path: Path) -> None:
    from alembic.autogenerate import compare_metadata
    from alembic.runtime.migration import MigrationContext

    from linetest.records.tables import metadata

    with Store(_url(tmp_path)) as store, store.reading() as connection:
        assert compare_metadata(MigrationContext.configure(connection), metadata) == []


def test_a_run_left_open_is_closed_void_with_all_it_held(world: World, tmp_path: Path) -> None:
    with Store(_url(tmp_path)) as store:
        happenings = world.sequencer().run(RunOrder("BQ4-000101"))
        kept = 0
        for happening in happenings:
            store.keep(happening)
            kept += isinstance(happening, ReadingTaken)
            if isinstance(happening, StepProgress):
                break
        happenings.close()
        assert store.close_dead_runs("B9", START) == []
        ((_, serial),) = store.close_dead_runs(world.sheet.name, START)
        (run,) = runs_of(store, serial)
        assert (run.disposition, run.cause) == (Disposition.VOID, DIED_CAUSE)
        assert len(run.readings) == kept
        assert store.close_dead_runs(world.sheet.name, START) == []


def test_summaries_hold_every_run(world: World, tmp_path: Path) -> None:
    with Store(_url(tmp_path)) as store:
        world.run_kept(store, "BQ4-000106")
        world.run_kept(store, "BQ4-000105")
        assert [(s.serial, s.disposition, s.cause) for s in run_summaries(store)] == [
            ("BQ4-000106", "FAIL", "identity"),
            ("BQ4-000105", "FAIL", "ber"),
        ]


def test_a_file_that_is_no_database_is_said_so(tmp_path: Path) -> None:
    path = tmp_path / "letter.db"
    path.write_text("Dear reader, this is not a database but a letter of more than a hundred bytes." * 3)
    with pytest.raises(RecordError, match="not a database of linetest"):
        Store(f"sqlite:///{path}")


def test_a_read_only_database_is_said_so(tmp_path: Path) -> None:
    with Store(_url(tmp_path)):
        pass
    with pytest.raises(RecordError, match="right to write there"):
        Store(f"sqlite:///file:{tmp_path / 'sub' / 'records.db'}?mode=ro&uri=true").close_dead_runs("A1", START)


def test_an_unusable_address_is_said_so() -> None:
    with pytest.raises(RecordError, match="cannot be used"):
        Store("nonsense")


def test_a_full_disk_is_said_so_and_leaves_what_was_kept_whole(world: World, tmp_path: Path) -> None:
    """A process that may not let a file grow stands for a full disk: SQLite's writes fail the same way."""
    url = _url(tmp_path)
    with Store(url) as store:
        world.run_kept(store, "BQ4-000106")
    program = (
        "import sys\nfrom datetime import UTC, datetime\nfrom linetest.errors import RecordError\n"
        "from linetest.records import Store\nfrom tests.records.test_store import started\n"
        "store = Store(sys.argv[1])\n"
        "try:\n    for n in range(2000): store.keep(started(f'R{n}'))\n"
        "except RecordError as reason:\n    print(reason); sys.exit(7)\n"
    )

    def small_files() -> None:
        resource.setrlimit(resource.RLIMIT_FSIZE, (300_000, 300_000))

    done = subprocess.run(
        [sys.executable, "-c", "import signal; signal.signal(signal.SIGXFSZ, signal.SIG_IGN)\n" + program, url],
        preexec_fn=small_files,
        cwd=Path(__file__).parents[2],
        env=os.environ | {"PYTHONPATH": str(Path(__file__).parents[2])},
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 7, done.stderr
    assert "disk" in done.stdout
    with Store(url) as store:
        assert store.check_integrity() == "ok"
        assert [run.disposition for run in runs_of(store, "BQ4-000106")] == ["FAIL"]


def started(run_id: str) -> RunStarted:
    """The start of a run that holds nothing else."""
    return RunStarted(run_id, "BQ4-000999", "BW-Q4", "", "A1", "", START, "1", "0" * 64, "0", "", ())
