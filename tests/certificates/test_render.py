"""Certificate and report as files."""

from __future__ import annotations

import re
import time
from dataclasses import replace
from datetime import timedelta
from html.parser import HTMLParser
from pathlib import Path, PurePosixPath, PureWindowsPath

import pytest
from hypothesis import given
from hypothesis import strategies as st

from linetest.certificates import certificate_file_name, render_certificate, render_report
from linetest.errors import CertificateError
from linetest.records import JudgementRecord
from linetest.settings import shipped_folder
from tests.certificates.sample import failed_run, passed_run, step_facts

TEMPLATES = shipped_folder("templates")
HOSTILE = '"><script>window.pwned=1</script><img src=x onerror="window.pwned=1">\'/../\u202e&amp;'
MAY_NOT_OCCUR = {"script", "img", "iframe", "object", "embed", "link", "form", "base", "audio", "video", "a"}


class Reader(HTMLParser):
    """Tags, attributes and visible words of a page."""

    def __init__(self) -> None:
        super().__init__()
        self.tags: list[str] = []
        self.attributes: list[tuple[str, str | None]] = []
        self.words = ""
        self._silent = 0

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        self.attributes += attrs
        self.words += " " if tag in {"td", "th", "br", "dt", "dd", "p"} else ""
        self._silent += tag in {"style", "title", "desc"}

    def handle_endtag(self, tag: str) -> None:
        self._silent -= tag in {"style", "title", "desc"}

    def handle_data(self, data: str) -> None:
        if not self._silent:
            self.words += data


def read(page: str) -> Reader:
    reader = Reader()
    reader.feed(page)
    reader.words = re.sub(r"\s+", " ", reader.words)
    return reader


def certificate() -> str:
    return render_certificate(passed_run(), templates_folder=TEMPLATES)


def test_the_same_record_gives_the_same_bytes(monkeypatch: pytest.MonkeyPatch) -> None:
    first = certificate()
    monkeypatch.setattr(time, "time", lambda: 4e9)
    assert certificate() == first


def test_identity_disposition_and_every_reading_are_there() -> None:
    said = read(certificate()).words
    for part in ("Certificate of test", "BW-Q4 BQ4-000123", "PASS", "2.4.1", "L2601", "A1", "M. Okafor", "revision 3"):
        assert part in said
    for part in ("12.00 V", "0.553 A – 0.4 to 0.7", "−20.13 dBm 0.12 −22 to −18", "0.080 s – at most 2", "22 528 21"):
        assert part in said.replace("\u202f", " ")


def test_instruments_calibration_and_cautions_are_there() -> None:
    said = read(certificate()).words
    for part in ("power meter", "34711", "2026-08-31", "CAL-2025-0317", "cal-0197f3a1", "10.000 MHz", "not required"):
        assert part in said
    for part in (
        "into rated loads",
        "radiating needs a licence",
        "RF power and DC supplies",
        "hot",
        "electrostatic",
        "Local codes",
    ):
        assert part in said


def test_the_decision_rule_is_said_with_its_three_kinds_of_numbers() -> None:
    """ISO/IEC 17025:2017, 7.8.6: a statement of conformity names its decision rule and the risk it takes."""
    said = read(certificate()).words.replace("\u202f", " ")
    assert "(a) counting risk: accept, at guarded limit" in said
    assert "0.49 % 0.99 % 0.25 %" in said
    assert "0.058 1.98 least 0.032, 0.021" in said
    assert (
        "this is the chance that a unit whose loss equals the margin would have been accepted, "
        "not the chance that this unit is bad" in said
    )
    assert "The results relate only to the unit named above" in said


def test_nothing_in_the_file_can_run_or_fetch() -> None:
    reader = read(certificate())
    assert not MAY_NOT_OCCUR & set(reader.tags)
    assert not [name for name, _ in reader.attributes if name.startswith("on") or name in {"href", "src", "style"}]
    policy = (
        dict(reader.attributes)["content"] if ("http-equiv", "Content-Security-Policy") in reader.attributes else ""
    )
    contents = [value or "" for name, value in reader.attributes if name == "content"]
    (policy,) = [value for value in contents if "default-src" in value]
    assert policy.startswith("default-src 'none'; style-src 'sha256-")
    assert "unsafe" not in policy
    assert "http" not in certificate().replace("http://www.w3.org/2000/svg", "").replace("http-equiv", "")


@pytest.mark.parametrize(
    "field", ["run_id", "serial", "model", "lot", "station", "operator", "firmware", "sheet_revision"]
)
def test_hostile_text_in_any_field_stays_text(field: str) -> None:
    page = render_certificate(passed_run(**{field: HOSTILE}), templates_folder=TEMPLATES)
    reader = read(page)
    assert not MAY_NOT_OCCUR & set(reader.tags)
    assert "\u202e" not in page
    assert "<script>window.pwned=1</script>" in reader.words
    assert "<U+202E>" in reader.words


def test_hostile_text_of_instruments_readings_and_judgements_stays_text() -> None:
    run = passed_run()
    run = replace(
        run,
        instruments=tuple(
            replace(used, identity=HOSTILE, serial=HOSTILE, certificate=HOSTILE) for used in run.instruments
        ),
        readings=tuple(replace(item, name=HOSTILE, value=HOSTILE, unit=HOSTILE) for item in run.readings),
        judgements=tuple(replace(item, check=HOSTILE, sentence=HOSTILE) for item in run.judgements),
    )
    page = render_certificate(run, templates_folder=TEMPLATES)
    assert not MAY_NOT_OCCUR & set(read(page).tags)
    assert "\u202e" not in page


def test_a_text_cannot_break_out_of_the_style_sheet() -> None:
    page = render_certificate(passed_run(serial='x"}</style><b>{'), templates_folder=TEMPLATES)
    assert page.count("</style>") == 1
    assert "b" not in read(page.split("</style>", maxsplit=1)[0]).tags


def test_two_checks_give_two_pictures_with_their_own_identifiers() -> None:
    other = JudgementRecord("ber coded", 1, "ACCEPT", "", {**step_facts(6.8, 6.8, 22_528, 21, 25.0), "scheme": "bpsk"})
    page = render_certificate(passed_run(judgements=(*passed_run().judgements, other)), templates_folder=TEMPLATES)
    identifiers = re.findall(r' id="([^"]+)"', page)
    assert len(identifiers) == len(set(identifiers)) == 6
    assert "Bit error rate against Eb/N0: ber coded" in page


def test_a_failed_run_gets_a_report_and_no_certificate() -> None:
    with pytest.raises(CertificateError, match="is FAIL: only a PASS is certified; a report can be printed"):
        render_certificate(failed_run(), templates_folder=TEMPLATES)
    said = read(render_report(failed_run(), templates_folder=TEMPLATES)).words
    assert "Test report" in said
    assert "ertificate of test" not in said
    assert "FAIL" in said
    assert "not shown inside the guarded limit" in said


def test_a_void_run_without_steps_gets_a_report_without_a_picture() -> None:
    run = passed_run(
        disposition="VOID", sentence="the power meter did not answer", judgements=(), readings=(), calibration=None
    )
    reader = read(render_report(run, templates_folder=TEMPLATES))
    assert "the power meter did not answer" in reader.words
    assert "svg" not in reader.tags


def test_an_open_run_has_no_report() -> None:
    with pytest.raises(CertificateError, match="still open: there is nothing to report yet"):
        render_report(passed_run(disposition="", ended_at=None), templates_folder=TEMPLATES)


def test_an_unknown_scheme_on_record_is_one_clear_sentence() -> None:
    facts = {**step_facts(6.8, 6.79, 22_528, 21, 25.0), "scheme": "semaphore"}
    run = passed_run(judgements=(JudgementRecord("ber", 1, "ACCEPT", "", facts),))
    with pytest.raises(CertificateError, match="ber cannot be drawn"):
        render_certificate(run, templates_folder=TEMPLATES)


@given(st.text(max_size=200), st.text(max_size=200))
def test_a_file_name_is_one_safe_component_on_any_system(serial: str, run_id: str) -> None:
    """Judged by pathlib's rules for both families of systems."""
    name = certificate_file_name(passed_run(serial=serial, run_id=run_id))
    assert PurePosixPath(name).name == PureWindowsPath(name).name == name
    assert re.fullmatch(r"[A-Za-z0-9_~-]+\.html", name)
    assert not name.startswith(("-", ".")) or serial.startswith("-")
    assert len(name) <= 160


def test_file_names_tell_units_apart_and_stay_plain_where_they_can() -> None:
    assert certificate_file_name(passed_run()) == "BQ4-000123-0197f3b2c4d8.html"
    names = {certificate_file_name(passed_run(serial=serial)) for serial in ("a/b", "a_b", "a\\b", "../a_b", "")}
    assert len(names) == 5


def test_a_later_run_of_the_same_unit_has_its_own_file() -> None:
    first, second = (
        passed_run(),
        passed_run(run_id="0197f3b2ffff", started_at=passed_run().started_at + timedelta(hours=1)),
    )
    assert certificate_file_name(first) != certificate_file_name(second)


def test_a_certificate_is_small() -> None:
    """The same content with a general plotting library's picture takes more than twice as much (60 KB)."""
    assert len(certificate().encode()) < 28_000


def test_templates_ship_with_the_package() -> None:
    assert {"certificate.html", "yield.html", "page.css"} <= {path.name for path in Path(TEMPLATES).iterdir()}
