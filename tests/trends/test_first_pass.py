"""First-pass yield against tables worked by hand and intervals computed by another library."""

from __future__ import annotations

import json
import random
from collections.abc import Sequence
from datetime import UTC, datetime, timedelta, timezone

import pytest
from hypothesis import given
from hypothesis import strategies as st
from statsmodels.stats.proportion import proportion_confint

from linetest.records import RunSummary
from linetest.trends import YieldReport, first_pass_yield, yield_as_dict

MONDAY = datetime(2026, 3, 2, 8, 0, tzinfo=UTC)


def run(
    number: int,
    serial: str,
    disposition: str,
    cause: str = "",
    *,
    hours: float | None = None,
    model: str = "BW-Q4",
    lot: str = "L2601",
    station: str = "A1",
) -> RunSummary:
    """A run; the number orders runs in time unless hours say otherwise."""
    at = MONDAY + timedelta(hours=number * 0.1 if hours is None else hours)
    return RunSummary(f"run-{number:03}", serial, model, lot, station, at, disposition, cause)


# Worked by hand. S1 passes; S2 fails, its retest passes (counts as failed); S3 is VOID, then passes (counts as
# passed); S4 is held; S5 has VOID runs only (does not count); S6 passes, then fails (counts as passed); S7 is open.
LINE = (
    run(1, "S1", "PASS"),
    run(2, "S2", "FAIL", "ber"),
    run(3, "S2", "PASS"),
    run(4, "S3", "VOID", "link"),
    run(5, "S3", "PASS"),
    run(6, "S4", "HOLD", "ber"),
    run(7, "S5", "VOID", "link"),
    run(8, "S5", "VOID", "stopped"),
    run(9, "S6", "PASS", station="A2"),
    run(10, "S6", "FAIL", "carrier", station="A2"),
    run(11, "S7", "", station="A2"),
    run(12, "S8", "FAIL", "ber", hours=20.0, lot="", model="BW-B2"),
    run(13, "S9", "FAIL", "supply", hours=20.0, lot="", model="BW-B2"),
)


def counted(report: YieldReport, kind: str) -> dict[str, tuple[int, int]]:
    """(passed, units) by group."""
    return {row.name: (row.passed, row.units) for row in report.groups[kind]}


def test_the_table_worked_by_hand() -> None:
    report = first_pass_yield(LINE)
    assert report.total is not None
    assert (report.total.passed, report.total.units) == (3, 7)
    assert counted(report, "day") == {"2026-03-02": (3, 5), "2026-03-03": (0, 2)}
    assert counted(report, "lot") == {"(none)": (0, 2), "L2601": (3, 5)}
    assert counted(report, "model") == {"BW-B2": (0, 2), "BW-Q4": (3, 5)}
    assert counted(report, "station") == {"A1": (2, 6), "A2": (1, 1)}
    assert report.rejects == (("ber", 2), ("ber (HOLD)", 1), ("supply", 1))
    assert report.voids == (("link", 2), ("stopped", 1))
    assert report.runs == 12


@pytest.mark.parametrize("disposition", ["PASS", "FAIL", "HOLD"])
def test_the_first_judged_run_stands_whatever_comes_later(disposition: str) -> None:
    later = [run(number, "S1", other) for number, other in enumerate(("PASS", "FAIL", "HOLD", "VOID"), start=2)]
    report = first_pass_yield([run(1, "S1", disposition), *later])
    assert report.total is not None
    assert (report.total.units, report.total.passed) == (1, int(disposition == "PASS"))


def test_the_order_in_which_runs_are_handed_over_does_not_matter() -> None:
    shuffled = list(LINE)
    random.Random(7).shuffle(shuffled)
    assert first_pass_yield(shuffled) == first_pass_yield(LINE)


def test_the_same_serial_of_two_models_is_two_units() -> None:
    report = first_pass_yield([run(1, "0001", "PASS"), run(2, "0001", "FAIL", "ber", model="BW-B2")])
    assert counted(report, "model") == {"BW-B2": (0, 1), "BW-Q4": (1, 1)}


def test_days_are_utc_days() -> None:
    """23:30 in a zone one hour west of Greenwich is the next day in UTC."""
    west = timezone(timedelta(hours=-1))
    late = RunSummary("r", "S1", "BW-Q4", "", "A1", datetime(2026, 3, 2, 23, 30, tzinfo=west), "PASS", "")
    assert counted(first_pass_yield([late]), "day") == {"2026-03-03": (1, 1)}


@pytest.mark.parametrize(("passed", "units"), [(0, 1), (1, 1), (21, 24), (36, 36), (0, 20), (171, 183)])
def test_intervals_are_those_of_statsmodels(passed: int, units: int) -> None:
    """Clopper-Pearson by statsmodels (method "beta"), which knows nothing of this code."""
    runs = [run(number, f"S{number}", "PASS" if number < passed else "FAIL", "ber") for number in range(units)]
    total = first_pass_yield(runs).total
    assert total is not None
    low, high = proportion_confint(passed, units, alpha=0.05, method="beta")
    assert (total.low, total.high) == pytest.approx((low, high), rel=1e-9, abs=1e-12)


def test_no_failure_in_59_units_shows_the_well_known_bound() -> None:
    """All of n passed: the lower limit is (alpha / 2) to the power 1/n, in closed form."""
    total = first_pass_yield([run(number, f"S{number}", "PASS") for number in range(59)]).total
    assert total is not None
    assert total.low == pytest.approx(0.025 ** (1 / 59), rel=1e-12)
    assert total.high == 1.0


def test_a_line_without_a_judged_unit_has_no_yield() -> None:
    report = first_pass_yield([run(1, "S1", "VOID", "link"), run(2, "S2", "")])
    assert report.total is None
    assert all(rows == () for rows in report.groups.values())
    assert report.voids == (("link", 1),)


DISPOSITIONS = st.sampled_from(["PASS", "FAIL", "HOLD", "VOID", ""])


@given(st.lists(st.tuples(st.integers(0, 6), DISPOSITIONS, st.sampled_from(["A1", "A2"])), max_size=40))
def test_every_grouping_counts_every_unit_once(drawn: Sequence[tuple[int, str, str]]) -> None:
    runs = [
        run(number, f"S{serial}", disposition, "ber", station=station)
        for number, (serial, disposition, station) in enumerate(drawn)
    ]
    report = first_pass_yield(runs)
    judged = {item.serial for item in runs if item.disposition in {"PASS", "FAIL", "HOLD"}}
    units = report.total.units if report.total else 0
    passed = report.total.passed if report.total else 0
    assert units == len(judged)
    for rows in report.groups.values():
        assert sum(row.units for row in rows) == units
        assert sum(row.passed for row in rows) == passed
    assert sum(count for _, count in report.rejects) == units - passed
    assert sum(count for _, count in report.voids) == sum(item.disposition == "VOID" for item in runs)


def test_a_report_goes_out_as_json() -> None:
    sent = json.loads(json.dumps(yield_as_dict(first_pass_yield(LINE))))
    assert sent["total"]["units"] == 7
    assert sent["groups"]["station"][1] == pytest.approx(
        {"name": "A2", "units": 1, "passed": 1, "share": 1.0, "low": 0.025, "high": 1.0}
    )
    assert sent["voids"] == [["link", 2], ["stopped", 1]]
