"""``linetest shift``: serial after serial, scanned or typed."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from typing import TYPE_CHECKING, Annotated, Any

import typer

from linetest.cli.options import AsJson, Database, LimitsFolder, Lot, Operator, StationFile

if TYPE_CHECKING:
    from linetest.cli.session import Session
    from linetest.limits import LimitSheet
    from linetest.procedure import Listener, RunEnded

CAUTIONS = (
    "Conducted measurement only, into rated loads; radiating needs a licence. RF power and DC supplies are live during "
    "a run; units get hot; wear the ESD strap. Local codes and licensed practice come first."
)
EXIT_CODES = {"PASS": 0, "FAIL": 1, "VOID": 3, "HOLD": 4}


def run_shift(
    serial: Annotated[str | None, typer.Option("--serial", help="Test this one unit and leave.")] = None,
    lot: Lot = "",
    operator: Operator = "",
    station: StationFile = None,
    database: Database = None,
    limits: LimitsFolder = None,
    as_json: AsJson = False,
) -> None:
    """Test units: scan or type serial after serial; an empty line or end of input ends the shift.

    With --serial the exit code says the disposition: 0 PASS, 1 FAIL, 3 VOID, 4 HOLD.
    """
    from rich.console import Console

    from linetest.cli.screen import Screen
    from linetest.cli.session import open_session
    from linetest.errors import SerialError
    from linetest.limits import list_sheets
    from linetest.settings import load_settings

    settings = load_settings(
        {
            "database_url": database,
            "station_sheet": str(station) if station else None,
            "limits_folder": str(limits) if limits else None,
        }
    )
    console = Console(stderr=as_json, highlight=False)
    sheets = list_sheets(settings.limits_folder)
    if serial is not None:
        sheet_of(serial, sheets)  # a serial nobody knows is refused before the station is touched
    screen = Screen(console)
    with open_session(settings, lambda sentence: console.print(sentence, style="yellow", markup=False)) as session:
        console.print(CAUTIONS, style="bold", markup=False)
        ended = None
        for scanned in [serial] if serial is not None else _scans(session, console):
            try:
                ended = test_unit(session, sheets, scanned, lot=lot, operator=operator, show=screen.show)
            except SerialError as reason:
                if serial is not None:
                    raise
                console.print(str(reason), style="yellow", markup=False)
                continue
            finally:
                screen.close()
            if as_json:
                typer.echo(_as_json(scanned, ended))
            if session.interrupts.stop.is_set():
                break
    if serial is not None and ended is not None:
        raise typer.Exit(EXIT_CODES[ended.disposition])


def sheet_of(serial: str, sheets: list[LimitSheet]) -> LimitSheet:
    """The limit sheet whose serial pattern the serial matches.

    Args:
        serial: Serial as scanned.
        sheets: The limit sheets known.

    Returns:
        The sheet.

    Raises:
        SerialError: No sheet, or more than one, knows such serials.
    """
    import re

    from linetest.errors import SerialError

    found = [sheet for sheet in sheets if re.fullmatch(sheet.serial_pattern, serial)]
    if len(found) == 1:
        return found[0]
    patterns = ", ".join(f"{sheet.model} {sheet.serial_pattern}" for sheet in found or sheets)
    trouble = "matches more than one model's pattern" if found else "matches no model's serial pattern"
    raise SerialError(serial, f"the serial {serial!r} {trouble} ({patterns}): scan the label again")


def _scans(session: Session, console: Any) -> Iterator[str]:
    while not session.interrupts.stop.is_set():
        console.print("scan a unit (empty line ends the shift): ", end="")
        try:
            with session.interrupts.awaiting_person():
                line = sys.stdin.readline()
        except KeyboardInterrupt:
            return
        serial = line.strip()
        if not serial:
            return
        yield serial


def test_unit(
    session: Session, sheets: list[LimitSheet], serial: str, *, lot: str, operator: str, show: Listener
) -> RunEnded:
    """Test one unit on an open session.

    Args:
        session: The session.
        sheets: The limit sheets known.
        serial: Serial as scanned.
        lot: Lot of the unit.
        operator: Who runs the shift.
        show: Told of every event once it is kept.

    Returns:
        How the run ended.

    Raises:
        SerialError: No model has such serials.
        CalibrationError: There is no noise calibration in force.
        RecordError: An event could not be kept.
    """
    from linetest.procedure import RunOrder, Sequencer, run_unit

    sheet = sheet_of(serial, sheets)
    calibration, calibration_id = session.calibration()
    sequencer = Sequencer(
        session.station,
        sheet,
        calibration,
        calibration_id=calibration_id,
        clock=session.clock,
        stop=session.interrupts.stop,
    )
    # Records listen first: what is shown is already kept.
    return run_unit(sequencer, RunOrder(serial, lot, operator), [session.store.keep, show])


def _as_json(serial: str, ended: RunEnded) -> str:
    import json

    return json.dumps(
        {
            "serial": serial,
            "disposition": ended.disposition.value,
            "cause": ended.cause,
            "sentence": ended.sentence,
            "unsafe": dict(ended.unsafe),
            "at": ended.at.isoformat(),
        }
    )
