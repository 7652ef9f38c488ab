"""Measuring: the noise calibration of a station, and the carrier of a unit.

Whatever ends a calibration, the noise is off afterwards and nothing half-measured is returned.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import datetime
from itertools import pairwise

import numpy as np

from linetest.errors import CalibrationError, LinkError, ParameterError
from linetest.noise import model
from linetest.noise.budget import evaluate
from linetest.noise.calibration import NoiseCalibration
from linetest.noise.sanity import check_readings, mean_level_dbm
from linetest.noise.station import NoiseStation

Now = Callable[[], datetime]
Sleep = Callable[[float], None]

# Nearer than this to the floor nothing is left of the carrier once the floor is subtracted.
LEAST_CARRIER_DB = 1.0


@dataclass(frozen=True, slots=True)
class CalibrationProgress:
    """How far a noise calibration is.

    Attributes:
        done: Levels measured.
        total: Levels to measure.
        attenuation_db: Setting just measured, dB; None for the floor.
        power_dbm: Mean reading there, dBm.
    """

    done: int
    total: int
    attenuation_db: float | None
    power_dbm: float


@dataclass(frozen=True, slots=True)
class CarrierReading:
    """A unit's carrier, read with the noise off.

    Attributes:
        power_dbm: Carrier power at the node, floor subtracted, dBm.
        u_db: Its standard uncertainty, the meter's calibration factor included, dB.
        readings_dbm: The readings, dBm.
        at: When it was read.
    """

    power_dbm: float
    u_db: float
    readings_dbm: tuple[float, ...]
    at: datetime


def calibrate_noise(
    station: NoiseStation,
    settings_db: Sequence[float],
    *,
    now: Now,
    sleep_s: Sleep = time.sleep,
    progress: Callable[[CalibrationProgress], None] | None = None,
) -> NoiseCalibration:
    """Measure N0 at the unit's input for attenuator settings.

    The floor is read with noise and carrier off, then each setting with the noise on, then the first setting once
    more: what moved meanwhile shows there.

    Args:
        station: The open station, with its carrier off or no unit.
        settings_db: Attenuator settings, dB, ascending.
        now: Where date and time come from.
        sleep_s: How to let seconds pass.
        progress: Told after each level.

    Returns:
        The calibration. The noise is off.

    Raises:
        ParameterError: The settings do not ascend.
        CalibrationError: What was read cannot be a calibration, or the noise cannot be switched off.
        LinkError: An instrument does not answer, or gives no valid number.
    """
    settings = tuple(settings_db)
    if not settings or any(later <= sooner for sooner, later in pairwise(settings)) or settings[0] < 0.0:
        raise ParameterError("settings_db", settings, "ascend from 0 or more, each once")
    started_at = now()
    survey = _Survey(station, sleep_s, progress or _silent, total=len(settings) + 2)
    try:
        floor, table, closing = survey.run(settings)
    except BaseException:
        # Also an interrupt must find the noise off; its own cause stays the one that is told.
        station.make_safe()
        raise
    _leave_silent(station)
    check_readings(station.sheet.noise, settings, table, floor, closing)
    return NoiseCalibration.from_readings(
        station,
        started_at=started_at,
        ended_at=now(),
        settings_db=settings,
        readings_dbm=table,
        floor_readings_dbm=floor,
        closing_readings_dbm=closing,
    )


def read_carrier(
    station: NoiseStation, calibration: NoiseCalibration, *, now: Now, sleep_s: Sleep = time.sleep
) -> CarrierReading:
    """Read a unit's carrier power with the noise off.

    Args:
        station: The open station, with the unit's carrier on.
        calibration: The noise calibration, for the floor and the meter's facts.
        now: Where date and time come from.
        sleep_s: How to let seconds pass.

    Returns:
        The reading; a carrier lost in the floor reads as the floor's level. The noise is off.

    Raises:
        LinkError: An instrument does not answer, or gives no valid number.
    """
    facts = calibration.facts
    if station.noise_source.is_on():
        station.noise_source.output_off()
    # The state in which the floor was read: what leaks from the source that is off must be the same.
    station.attenuator.set_attenuation_db(calibration.settings_db[-1])
    station.power_meter.set_averaging_s(facts.averaging_s)
    sleep_s(facts.settle_s)
    readings = tuple(station.power_meter.read_power_dbm() for _ in range(facts.readings))
    floor_dbm = mean_level_dbm(calibration.floor_readings_dbm)
    # A unit without a carrier must be judged, not void the run: the level read is the most it can be.
    if float(np.mean(readings)) < floor_dbm + LEAST_CARRIER_DB:
        return CarrierReading(float(np.mean(readings)), facts.meter_calibration_db, readings, now())
    quantities = model.carrier_quantities(facts, calibration.floor_readings_dbm, readings)
    found = evaluate(model.carrier_dbm, quantities)
    return CarrierReading(found.value, found.u, readings, now())


class _Survey:
    """One pass over floor and settings."""

    def __init__(
        self,
        station: NoiseStation,
        sleep_s: Sleep,
        progress: Callable[[CalibrationProgress], None],
        *,
        total: int,
    ) -> None:
        self._station = station
        self._sleep_s = sleep_s
        self._progress = progress
        self._total = total
        self._done = 0

    def run(
        self, settings_db: tuple[float, ...]
    ) -> tuple[tuple[float, ...], tuple[tuple[float, ...], ...], tuple[float, ...]]:
        station = self._station
        station.unit_port.carrier_off()
        station.noise_source.output_off()
        station.power_meter.set_averaging_s(station.sheet.noise.averaging_s)
        # A source that is off still leaks a little through the attenuator; at most attenuation least.
        station.attenuator.set_attenuation_db(settings_db[-1])
        floor = self._level(None)
        station.noise_source.output_on()
        table = tuple(self._level(setting_db) for setting_db in settings_db)
        closing = self._level(settings_db[0])
        return floor, table, closing

    def _level(self, setting_db: float | None) -> tuple[float, ...]:
        facts = self._station.sheet.noise
        if setting_db is not None:
            self._station.attenuator.set_attenuation_db(setting_db)
        self._sleep_s(facts.settle_s)
        readings = tuple(self._station.power_meter.read_power_dbm() for _ in range(facts.readings))
        self._done += 1
        self._progress(CalibrationProgress(self._done, self._total, setting_db, float(np.mean(readings))))
        return readings


def _silent(_: CalibrationProgress) -> None:
    """Nobody listens."""


def _leave_silent(station: NoiseStation) -> None:
    try:
        station.noise_source.output_off()
    except LinkError as reason:
        unsafe = {role: why for role, why in station.make_safe().items() if why}
        if unsafe:
            listed = "; ".join(f"{role.replace('_', ' ')}: {why}" for role, why in unsafe.items())
            raise CalibrationError(
                f"the noise could not be switched off after the calibration ({listed}): switch it off by hand"
            ) from reason
