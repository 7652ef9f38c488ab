"""Certificate and report as a customer sees them: on screen by light and dark, and on paper."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest

from linetest.certificates import render_certificate, render_report
from linetest.settings import shipped_folder
from tests.certificates.chromium import A4_POINTS, Browser, chromium, pages_of, paper_of
from tests.certificates.sample import failed_run, passed_run
from tests.certificates.test_render import HOSTILE

pytestmark = pytest.mark.browser

TEMPLATES = shipped_folder("templates")


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    with chromium() as opened:
        yield opened


@pytest.fixture
def certificate(browser: Browser, tmp_path: Path) -> Browser:
    browser.see_as()
    browser.open(render_certificate(passed_run(), templates_folder=TEMPLATES), tmp_path)
    return browser


def test_the_page_asks_for_nothing_and_the_console_is_silent(certificate: Browser) -> None:
    assert [address.rsplit("/", 1)[-1] for address in certificate.requests()] == ["page.html"]
    assert certificate.complaints() == []


def test_the_watch_sees_a_page_that_fetches_and_errs(browser: Browser, tmp_path: Path) -> None:
    """The two checks above can fail: a planted page trips both."""
    browser.open('<script>fetch("file:///nowhere.txt")</script><img src="missing.png">', tmp_path)
    assert len(browser.requests()) > 1
    assert browser.complaints() != []


def test_the_style_is_applied_under_the_policy(certificate: Browser) -> None:
    """A digest that did not match would leave the page without style and complain."""
    assert certificate.ask("return getComputedStyle(document.querySelector('h2')).color") == "rgb(10, 90, 118)"
    assert certificate.ask("return getComputedStyle(document.querySelector('svg .limit')).strokeDasharray") != "none"


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_every_text_can_be_read_by_light_and_dark(certificate: Browser, scheme: str) -> None:
    """WCAG 2.1, 1.4.3: contrast at least 4.5."""
    certificate.see_as(scheme=scheme)
    measured = certificate.contrasts()
    assert len(measured) > 100
    assert measured[0][0] >= 4.5, measured[:5]


def test_dark_is_dark_and_paper_is_white_even_for_a_reader_of_dark(certificate: Browser) -> None:
    ground = "return getComputedStyle(document.body).backgroundColor"
    certificate.see_as(scheme="dark")
    assert certificate.ask(ground) == "rgb(20, 28, 33)"
    certificate.see_as(media="print", scheme="dark")
    assert certificate.ask(ground) == "rgb(255, 255, 255)"
    assert certificate.contrasts()[0][0] >= 4.5


def test_a_certificate_is_two_pages_of_a4(certificate: Browser) -> None:
    pdf = certificate.printed()
    assert pages_of(pdf) == 2
    assert paper_of(pdf) == pytest.approx(A4_POINTS, abs=1.0)


def test_no_row_or_picture_is_cut_between_pages(certificate: Browser) -> None:
    certificate.see_as(media="print")
    cut = "getComputedStyle(element).breakInside !== 'avoid'"
    breakable = f"return [...document.querySelectorAll('tr,figure')].filter(element => {cut}).length"
    assert certificate.ask("return document.querySelectorAll('tr').length") > 20
    assert certificate.ask(breakable) == 0
    assert certificate.ask("return getComputedStyle(document.querySelector('thead')).display") == "table-header-group"


@pytest.mark.parametrize("width", [360, 680, 1000])
def test_nothing_runs_off_the_side(certificate: Browser, width: int) -> None:
    """680 CSS pixels are the 180 mm between the margins of A4; 360 a phone, where wide tables scroll on their own."""
    metrics = {"width": width, "height": 1000, "deviceScaleFactor": 1, "mobile": False}
    certificate.driver.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", metrics)
    try:
        wide = certificate.ask("return document.documentElement.scrollWidth - document.documentElement.clientWidth")
    finally:
        certificate.driver.execute_cdp_cmd("Emulation.clearDeviceMetricsOverride", {})
    assert wide <= 0


def test_the_picture_has_a_name_and_a_description_for_those_who_cannot_see_it(certificate: Browser) -> None:
    (name,) = {
        node["name"]["value"]
        for node in certificate.driver.execute_cdp_cmd("Accessibility.getFullAXTree", {})["nodes"]
        if node.get("role", {}).get("value") in {"image", "img"}
    }
    assert name.startswith("Bit error rate of BQ4-000123, ber Curves: theory, QPSK; limit: theory + 1 dB.")


def test_hostile_text_is_inert_and_seen_as_what_it_is(browser: Browser, tmp_path: Path) -> None:
    fields = {"serial": HOSTILE, "operator": HOSTILE, "lot": HOSTILE, "firmware": HOSTILE}
    browser.open(render_certificate(passed_run(**fields), templates_folder=TEMPLATES), tmp_path)
    assert browser.ask("return window.pwned === undefined")
    assert browser.ask("return document.querySelectorAll('script,img').length") == 0
    assert "<script>window.pwned=1</script>" in browser.ask("return document.querySelector('.serial').textContent")
    assert browser.requests()[1:] == []
    assert browser.complaints() == []
    assert pages_of(browser.printed()) <= 3


def test_a_report_of_a_failed_unit_is_two_pages_and_legible(browser: Browser, tmp_path: Path) -> None:
    browser.see_as()
    browser.open(render_report(failed_run(), templates_folder=TEMPLATES), tmp_path)
    assert browser.ask("return document.querySelector('h1').textContent") == "Test report"
    assert pages_of(browser.printed()) == 2
    assert browser.contrasts()[0][0] >= 4.5


def test_a_report_of_a_void_run_is_one_page(browser: Browser, tmp_path: Path) -> None:
    void = replace(
        passed_run(), disposition="VOID", sentence="the power meter did not answer", judgements=(), readings=()
    )
    browser.open(render_report(void, templates_folder=TEMPLATES), tmp_path)
    assert pages_of(browser.printed()) == 1
