"""Options that several commands share, each in one place."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

Database = Annotated[
    str | None, typer.Option("--database", help="Database URL, such as sqlite:///records.db.", show_default=False)
]
StationFile = Annotated[
    Path | None, typer.Option("--station", help="Station sheet (TOML).", show_default=False, dir_okay=False)
]
LimitsFolder = Annotated[
    Path | None, typer.Option("--limits", help="Folder of limit sheets.", show_default=False, file_okay=False)
]
AsJson = Annotated[bool, typer.Option("--json", help="Print the result as JSON.")]
Operator = Annotated[str, typer.Option("--operator", help="Who runs the shift; kept with each run.")]
Lot = Annotated[str, typer.Option("--lot", help="Lot of the units; kept with each run.")]
