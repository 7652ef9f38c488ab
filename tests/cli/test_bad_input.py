"""Bad input gives one clear sentence and the right exit code, never a traceback and nothing half-written."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path

import pytest

from linetest.records import Store
from tests.cli.runner import Place
from tests.world import served_bench


@pytest.fixture(scope="module")
def place(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Place]:
    found = Place(tmp_path_factory.mktemp("station"))
    with served_bench(found.sheet):
        yield found


def _says(place: Place, code: int, pattern: str, *arguments: str) -> None:
    done = place.run(*arguments)
    said = done.stderr + done.stdout
    assert done.returncode == code, said
    assert re.search(pattern, said), said
    assert "Traceback" not in said


def test_a_unit_without_noise_calibration_is_not_tested(place: Place) -> None:
    _says(place, 3, "no noise calibration: run 'linetest station calibrate' first", "shift", "--serial", "BQ4-000101")


@pytest.mark.parametrize(
    "serial", ["BQ4-1", "XX-000001", "<b>BQ4-000101</b>", "../../etc/passwd", "BQ4-000101\n", "", "BQ4-00010१"]
)
def test_a_serial_that_matches_no_model_is_refused_before_the_station_is_touched(place: Place, serial: str) -> None:
    _says(place, 2, "matches no model's serial pattern", "shift", "--serial", serial)


def test_a_wrong_limit_sheet_names_every_fault_at_once(place: Place, tmp_path: Path) -> None:
    good = (Path(__file__).parents[2] / "limits" / "bw-q4.toml").read_text(encoding="utf-8")
    wrong = good.replace("design_loss_db = 0.5", "design_loss_db = 1.5").replace("voltage_v = 12.0", "voltage_v = -1.0")
    sheet = tmp_path / "wrong.toml"
    sheet.write_text(wrong, encoding="utf-8")
    done = place.run("limits", "check", str(sheet))
    assert done.returncode == 2
    assert "wrong.toml" in done.stderr
    assert "design_loss_db" in done.stderr
    assert "voltage_v" in done.stderr
    assert "Traceback" not in done.stderr


def test_an_unknown_model_is_named_with_those_known(place: Place) -> None:
    _says(place, 2, r"(?s)BW-Z9.*BW-Q4", "limits", "show", "BW-Z9")


def test_a_station_that_is_not_there_is_said_with_what_to_do(place: Place, tmp_path: Path) -> None:
    lost = tmp_path / "lost.toml"
    text = re.sub(r"127\.0\.0\.1::\d+::", "127.0.0.1::1::", place.sheet.read_text(encoding="utf-8"))
    lost.write_text(text, encoding="utf-8")
    _says(place, 3, "nothing answers there", "shift", "--station", str(lost), "--serial", "BQ4-000101")
    _says(place, 3, "check power, cable, address and port", "station", "check", "--station", str(lost))


def test_an_overdue_instrument_stops_the_shift(place: Place, tmp_path: Path) -> None:
    overdue = tmp_path / "overdue.toml"
    text = re.sub(r"calibration_due = \S+", "calibration_due = 2020-01-31", place.sheet.read_text(encoding="utf-8"))
    overdue.write_text(text, encoding="utf-8")
    _says(place, 3, "calibration overdue", "shift", "--station", str(overdue), "--serial", "BQ4-000101")


def test_a_missing_or_wrong_station_sheet_is_said(place: Place, tmp_path: Path) -> None:
    _says(place, 2, "cannot be read", "station", "check", "--station", str(tmp_path / "none.toml"))
    wrong = tmp_path / "wrong.toml"
    wrong.write_text('name = "A1"\n[noise]\nenbw_hz = -1.0\n', encoding="utf-8")
    _says(place, 2, r"(?s)enbw_hz.*instrument", "station", "check", "--station", str(wrong))


def test_a_database_that_cannot_be_used_is_said(place: Place, tmp_path: Path) -> None:
    path = tmp_path / "letter.db"
    path.write_text("This is a letter and no database at all. " * 9)
    url = f"sqlite:///{path}"
    _says(place, 2, "not a database of linetest", "shift", "--database", url, "--serial", "BQ4-000101")
    _says(place, 2, "cannot be", "unit", "BQ4-000101", "--database", "sqlite:////proc/nowhere/records.db")


def test_a_unit_or_certificate_that_is_not_there_is_said(place: Place) -> None:
    _says(place, 2, "no run of 'BQ4-000777' is on record", "unit", "BQ4-000777")
    _says(place, 2, "no run of '<script>' is on record", "certificate", "issue", "<script>")


def test_a_second_program_is_kept_off_the_station(place: Place) -> None:
    first = place.start("shift")
    assert first.stdout is not None
    # The cautions are printed once the station is held.
    assert any("Local codes" in line for line in iter(first.stdout.readline, ""))
    _says(place, 3, "another program holds station A1", "station", "calibrate")
    first.communicate("\n", timeout=20)
    assert first.returncode == 0


def test_a_calibration_that_fails_is_not_kept(place: Place, tmp_path: Path) -> None:
    """Beyond the meter's range it answers the standard's infinity, which is no reading."""
    overload = tmp_path / "overload.toml"
    text = place.sheet.read_text(encoding="utf-8").replace("calibration_max_db = 26.0", "calibration_max_db = 90.0")
    overload.write_text(text, encoding="utf-8")
    _says(place, 3, "-222 Data out of range", "station", "calibrate", "--station", str(overload))
    with Store(place.database) as store:
        assert store.latest_calibration("A1") is None
