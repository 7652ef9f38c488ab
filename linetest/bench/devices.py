"""The bench's five instruments: which commands each understands, over the bench's state."""

from __future__ import annotations

from typing import TYPE_CHECKING

from linetest.bench.scpi import Instrument, ScpiError, number, quoted, switch
from linetest.bench.symbols import PATTERN_STAGES
from linetest.bench.truth import ATTENUATOR_MAX_DB, ATTENUATOR_STEP_DB, METER_OVERLOAD_DBM

if TYPE_CHECKING:
    from linetest.bench.station import Bench

MAKER = "Brackwater Telemetry"
MODELS = {
    "noise_source": ("NS-10", "NS10-0007"),
    "attenuator": ("AT-64", "AT64-0031"),
    "power_meter": ("PM-1", "PM1-0112"),
    "supply": ("DC-2", "DC2-0054"),
    "unit_port": ("UP-1", "UP1-0009"),
}
OVERLOAD = "9.9E37"
OUT_OF_RANGE = ScpiError(-222, "Data out of range")
SETTINGS_CONFLICT = ScpiError(-221, "Settings conflict")


def build_instruments(bench: Bench) -> dict[str, Instrument]:
    """The instruments of a bench.

    Args:
        bench: The bench, whose state they act on.

    Returns:
        Instrument by role.
    """
    builders = {
        "noise_source": _noise_source,
        "attenuator": _attenuator,
        "power_meter": _power_meter,
        "supply": _supply,
        "unit_port": _unit_port,
    }
    return {role: build(bench, role) for role, build in builders.items()}


def _identity(role: str) -> str:
    model, serial = MODELS[role]
    return f"{MAKER},{model},{serial},1.0"


def _noise_source(bench: Bench, role: str) -> Instrument:
    device = Instrument(_identity(role), lambda: bench.set_noise(False), bench.lock)
    device.add("OUTPut[:STATe]", 1, lambda given: bench.set_noise(switch(given[0])))
    device.add("OUTPut[:STATe]?", 0, lambda _: str(int(bench.noise_on)))
    return device


def _attenuator(bench: Bench, role: str) -> Instrument:
    device = Instrument(_identity(role), lambda: bench.set_attenuation_db(ATTENUATOR_MAX_DB), bench.lock)

    def set_attenuation(text: str) -> None:
        wanted_db = number(text)
        steps = round(wanted_db / ATTENUATOR_STEP_DB)
        if not 0.0 <= wanted_db <= ATTENUATOR_MAX_DB or abs(steps * ATTENUATOR_STEP_DB - wanted_db) > 1e-6:
            raise OUT_OF_RANGE
        bench.set_attenuation_db(steps * ATTENUATOR_STEP_DB)

    device.add("INPut:ATTenuation", 1, lambda given: set_attenuation(given[0]))
    device.add("INPut:ATTenuation?", 0, lambda _: f"{bench.attenuation_db:.2f}")
    return device


def _power_meter(bench: Bench, role: str) -> Instrument:
    def set_averaging(seconds: float) -> None:
        if not 0.001 <= seconds <= 10.0:
            raise OUT_OF_RANGE
        bench.averaging_s = seconds

    def read_power() -> str:
        shown_dbm = bench.read_meter_dbm()
        return OVERLOAD if shown_dbm > METER_OVERLOAD_DBM else f"{shown_dbm:.4f}"

    device = Instrument(_identity(role), lambda: set_averaging(0.02), bench.lock)
    device.add("[SENSe:]AVERage:TIME", 1, lambda given: set_averaging(number(given[0])))
    device.add("[SENSe:]AVERage:TIME?", 0, lambda _: f"{bench.averaging_s:g}")
    device.add("READ[:SCALar]:POWer[:AC]?", 0, lambda _: read_power())
    return device


def _supply(bench: Bench, role: str) -> Instrument:
    def set_voltage(voltage_v: float) -> None:
        if not 0.0 <= voltage_v <= 32.0:
            raise OUT_OF_RANGE
        bench.voltage_v = voltage_v

    def set_current(current_a: float) -> None:
        if not 0.0 < current_a <= 5.0:
            raise OUT_OF_RANGE
        bench.current_limit_a = current_a

    device = Instrument(_identity(role), lambda: bench.set_supply(False), bench.lock)
    device.add("[SOURce:]VOLTage", 1, lambda given: set_voltage(number(given[0])))
    device.add("[SOURce:]VOLTage?", 0, lambda _: f"{bench.voltage_v:.3f}")
    device.add("[SOURce:]CURRent", 1, lambda given: set_current(number(given[0])))
    device.add("[SOURce:]CURRent?", 0, lambda _: f"{bench.current_limit_a:.3f}")
    device.add("OUTPut[:STATe]", 1, lambda given: bench.set_supply(switch(given[0])))
    device.add("OUTPut[:STATe]?", 0, lambda _: str(int(bench.supply_on)))
    device.add("MEASure:VOLTage?", 0, lambda _: f"{bench.voltage_v if bench.supply_on else 0.0:.3f}")
    device.add("MEASure:CURRent?", 0, lambda _: f"{bench.current_a():.4f}")
    return device


def _unit_port(bench: Bench, role: str) -> Instrument:
    def load(serial: str) -> None:
        if not bench.load(serial):
            raise ScpiError(-241, f"Hardware missing;the handler has no unit {serial}")

    def identity() -> str:
        unit = bench.unit
        if unit is None or not bench.powered():
            return '"","",""'
        return f'"{unit.model.model}","{unit.inner_serial}","{unit.firmware}"'

    def set_mode(mode: str) -> None:
        if bench.unit is None or not bench.powered():
            raise SETTINGS_CONFLICT
        if mode != bench.unit.model.mode:
            raise OUT_OF_RANGE
        bench.mode = mode

    def start_count(pattern: str) -> None:
        if pattern not in PATTERN_STAGES:
            raise OUT_OF_RANGE
        bench.start_count(pattern)

    def count_until(bits: float) -> str:
        if not bench.counting():
            raise SETTINGS_CONFLICT
        counted, errors, lost, locked = bench.count_until(int(bits))
        return f"{counted},{errors},{lost},{int(locked)}"

    device = Instrument(_identity(role), lambda: bench.set_carrier(False), bench.lock)
    device.add("FIXTure:LOAD", 1, lambda given: load(quoted(given[0])))
    device.add("UNIT:IDENtity?", 0, lambda _: identity())
    device.add("UNIT:MODE", 1, lambda given: set_mode(quoted(given[0])))
    device.add("UNIT:MODE?", 0, lambda _: f'"{bench.mode}"')
    device.add("UNIT:CARRier[:STATe]", 1, lambda given: bench.set_carrier(switch(given[0])))
    device.add("UNIT:CARRier[:STATe]?", 0, lambda _: str(int(bench.carrier_on)))
    device.add("UNIT:LOCK?", 0, lambda _: str(int(bench.locked())))
    device.add("COUNt:STARt", 1, lambda given: start_count(quoted(given[0])))
    device.add("COUNt:UNTil?", 1, lambda given: count_until(number(given[0])))
    device.add("COUNt:STOP", 0, lambda _: bench.stop_count())
    return device
