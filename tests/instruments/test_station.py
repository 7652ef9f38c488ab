"""The station: sheets and dialects refused with all faults at once, found, made safe, held by one program."""

from __future__ import annotations

import time
from collections.abc import Callable
from contextlib import closing
from datetime import UTC, datetime
from pathlib import Path

import pytest

from linetest.bench import Bench, serve, write_station_sheet
from linetest.bench.units import InstrumentFault
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
    assert station.make_safe() == {"supply": "", "noise_source": "", "unit_port": ""}
    assert [bench.noise_on, bench.carrier_on, bench.supply_on] == [False, False, False]


def test_a_signal_during_safe_off_does_not_cut_it_short(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The cancel comes in the middle of the first output's switching, and again at every later one."""
    bench = Bench(seed=3)
    station, library = _opened(bench, tmp_path)
    station.supply.output_on()
    station.noise_source.output_on()
    for role in (station.supply, station.noise_source):
        said = role.output_off

        def cancelled_meanwhile(said: Callable[[], None] = said) -> None:
            library.cancel.set()
            said()

        monkeypatch.setattr(role, "output_off", cancelled_meanwhile)
    assert set(station.make_safe().values()) == {""}
    assert [bench.noise_on, bench.supply_on] == [False, False]
    assert station.supply.is_on() is False, "after safe-off the links must be of use again"


def test_an_output_that_hangs_is_reported_in_bounded_time_and_the_others_are_off(tmp_path: Path) -> None:
    bench = Bench(seed=3, speed=1.0)
    with closing(serve(bench)) as served:
        write_station_sheet(tmp_path / "station.toml", served.resources)
        sheet = load_station_sheet(tmp_path / "station.toml")
        station = open_station(sheet, now=lambda: NOW)
        station.supply.output_on()
        station.noise_source.output_on()
        bench.devices["supply"].plant(InstrumentFault("supply", "hang", "OUTP"))
        began_s = time.monotonic()
        report = station.make_safe()
        assert time.monotonic() - began_s < 12.0
        station.close()
    assert report["supply"]
    assert (report["noise_source"], report["unit_port"]) == ("", "")
    assert not bench.noise_on


def test_a_fault_of_the_program_at_one_output_leaves_none_of_the_others_on(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    bench = Bench(seed=3)
    station, _ = _opened(bench, tmp_path)
    station.noise_source.output_on()

    def broken() -> None:
        raise ZeroDivisionError

    monkeypatch.setattr(station.supply, "output_off", broken)
    assert "ZeroDivisionError" in station.make_safe()["supply"]
    assert not bench.noise_on


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


HEAD = b'[dialect]\nname = "odd"\nrole = "power_meter"\n'
VERBS = b'[verb.set_averaging]\nset = "A {value}"\n[verb.read_power]\nask = "P?"\n'


@pytest.mark.parametrize(
    "content",
    [
        b"dialect = 3\n",
        b"verb = 3\n" + HEAD,
        b'[dialect]\nname = "odd"\nrole = ["power_meter"]\n',
        HEAD + b'encoding = "klingon"\n' + VERBS,
        HEAD + b"shortest_gate_s = nan\n" + VERBS,
        HEAD + VERBS.replace(b"{value}", b"{value:zz}"),
        HEAD + VERBS.replace(b"P?", b"P?\\nQ?"),
    ],
)
def test_a_dialect_of_the_wrong_shape_is_refused_when_it_is_read(content: bytes) -> None:
    parse_dialect(Path("odd.toml"), HEAD + VERBS)
    with pytest.raises(SheetError):
        parse_dialect(Path("odd.toml"), content)


def test_a_second_holder_of_a_station_is_refused(tmp_path: Path) -> None:
    with (
        station_lock("A1", tmp_path),
        pytest.raises(StationBusyError, match="another program holds station A1"),
        station_lock("A1", tmp_path),
    ):
        pytest.fail("the lock was given twice")
    with station_lock("A1", tmp_path):
        pass
