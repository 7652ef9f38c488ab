"""A program's time at a station: lock, safe state, records, noise calibration, signals.

Opening a session makes the station safe before anything else and closes as VOID what a dead program left open.
"""

from __future__ import annotations

import signal
import threading
from collections.abc import Callable, Iterator
from contextlib import ExitStack, contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from types import FrameType

from linetest.errors import CalibrationError, SettingsError, StationError
from linetest.instruments import Station, StationLibrary, StationSheet, load_station_sheet, open_station, station_lock
from linetest.noise import NoiseCalibration, check_current
from linetest.procedure import SystemClock
from linetest.records import Store
from linetest.settings import Settings

Say = Callable[[str], None]

SIGNALS = (signal.SIGINT, signal.SIGTERM, signal.SIGHUP)


@dataclass
class Interrupts:
    """Signals, turned into a flag that the sequencer heeds and a cancel that wakes a blocked link.

    Attributes:
        stop: Set once a signal came.
        waiting: True while the program only waits for a person; a signal then ends the wait at once.
    """

    stop: threading.Event = field(default_factory=threading.Event)
    waiting: bool = False
    cancel: threading.Event | None = None

    def __call__(self, _number: int, _frame: FrameType | None) -> None:
        """Note the signal. Nothing is raised in the middle of a measurement: safe-off must not be cut short."""
        again = self.stop.is_set()
        self.stop.set()
        # A second signal must not cancel the links that safe-off is using.
        if self.cancel is not None and not again:
            self.cancel.set()
        if self.waiting:
            raise KeyboardInterrupt

    @contextmanager
    def installed(self) -> Iterator[None]:
        """Take the signals over for a while.

        Yields:
            Nothing; the former handlers return at the end.
        """
        before = {number: signal.signal(number, self) for number in SIGNALS}
        try:
            yield
        finally:
            for number, handler in before.items():
                signal.signal(number, handler)

    @contextmanager
    def awaiting_person(self) -> Iterator[None]:
        """While a person is asked: a signal ends the wait."""
        self.waiting = True
        try:
            if self.stop.is_set():
                raise KeyboardInterrupt
            yield
        finally:
            self.waiting = False


@dataclass(frozen=True)
class Session:
    """An open station with its records.

    Attributes:
        station: The station, safe and identified.
        sheet: Its sheet.
        store: The records.
        clock: The wall clock.
        interrupts: The signals.
    """

    station: Station
    sheet: StationSheet
    store: Store
    clock: SystemClock
    interrupts: Interrupts

    def calibration(self) -> tuple[NoiseCalibration, str]:
        """The noise calibration in force.

        Returns:
            The calibration and its identity in the records.

        Raises:
            CalibrationError: There is none, or it is out of date, or the instruments changed.
        """
        found = self.store.latest_calibration(self.sheet.name)
        if found is None:
            raise CalibrationError(
                f"station {self.sheet.name} has no noise calibration: run 'linetest station calibrate' first"
            )
        record, content = found
        calibration = NoiseCalibration.from_json(content)
        check_current(calibration, self.station, now=self.clock.now())
        return calibration, record.calibration_id


def station_sheet_path(settings: Settings) -> Path:
    """The station sheet set for this station.

    Args:
        settings: The settings.

    Returns:
        Its path.

    Raises:
        SettingsError: None is set.
    """
    if settings.station_sheet is None:
        raise SettingsError(
            "no station sheet is set: give --station FILE, or set LINETEST_STATION_SHEET, "
            "or station_sheet in the settings file"
        )
    return settings.station_sheet


@contextmanager
def open_session(settings: Settings, say: Say) -> Iterator[Session]:
    """Take the station, make it safe, open the records, and give everything back at the end.

    Args:
        settings: Where sheet and database are.
        say: Where a sentence for the technician goes.

    Yields:
        The session.

    Raises:
        StationBusyError: Another program holds the station.
        LinkError: An instrument does not answer.
        StationError: The station cannot be made safe.
        RecordError: The database cannot be used.
        SheetError: The station sheet is wrong.
    """
    path = station_sheet_path(settings)
    sheet = load_station_sheet(path)
    interrupts = Interrupts()
    clock = SystemClock()
    with ExitStack() as stack:
        stack.enter_context(station_lock(sheet.name))
        store = stack.enter_context(Store(settings.database_url))
        library = StationLibrary.create()
        interrupts.cancel = library.cancel
        stack.enter_context(interrupts.installed())
        station = open_station(sheet, library=library, now=clock.now, folder=path.parent)
        stack.callback(station.close)
        stack.callback(station.make_safe)
        _start_safe(station, say)
        for run_id, serial in store.close_dead_runs(sheet.name, clock.now()):
            say(f"run {run_id} of {serial} was left open by a program that died: closed as VOID, test it again")
        yield Session(station, sheet, store, clock, interrupts)


def _start_safe(station: Station, say: Say) -> None:
    unsafe = {role: why for role, why in station.make_safe().items() if why}
    for role, why in unsafe.items():
        say(f"NOT SAFE: {role.replace('_', ' ')}: {why}. Switch it off by hand.")
    if unsafe:
        raise StationError(f"the station could not be made safe: {', '.join(unsafe)}; no unit is tested until it is")
