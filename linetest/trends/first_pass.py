"""First-pass yield: a unit counts once, by its first run that is not VOID.

HOLD counts as not passed until it is decided. VOID runs say nothing of a unit; they are listed by cause.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterable, Sequence
from dataclasses import asdict, dataclass
from datetime import UTC
from typing import Any

from linetest.decision import interval
from linetest.records import RunSummary

Key = Callable[[RunSummary], str]
GROUPS: dict[str, Key] = {
    "day": lambda run: f"{run.started_at.astimezone(UTC):%Y-%m-%d}",
    "lot": lambda run: run.lot or "(none)",
    "model": lambda run: run.model,
    "station": lambda run: run.station,
}


@dataclass(frozen=True, slots=True)
class YieldRow:
    """First-pass yield of a group.

    Attributes:
        name: What the group has in common.
        units: Units counted.
        passed: Units that passed at their first run that is not VOID.
        share: passed / units.
        low: Lower limit of the exact 95 % interval.
        high: Upper limit.
    """

    name: str
    units: int
    passed: int
    share: float
    low: float
    high: float


@dataclass(frozen=True, slots=True)
class YieldReport:
    """What the line did.

    Attributes:
        total: All units together, None where there are none.
        groups: Rows by kind of group: day, lot, model, station.
        rejects: (cause, units) of units that did not pass at first, most frequent first.
        voids: (cause, runs) of VOID runs, most frequent first.
        runs: Closed runs, VOID ones among them.
    """

    total: YieldRow | None
    groups: dict[str, tuple[YieldRow, ...]]
    rejects: tuple[tuple[str, int], ...]
    voids: tuple[tuple[str, int], ...]
    runs: int


def first_pass_yield(runs: Sequence[RunSummary]) -> YieldReport:
    """First-pass yield of a set of runs.

    Args:
        runs: The runs, in any order; open runs are passed over.

    Returns:
        The report.
    """
    closed = sorted((run for run in runs if run.disposition), key=lambda run: (run.started_at, run.run_id))
    firsts: dict[tuple[str, str], RunSummary] = {}
    for run in closed:
        if run.disposition != "VOID":
            firsts.setdefault((run.model, run.serial), run)
    units = list(firsts.values())
    return YieldReport(
        total=_row("all", units) if units else None,
        groups={kind: _grouped(units, key) for kind, key in GROUPS.items()},
        rejects=_counted(
            f"{run.cause}" if run.disposition == "FAIL" else f"{run.cause} (HOLD)" for run in _failed(units)
        ),
        voids=_counted(run.cause for run in closed if run.disposition == "VOID"),
        runs=len(closed),
    )


def yield_as_dict(report: YieldReport) -> dict[str, Any]:
    """A report as plain data for JSON.

    Args:
        report: The report.

    Returns:
        Nested dictionaries and lists.
    """
    return asdict(report)


def _failed(units: Sequence[RunSummary]) -> list[RunSummary]:
    return [run for run in units if run.disposition != "PASS"]


def _counted(causes: Iterable[str]) -> tuple[tuple[str, int], ...]:
    return tuple(sorted(Counter(causes).items(), key=lambda pair: (-pair[1], pair[0])))


def _grouped(units: Sequence[RunSummary], key: Key) -> tuple[YieldRow, ...]:
    members: dict[str, list[RunSummary]] = {}
    for run in units:
        members.setdefault(key(run), []).append(run)
    return tuple(_row(name, members[name]) for name in sorted(members))


def _row(name: str, units: Sequence[RunSummary]) -> YieldRow:
    passed = sum(run.disposition == "PASS" for run in units)
    low, high = interval(len(units), passed)
    return YieldRow(name, len(units), passed, passed / len(units), low, high)
