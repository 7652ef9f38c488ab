"""Dialects: how one model of instrument says the verbs of its role, as a short TOML file.

A small fixed vocabulary of verbs per role is all that a production test needs. A file says what to send for each
verb and how to find the value in the answer; expressions, loops and conditions stay out of it.
"""

from __future__ import annotations

import codecs
import hashlib
import math
import re
import string
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field
from importlib import resources
from pathlib import Path
from typing import Any, Literal

from linetest.errors import SheetError, SheetFault

Kind = Literal["set", "ask"]


@dataclass(frozen=True, slots=True)
class VerbRule:
    """What a verb must look like in every dialect of its role.

    Attributes:
        kind: ``set`` sends, ``ask`` asks.
        placeholders: Names that may stand in braces.
        unit: Unit that an answer must be in, empty where the answer is text.
        required: Whether a dialect may leave it out.
    """

    kind: Kind
    placeholders: tuple[str, ...] = ()
    unit: str = ""
    required: bool = True


_SWITCH = {
    "output_on": VerbRule("set"),
    "output_off": VerbRule("set"),
    "is_on": VerbRule("ask"),
}
VERBS: Mapping[str, Mapping[str, VerbRule]] = {
    "noise_source": _SWITCH,
    "attenuator": {
        "set_attenuation": VerbRule("set", ("value",), "dB"),
        "read_attenuation": VerbRule("ask", (), "dB"),
    },
    "power_meter": {
        "set_averaging": VerbRule("set", ("value",), "s"),
        "read_power": VerbRule("ask", (), "dBm"),
    },
    "supply": {
        **_SWITCH,
        "set_voltage": VerbRule("set", ("value",), "V"),
        "set_current_limit": VerbRule("set", ("value",), "A"),
        "read_voltage": VerbRule("ask", (), "V"),
        "read_current": VerbRule("ask", (), "A"),
    },
    "unit_port": {
        "load_unit": VerbRule("set", ("serial",), required=False),
        "read_identity": VerbRule("ask"),
        "set_mode": VerbRule("set", ("mode",)),
        "carrier_on": VerbRule("set"),
        "carrier_off": VerbRule("set"),
        "carrier_is_on": VerbRule("ask"),
        "is_locked": VerbRule("ask"),
        "start_count": VerbRule("set", ("pattern",)),
        "count_until": VerbRule("ask", ("bits",)),
        "stop_count": VerbRule("set"),
    },
}
ROLES = tuple(VERBS)


@dataclass(frozen=True, slots=True)
class Verb:
    """One verb of a dialect.

    Attributes:
        text: What to send, with its placeholders in braces.
        pattern: Where the value stands in the answer (group ``v``), or None for the whole answer.
        timeout_ms: Longest wait, or None for the dialect's.
    """

    text: str
    pattern: re.Pattern[str] | None = None
    timeout_ms: int | None = None


@dataclass(frozen=True)
class Dialect:
    """How one model of instrument speaks.

    Attributes:
        name: Name in station sheets.
        role: The role it serves.
        verbs: Its verbs.
        identify: Query for its identity; empty where it has none.
        errors: Query for the next entry of its error queue; empty where it has none.
        clear_status: Command that empties status and error queue; empty where it has none.
        fence: Whether it knows ``*ESE``.
        encoding: Of its texts.
        timeout_ms: Longest wait for an answer.
        open_timeout_ms: Longest wait for a connection.
        query_delay_ms: Pause between a query and reading its answer.
        shortest_gate_s: Shortest gate of a unit port's counter, s.
        digest: SHA-256 of the file.
    """

    name: str
    role: str
    verbs: Mapping[str, Verb]
    identify: str = "*IDN?"
    errors: str = "SYST:ERR?"
    clear_status: str = "*CLS"
    fence: bool = True
    encoding: str = "ascii"
    timeout_ms: int = 2000
    open_timeout_ms: int = 3000
    query_delay_ms: int = 0
    shortest_gate_s: float = 0.001
    digest: str = field(default="", compare=False)


_TEXTS = ("identify", "errors", "clear_status", "encoding")
_NUMBERS = ("timeout_ms", "open_timeout_ms", "query_delay_ms")


def load_dialect(name_or_path: str, folder: Path | None = None) -> Dialect:
    """Load a dialect by its name among those shipped, or from a file.

    Args:
        name_or_path: Name of a shipped dialect, or a path ending in ``.toml``.
        folder: Where relative paths begin; the current folder where None.

    Returns:
        The dialect.

    Raises:
        SheetError: The file cannot be read or breaks its rules; all faults at once.
    """
    if name_or_path.endswith(".toml"):
        path = (folder or Path()) / name_or_path
        try:
            content = path.read_bytes()
        except OSError as reason:
            raise SheetError(path, [SheetFault("(file)", str(path), f"cannot be read: {reason.strerror}")]) from reason
    else:
        shipped = resources.files("linetest.instruments") / "dialects"
        entry = shipped / f"{name_or_path}.toml"
        if not re.fullmatch(r"[a-z0-9-]+", name_or_path) or not entry.is_file():
            known = ", ".join(
                sorted(e.name.removesuffix(".toml") for e in shipped.iterdir() if e.name.endswith(".toml"))
            )
            raise SheetError(
                name_or_path,
                [SheetFault("dialect", repr(name_or_path), f"be a .toml file or one of {known}")],
            )
        path, content = Path(entry.name), entry.read_bytes()
    return parse_dialect(path, content)


def parse_dialect(path: Path, content: bytes) -> Dialect:
    """A dialect from a file's bytes.

    Args:
        path: The file, for messages.
        content: Its bytes.

    Returns:
        The dialect.

    Raises:
        SheetError: It breaks its rules; all faults at once.
    """
    try:
        table = tomllib.loads(content.decode("utf-8"))
    except (UnicodeDecodeError, tomllib.TOMLDecodeError) as reason:
        raise SheetError(path, [SheetFault("(file)", path.name, f"is not TOML: {reason}")]) from reason
    faults: list[SheetFault] = []
    head = table.get("dialect", {})
    verbs_table = table.get("verb", {})
    for key, found in (("dialect", head), ("verb", verbs_table)):
        if not isinstance(found, dict):
            faults.append(SheetFault(key, repr(found), "be a table"))
    if faults:
        raise SheetError(path, faults)
    role = head.get("role")
    if not isinstance(role, str) or role not in VERBS:
        faults.append(SheetFault("dialect.role", repr(role), f"be one of {', '.join(VERBS)}"))
        raise SheetError(path, faults)
    known = {"name", "role", "fence", "shortest_gate_s", *_TEXTS, *_NUMBERS}
    faults += [SheetFault(f"dialect.{key}", repr(head[key]), "is not known here") for key in head if key not in known]
    faults += [SheetFault(key, "…", "is not known here") for key in table if key not in {"dialect", "verb"}]
    name = head.get("name")
    if not isinstance(name, str) or not name:
        faults.append(SheetFault("dialect.name", repr(name), "be a text"))
    faults += _wrong_types(head)
    verbs = _verbs(role, verbs_table, faults)
    if faults:
        raise SheetError(path, faults)
    given = {key: head[key] for key in (*_TEXTS, *_NUMBERS, "fence", "shortest_gate_s") if key in head}
    return Dialect(name=str(name), role=role, verbs=verbs, digest=hashlib.sha256(content).hexdigest(), **given)


def _wrong_types(head: Mapping[str, Any]) -> list[SheetFault]:
    faults = [
        SheetFault(f"dialect.{key}", repr(head[key]), "be a text")
        for key in _TEXTS
        if key in head and not isinstance(head[key], str)
    ]
    faults += [
        SheetFault(f"dialect.{key}", repr(head[key]), "be a whole number of ms, 0 or more")
        for key in _NUMBERS
        if key in head and (type(head[key]) is not int or head[key] < 0)
    ]
    if isinstance(head.get("encoding"), str) and not _known_encoding(head["encoding"]):
        faults.append(SheetFault("dialect.encoding", repr(head["encoding"]), "be a text encoding of Python"))
    if "fence" in head and type(head["fence"]) is not bool:
        faults.append(SheetFault("dialect.fence", repr(head["fence"]), "be true or false"))
    gate = head.get("shortest_gate_s", 1.0)
    if type(gate) not in {int, float} or not 0 < gate < math.inf:
        faults.append(SheetFault("dialect.shortest_gate_s", repr(gate), "be a time in s above 0"))
    return faults


def _known_encoding(name: str) -> bool:
    try:
        return isinstance("".encode(codecs.lookup(name).name), bytes)
    except (LookupError, ValueError):
        return False


def _verbs(role: str, table: Mapping[str, Any], faults: list[SheetFault]) -> dict[str, Verb]:
    rules = VERBS[role]
    faults += [
        SheetFault(f"verb.{name}", "(missing)", f"every {role} dialect must say it")
        for name, rule in rules.items()
        if rule.required and name not in table
    ]
    verbs = {}
    for name, entry in table.items():
        if name not in rules:
            faults.append(SheetFault(f"verb.{name}", "…", f"is not a {role} verb; known: {', '.join(rules)}"))
        elif (verb := _verb(name, rules[name], entry, faults)) is not None:
            verbs[name] = verb
    return verbs


def _verb(name: str, rule: VerbRule, entry: Any, faults: list[SheetFault]) -> Verb | None:
    before = len(faults)
    key = f"verb.{name}"
    if not isinstance(entry, dict):
        faults.append(SheetFault(key, repr(entry), "be a table"))
        return None
    allowed = {rule.kind, "unit", "timeout_ms"} | ({"pattern"} if rule.kind == "ask" else set())
    faults += [
        SheetFault(f"{key}.{k}", repr(entry[k]), f"may hold {', '.join(sorted(allowed))}")
        for k in entry
        if k not in allowed
    ]
    text = entry.get(rule.kind)
    if not isinstance(text, str) or not text:
        faults.append(SheetFault(f"{key}.{rule.kind}", repr(text), "be the text to send"))
    else:
        faults += _placeholder_faults(key, rule, text)
    if entry.get("unit", rule.unit) != rule.unit:
        faults.append(SheetFault(f"{key}.unit", repr(entry["unit"]), f"be {rule.unit!r}"))
    pattern = _pattern(key, entry.get("pattern"), faults)
    timeout_ms = entry.get("timeout_ms")
    if timeout_ms is not None and (type(timeout_ms) is not int or timeout_ms <= 0):
        faults.append(SheetFault(f"{key}.timeout_ms", repr(timeout_ms), "be a whole number of ms above 0"))
    if len(faults) > before:
        return None
    return Verb(str(text), pattern, timeout_ms)


def _placeholder_faults(key: str, rule: VerbRule, text: str) -> list[SheetFault]:
    try:
        parts = [part[1:] for part in string.Formatter().parse(text) if part[1] is not None]
    except ValueError as reason:
        return [SheetFault(key, repr(text), f"has a broken placeholder: {reason}")]
    if "\n" in text or "\r" in text:
        return [SheetFault(key, repr(text), "must be one line")]
    if any(spec or conversion for _, spec, conversion in parts):
        return [SheetFault(key, repr(text), "must have its placeholders plain, without : or !")]
    wrong = sorted({name for name, _, _ in parts if name is not None} ^ set(rule.placeholders))
    listed = ", ".join(rule.placeholders) or "none"
    return (
        [SheetFault(key, repr(text), f"must have the placeholders {listed}; wrong: {', '.join(wrong)}")]
        if wrong
        else []
    )


def _pattern(key: str, text: Any, faults: list[SheetFault]) -> re.Pattern[str] | None:
    if text is None:
        return None
    try:
        pattern = re.compile(text)
    except (re.error, TypeError) as reason:
        faults.append(SheetFault(f"{key}.pattern", repr(text), f"is not a regular expression: {reason}"))
        return None
    if "v" not in pattern.groupindex:
        faults.append(SheetFault(f"{key}.pattern", repr(text), "must name the value: (?P<v>…)"))
    return pattern
