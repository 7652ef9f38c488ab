"""A sound limit sheet as text, and a way to write it with something changed."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

SHIPPED = Path(__file__).resolve().parents[2] / "limits"

WriteSheet = Callable[..., Path]


@pytest.fixture
def write_sheet(tmp_path: Path) -> WriteSheet:
    """Writes the BW-Q4's sheet with pieces of its text replaced; returns the file."""

    def write(*changes: tuple[str, str], name: str = "bw-q4.toml", base: str = "bw-q4.toml") -> Path:
        text = (SHIPPED / base).read_text(encoding="utf-8")
        for old, new in changes:
            assert text.count(old) >= 1, f"the sheet no longer holds {old!r}"
            text = text.replace(old, new, 1)
        file = tmp_path / name
        file.write_text(text, encoding="utf-8")
        return file

    return write
