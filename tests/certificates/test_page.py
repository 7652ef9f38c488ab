"""The page around the content."""

from __future__ import annotations

import base64
import hashlib
import re
from pathlib import Path

import pytest

from linetest.certificates import render_page
from linetest.errors import SettingsError


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "page.css").write_text("p{color:#000}\n", encoding="utf-8")
    page = '<meta content="{{ policy }}"><style>{{ css }}</style><p title="{{ text }}">{{ text }}</p>'
    (tmp_path / "plain.html").write_text(page, encoding="utf-8")
    return tmp_path


def test_the_policy_names_the_style_by_its_digest(folder: Path) -> None:
    """CSP level 3: the digest is of the exact text between the style tags."""
    page = render_page("plain.html", folder, {"text": "x"}, foot="Ünit <1>")
    (style,) = re.findall(r"<style>(.*?)</style>", page, re.DOTALL)
    digest = base64.b64encode(hashlib.sha256(style.encode()).digest()).decode()
    assert f"&#39;sha256-{digest}&#39;" in page
    assert r"\0000dcnit \00003c1\00003e" in style


def test_values_are_escaped_and_made_visible(folder: Path) -> None:
    page = render_page("plain.html", folder, {"text": '<i>"\u202e'})
    assert '<p title="&lt;i&gt;&#34;&lt;U+202E&gt;">&lt;i&gt;&#34;&lt;U+202E&gt;</p>' in page


def test_a_missing_folder_or_template_is_one_clear_sentence(tmp_path: Path, folder: Path) -> None:
    with pytest.raises(SettingsError, match=r"page templates in .* cannot be read"):
        render_page("plain.html", tmp_path / "nowhere", {})
    with pytest.raises(SettingsError, match=r"absent\.html .* cannot be used: TemplateNotFound"):
        render_page("absent.html", folder, {})


def test_a_template_that_asks_for_what_is_not_there_is_refused(folder: Path) -> None:
    with pytest.raises(SettingsError, match="UndefinedError: 'text' is undefined"):
        render_page("plain.html", folder, {})
