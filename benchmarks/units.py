"""Software time of a unit beyond what its bits take, and durable commits against the disk's own sync."""

from __future__ import annotations

import os
import tempfile
import time
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from secrets import token_hex

from benchmarks.timing import medians_s
from linetest.bench import Bench, write_station_sheet
from linetest.instruments import StationLibrary, load_station_sheet, open_station
from linetest.limits import load_model
from linetest.noise import calibrate_noise
from linetest.procedure import Event, Judged, RunOrder, RunStarted, Sequencer, SystemClock, run_unit
from linetest.records import Store


def rows() -> Iterator[tuple[str, str, str]]:
    """Rows of a unit's software time and of commits.

    Yields:
        What, ratio, of what.
    """
    with tempfile.TemporaryDirectory() as folder:
        yield from _unit_rows(Path(folder))


def _unit_rows(folder: Path) -> Iterator[tuple[str, str, str]]:
    bench = Bench(seed=1)
    write_station_sheet(folder / "station.toml", bench.resources)
    sheet = load_station_sheet(folder / "station.toml")
    library = StationLibrary.create({bench.resources[role]: device for role, device in bench.devices.items()})
    clock = SystemClock()
    station = open_station(sheet, library=library, now=clock.now)
    calibration = calibrate_noise(station, sheet.noise.settings_db, now=clock.now, sleep_s=lambda _: None)
    sequencer = Sequencer(station, load_model("BW-Q4"), calibration, calibration_id="", clock=clock)
    with Store(f"sqlite:///{folder / 'records.db'}") as store:
        events: list[Event] = []
        spent = []
        for _ in range(4):
            events.clear()
            began_s = time.perf_counter()
            run_unit(sequencer, RunOrder("BQ4-000101"), [store.keep, events.append])
            spent.append(time.perf_counter() - began_s)
        bits_s = sum(e.facts["bits"] / e.facts["bit_rate_bps"] for e in events if isinstance(e, Judged) and e.step)
        yield (
            "software time of a unit, plans new (bench's own time included)",
            f"{spent[0] / bits_s:.2f}",
            "its bits' time",
        )
        yield "software time of a unit, plans known", f"{min(spent[1:]) / bits_s:.2f}", "its bits' time"
        kept = list(events)
        with (folder / "sync").open("wb") as file:

            def synced() -> None:
                for _ in kept:
                    os.pwrite(file.fileno(), b"x" * 12_288, 0)
                    os.fdatasync(file.fileno())

            def committed() -> None:
                started = kept[0]
                if isinstance(started, RunStarted):
                    store.keep(replace(started, run_id=token_hex(8)))
                for event in kept[1:]:
                    store.keep(event)

            times = medians_s({"sync": synced, "store": committed})
        yield (
            "durable commits a second, one an event",
            f"{times['sync'] / times['store']:.2f}",
            "12 KB overwrite + fdatasync",
        )
