"""A run's certificate as one self-contained HTML file, made from the record only.

No clock, no random number, no network: the same record gives the same bytes.
"""

from __future__ import annotations

import re
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from jinja2 import Environment, FileSystemLoader, StrictUndefined
from markupsafe import Markup

from linetest.charts import CHART_STYLE, BerPoint, ber_chart, ber_range_db, theory_curve
from linetest.errors import CertificateError
from linetest.records import JudgementRecord, ReadingRecord, RunRecord

CERTIFICATE, REPORT = "Certificate of test", "Test report"


def render_certificate(run: RunRecord, *, templates_folder: Path) -> str:
    """The certificate of a passed run.

    Args:
        run: The run.
        templates_folder: Folder of page templates.

    Returns:
        HTML text.

    Raises:
        CertificateError: The run did not pass, or its record lacks what a certificate must say.
    """
    if run.disposition != "PASS":
        raise CertificateError(
            f"run {run.run_id} of {run.serial} is {run.disposition or 'still open'}: only a PASS is certified"
        )
    steps = [judgement for judgement in run.judgements if judgement.step is not None]
    if not steps or run.calibration is None or not run.instruments:
        raise CertificateError(
            f"run {run.run_id} of {run.serial} has no bit error steps, instruments or noise calibration on record"
        )
    return _render(run, steps, CERTIFICATE, templates_folder)


def render_report(run: RunRecord, *, templates_folder: Path) -> str:
    """The report of any closed run, with the same content under another title.

    Args:
        run: The run.
        templates_folder: Folder of page templates.

    Returns:
        HTML text.

    Raises:
        CertificateError: The run is still open.
    """
    if not run.disposition:
        raise CertificateError(f"run {run.run_id} of {run.serial} is still open: there is nothing to report yet")
    steps = [j for j in run.judgements if j.step is not None and j.facts]
    return _render(run, steps, REPORT, templates_folder)


def certificate_file_name(run: RunRecord) -> str:
    """File name of a run's certificate: serial and run, with nothing a file system could trip over.

    Args:
        run: The run.

    Returns:
        The name.
    """
    safe = re.sub(r"[^A-Za-z0-9._-]", "_", run.serial).lstrip(".")
    return f"{safe}-{re.sub(r'[^A-Za-z0-9-]', '_', run.run_id)}.html"


def _render(run: RunRecord, steps: list[JudgementRecord], title: str, templates_folder: Path) -> str:
    environment = Environment(
        loader=FileSystemLoader(templates_folder),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters.update(utc=_utc, rate=_rate, share=_share, grouped=_grouped, number=_number, limits=_limits)
    css = (templates_folder / "page.css").read_text(encoding="utf-8") + CHART_STYLE
    factors = {f"{step.facts['k']:.2f}" for step in steps}
    levels = {f"{step.facts['interval_level'] * 100:g} %" for step in steps}
    return (
        environment.get_template("certificate.html").render(
            title=title,
            css=Markup(css),  # noqa: S704  (our own style sheet)
            run=run,
            steps=steps,
            k=" / ".join(sorted(factors)),
            level=" / ".join(sorted(levels)),
            bursts=any(step.facts["burst_weights"] != [[1, 1.0]] for step in steps),
            chart=_chart(run, steps) if steps else "",
        )
        + "\n"
    )


def _chart(run: RunRecord, steps: list[JudgementRecord]) -> Markup:
    facts = steps[0].facts
    scheme, margin_db = str(facts["scheme"]), float(facts["margin_db"])
    points = [_point(step) for step in steps]
    low_db, high_db = ber_range_db(points)
    curves = [
        theory_curve(scheme, low_db, high_db),
        theory_curve(
            scheme, low_db, high_db, loss_db=margin_db, kind="limit", name=f"limit: theory + {margin_db:g} dB"
        ),
    ]
    title = f"Bit error rate of {run.serial}"
    return Markup(ber_chart(curves, points, title=title, interval_level=facts["interval_level"]))  # noqa: S704  (our own SVG, every text in it escaped)


def _point(step: JudgementRecord) -> BerPoint:
    facts = step.facts
    return BerPoint(
        ebn0_db=facts["ebn0_db"],
        bits=facts["bits"],
        errors=facts["errors"],
        low=facts["interval_low"],
        high=facts["interval_high"],
        expanded_u_db=facts["expanded_u_db"],
        name=str(step.step),
        judgement=step.judgement,
        guarded_limit_ber=facts["guarded_limit_ber"],
        estimate=facts["median_unbiased_ber"],
    )


def _utc(at: datetime) -> str:
    return f"{at.astimezone(UTC):%Y-%m-%d %H:%M:%S} UTC"


def _rate(value: float) -> str:
    return "0" if value == 0.0 else f"{value:.2e}"


def _share(value: float) -> str:
    return f"{value * 100:.2f} %"


def _grouped(value: int) -> str:
    return f"{value:,}".replace(",", "\u202f")


def _number(value: Any) -> str:
    if isinstance(value, str):
        return value
    if float(value).is_integer() and abs(value) >= 1000:
        return _grouped(int(value))
    return f"{value:.4g}" if abs(value) < 1000 else f"{value:.1f}"


def _limits(reading: ReadingRecord) -> str:
    low = "" if reading.lower is None else f"{reading.lower:g}"
    high = "" if reading.upper is None else f"{reading.upper:g}"
    if low and high:
        return f"{low} … {high}"
    return f"≥ {low}" if low else f"≤ {high}" if high else "–"
