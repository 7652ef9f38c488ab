"""The station: its instruments opened, identified, and always brought back to a safe state."""

from __future__ import annotations

import fcntl
import os
import time
from collections import deque
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

from linetest.errors import LinkError, LinkLost, LinkTimeout, SheetError, SheetFault, StationBusyError, StationError
from linetest.instruments.dialect import Dialect, load_dialect
from linetest.instruments.library import StationLibrary
from linetest.instruments.link import Link
from linetest.instruments.roles import Attenuator, NoiseSource, PowerMeter, Supply, UnitPort
from linetest.instruments.sheet import InstrumentEntry, StationSheet

TRANSCRIPT_LINES = 20_000
SAFE_S = 8.0
SAFE_WAIT_MS = 1000


@dataclass(frozen=True, slots=True)
class StationFinding:
    """What the station check found of one instrument.

    Attributes:
        role: Its role.
        resource: Its VISA resource name.
        ok: Whether it may be used.
        sentence: What was found.
        advice: What to do about it; empty where nothing is to do.
    """

    role: str
    resource: str
    ok: bool
    sentence: str
    advice: str = ""


class Station:
    """An open station. Made by :func:`open_station`.

    Attributes:
        sheet: Its sheet.
        identities: Identity answer by role.
        dialect_digests: SHA-256 of the dialect file by role.
        transcript: The last exchanges with every instrument: (time, resource, direction, text).
    """

    def __init__(self, sheet: StationSheet, library: StationLibrary, dialects: Mapping[str, Dialect]) -> None:
        self.sheet = sheet
        self.transcript: deque[tuple[float, str, str, str]] = deque(maxlen=TRANSCRIPT_LINES)
        self.dialect_digests = {role: dialect.digest for role, dialect in dialects.items()}
        self.identities: dict[str, str] = {}
        self._library = library
        self.links = {
            entry.role: Link(
                entry.resource,
                dialects[entry.role],
                library,
                expected_identity=entry.identity,
                tap=lambda *line: self.transcript.append(line),
            )
            for entry in sheet.instruments
        }
        self.noise_source = NoiseSource(self.links["noise_source"])
        self.attenuator = Attenuator(self.links["attenuator"])
        self.power_meter = PowerMeter(self.links["power_meter"])
        self.supply = Supply(self.links["supply"])
        self.unit_port = UnitPort(self.links["unit_port"])

    def open(self) -> None:
        """Open every link and note who answers.

        Raises:
            LinkError: One cannot be reached or another instrument answers.
        """
        for role, link in self.links.items():
            self.identities[role] = link.open()

    def make_safe(self) -> dict[str, str]:
        """Switch noise, carrier and supply off in the sheet's order, each verified by reading back.

        Every output is tried once before any is tried again, over a fresh link; no cancel cuts it short, a second one
        neither. Each wait is capped, and no second try begins after the time is up.

        Returns:
            By role: empty text where it is off, else why that could not be shown.
        """
        switches: Mapping[str, Callable[[], None]] = {
            "noise_source": self.noise_source.output_off,
            "unit_port": self.unit_port.carrier_off,
            "supply": self.supply.output_off,
        }
        deadline_s = time.monotonic() + SAFE_S
        with self._library.cancel.shielded():
            report = {role: self._switched_off(role, switches[role]) for role in self.sheet.safe_off}
            for role, why in report.items():
                if why and time.monotonic() < deadline_s:
                    report[role] = self._switched_off(role, switches[role])
        # The cancel has done its work: what is asked next is asked anew.
        self._library.cancel.clear()
        return report

    def _switched_off(self, role: str, switch_off: Callable[[], None]) -> str:
        try:
            with self.links[role].hurried(SAFE_WAIT_MS):
                switch_off()
        except Exception as reason:  # noqa: BLE001  (nothing that happens to one output may keep the others on)
            self.links[role].close()
            return str(reason) or repr(reason)
        return ""

    def close(self) -> None:
        """Close every link."""
        for link in self.links.values():
            link.close()


def open_station(
    sheet: StationSheet,
    *,
    library: StationLibrary | None = None,
    now: Callable[[], datetime],
    folder: Path | None = None,
) -> Station:
    """Open a station: every instrument reached, the right one, and calibrated in time.

    Args:
        sheet: The station sheet.
        library: The VISA library; a new one where None.
        now: Where the date comes from.
        folder: Folder of the sheet, for dialect files beside it.

    Returns:
        The station, open; nothing was switched on.

    Raises:
        StationError: An instrument's calibration is overdue.
        LinkError: An instrument cannot be reached, or another one answers.
        SheetError: A dialect is wrong.
    """
    dialects = {entry.role: _dialect_of(entry, folder) for entry in sheet.instruments}
    overdue = [entry for entry in sheet.instruments if _overdue(entry, now())]
    if overdue:
        listed = ", ".join(f"{e.role.replace('_', ' ')} {e.serial} since {e.calibration_due}" for e in overdue)
        raise StationError(
            f"calibration overdue: {listed}; send it for calibration, or use another and correct the sheet"
        )
    station = Station(sheet, library or StationLibrary.create(), dialects)
    try:
        station.open()
    except LinkError:
        station.close()
        raise
    return station


def check_station(
    sheet: StationSheet,
    *,
    library: StationLibrary | None = None,
    now: Callable[[], datetime],
    folder: Path | None = None,
) -> list[StationFinding]:
    """Look at every instrument of a station and say what is wrong and what to do.

    Args:
        sheet: The station sheet.
        library: The VISA library; a new one where None.
        now: Where the date comes from.
        folder: Folder of the sheet.

    Returns:
        One finding an instrument.
    """
    library = library or StationLibrary.create()
    return [_check_one(entry, library, now(), folder) for entry in sheet.instruments]


def _check_one(entry: InstrumentEntry, library: StationLibrary, now: datetime, folder: Path | None) -> StationFinding:
    def found(ok: bool, sentence: str, advice: str = "") -> StationFinding:
        return StationFinding(entry.role, entry.resource, ok, sentence, advice)

    try:
        dialect = _dialect_of(entry, folder)
    except SheetError as reason:
        return found(False, str(reason), "correct the dialect")
    link = Link(entry.resource, dialect, library, expected_identity=entry.identity)
    try:
        identity = link.open()
        queue = link.ask(dialect.errors) if dialect.errors else "0"
    except LinkError as reason:
        return found(False, *_trouble(reason))
    finally:
        link.close()
    if not queue.lstrip("+").startswith("0"):
        return found(False, f"its error queue is not empty after clearing: {queue}", "switch it off and on again")
    if _overdue(entry, now):
        advice = "send it for calibration, or use another and correct the sheet"
        return found(False, f"{identity}: calibration overdue since {entry.calibration_due}", advice)
    due = f"calibration due {entry.calibration_due}" if entry.calibration_due else "needs no calibration"
    return found(True, f"{identity}; {due}")


def _trouble(reason: LinkError) -> tuple[str, str]:
    match reason:
        case LinkTimeout():
            advice = "check its terminator (line feed) and that it is in remote control; then its dialect"
            return "it is reached but does not answer its identity query", advice
        case LinkLost():
            return str(reason), "check power, cable, address and port, then the resource on the station sheet"
        case _:
            return str(reason), "switch it off and on again; then check its dialect"


def _dialect_of(entry: InstrumentEntry, folder: Path | None) -> Dialect:
    dialect = load_dialect(entry.dialect, folder)
    if dialect.role != entry.role:
        rule = f"is a dialect for a {dialect.role}, not for a {entry.role}"
        raise SheetError(entry.dialect, [SheetFault(f"instrument.{entry.role}.dialect", repr(entry.dialect), rule)])
    return dialect


def _overdue(entry: InstrumentEntry, now: datetime) -> bool:
    return entry.calibration_due is not None and now.date() > entry.calibration_due


@contextmanager
def station_lock(name: str, folder: Path | None = None) -> Iterator[None]:
    """Hold a station, so that no second program drives it.

    The lock is the system's own and falls with the process, however it dies.

    Args:
        name: Name of the station.
        folder: Where lock files are; the user's state folder where None.

    Yields:
        Nothing.

    Raises:
        StationBusyError: Another program holds it.
        StationError: The lock file cannot be made.
    """
    if folder is None:
        from platformdirs import user_state_path

        folder = user_state_path("linetest", appauthor=False)
    path = folder / f"station-{name}.lock"
    try:
        folder.mkdir(parents=True, exist_ok=True)
        handle = os.open(path, os.O_RDWR | os.O_CREAT, 0o644)
    except OSError as reason:
        raise StationError(f"the lock {path} of station {name} cannot be made: {reason.strerror}") from reason
    try:
        try:
            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            raise StationBusyError(f"another program holds station {name}; close it first") from None
        yield
    finally:
        os.close(handle)
