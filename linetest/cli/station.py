"""``linetest station``: check the instruments, calibrate the noise."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import typer

from linetest.cli.options import AsJson, Database, StationFile

if TYPE_CHECKING:
    from rich.console import Console

    from linetest.cli.session import Session
    from linetest.instruments import StationFinding
    from linetest.noise import NoiseCalibration

app = typer.Typer(help="The station and its noise.", no_args_is_help=True, rich_markup_mode=None)


@app.callback()
def _root() -> None:
    """The station and its noise."""


@app.command("check")
def check_sheet(station: StationFile = None, as_json: AsJson = False) -> None:
    """Look at every instrument: reached, the right one, calibrated in time; say what to do about each fault."""
    import json
    from dataclasses import asdict
    from datetime import UTC, datetime

    from rich.console import Console

    from linetest.cli.session import station_sheet_path
    from linetest.cli.shift import CAUTIONS
    from linetest.instruments import check_station, load_station_sheet, station_lock
    from linetest.settings import load_settings

    path = station_sheet_path(load_settings({"station_sheet": str(station) if station else None}))
    sheet = load_station_sheet(path)
    with station_lock(sheet.name):
        findings = check_station(sheet, now=lambda: datetime.now(UTC), folder=path.parent)
    if as_json:
        typer.echo(json.dumps([asdict(finding) for finding in findings], indent=2))
    else:
        console = Console(highlight=False)
        console.print(CAUTIONS, style="bold", markup=False)
        print_findings(console, findings)
    if not all(finding.ok for finding in findings):
        raise typer.Exit(3)


@app.command("calibrate")
def calibrate_station(station: StationFile = None, database: Database = None, as_json: AsJson = False) -> None:
    """Calibrate the noise: N0 at the unit's input for each attenuator setting, with its uncertainty; kept on record."""
    import json

    from rich.console import Console

    from linetest.cli.session import open_session
    from linetest.settings import load_settings

    settings = load_settings({"database_url": database, "station_sheet": str(station) if station else None})
    console = Console(stderr=as_json, highlight=False)
    with open_session(settings, lambda sentence: console.print(sentence, style="yellow", markup=False)) as session:
        calibration = calibrate_session(console, session)
    if as_json:
        typer.echo(json.dumps(json.loads(calibration.to_json()), indent=2))


def print_findings(console: Console, findings: list[StationFinding]) -> None:
    """Print what the station check found.

    Args:
        console: Where to.
        findings: One an instrument.
    """
    for finding in findings:
        mark, style = ("✔", "green") if finding.ok else ("✘", "red")
        console.print(f"{mark} ", style=style, end="")
        console.print(f"{finding.role.replace('_', ' ')}: {finding.sentence}", markup=False)
        if finding.advice:
            console.print(f"  → {finding.advice}", style="yellow", markup=False)


def calibrate_session(console: Console, session: Session) -> NoiseCalibration:
    """Calibrate the noise of an open session and keep the result.

    Args:
        console: Where progress and table go.
        session: The session.

    Returns:
        The calibration.

    Raises:
        StationError: An instrument failed; no calibration is kept and the old one is untouched.
    """
    from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn

    from linetest.noise import calibrate_noise
    from linetest.procedure import new_run_id
    from linetest.records import CalibrationRecord

    facts = session.sheet.noise
    settings_db = facts.settings_db
    expected_s = len(settings_db) * facts.readings * facts.averaging_s
    console.print(
        f"{len(settings_db)} attenuator settings, {facts.readings} readings each of {facts.averaging_s:g} s: "
        f"about {expected_s:.0f} s"
    )
    columns = (TextColumn("  calibrating"), BarColumn(), TextColumn("{task.completed}/{task.total}"))
    with Progress(*columns, TimeRemainingColumn(), console=console, transient=True) as progress:
        # The floor before, and the first setting once more at the end, are levels too.
        task = progress.add_task("noise", total=len(settings_db) + 2)

        def advance(*_: Any) -> None:
            progress.advance(task)

        calibration = calibrate_noise(
            session.station, settings_db, now=session.clock.now, sleep_s=session.clock.sleep_s, progress=advance
        )
    record = CalibrationRecord(
        calibration_id=f"N-{new_run_id(calibration.started_at)}",
        started_at=calibration.started_at,
        valid_until=calibration.valid_until,
        digest=calibration.digest(),
        enbw_hz=facts.enbw_hz,
    )
    session.store.keep_calibration(record, session.sheet.name, calibration.to_json())
    _print_calibration(console, calibration, record.calibration_id)
    return calibration


def _print_calibration(console: Console, calibration: NoiseCalibration, calibration_id: str) -> None:
    from rich.table import Table

    table = Table("attenuator, dB", "N0, dBm/Hz", "u, dB", box=None, pad_edge=False)
    for setting_db, n0_dbm_hz, u_db in zip(
        calibration.settings_db, calibration.n0_dbm_hz, calibration.u_db, strict=True
    ):
        if setting_db % 2.0 == 0.0:
            table.add_row(f"{setting_db:.2f}", f"{n0_dbm_hz:.3f}", f"{u_db:.3f}")
    console.print(table)
    console.print(f"kept as {calibration_id}, valid until {calibration.valid_until:%Y-%m-%d %H:%M} UTC")
