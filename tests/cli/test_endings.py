"""Whatever ends a run, noise, carrier and supply are off; asked through a second connection to the bench."""

from __future__ import annotations

import random
import signal
import time
from collections.abc import Iterator
from datetime import UTC, datetime

import pytest

from linetest.instruments import StationLibrary, load_station_sheet, open_station
from linetest.records import RunRecord, Store, runs_of
from linetest.records.store import DIED_CAUSE
from tests.cli.runner import Place
from tests.world import served_bench

KILLS = 50
SERIAL = "BQ4-000101"


@pytest.fixture(scope="module")
def place(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Place]:
    found = Place(tmp_path_factory.mktemp("station"))
    with served_bench(found.sheet):
        done = found.run("station", "calibrate")
        assert done.returncode == 0, done.stderr
        yield found


def _switched_on(place: Place) -> list[str]:
    """Roles whose output is on, asked over connections of our own."""
    sheet = load_station_sheet(place.sheet)
    station = open_station(sheet, library=StationLibrary.create(), now=lambda: datetime.now(UTC))
    try:
        asked = {
            "noise": station.noise_source.is_on,
            "carrier": station.unit_port.carrier_is_on,
            "supply": station.supply.is_on,
        }
        return [name for name, is_on in asked.items() if is_on()]
    finally:
        station.close()


def _runs(place: Place, serial: str = SERIAL) -> list[RunRecord]:
    with Store(place.database) as store:
        return runs_of(store, serial)


def _wait_for_a_step(place: Place, runs_before: int) -> None:
    for _ in range(600):
        runs = _runs(place)
        if len(runs) > runs_before and any(counts.bits for counts in runs[-1].step_counts):
            return
        time.sleep(0.02)
    pytest.fail("no step began within 12 s")


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM, signal.SIGHUP])
def test_a_signal_in_a_step_ends_safe_and_void_and_the_next_unit_works(place: Place, number: signal.Signals) -> None:
    before = len(_runs(place))
    process = place.start("shift", "--serial", SERIAL)
    _wait_for_a_step(place, before)
    process.send_signal(number)
    _, said = process.communicate(timeout=20)
    assert process.returncode == 3, said
    assert "Traceback" not in said
    assert _switched_on(place) == []
    assert (_runs(place)[-1].disposition, _runs(place)[-1].cause) == ("VOID", "stopped")
    assert place.run("shift", "--serial", SERIAL).returncode == 0


def test_an_instrument_that_dies_in_a_step_ends_safe_and_void_and_the_next_unit_works(place: Place) -> None:
    done = place.run("shift", "--serial", "BQ4-000122")
    assert done.returncode == 3, done.stdout
    assert _switched_on(place) == []
    assert _runs(place, "BQ4-000122")[-1].cause == "instrument fault: unit port"
    assert place.run("shift", "--serial", SERIAL).returncode == 0


def _wait_for_an_open_run(place: Place, runs_before: int) -> None:
    for _ in range(1000):
        if len(_runs(place)) > runs_before:
            return
        time.sleep(0.01)
    pytest.fail("no run began within 10 s")


def test_a_program_killed_at_random_moments_loses_nothing_shown(place: Place) -> None:
    """Each kill leaves whole records; the next start makes the station safe and closes the run as VOID."""
    rng = random.Random(20260302)
    shown_without_record: list[str] = []
    shown_in_all = died = 0
    for _ in range(KILLS):
        before = len(_runs(place))
        process = place.start("shift", "--serial", SERIAL)
        _wait_for_an_open_run(place, before)
        time.sleep(rng.uniform(0.0, 1.0))
        process.kill()
        shown, _ = process.communicate(timeout=20)
        with Store(place.database) as store:
            assert store.check_integrity() == "ok"
            run = runs_of(store, SERIAL)[-1]
        died += run.ended_at is None
        kept = {judgement.sentence for judgement in run.judgements}
        lines = [line.partition(": ")[2].strip() for line in shown.splitlines() if line.startswith(("✔", "✘"))]
        shown_in_all += len(lines)
        shown_without_record += [line for line in lines if line not in kept]
    assert not shown_without_record
    assert shown_in_all >= KILLS, "too little was shown to test anything"
    assert died >= KILLS // 2, f"only {died} kills met an open run: the moments do not test what they must"
    assert place.run("shift", text="\n").returncode == 0
    assert _switched_on(place) == []
    runs = _runs(place)
    assert all(run.ended_at is not None for run in runs)
    assert sum(run.cause == DIED_CAUSE for run in runs) == died
