"""A station of plain objects: what a noise calibration needs, without links, and with faults on demand."""

from __future__ import annotations

import math
from collections.abc import Callable
from datetime import UTC, datetime, timedelta

import numpy as np

from linetest.errors import LinkTimeout
from linetest.instruments import StationSheet

NOISE = {
    "enbw_hz": 10.0e6,
    "enbw_u_percent": 0.6,
    "meter_calibration_db": 0.20,
    "meter_linearity_db": 0.03,
    "noise_response_db": 0.05,
    "mismatch_db": 0.04,
    "filter_slope_db": 0.03,
    "attenuator_repeatability_db": 0.005,
    "readings": 4,
    "averaging_s": 0.02,
    "settle_s": 0.005,
    "calibration_valid_h": 12.0,
    "calibration_min_db": 14.0,
    "calibration_max_db": 26.0,
    "calibration_step_db": 0.25,
}
ROLES = {
    "noise_source": ("scpi-noise-source", None),
    "attenuator": ("scpi-attenuator", "2031-01-31"),
    "power_meter": ("scpi-power-meter", "2030-06-30"),
    "supply": ("scpi-supply", None),
    "unit_port": ("modem-port", None),
}
START = datetime(2030, 5, 1, 6, 0, tzinfo=UTC)
SETTINGS_DB = tuple(14.0 + 0.5 * n for n in range(25))


def station_sheet(name: str = "A1", **noise: float) -> StationSheet:
    """A sound station sheet, with noise facts changed."""
    instruments = []
    for role, (dialect, due) in ROLES.items():
        entry: dict[str, object] = {
            "role": role,
            "resource": f"TCPIP0::fake-{role.replace('_', '-')}::inst0::INSTR",
            "dialect": dialect,
            "identity": ".*",
            "serial": f"{role}-7",
        }
        if due is not None:
            entry |= {"calibration_due": datetime.fromisoformat(due).date(), "certificate": f"C-{role}"}
        instruments.append(entry)
    return StationSheet.model_validate({"name": name, "noise": NOISE | noise, "instrument": instruments})


class FakeStation:
    """All instruments in one object, around one node with a carrier and a noise source.

    Attributes:
        exchanges: Every verb said, in order.
        fail_at: Number of the exchange that fails, or None.
        failure: What it raises then, and for every exchange after it if `stays_dead`.
        show: Turns the true level in dBm into what the meter shows.
    """

    def __init__(self, sheet: StationSheet | None = None, *, seed: int = 1) -> None:
        self.sheet = sheet or station_sheet()
        self.identities = {role: f"Brackwater,{role},7,1.0" for role in ROLES}
        self.dialect_digests = {role: f"{number:064x}" for number, role in enumerate(ROLES)}
        self.exchanges: list[str] = []
        self.fail_at: int | None = None
        self.failure: BaseException = LinkTimeout("TCPIP0::fake::inst0::INSTR", "READ?", "no answer within 2 s")
        self.stays_dead = False
        self.noise_on = self.carrier_on = False
        self.attenuation_db = 63.75
        self.carrier_dbm = -20.0
        self.density_dbm_hz = -72.0
        self.sigma_db = 0.01
        self.drift_db_per_reading = 0.0
        self.show: Callable[[float], float] = lambda level_dbm: level_dbm
        self.unsafe: dict[str, str] = {}
        self.safe_calls = 0
        self._rng = np.random.default_rng(seed)
        self._readings = 0

    # Each role's verbs live in this one object.
    @property
    def noise_source(self) -> FakeStation:
        return self

    @property
    def attenuator(self) -> FakeStation:
        return self

    @property
    def power_meter(self) -> FakeStation:
        return self

    @property
    def unit_port(self) -> FakeStation:
        return self

    def _say(self, verb: str) -> None:
        number = len(self.exchanges)
        self.exchanges.append(verb)
        if self.fail_at is not None and (number == self.fail_at or (self.stays_dead and number > self.fail_at)):
            raise self.failure

    def output_on(self) -> None:
        self._say("noise on")
        self.noise_on = True

    def output_off(self) -> None:
        self._say("noise off")
        self.noise_on = False

    def is_on(self) -> bool:
        self._say("noise?")
        return self.noise_on

    def set_attenuation_db(self, attenuation_db: float) -> None:
        self._say(f"attenuation {attenuation_db:g}")
        self.attenuation_db = attenuation_db

    def set_averaging_s(self, averaging_s: float) -> None:
        self._say(f"averaging {averaging_s:g}")

    def carrier_off(self) -> None:
        self._say("carrier off")
        self.carrier_on = False

    def read_power_dbm(self) -> float:
        self._say("power?")
        noise_dbm = self.density_dbm_hz + 70.0 - self.attenuation_db - (0.0 if self.noise_on else 40.0)
        power_mw = 10.0 ** (noise_dbm / 10.0) + 10.0 ** (-60.0 / 10.0)
        if self.carrier_on:
            power_mw += 10.0 ** (self.carrier_dbm / 10.0)
        self._readings += 1
        drift_db = self.drift_db_per_reading * self._readings
        level_dbm = 10.0 * math.log10(power_mw) + drift_db + self.sigma_db * float(self._rng.standard_normal())
        return self.show(level_dbm)

    def make_safe(self) -> dict[str, str]:
        """Works over fresh links: nothing that failed before fails here, unless a test says so."""
        self.safe_calls += 1
        if "noise_source" not in self.unsafe:
            self.noise_on = False
        self.carrier_on = False
        return {role: self.unsafe.get(role, "") for role in ("noise_source", "unit_port", "supply")}


class FakeClock:
    """Time that moves only when slept."""

    def __init__(self, start: datetime = START) -> None:
        self.at = start

    def now(self) -> datetime:
        return self.at

    def sleep_s(self, seconds: float) -> None:
        self.at += timedelta(seconds=seconds)
