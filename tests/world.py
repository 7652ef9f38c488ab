"""A small world for tests: the bench in process on virtual time, or served over sockets by a second process."""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from datetime import UTC, datetime, timedelta
from pathlib import Path

from linetest.bench import Bench, write_station_sheet
from linetest.instruments import Station, StationLibrary, load_station_sheet, open_station
from linetest.limits import load_model
from linetest.noise import NoiseCalibration, calibrate_noise
from linetest.procedure import Sequencer
from linetest.procedure.events import Event, RunEnded
from linetest.procedure.sequencer import RunOrder, run_unit
from linetest.records import CalibrationRecord, Store

START = datetime(2026, 3, 2, 8, 0, tzinfo=UTC)


class BenchTime:
    """The clock of a bench on virtual time."""

    def __init__(self, bench: Bench) -> None:
        self._bench = bench
        self._slept_s = 0.0

    def monotonic_s(self) -> float:
        return self._bench.clock.now_s()

    def now(self) -> datetime:
        return START + timedelta(seconds=self.monotonic_s())

    def sleep_s(self, seconds: float) -> None:
        self._bench.clock.advance_s(seconds)


class World:
    """A station on a bench in process, calibrated."""

    def __init__(self, folder: Path, seed: int = 1) -> None:
        self.bench = Bench(seed=seed)
        self.clock = BenchTime(self.bench)
        sheet_file = folder / f"station-{seed}.toml"
        write_station_sheet(sheet_file, self.bench.resources)
        devices = {self.bench.resources[role]: device for role, device in self.bench.devices.items()}
        self.library = StationLibrary.create(devices)
        self.sheet = load_station_sheet(sheet_file)
        self.station: Station = open_station(self.sheet, library=self.library, now=self.clock.now)
        self.limits = load_model("BW-Q4")
        self.calibration: NoiseCalibration = calibrate_noise(
            self.station, self.sheet.noise.settings_db, now=self.clock.now, sleep_s=self.clock.sleep_s
        )

    def sequencer(self, calibration_id: str = "") -> Sequencer:
        return Sequencer(self.station, self.limits, self.calibration, calibration_id=calibration_id, clock=self.clock)

    def run(self, serial: str) -> tuple[RunEnded, list[Event]]:
        events: list[Event] = []
        return run_unit(self.sequencer(), RunOrder(serial), [events.append]), events

    def run_kept(self, store: Store, serial: str, lot: str = "L1") -> RunEnded:
        record = CalibrationRecord(
            calibration_id="N-1",
            started_at=self.calibration.started_at,
            valid_until=self.calibration.valid_until,
            digest=self.calibration.digest(),
            enbw_hz=self.sheet.noise.enbw_hz,
        )
        if store.latest_calibration(self.sheet.name) is None:
            store.keep_calibration(record, self.sheet.name, self.calibration.to_json())
        return run_unit(self.sequencer("N-1"), RunOrder(serial, lot, "op"), [store.keep])

    def is_dark(self) -> bool:
        """Noise, carrier and supply are off, by the bench's own state."""
        return not (self.bench.noise_on or self.bench.carrier_on or self.bench.supply_on)


@contextmanager
def served_bench(sheet_file: Path, *, seed: int = 1) -> Iterator[dict[str, str]]:
    """The simulated station in a second process, through the real command."""
    command = [sys.executable, "-m", "linetest", "bench", "serve", "--follow-parent", "--json"]
    command += ["--seed", str(seed), "--write-sheet", str(sheet_file)]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True, start_new_session=True) as process:
        try:
            assert process.stdout is not None
            yield json.loads(process.stdout.readline())
        finally:
            process.terminate()
            process.wait(10)
