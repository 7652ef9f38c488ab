"""The simulated station: five instruments around one node, and whatever unit is in the fixture."""

from __future__ import annotations

import math
import threading
from collections.abc import Mapping

import numpy as np

from linetest.bench.clock import BenchClock
from linetest.bench.devices import build_instruments
from linetest.bench.scpi import Instrument
from linetest.bench.symbols import ErrorProcess
from linetest.bench.truth import (
    ATTENUATOR_MAX_DB,
    MUTED_CARRIER_DB,
    SOURCE_OFF_DB,
    DataSheet,
    Truth,
)
from linetest.bench.units import UnitTruth, unit_truth
from linetest.units import ebn0_db

GATE_S = 0.001
MINUS_INFINITY = float("-inf")
WARM_S = 0.15


class Bench:
    """A simulated station with hidden truth.

    Args:
        seed: The same seed is the same bench.
        speed: How many times faster than life its time runs; infinity (virtual time) for use in process.
        sheet: The data sheets that its hidden errors keep to.

    Attributes:
        truth: Its hidden truth, for tests only.
        devices: Its instruments by role.
        resources: VISA resource name by role, for use in process.
    """

    def __init__(self, *, seed: int = 1, speed: float = math.inf, sheet: DataSheet | None = None) -> None:
        self.sheet = sheet or DataSheet()
        self.truth = Truth.draw(seed, self.sheet)
        self.clock = BenchClock(speed)
        self._rng = np.random.default_rng([seed, 3])
        self.lock = threading.Condition(threading.RLock())
        self._loads: dict[str, int] = {}
        self.noise_on = False
        self.attenuation_db = ATTENUATOR_MAX_DB
        self._attenuation_off_db = 0.0
        self.averaging_s = 0.02
        self.voltage_v = 0.0
        self.current_limit_a = 1.0
        self.supply_on = False
        self.unit: UnitTruth | None = None
        self.mode = ""
        self.carrier_on = False
        self._carrier_since_s = 0.0
        self._drifts = False
        self._counter: ErrorProcess | None = None
        self._count_began_s = 0.0
        self._bits = 0
        self._errors = 0
        self._lost_bits = 0
        self.devices: Mapping[str, Instrument] = build_instruments(self)
        self.resources = {role: f"TCPIP0::bench-{seed}-{role.replace('_', '-')}::inst0::INSTR" for role in self.devices}

    def powered(self) -> bool:
        """Whether a unit is in the fixture, alive and supplied."""
        return self.unit is not None and self.unit.answers and self.supply_on and self.voltage_v > 9.0

    def carrier_dbm(self) -> float:
        """True carrier power at the node now, dBm."""
        if self.unit is None or not self.powered():
            return MINUS_INFINITY
        level_dbm = self.unit.carrier_dbm
        if self._drifts and self.clock.now_s() - self._carrier_since_s > WARM_S:
            level_dbm += self.unit.carrier_step_db
        return level_dbm if self.carrier_on else level_dbm - MUTED_CARRIER_DB

    def true_ebn0_db(self) -> float:
        """True Eb/N0 at the unit's input now, dB."""
        if self.unit is None or not (self.carrier_on and self.powered()):
            return MINUS_INFINITY
        n0_dbm_hz = self.truth.n0_dbm_hz(self.attenuation_db, self._attenuation_off_db)
        if not self.noise_on:
            n0_dbm_hz -= SOURCE_OFF_DB
        return ebn0_db(self.carrier_dbm(), n0_dbm_hz, self.unit.model.bit_rate_bps)

    def locked(self) -> bool:
        """Whether the unit's receiver is locked now."""
        unit = self.unit
        if unit is None or not unit.locks or not (self.carrier_on and self.powered()):
            return False
        return self.clock.now_s() - self._carrier_since_s >= unit.lock_s

    def wait_s(self, seconds: float) -> None:
        """Let time pass on the bench; the lock, held by the caller, is free meanwhile.

        Args:
            seconds: How long.
        """
        if self.clock.virtual:
            self.clock.advance_s(seconds)
            return
        until_s = self.clock.now_s() + seconds
        while (left_s := until_s - self.clock.now_s()) > 0.0:
            self.lock.wait(left_s / self.clock.speed)

    def set_attenuation_db(self, setting_db: float) -> None:
        """Set the attenuator; its repeatability is drawn anew.

        Args:
            setting_db: A whole number of steps, dB.
        """
        self.settle_counts()
        self.attenuation_db = setting_db
        self._attenuation_off_db = self.sheet.attenuator_repeatability_db * float(self._rng.standard_normal())

    def set_noise(self, on: bool) -> None:
        """Switch the noise.

        Args:
            on: Whether it is on.
        """
        self.settle_counts()
        self.noise_on = on

    def set_carrier(self, on: bool) -> None:
        """Switch the unit's carrier.

        Args:
            on: Whether it is on.
        """
        self.settle_counts()
        if on and not self.carrier_on:
            self._carrier_since_s = self.clock.now_s()
        self.carrier_on = on

    def set_supply(self, on: bool) -> None:
        """Switch the supply; without it the unit forgets its carrier and its counts.

        Args:
            on: Whether it is on.
        """
        self.settle_counts()
        self.supply_on = on
        if not on:
            self.carrier_on = False
            self._counter = None

    def read_meter_dbm(self) -> float:
        """What the meter shows now, dBm, after its averaging time."""
        self.wait_s(self.averaging_s)
        noise_dbm = self.truth.noise_dbm(self.attenuation_db, self._attenuation_off_db)
        if not self.noise_on:
            noise_dbm -= SOURCE_OFF_DB
        return self.truth.shown_dbm(self.carrier_dbm(), noise_dbm, self._rng, self.averaging_s)

    def current_a(self) -> float:
        """Current that the unit draws now, A."""
        if self.unit is None or not self.supply_on or self.voltage_v < 1.0:
            return 0.0
        drawn_a = self.unit.current_a + 0.0005 * float(self._rng.standard_normal())
        return float(np.clip(drawn_a, 0.0, self.current_limit_a))

    def load(self, serial: str) -> bool:
        """Place a unit in the fixture; an instrument's planted fault comes with its first visit only.

        Args:
            serial: Serial on its label.

        Returns:
            Whether the bench has such a unit.
        """
        unit = unit_truth(serial)
        if unit is None:
            return False
        self.settle_counts()
        first = self._loads.get(serial, 0) == 0
        self._loads[serial] = self._loads.get(serial, 0) + 1
        self.unit, self.mode, self.carrier_on, self._counter = unit, "", False, None
        self._drifts = first
        for role, device in self.devices.items():
            planted = unit.fault if first and unit.fault is not None and unit.fault.role == role else None
            device.plant(planted)
        return True

    def start_count(self, pattern: str) -> None:
        """Start counting errors from zero.

        Args:
            pattern: Name of the test pattern.
        """
        if self.unit is not None and self.powered():
            self._counter = ErrorProcess(self.unit, pattern, self._rng)
        self._count_began_s = self.clock.now_s()
        self._bits = self._errors = self._lost_bits = 0

    def stop_count(self) -> None:
        """Stop counting."""
        self.settle_counts()
        self._counter = None

    def counting(self) -> bool:
        """Whether the counter runs."""
        return self._counter is not None

    def count_until(self, bits: int) -> tuple[int, int, int, bool]:
        """Wait until that many bits are counted, to a whole gate.

        Args:
            bits: Bits wanted since counting began.

        Returns:
            Bits, errors, lost bits, lock: latched together at the end of a gate.
        """
        gate = self._gate_bits()
        wanted = -(-bits // gate) * gate
        rate_bps = self.unit.model.bit_rate_bps if self.unit is not None else 1.0
        self.wait_s(self._count_began_s + (wanted + self._lost_bits) / rate_bps - self.clock.now_s())
        self.settle_counts()
        return self._bits, self._errors, self._lost_bits, self.locked()

    def settle_counts(self) -> None:
        """Count all whole gates that passed, at the Eb/N0 that held; called before anything changes."""
        if self._counter is None or self.unit is None:
            return
        gate = self._gate_bits()
        passed_s = self.clock.now_s() - self._count_began_s
        # A hair more, because a wait may end a rounding error before the gate does.
        total = int((passed_s * self.unit.model.bit_rate_bps + 1e-3) // gate) * gate
        new = total - self._bits - self._lost_bits
        if new <= 0:
            return
        errors = self._counter.advance(new, self.true_ebn0_db())
        self._bits += new
        self._errors += int(errors.size)

    def _gate_bits(self) -> int:
        return round(GATE_S * self.unit.model.bit_rate_bps) if self.unit is not None else 1
