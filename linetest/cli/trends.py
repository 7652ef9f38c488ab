"""``linetest trends``: what the line does."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from linetest.cli.options import AsJson, Database

if TYPE_CHECKING:
    from linetest.trends import YieldReport

app = typer.Typer(help="Yield and trends of the line.", no_args_is_help=True, rich_markup_mode=None)


@app.callback()
def _root() -> None:
    """Yield and trends of the line."""


@app.command("yield")
def show_yield(
    page: Annotated[
        Path | None, typer.Option("--page", help="Also write the HTML page here.", dir_okay=False, show_default=False)
    ] = None,
    database: Database = None,
    as_json: AsJson = False,
) -> None:
    """First-pass yield by day, lot, model and station, with exact 95 % intervals.

    A unit counts once, by its first run that is not VOID; VOID runs are listed by cause.
    """
    import json

    from linetest.cli.files import write_whole
    from linetest.errors import SettingsError
    from linetest.records import Store, run_summaries
    from linetest.settings import load_settings
    from linetest.trends import first_pass_yield, render_yield_page, yield_as_dict

    settings = load_settings({"database_url": database})
    with Store(settings.database_url) as store:
        report = first_pass_yield(run_summaries(store))
    if page is not None:
        try:
            write_whole(page, render_yield_page(report, templates_folder=settings.templates_folder))
        except OSError as reason:
            raise SettingsError(f"the page {page} cannot be written: {reason.strerror}") from reason
    if as_json:
        typer.echo(json.dumps(yield_as_dict(report), indent=2))
    else:
        print_yield(report)


def print_yield(report: YieldReport) -> None:
    """Print the yield as tables.

    Args:
        report: The report.
    """
    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

    console = Console(highlight=False)
    if report.total is None:
        console.print("no unit has a run that is not VOID yet")
    table = Table("by", "", "units", "passed", "first-pass yield", "95 % interval", box=None, pad_edge=False)
    rows = [("all", report.total)] if report.total is not None else []
    rows += [(kind, row) for kind, group in report.groups.items() for row in group]
    for kind, row in rows:
        limits = f"{row.low:.1%} to {row.high:.1%}"
        table.add_row(kind, Text(row.name), str(row.units), str(row.passed), f"{row.share:.1%}", limits)
    if rows:
        console.print(table)
    for title, causes in (("did not pass", report.rejects), ("VOID runs", report.voids)):
        for cause, count in causes:
            console.print(f"{title}: {count} x {cause}", markup=False)
