"""The page of the line's yield: one self-contained HTML file."""

from __future__ import annotations

from pathlib import Path

from jinja2 import Environment, FileSystemLoader, StrictUndefined
from markupsafe import Markup

from linetest.charts import CHART_STYLE, yield_chart
from linetest.charts import YieldRow as Bar
from linetest.trends.first_pass import YieldReport, YieldRow


def render_yield_page(report: YieldReport, *, templates_folder: Path) -> str:
    """Render the page.

    Args:
        report: The report.
        templates_folder: Folder of page templates.

    Returns:
        HTML text.
    """
    environment = Environment(
        loader=FileSystemLoader(templates_folder), autoescape=True, undefined=StrictUndefined, trim_blocks=True
    )
    charts = {kind: _chart(kind, rows) for kind, rows in report.groups.items() if rows}
    return (
        environment.get_template("yield.html").render(report=report, charts=charts, chart_style=Markup(CHART_STYLE))
        + "\n"
    )


def _chart(kind: str, rows: tuple[YieldRow, ...]) -> Markup:
    bars = [Bar(row.name, row.passed, row.units, row.low, row.high) for row in rows]
    drawn = yield_chart(bars, title=f"First-pass yield by {kind}", ident=f"yield-{kind}")
    return Markup(drawn)  # noqa: S704  (our own SVG, every text in it escaped)
