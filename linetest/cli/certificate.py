"""``linetest certificate``: what the customer gets."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from linetest.cli.options import AsJson, Database

if TYPE_CHECKING:
    from linetest.records import Store

app = typer.Typer(help="The customer's certificate.", no_args_is_help=True, rich_markup_mode=None)


@app.callback()
def _root() -> None:
    """The customer's certificate."""


@app.command("issue")
def issue_certificate(
    serial: Annotated[str, typer.Argument(help="Serial of a unit that passed.")],
    folder: Annotated[
        Path | None, typer.Option("--folder", help="Where the file goes.", file_okay=False, show_default=False)
    ] = None,
    database: Database = None,
    as_json: AsJson = False,
) -> None:
    """Print the certificate of a unit's newest passed run as one self-contained HTML file.

    It is made from the record only: issuing twice gives the same bytes.
    """
    import json

    from linetest.records import Store
    from linetest.settings import load_settings

    settings = load_settings(
        {"database_url": database, "certificates_folder": str(folder) if folder is not None else None}
    )
    with Store(settings.database_url) as store:
        path = write_certificate(store, serial, settings.certificates_folder, settings.templates_folder)
    typer.echo(json.dumps({"serial": serial, "certificate": str(path)}) if as_json else str(path))


def write_certificate(store: Store, serial: str, folder: Path, templates_folder: Path) -> Path:
    """Write a unit's certificate, whole or not at all.

    Args:
        store: The open records.
        serial: Serial of the unit.
        folder: Where the file goes; made where it is missing.
        templates_folder: Folder of page templates.

    Returns:
        The file.

    Raises:
        SerialError: No run of this serial is on record.
        CertificateError: The unit's last judged run did not pass, or the folder cannot be written.
    """
    from linetest.certificates import certificate_file_name, render_certificate
    from linetest.cli.files import write_whole
    from linetest.errors import CertificateError, SerialError
    from linetest.records import runs_of

    runs = runs_of(store, serial)
    if not runs:
        raise SerialError(serial, f"no run of {serial!r} is on record in this database; check the serial")
    judged = [run for run in runs if run.disposition not in {None, "", "VOID"}]
    if not judged or judged[-1].disposition != "PASS":
        last = judged[-1].disposition if judged else "VOID"
        raise CertificateError(f"{serial} has no certificate: its last run is {last}, and only a PASS is certified")
    text = render_certificate(judged[-1], templates_folder=templates_folder)
    path = folder / certificate_file_name(judged[-1])
    try:
        write_whole(path, text)
    except OSError as reason:
        raise CertificateError(f"the certificate {path} cannot be written: {reason.strerror}") from reason
    return path
