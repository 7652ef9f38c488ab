"""``linetest limits``: what a limit sheet will do, before the first unit."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from linetest.cli.options import AsJson, LimitsFolder

if TYPE_CHECKING:
    from linetest.charts import BerPoint
    from linetest.limits import BerCheck, LimitSheet, StepLimit

app = typer.Typer(help="Limit sheets.", no_args_is_help=True, rich_markup_mode=None)

PLANNED_GATE_S = 0.001
SIMULATED_SYMBOLS = 1_000_000
SIMULATION_SEED = 11
SIMULATED_LEVEL = 0.99


@app.callback()
def _root() -> None:
    """Limit sheets."""


@app.command("list")
def list_limits(limits: LimitsFolder = None, as_json: AsJson = False) -> None:
    """List the models that have a limit sheet."""
    import json

    from linetest.limits import list_sheets
    from linetest.settings import load_settings

    settings = load_settings({"limits_folder": str(limits) if limits else None})
    sheets = list_sheets(settings.limits_folder)
    if as_json:
        rows = [
            {"model": s.model, "title": s.title, "revision": s.revision, "serial": s.serial_pattern} for s in sheets
        ]
        typer.echo(json.dumps(rows, indent=2))
        return
    for sheet in sheets:
        typer.echo(f"{sheet.model:10} revision {sheet.revision:4} {sheet.serial_pattern:16} {sheet.title}")


@app.command("check")
def check_limits(
    file: Annotated[Path, typer.Argument(help="Limit sheet (TOML).", dir_okay=False)], as_json: AsJson = False
) -> None:
    """Check a limit sheet: every fault at once, with file, key, value and rule."""
    import json

    from linetest.limits import load_sheet

    sheet = load_sheet(file)
    if as_json:
        typer.echo(json.dumps({"file": str(file), "model": sheet.model, "revision": sheet.revision, "ok": True}))
    else:
        typer.echo(f"{file}: {sheet.model} revision {sheet.revision} is in order")


@app.command("show")
def show_limits(
    model: Annotated[str, typer.Argument(help="Model, such as BW-Q4.")],
    u_db: Annotated[
        float | None, typer.Option("--u-db", help="Standard uncertainty of Eb/N0 to plan for, dB.", min=0.0)
    ] = None,
    chart: Annotated[
        Path | None, typer.Option("--chart", help="Write a chart (SVG) here.", dir_okay=False, show_default=False)
    ] = None,
    limits: LimitsFolder = None,
    as_json: AsJson = False,
) -> None:
    """Show each step: theory, limit, plan, exact risks, and bits and seconds for a good, a borderline and a bad unit.

    The chart compares the limit with a symbol-by-symbol simulation of an ideal unit.
    """
    import json

    from linetest.cli.files import write_whole
    from linetest.errors import SettingsError
    from linetest.limits import load_model
    from linetest.settings import load_settings

    settings = load_settings({"limits_folder": str(limits) if limits else None})
    sheet = load_model(model, settings.limits_folder)
    rows = [
        _step_row(sheet, check, nominal, check.max_u_db if u_db is None else u_db)
        for check in sheet.procedure.ber
        for nominal in check.steps
    ]
    if as_json:
        typer.echo(json.dumps(rows, indent=2))
    else:
        _print_steps(sheet, rows)
    if chart is not None:
        try:
            write_whole(chart, draw_chart(sheet))
        except OSError as reason:
            raise SettingsError(f"the chart {chart} cannot be written: {reason.strerror}") from reason
        if not as_json:
            typer.echo(f"chart written to {chart}")


def _step_row(sheet: LimitSheet, check: BerCheck, nominal_ebn0_db: float, u_db: float) -> dict[str, Any]:
    from linetest.limits import derive_step

    limit: StepLimit = derive_step(
        sheet, check, nominal_ebn0_db, ebn0_db=nominal_ebn0_db, u_db=u_db, shortest_gate_s=PLANNED_GATE_S
    )
    plan = limit.guarded.plan
    rates = {
        "good": plan.good_ber,
        "borderline": (plan.good_ber * plan.limit_ber) ** 0.5,
        "bad": plan.limit_ber,
    }
    bits = {name: plan.expected_bits(ber) for name, ber in rates.items()}
    return limit.derivation | {
        "expected_bits": bits,
        "expected_s": {name: count / limit.bit_rate_bps for name, count in bits.items()},
    }


def _print_steps(sheet: LimitSheet, rows: list[dict[str, Any]]) -> None:
    from rich.console import Console
    from rich.table import Table

    # Narrower than this a number would be cut, which is worse than a wrapped line.
    console = Console(highlight=False)
    console.width = max(console.width, 116)
    console.print(f"{sheet.model} revision {sheet.revision}: {sheet.title}", style="bold", markup=False)
    table = Table(
        "Eb/N0\ndB",
        "theory\nBER",
        "limit\nBER",
        "guarded\nlimit",
        "w in/out\ndB",
        "risk at margin\n/ design loss",
        "good unit\nbits, s",
        "borderline\nbits, s",
        "bad unit\nbits, s",
        "most\nbits",
        box=None,
        pad_edge=False,
    )
    for row in rows:
        spent = [
            f"{row['expected_bits'][kind]:.2e}\n{row['expected_s'][kind]:.3f}" for kind in ("good", "borderline", "bad")
        ]
        table.add_row(
            f"{row['ebn0_db']:.2f}",
            f"{row['theory_ber']:.2e}",
            f"{row['limit_ber']:.2e}",
            f"{row['guarded_limit_ber']:.2e}",
            f"{row['guard_consumer_db']:.3f}\n{row['guard_producer_db']:.3f}",
            f"{row['averaged_consumer_risk']:.2%}\n{row['averaged_producer_risk']:.2%}",
            *spent,
            f"{row['max_bits']:.2e}",
        )
    console.print(table)
    good_s = sum(row["expected_s"]["good"] for row in rows)
    worst_s = sum(row["expected_s"]["borderline"] for row in rows)
    console.print(f"counting time of a unit: good {good_s:.2f} s, borderline in every step {worst_s:.2f} s")


def draw_chart(sheet: LimitSheet) -> str:
    """Theory and limit of a sheet's first check, and an ideal unit simulated symbol by symbol where it is uncoded.

    BPSK stands beside QPSK at the same Eb/N0: both have the same bit error rate.

    Args:
        sheet: The sheet.

    Returns:
        SVG text.
    """
    from linetest.charts import ber_chart, theory_curve

    check = sheet.procedure.ber[0]
    scheme = sheet.mode(check.mode).scheme
    simulated = scheme in {"bpsk", "qpsk"}
    low_db = 0.0 if simulated else check.steps[0] - 0.5
    high_db = max(check.steps[-1], 10.0 if simulated else 0.0) + 0.5
    curves = [
        theory_curve(scheme, low_db, high_db),
        theory_curve(
            scheme,
            low_db,
            high_db,
            loss_db=check.margin_db,
            kind="limit",
            name=f"limit: theory + {check.margin_db:g} dB",
        ),
    ]
    points = [*_simulated("qpsk"), *_simulated("bpsk")] if simulated else []
    title = f"{sheet.model}: theory, limit" + (" and simulated QPSK (dots) and BPSK (hollow)" if simulated else "")
    return ber_chart(curves, points, title=title, interval_level=SIMULATED_LEVEL, standalone=True)


def _simulated(scheme: str) -> list[BerPoint]:
    import numpy as np

    from linetest.bench import UnitTruth, count_by_symbols, model_truth
    from linetest.charts import BerPoint
    from linetest.decision import interval

    ideal = UnitTruth(serial="", inner_serial="", model=model_truth(scheme))
    rng = np.random.default_rng(SIMULATION_SEED)
    bits = SIMULATED_SYMBOLS * (2 if scheme == "qpsk" else 1)
    points = []
    for ebn0_db in range(11):
        errors = int(count_by_symbols(ideal, SIMULATED_SYMBOLS, float(ebn0_db), rng).sum())
        low, high = interval(bits, errors, SIMULATED_LEVEL)
        mark = "ACCEPT" if scheme == "qpsk" else "none"
        points.append(BerPoint(float(ebn0_db), bits, errors, low, high, judgement=mark))
    return points
