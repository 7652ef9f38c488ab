"""The yield page as a quality engineer sees it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest

from linetest.settings import shipped_folder
from linetest.trends import first_pass_yield, render_yield_page
from tests.certificates.chromium import A4_POINTS, Browser, chromium, pages_of, paper_of
from tests.trends.test_first_pass import LINE
from tests.trends.test_page import HOSTILE

pytestmark = pytest.mark.browser


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    with chromium() as opened:
        yield opened


def test_the_page_is_quiet_legible_and_one_sheet_of_a4(browser: Browser, tmp_path: Path) -> None:
    """WCAG 2.1, 1.4.3: contrast at least 4.5."""
    page = render_yield_page(first_pass_yield(LINE), templates_folder=shipped_folder("templates"))
    browser.open(page, tmp_path)
    assert [address.rsplit("/", 1)[-1] for address in browser.requests()] == ["page.html"]
    assert browser.complaints() == []
    for scheme in ("light", "dark"):
        browser.see_as(scheme=scheme)
        assert browser.contrasts()[0][0] >= 4.5, browser.contrasts()[:5]
    pdf = browser.printed()
    assert pages_of(pdf) == 1
    assert paper_of(pdf) == pytest.approx(A4_POINTS, abs=1.0)


def test_hostile_lots_stations_and_causes_are_inert(browser: Browser, tmp_path: Path) -> None:
    runs = [replace(item, lot=HOSTILE, station=HOSTILE, cause=HOSTILE) for item in LINE]
    page = render_yield_page(first_pass_yield(runs), templates_folder=shipped_folder("templates"))
    browser.open(page, tmp_path)
    assert browser.ask("return window.pwned === undefined")
    assert browser.ask("return document.querySelectorAll('script,img').length") == 0
    assert browser.requests()[1:] == []
    assert browser.complaints() == []
