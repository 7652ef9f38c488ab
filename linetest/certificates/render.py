"""A run's certificate or report as one self-contained HTML file, made from the record only.

No clock, no random number, no network: the same record gives the same bytes.
"""

from __future__ import annotations

import hashlib
import re
from pathlib import Path

from markupsafe import Markup

from linetest.certificates.content import (
    BerCheck,
    Step,
    ber_checks,
    check_certifiable,
    check_rows,
    guard_rules,
    overall_sentence,
)
from linetest.certificates.page import render_page
from linetest.charts import BerPoint, ber_chart, ber_range_db, theory_curve
from linetest.errors import CertificateError, ParameterError
from linetest.records import RunRecord

CERTIFICATE, REPORT = "Certificate of test", "Test report"
LONGEST_NAME = 64


def render_certificate(run: RunRecord, *, templates_folder: Path) -> str:
    """The certificate of a passed run.

    Args:
        run: The run.
        templates_folder: Folder of page templates.

    Returns:
        HTML text, one file without script and without outside references.

    Raises:
        CertificateError: The run did not pass, or its record lacks or contradicts what a certificate must say.
        SettingsError: The templates cannot be used.
    """
    check_certifiable(run)
    return _render(run, CERTIFICATE, templates_folder)


def render_report(run: RunRecord, *, templates_folder: Path) -> str:
    """The report of any closed run, with the same content under another title.

    Args:
        run: The run.
        templates_folder: Folder of page templates.

    Returns:
        HTML text, one file without script and without outside references.

    Raises:
        CertificateError: The run is still open, or its record contradicts itself.
        SettingsError: The templates cannot be used.
    """
    if not run.disposition:
        raise CertificateError(f"run {run.run_id} of {run.serial} is still open: there is nothing to report yet")
    return _render(run, REPORT, templates_folder)


def certificate_file_name(run: RunRecord) -> str:
    """File name of a run's certificate: serial and run, with nothing a file system could trip over.

    Args:
        run: The run.

    Returns:
        The name; a serial that had to be changed carries a digest, so that two serials never share a name.
    """
    return f"{_safe(run.serial)}-{_safe(run.run_id)}.html"


def _safe(text: str) -> str:
    kept = re.sub(r"[^A-Za-z0-9_-]", "_", text)[:LONGEST_NAME]
    return kept if kept == text and kept else f"{kept}~{hashlib.sha256(text.encode(errors='replace')).hexdigest()[:8]}"


def _render(run: RunRecord, title: str, templates_folder: Path) -> str:
    checks = ber_checks(run)
    content = {
        "title": title,
        "run": run,
        "conclusion": overall_sentence(run, checks),
        "checks": [(check, _chart(run, index, check)) for index, check in enumerate(checks, start=1)],
        "groups": check_rows(run),
        "rules": guard_rules(checks),
    }
    return render_page("certificate.html", templates_folder, content, foot=f"{title}, {run.model} {run.serial}")


def _chart(run: RunRecord, index: int, check: BerCheck) -> Markup:
    facts = check.facts
    scheme, margin_db = facts["scheme"], float(facts["margin_db"])
    try:
        points = [_point(step) for step in check.steps]
        low_db, high_db = ber_range_db(points)
        limit_name = f"limit: theory + {margin_db:g} dB"
        curves = [
            theory_curve(scheme, low_db, high_db, name=f"theory, {scheme.upper()}"),
            theory_curve(scheme, low_db, high_db, loss_db=margin_db, kind="limit", name=limit_name),
        ]
        drawn = ber_chart(
            curves,
            points,
            title=f"Bit error rate of {run.serial}, {check.name}",
            ident=f"ber-{index}",
            interval_level=facts["interval_level"],
        )
    except ParameterError as reason:
        raise CertificateError(f"run {run.run_id} of {run.serial}, {check.name} cannot be drawn: {reason}") from reason
    return Markup(drawn)  # noqa: S704  (our own SVG, every text in it escaped)


def _point(step: Step) -> BerPoint:
    facts = step.facts
    return BerPoint(
        ebn0_db=facts["ebn0_db"],
        bits=facts["bits"],
        errors=facts["errors"],
        low=facts["interval_low"],
        high=facts["interval_high"],
        expanded_u_db=facts["expanded_u_db"],
        name=str(step.number),
        judgement=step.judgement,
        guarded_limit_ber=facts["guarded_limit_ber"],
        estimate=facts["ber"],
    )
