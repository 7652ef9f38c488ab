"""The page of the line's yield: one self-contained HTML file."""

from __future__ import annotations

from pathlib import Path

from markupsafe import Markup

from linetest.certificates import render_page
from linetest.charts import YieldRow as ChartRow
from linetest.charts import bar_chart, yield_chart
from linetest.trends.first_pass import YieldReport, YieldRow


def render_yield_page(report: YieldReport, *, templates_folder: Path) -> str:
    """Render the page.

    Args:
        report: The report.
        templates_folder: Folder of page templates.

    Returns:
        HTML text, one file without script and without outside references.

    Raises:
        SettingsError: The templates cannot be used.
    """
    days = report.groups.get("day", ())
    content = {
        "report": report,
        "charts": [(kind, _chart(kind, rows, report.total)) for kind, rows in report.groups.items() if rows],
        "rejects": _rejects(report),
        "span": " to ".join(dict.fromkeys((days[0].name, days[-1].name))) if days else "",
    }
    return render_page("yield.html", templates_folder, content, foot="First-pass yield")


def _chart(kind: str, rows: tuple[YieldRow, ...], total: YieldRow | None) -> Markup:
    drawn = yield_chart(
        [_drawn(row) for row in rows],
        overall=None if total is None else _drawn(total),
        title=f"First-pass yield by {kind}",
        ident=f"yield-{kind}",
    )
    return Markup(drawn)  # noqa: S704  (our own SVG, every text in it escaped)


def _drawn(row: YieldRow) -> ChartRow:
    return ChartRow(row.name, row.passed, row.units, row.low, row.high)


def _rejects(report: YieldReport) -> Markup:
    """Bars of the causes, most frequent first, each with its count and the share of all up to it."""
    total = sum(count for _, count in report.rejects)
    rows, so_far = [], 0
    for cause, count in report.rejects:
        so_far += count
        rows.append((cause or "not stated", float(count), f"{count}, together {100.0 * so_far / total:.0f} %"))
    if not rows:
        return Markup("")
    drawn = bar_chart(rows, title="Units that did not pass at first, by cause", ident="rejects")
    return Markup(drawn)  # noqa: S704  (our own SVG, every text in it escaped)
