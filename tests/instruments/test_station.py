"""The station: sheets and dialects refused with all faults at once, found, made safe, held by one program."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path

import pytest

from linetest.bench import Bench, write_station_sheet
from linetest.errors import SheetError, StationBusyError, StationError
from linetest.instruments import (
    ROLES,
    Station,
    StationLibrary,
    check_station,
    load_dialect,
    load_station_sheet,
    open_station,
    station_lock,
)
from linetest.instruments.dialect import parse_dialect

NOW = datetime.now(UTC)


def _opened(bench: Bench, folder: Path) -> tuple[Station, StationLibrary]:
    write_station_sheet(folder / "station.toml", bench.resources)
    library = StationLibrary.create({bench.resources[role]: device for role, device in bench.devices.items()})
    return open_station(load_station_sheet(folder / "station.toml"), library=library, now=lambda: NOW), library


def test_safe_off_works_after_a_cancel_and_is_verified(tmp_path: Path) -> None:
    bench = Bench(seed=3)
    station, library = _opened(bench, tmp_path)
    station.unit_port.load_unit("BQ4-000101")
    station.supply.set_voltage_v(12.0)
    station.supply.output_on()
    station.unit_port.carrier_on()
    station.noise_source.output_on()
    assert bench.noise_on
    assert bench.carrier_on
    library.cancel.set()
    assert station.make_safe() == {"noise_source": "", "unit_port": "", "supply": ""}
    assert [bench.noise_on, bench.carrier_on, bench.supply_on] == [False, False, False]


def test_the_station_check_names_what_is_wrong_and_what_to_do(tmp_path: Path) -> None:
    bench = Bench(seed=3)
    _opened(bench, tmp_path)
    text = (tmp_path / "station.toml").read_text(encoding="utf-8")
    (tmp_path / "other.toml").write_text(text.replace("0112", "9999"), encoding="utf-8")
    library = StationLibrary.create({bench.resources[role]: device for role, device in bench.devices.items()})
    findings = check_station(load_station_sheet(tmp_path / "other.toml"), library=library, now=lambda: NOW)
    wrong = [finding for finding in findings if not finding.ok]
    assert [finding.role for finding in wrong] == ["power_meter"]
    assert "another instrument answers" in wrong[0].sentence
    assert wrong[0].advice


def test_an_overdue_instrument_keeps_the_station_shut(tmp_path: Path) -> None:
    bench = Bench(seed=3)
    station, library = _opened(bench, tmp_path)
    later = datetime(2099, 1, 1, tzinfo=UTC)
    with pytest.raises(StationError, match="calibration overdue: attenuator"):
        open_station(station.sheet, library=library, now=lambda: later)


def test_a_wrong_station_sheet_names_all_faults_at_once(tmp_path: Path) -> None:
    _opened(Bench(seed=3), tmp_path)
    text = (tmp_path / "station.toml").read_text(encoding="utf-8")
    wrong = text.replace("readings = 4", "readings = 1").replace('role = "supply"', 'role = "heater"')
    wrong = wrong.replace("settle_s = 0.005", "settle_s = 0.005\ncolour = 3")
    (tmp_path / "wrong.toml").write_text(wrong, encoding="utf-8")
    with pytest.raises(SheetError) as caught:
        load_station_sheet(tmp_path / "wrong.toml")
    keys = {fault.key for fault in caught.value.faults}
    assert {"noise.readings", "noise.colour"} <= keys
    assert any(key.endswith("role") for key in keys)


@pytest.mark.parametrize(
    "name", ["scpi-noise-source", "scpi-attenuator", "scpi-power-meter", "scpi-supply", "modem-port"]
)
def test_shipped_dialects_load_and_carry_their_digest(name: str) -> None:
    dialect = load_dialect(name)
    assert dialect.role in ROLES
    assert len(dialect.digest) == 64


def test_a_wrong_dialect_names_all_faults_at_once() -> None:
    content = (
        b'[dialect]\nname = "odd"\nrole = "power_meter"\ntimeout_ms = -1\n'
        b'[verb.read_powr]\nask = "P?"\n[verb.read_power]\nask = "P? {chanel}"\nunit = "mW"\n'
    )
    with pytest.raises(SheetError) as caught:
        parse_dialect(Path("odd.toml"), content)
    keys = [fault.key for fault in caught.value.faults]
    assert {"dialect.timeout_ms", "verb.read_powr", "verb.set_averaging", "verb.read_power.unit"} <= set(keys)


def test_a_second_holder_of_a_station_is_refused(tmp_path: Path) -> None:
    with (
        station_lock("A1", tmp_path),
        pytest.raises(StationBusyError, match="another program holds station A1"),
        station_lock("A1", tmp_path),
    ):
        pytest.fail("the lock was given twice")
    with station_lock("A1", tmp_path):
        pass
