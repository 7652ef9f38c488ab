"""A headless Chromium for looking at pages, watched: what it asks the network for and what it complains about."""

from __future__ import annotations

import base64
import json
import os
import re
import shutil
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import pytest
from selenium import webdriver
from selenium.webdriver.chrome.options import Options
from selenium.webdriver.chrome.service import Service

ARGUMENTS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--window-size=1000,1300",
)
A4_POINTS = (595.28, 841.89)

# Contrast (WCAG 2.1) of every text with what lies behind it, least first.
CONTRAST_SCRIPT = """
const lum = c => { const v = c.map(x => { x /= 255; return x <= 0.03928 ? x / 12.92 : ((x + 0.055) / 1.055) ** 2.4; });
  return 0.2126 * v[0] + 0.7152 * v[1] + 0.0722 * v[2]; };
const rgb = text => (text.match(/[\\d.]+/g) || []).map(Number);
const ground = element => { for (let e = element; e; e = e.parentElement) {
  const c = rgb(getComputedStyle(e).backgroundColor); if (c.length === 3 || c[3] > 0.99) return c.slice(0, 3); }
  return [255, 255, 255]; };
const found = [];
for (const element of document.body.querySelectorAll('*')) {
  if (['STYLE', 'title', 'desc'].includes(element.tagName)) continue;
  const own = [...element.childNodes].filter(n => n.nodeType === 3 && n.data.trim()).map(n => n.data.trim()).join(' ');
  if (!own) continue;
  const style = getComputedStyle(element);
  const ink = rgb(element instanceof SVGElement ? style.fill : style.color).slice(0, 3);
  const [a, b] = [lum(ink), lum(ground(element))];
  found.push([(Math.max(a, b) + 0.05) / (Math.min(a, b) + 0.05), own.slice(0, 40)]);
}
return found.sort((x, y) => x[0] - y[0]);
"""


class Browser:
    """A page in a watched browser."""

    def __init__(self, driver: webdriver.Chrome) -> None:
        self.driver = driver

    def open(self, page: str, folder: Path) -> None:
        """Open a page from a file, as a customer does."""
        path = folder / "page.html"
        path.write_text(page, encoding="utf-8")
        self.driver.get("about:blank")  # so that nothing of the page before, or of the browser's own, is counted
        for kind in ("performance", "browser"):
            self._log(kind)
        self.driver.get(path.as_uri())

    def _log(self, kind: str) -> list[dict[str, Any]]:
        """Entries of one of the browser's logs since it was last asked."""
        entries: list[dict[str, Any]] = self.driver.execute("getLog", {"type": kind})["value"]
        return entries

    def requests(self) -> list[str]:
        """Address of everything asked for since the page was opened."""
        messages = [json.loads(entry["message"])["message"] for entry in self._log("performance")]
        return [
            message["params"]["request"]["url"]
            for message in messages
            if message["method"] == "Network.requestWillBeSent"
        ]

    def complaints(self) -> list[str]:
        """What the console says."""
        return [entry["message"] for entry in self._log("browser")]

    def see_as(self, *, media: str = "screen", scheme: str = "light") -> None:
        """Screen or print, light or dark."""
        features = [{"name": "prefers-color-scheme", "value": scheme}]
        self.driver.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": media, "features": features})

    def contrasts(self) -> list[tuple[float, str]]:
        """Contrast and words of every text on the page, least first."""
        return [(ratio, words) for ratio, words in self.driver.execute_script(CONTRAST_SCRIPT)]

    def ask(self, script: str) -> Any:
        """The value of a script run in the page by the driver."""
        return self.driver.execute_script(script)

    def printed(self) -> bytes:
        """The page as PDF on the paper that its own style asks for, by the style for print."""
        self.driver.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": "", "features": []})
        result = self.driver.execute_cdp_cmd("Page.printToPDF", {"preferCSSPageSize": True, "printBackground": True})
        return base64.b64decode(result["data"])


def pages_of(pdf: bytes) -> int:
    """Number of pages of a PDF whose page objects are not compressed."""
    return len(re.findall(rb"/Type\s*/Page\b(?!s)", pdf))


def paper_of(pdf: bytes) -> tuple[float, float]:
    """Width and height of the first page, points."""
    found = re.search(rb"/MediaBox\s*\[\s*0\s+0\s+([\d.]+)\s+([\d.]+)", pdf)
    assert found is not None
    return float(found.group(1)), float(found.group(2))


@contextmanager
def chromium() -> Iterator[Browser]:
    """A browser for as long as the context lasts; where there is none, a failure under CI, else a visible skip."""
    browser = shutil.which("chromium") or shutil.which("chromium-browser")
    driver_path = shutil.which("chromedriver")
    if not browser or not driver_path:
        reason = "no Chromium with chromedriver on this machine: pages were not looked at"
        if os.environ.get("CI"):
            pytest.fail(reason)
        pytest.skip(reason)
    options = Options()
    options.binary_location = browser
    with tempfile.TemporaryDirectory(prefix="linetest-chromium-", ignore_cleanup_errors=True) as profile:
        for argument in (*ARGUMENTS, f"--user-data-dir={profile}"):
            options.add_argument(argument)
        options.set_capability("goog:loggingPrefs", {"performance": "ALL", "browser": "ALL"})
        driver = webdriver.Chrome(options=options, service=Service(executable_path=driver_path))
        try:
            yield Browser(driver)
        finally:
            driver.quit()
