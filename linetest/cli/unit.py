"""``linetest unit``: everything kept of one serial."""

from __future__ import annotations

from typing import Annotated

import typer

from linetest.cli.options import AsJson, Database


def show_unit(
    serial: Annotated[str, typer.Argument(help="Serial of the unit.")],
    database: Database = None,
    as_json: AsJson = False,
) -> None:
    """Show the history of one unit: every run with its readings and judgements."""
    import json

    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

    from linetest.errors import SerialError
    from linetest.records import Store, run_as_dict, runs_of
    from linetest.settings import load_settings

    settings = load_settings({"database_url": database})
    with Store(settings.database_url) as store:
        runs = runs_of(store, serial)
    if not runs:
        raise SerialError(serial, f"no run of {serial!r} is on record in this database; check the serial")
    if as_json:
        typer.echo(json.dumps([run_as_dict(run) for run in runs], indent=2))
        return
    console = Console(highlight=False)
    for run in runs:
        head = f"{run.run_id}  {run.serial}  {run.disposition or 'open'}"
        console.print(Text(head, style="bold"))
        console.print(
            Text(f"  {run.started_at:%Y-%m-%d %H:%M:%S} UTC, station {run.station}, lot {run.lot or '-'}, {run.cause}")
        )
        table = Table("check", "step", "judgement", "why", box=None, pad_edge=True)
        for judgement in run.judgements:
            step = "" if judgement.step is None else str(judgement.step)
            table.add_row(judgement.check, step, judgement.judgement, Text(judgement.sentence))
        console.print(table)
