"""The tree of commands."""

from __future__ import annotations

from typing import Annotated

import typer

from linetest import __version__
from linetest.cli import bench, certificate, demo, limits, shift, station, trends, unit

app = typer.Typer(
    name="linetest",
    help="End-of-line test of modem units: calibrated Eb/N0, counted bit errors, exact risks.\n\n"
    "Exit codes: 0 done or PASS, 1 FAIL, 2 wrong use or wrong file, 3 VOID (station), 4 HOLD.",
    no_args_is_help=True,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    add_completion=False,
)


def _show_version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"linetest {__version__}")
        raise typer.Exit


@app.callback()
def _root(
    _version: Annotated[
        bool, typer.Option("--version", callback=_show_version, is_eager=True, help="Print the version and leave.")
    ] = False,
) -> None:
    """End-of-line test of modem units: calibrated Eb/N0, counted bit errors, exact risks.

    Exit codes: 0 done or PASS, 1 FAIL, 2 wrong use or wrong file, 3 VOID (station), 4 HOLD.
    """


app.command("demo")(demo.run_demo)
app.command("shift")(shift.run_shift)
app.command("unit")(unit.show_unit)
app.add_typer(certificate.app, name="certificate")
app.add_typer(trends.app, name="trends")
app.add_typer(limits.app, name="limits")
app.add_typer(station.app, name="station")
app.add_typer(bench.app, name="bench")
