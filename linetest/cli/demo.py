"""``linetest demo``: a whole shift on the simulated station, over real sockets, from a second process."""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

if TYPE_CHECKING:
    from rich.console import Console

    from linetest.bench import Planted
    from linetest.cli.session import Session
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
    from linetest.cli.shift import CAUTIONS
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
        console.print(CAUTIONS, style="bold", markup=False)
        with open_session(settings, console.print) as session:
            _prepare(console, session, sheet_file)
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

    command = [sys.executable, "-m", "linetest", "bench", "serve", "--follow-parent", "--json", "--seed", str(seed)]
    command += ["--write-sheet", str(sheet_file)]
    # A session of its own: Ctrl-C at the terminal must reach the program first, which then makes the bench safe.
    process = subprocess.Popen(  # noqa: S603  (our own interpreter and module)
        command, stdout=subprocess.PIPE, text=True, start_new_session=True
    )
    try:
        line = process.stdout.readline() if process.stdout else ""
        if not line:
            raise StationError(
                f"the simulated station did not start (exit code {process.wait(5)}); see its message above"
            )
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


def _prepare(console: Console, session: Session, station_file: Path) -> None:
    from linetest.cli.station import calibrate_session, print_findings
    from linetest.instruments import check_station

    console.print("\nStation check", style="bold")
    print_findings(console, check_station(session.sheet, now=session.clock.now, folder=station_file.parent))
    console.print("\nNoise calibration", style="bold")
    calibrate_session(console, session)


def _run_lot(console: Console, session: Session) -> list[tuple[Planted, RunEnded]]:
    """Run the lot, then once more the units whose first run was VOID, as a technician would."""
    from linetest.bench import demo_lot
    from linetest.cli.screen import Screen
    from linetest.cli.shift import test_unit
    from linetest.limits import list_sheets
    from linetest.settings import shipped_folder

    sheets = list_sheets(shipped_folder("limits"))
    screen = Screen(console, brief=True)

    def tested(planted: Planted) -> RunEnded:
        ended = test_unit(session, sheets, planted.serial, lot=LOT, operator=OPERATOR, show=screen.show)
        if session.interrupts.stop.is_set():
            raise typer.Exit(3)
        return ended

    try:
        console.print(f"\nLot {LOT}", style="bold")
        ends = [(planted, tested(planted)) for planted in demo_lot()]
        console.print("\nVOID units once more", style="bold")
        for planted, ended in ends:
            if ended.disposition == "VOID":
                tested(planted)
    finally:
        screen.close()
    return ends


def _issue_certificates(store: Store, settings: Settings) -> list[Path]:
    from linetest.cli.certificate import write_certificate
    from linetest.records import run_summaries

    passed = {run.serial for run in run_summaries(store) if run.disposition == "PASS"}
    return [
        write_certificate(store, serial, settings.certificates_folder, settings.templates_folder)
        for serial in sorted(passed)
    ]


def _write_yield_page(console: Console, store: Store, settings: Settings, output: Path) -> Path:
    from linetest.cli.files import write_whole
    from linetest.cli.trends import print_yield
    from linetest.records import run_summaries
    from linetest.trends import first_pass_yield, render_yield_page

    report = first_pass_yield(run_summaries(store))
    page = output / "yield.html"
    write_whole(page, render_yield_page(report, templates_folder=settings.templates_folder))
    console.print("\nThe lot", style="bold")
    print_yield(report)
    return page


def _compare(console: Console, ends: list[tuple[Planted, RunEnded]]) -> bool:
    """Hold each first disposition against what was planted; the program itself never sees the plant."""
    from rich.table import Table
    from rich.text import Text

    console.print("\nPlanted against found", style="bold")
    table = Table("serial", "planted", "expected", "found", "", box=None, pad_edge=False)
    agreed = True
    for planted, ended in ends:
        right = planted.expected in {"EITHER", ended.disposition}
        agreed = agreed and right
        found = f"{ended.disposition} {ended.cause}".strip()
        mark = Text("✔", style="green") if right else Text("✘", style="red")
        table.add_row(planted.serial, planted.reason, planted.expected, found, mark)
    console.print(table)
    return agreed
