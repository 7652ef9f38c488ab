"""``linetest bench``: the simulated station, served to any VISA."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from linetest.cli.options import AsJson

app = typer.Typer(help="The simulated station.", no_args_is_help=True, rich_markup_mode=None)


@app.callback()
def _root() -> None:
    """The simulated station."""


@app.command("serve")
def serve_bench(
    seed: Annotated[int, typer.Option(help="Seed of the hidden truth: the same seed is the same bench.")] = 1,
    speed: Annotated[float, typer.Option(min=0.001, help="How many times faster than life its time runs.")] = 1.0,
    station_name: Annotated[str, typer.Option("--name", help="Name of the station on the sheet written.")] = "A1",
    write_sheet: Annotated[
        Path | None, typer.Option("--write-sheet", help="Write the matching station sheet here.", dir_okay=False)
    ] = None,
    follow_parent: Annotated[
        bool, typer.Option("--follow-parent", help="Stop when the program that started it is gone, however it went.")
    ] = False,
    as_json: AsJson = False,
) -> None:
    """Serve every simulated instrument on a loopback port of its own until a signal.

    Prints the VISA resource of each role.
    """
    import json
    import os
    import signal
    import threading

    from linetest.bench import Bench, serve, write_station_sheet

    parent = os.getppid()
    done = threading.Event()
    for number in (signal.SIGINT, signal.SIGTERM, signal.SIGHUP):
        signal.signal(number, lambda *_: done.set())
    bench = Bench(seed=seed, speed=speed)
    served = serve(bench)
    try:
        if write_sheet is not None:
            write_station_sheet(write_sheet, served.resources, station=station_name)
        if as_json:
            typer.echo(json.dumps(dict(served.resources)))
        else:
            for role, resource in served.resources.items():
                typer.echo(f"{role:14} {resource}")
            typer.echo("serving on loopback only; stop with Ctrl-C")
        # Never join a thread here: an event is woken by a signal at once.
        while not done.wait(0.5):
            if follow_parent and os.getppid() != parent:
                break
    finally:
        served.close()
