"""Reading limit sheets: every fault of a file at once, with key, value and rule."""

from __future__ import annotations

import difflib
import hashlib
import math
import tomllib
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from linetest.errors import ParameterError, SettingsError, SheetError, SheetFault
from linetest.limits.crossrules import cross_faults
from linetest.limits.sheet import (
    BerCheck,
    CarrierLimits,
    LimitSheet,
    LockLimits,
    Procedure,
    SupplyLimits,
)
from linetest.limits.tables import Mode, Strict, named
from linetest.settings import shipped_folder

# Sheets are a few kilobytes; a larger file is something else.
MAX_SHEET_BYTES = 1_000_000

_WORDING = (
    ("Input should be a valid ", "must be a "),
    ("Input should be ", "must be "),
    ("Input should ", "must "),
    ("String should ", "must "),
    ("Tuple should ", "must "),
    ("Field required", "must be given"),
    ("Value error, ", ""),
)


def load_sheet(path: Path | str) -> LimitSheet:
    """Read and check a limit sheet.

    Args:
        path: The file. Its name must be the model's in lower case, with ``.toml``.

    Returns:
        The sheet, frozen, with the digest of the file.

    Raises:
        SheetError: The file cannot be read or breaks its rules; all faults at once, in the file's order.
    """
    file = Path(path)
    content, digest = _read(file)
    faults = list(cross_faults(content, file.name))
    try:
        sheet = LimitSheet.model_validate({**content, "digest": digest})
    except ValidationError as reason:
        faults.extend(_fault(entry, content) for entry in reason.errors())
    if faults:
        raise SheetError(file, _in_file_order(faults, content))
    return sheet


def load_model(model: str, folder: Path | str | None = None) -> LimitSheet:
    """Read and check the limit sheet of a model.

    Args:
        model: The product, in upper or lower case.
        folder: Folder of limit sheets; those shipped with linetest by default.

    Returns:
        The sheet.

    Raises:
        ParameterError: The folder holds no sheet of that model.
        SheetError: The sheet breaks its rules.
        SettingsError: The folder holds no sheet at all.
    """
    files = _sheet_files(folder)
    for file in files:
        if file.stem == model.lower():
            return load_sheet(file)
    raise ParameterError("model", model, f"be one of {', '.join(file.stem.upper() for file in files)}")


def list_sheets(folder: Path | str | None = None) -> list[LimitSheet]:
    """Read and check every limit sheet of a folder.

    Args:
        folder: Folder of limit sheets; those shipped with linetest by default.

    Returns:
        The sheets, by file name.

    Raises:
        SheetError: A sheet breaks its rules.
        SettingsError: The folder cannot be read or holds no sheet.
    """
    return [load_sheet(file) for file in _sheet_files(folder)]


def _sheet_files(folder: Path | str | None) -> list[Path]:
    place = shipped_folder("limits") if folder is None else Path(folder)
    if not place.is_dir():
        raise SettingsError(f"the folder of limit sheets {place} does not exist; correct --limits or limits_folder")
    files = sorted(place.glob("*.toml"))
    if not files:
        raise SettingsError(f"the folder {place} holds no limit sheet; correct --limits or limits_folder")
    return files


def _read(file: Path) -> tuple[dict[str, Any], str]:
    def refused(rule: str) -> SheetError:
        return SheetError(file, [SheetFault("(file)", file.name, rule)])

    try:
        if file.stat().st_size > MAX_SHEET_BYTES:
            raise refused(f"must be a limit sheet, not {file.stat().st_size} bytes of something else")
        data = file.read_bytes()
    except OSError as reason:
        raise refused(f"cannot be read: {(reason.strerror or 'unknown reason').lower()}") from reason
    try:
        return tomllib.loads(data.decode("utf-8")), hashlib.sha256(data).hexdigest()
    except UnicodeDecodeError as reason:
        raise refused(f"must be text in UTF-8; byte {reason.start} is not") from reason
    except tomllib.TOMLDecodeError as reason:
        raise refused(f"is not TOML: {reason}") from reason
    except RecursionError as reason:
        raise refused("is not TOML: tables nested too deep") from reason


def _fault(entry: Mapping[str, Any], content: Mapping[str, Any]) -> SheetFault:
    path = tuple(entry["loc"])
    rule = str(entry["msg"])
    for theirs, ours in _WORDING:
        if rule.startswith(theirs):
            rule = ours + rule.removeprefix(theirs)
            break
    if entry["type"] == "missing":
        value = "(missing)"
    elif entry["type"] == "extra_forbidden":
        value, rule = _shown(entry["input"]), _unknown_key(str(path[-1]), path)
    else:
        value = _shown(entry["input"])
    return SheetFault(_dotted(path, content), value, rule)


def _shown(value: object) -> str:
    if value == {}:
        return "(missing)"
    if isinstance(value, dict):
        return "{…}"
    if isinstance(value, list) and any(isinstance(item, dict) for item in value):
        return "[…]"
    return repr(value)


_TABLES: dict[tuple[str, ...], type[Strict]] = {
    (): LimitSheet,
    ("mode",): Mode,
    ("procedure",): Procedure,
    ("procedure", "supply"): SupplyLimits,
    ("procedure", "carrier"): CarrierLimits,
    ("procedure", "lock"): LockLimits,
    ("procedure", "ber"): BerCheck,
}


def _unknown_key(key: str, path: tuple[str | int, ...]) -> str:
    table = _TABLES.get(tuple(part for part in path[:-1] if isinstance(part, str)))
    fields = table.model_fields if table is not None else {}
    known = [field.alias or name for name, field in fields.items() if name != "digest"]
    close = difflib.get_close_matches(key, known, n=1)
    return f"is no key of this table; did you mean {close[0]}?" if close else "is no key of this table"


def _dotted(path: tuple[str | int, ...], content: Mapping[str, Any]) -> str:
    """A path as ``procedure.ber[uncoded].steps``; an entry of a list of tables goes by its name."""
    text, place = "", content
    for part in path:
        if isinstance(part, int):
            text += f"[{named(place, part)}]"
        else:
            text += f".{part}" if text else part
        place = _step_into(place, part)
    return text


def _step_into(place: Any, part: str | int) -> Any:
    if isinstance(place, dict):
        return place.get(part)
    if isinstance(place, list) and isinstance(part, int) and part < len(place):
        return place[part]
    return None


def _in_file_order(faults: list[SheetFault], content: Mapping[str, Any]) -> list[SheetFault]:
    """Faults sorted by where their keys stand; a missing key stands at the end of its table."""
    places = {key: number for number, key in enumerate(_keys(content, ""))}

    def place(fault: SheetFault) -> tuple[float, str]:
        key = fault.key
        while key not in places and key:
            key = key[: max(key.rfind("."), key.rfind("["), 0)]
        exact = key == fault.key
        last = max((number for other, number in places.items() if other.startswith(key)), default=-1)
        return (float(places[key]) if exact else last + 0.5 if key else math.inf, fault.key)

    unique = list(dict.fromkeys(faults))
    return sorted(unique, key=place)


def _keys(table: Any, prefix: str) -> Iterator[str]:
    if isinstance(table, Mapping):
        for key, value in table.items():
            here = f"{prefix}.{key}" if prefix else str(key)
            yield here
            yield from _keys(value, here)
    elif isinstance(table, list):
        for index, value in enumerate(table):
            here = f"{prefix}[{named(table, index)}]"
            yield here
            yield from _keys(value, here)
