"""``linetest demo``: a whole shift on the simulated station, over real sockets, from a second process."""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

if TYPE_CHECKING:
    from rich.console import Console

    from linetest.procedure import RunEnded
    from linetest.records import Store
    from linetest.settings import Settings

LOT = "L2601"
OPERATOR = "demo"


def run_demo(
    folder: Annotated[
        Path, typer.Option("--folder", help="Where database, certificates and page go.", file_okay=False)
    ] = Path("demo-output"),
    seed: Annotated[int, typer.Option(help="Seed of the bench's hidden truth.")] = 1,
) -> None:
    """Run a lot of 24 simulated units with planted faults through the real program.

    The station runs in a second process, each instrument on a loopback port of its own, and is reached through
    VISA exactly as hardware is. Leaves a database, a certificate for each passed unit and a page of the lot's yield.
    """
    from datetime import UTC, datetime

    from rich.console import Console

    from linetest.cli.session import open_session
    from linetest.settings import load_settings

    console = Console(highlight=False)
    output = folder.resolve() / f"{datetime.now(UTC):%Y%m%d-%H%M%S}"
    output.mkdir(parents=True)
    sheet_file = output / "station-a1.toml"
    settings = load_settings(
        {
            "database_url": f"sqlite:///{output / 'records.db'}",
            "station_sheet": str(sheet_file),
            "certificates_folder": str(output / "certificates"),
        }
    )
    with _bench_process(sheet_file, seed) as resources:
        _tell_bench(console, resources)
        with open_session(settings, console.print) as session:
            _prepare(console, session)
            ends = _run_lot(console, session)
            certificates = _issue_certificates(session.store, settings)
            page = _write_yield_page(console, session.store, settings, output)
    agreed = _compare(console, ends)
    console.print(f"\n{len(certificates)} certificates in {output / 'certificates'}")
    console.print(f"yield page         {page}")
    console.print(f"database           {output / 'records.db'}")
    if not agreed:
        raise typer.Exit(1)


@contextmanager
def _bench_process(sheet_file: Path, seed: int) -> Iterator[dict[str, str]]:
    """The simulated station as a process of its own, for as long as the context lasts."""
    from linetest.errors import StationError

    command = [sys.executable, "-m", "linetest", "bench", "serve", "--json", "--seed", str(seed)]
    command += ["--write-sheet", str(sheet_file)]
    # A session of its own: Ctrl-C at the terminal must reach the program first, which then makes the bench safe.
    process = subprocess.Popen(  # noqa: S603  (our own interpreter and module)
        command, stdout=subprocess.PIPE, text=True, start_new_session=True
    )
    try:
        line = process.stdout.readline() if process.stdout else ""
        if not line:
            raise StationError(f"the simulated station did not start (exit code {process.wait(5)}); see its message above")
        yield json.loads(line)
    finally:
        process.terminate()
        try:
            process.wait(5)
        except subprocess.TimeoutExpired:
            process.kill()
            process.wait()


def _tell_bench(console: Console, resources: dict[str, str]) -> None:
    console.print("Simulated station A1, in a second process:", style="bold")
    for role, resource in resources.items():
        console.print(f"  {role.replace('_', ' '):14} {resource}", markup=False)


def _prepare(console: Console, session: Session) -> None:
    from linetest.cli.shift import CAUTIONS
    from linetest.cli.station import calibrate_session, check_session

    console.print(CAUTIONS, style="bold", markup=False)
    console.print("\nStation check", style="bold")
    check_session(console, session)
    console.print("\nNoise calibration", style="bold")
    calibrate_session(console, session)


def _run_lot(console: Console, session: Session) -> list[tuple[str, RunEnded]]:
    """Run the lot, then once more the units whose run was VOID for an instrument's sake."""
    from linetest.bench import demo_lot
    from linetest.cli.screen import Screen
    from linetest.cli.shift import test_unit
    from linetest.limits import list_sheets
    from linetest.settings import shipped_folder

    sheets = list_sheets(shipped_folder("limits"))
    screen = Screen(console, brief=True)
    ends: list[tuple[str, RunEnded]] = []
    console.print(f"\nLot {LOT}", style="bold")
    for planted in demo_lot():
        ended = test_unit(session, sheets, planted.serial, lot=LOT, operator=OPERATOR, show=screen.show)
        ends.append((planted.serial, ended))
        if session.interrupts.stop.is_set():
            raise typer.Exit(3)
    return ends
