"""Imports point one way through the house, and only one room knows VISA."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parent.parent / "linetest"

ROOMS = (
    "errors",
    "units",
    "settings",
    "theory",
    "patterns",
    "decision",
    "limits",
    "instruments",
    "noise",
    "procedure",
    "records",
    "charts",
    "certificates",
    "trends",
    "cli",
)
BENCH_MAY_IMPORT = {"theory", "patterns", "units", "errors", "bench"}
READS_RECORDS_ONLY = {"certificates", "trends"}
NEVER_FOR_THEM = {"instruments", "noise", "procedure"}


def _room(path: Path) -> str:
    relative = path.relative_to(PACKAGE)
    return relative.parts[0].removesuffix(".py")


def _imports(path: Path) -> Iterator[tuple[int, str]]:
    """Every module imported anywhere in a file, also inside functions, with its line."""
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            for name in node.names:
                yield node.lineno, name.name
        elif isinstance(node, ast.ImportFrom):
            module = "." * node.level + (node.module or "")
            if module == "linetest":
                yield from ((node.lineno, f"linetest.{name.name}") for name in node.names)
            else:
                yield node.lineno, module


def _arrows() -> Iterator[tuple[str, str, str]]:
    for path in sorted(PACKAGE.rglob("*.py")):
        room = _room(path)
        for line, module in _imports(path):
            where = f"{path.relative_to(PACKAGE.parent)}:{line}"
            assert not module.startswith("."), f"{where}: relative import"
            parts = module.split(".")
            if parts[0] == "linetest" and len(parts) > 1 and parts[1] not in {"__version__", room}:
                yield where, room, parts[1]


def test_every_folder_of_the_package_is_a_known_room() -> None:
    found = {_room(path) for path in PACKAGE.rglob("*.py")} - {"__init__", "__main__"}
    assert found == {*ROOMS, "bench"}


def test_arrows_point_up_only() -> None:
    wrong = [
        f"{where}: {room} imports {target}"
        for where, room, target in _arrows()
        if room in ROOMS and target in ROOMS and ROOMS.index(target) >= ROOMS.index(room)
    ]
    assert not wrong, "\n".join(wrong)


def test_bench_stands_aside() -> None:
    wrong = [
        f"{where}: {room} imports {target}"
        for where, room, target in _arrows()
        if (room == "bench" and target not in BENCH_MAY_IMPORT) or (target == "bench" and room not in {"cli", "bench"})
    ]
    assert not wrong, "\n".join(wrong)


def test_certificates_and_trends_read_records_only() -> None:
    wrong = [
        f"{where}: {room} imports {target}"
        for where, room, target in _arrows()
        if room in READS_RECORDS_ONLY and target in NEVER_FOR_THEM
    ]
    assert not wrong, "\n".join(wrong)


@pytest.mark.parametrize(("library", "room"), [("pyvisa", "instruments"), ("pyvisa_py", "instruments")])
def test_only_one_room_knows_a_library(library: str, room: str) -> None:
    wrong = [
        str(path)
        for path in PACKAGE.rglob("*.py")
        for _, module in _imports(path)
        if module.split(".")[0] == library and _room(path) != room
    ]
    assert not wrong


def test_the_test_sees_an_import_that_points_down(tmp_path: Path) -> None:
    """The check itself can fail: a planted import is found."""
    planted = tmp_path / "planted.py"
    planted.write_text("def late() -> None:\n    from linetest.cli import main\n    main()\n", encoding="utf-8")
    assert list(_imports(planted)) == [(2, "linetest.cli")]
