"""The page around the content: one file, no script, nothing fetched, every text escaped."""

from __future__ import annotations

import base64
import hashlib
import re
from collections.abc import Mapping
from functools import lru_cache
from pathlib import Path
from typing import Any

from jinja2 import Environment, FileSystemLoader, StrictUndefined, TemplateError
from markupsafe import Markup

from linetest.certificates import words
from linetest.charts import CHART_STYLE, visible
from linetest.errors import SettingsError


def render_page(template: str, templates_folder: Path, content: Mapping[str, Any], *, foot: str = "") -> str:
    """Render a template as one self-contained HTML file.

    The page's policy allows the one style sheet inside it, by digest, and nothing else: even markup that slipped
    through could neither run nor fetch.

    Args:
        template: File name of the template.
        templates_folder: Folder of page templates, with ``page.css``.
        content: What the template prints.
        foot: Text at the foot of every printed page.

    Returns:
        HTML text that ends with a line feed.

    Raises:
        SettingsError: The template or the style sheet cannot be read or used.
    """
    try:
        environment, style = _environment(templates_folder)
        css = style + _foot_style(foot)
        digest = base64.b64encode(hashlib.sha256(css.encode()).digest()).decode()
        policy = f"default-src 'none'; style-src 'sha256-{digest}'; base-uri 'none'; form-action 'none'"
        css_markup = Markup(css)  # noqa: S704  (our own style sheet; the foot is escaped for CSS)
        return environment.get_template(template).render(css=css_markup, policy=policy, **content) + "\n"
    except TemplateError as reason:
        raise SettingsError(
            f"the page template {template} in {templates_folder} cannot be used: {type(reason).__name__}: {reason}"
        ) from reason
    except (OSError, UnicodeDecodeError) as reason:
        raise SettingsError(f"the page templates in {templates_folder} cannot be read: {reason}") from reason


@lru_cache(maxsize=4)
def _environment(templates_folder: Path) -> tuple[Environment, str]:
    """Templates of a folder, read and compiled once: compiling costs ten times what rendering does."""
    environment = Environment(
        loader=FileSystemLoader(templates_folder),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        auto_reload=False,
        finalize=words.shown,
    )
    environment.filters.update(
        decimals=words.decimals,
        grouped=words.grouped,
        percent=words.percent,
        rate=words.rate,
        utc=words.utc,
    )
    style = (templates_folder / "page.css").read_text(encoding="utf-8") + CHART_STYLE
    return environment, style.replace("\r\n", "\n")


def _foot_style(text: str) -> str:
    """Style that prints a text at the foot of every page, as a CSS string that no text can break out of."""
    if not text:
        return ""
    escaped = re.sub(r"[^A-Za-z0-9 .,:_-]", lambda found: f"\\{ord(found.group()):06x}", visible(text))
    return f'@page{{@bottom-left{{content:"{escaped}"}}}}\n'
