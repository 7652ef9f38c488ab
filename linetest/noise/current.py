"""Whether a noise calibration still holds: its time, its station, its instruments."""

from __future__ import annotations

from datetime import datetime

from linetest.errors import CalibrationError
from linetest.noise.calibration import NoiseCalibration
from linetest.noise.station import ADVICE, NoiseStation, instruments_of


def check_current(calibration: NoiseCalibration, station: NoiseStation, *, now: datetime) -> None:
    """Make sure that a calibration holds for a station now.

    Args:
        calibration: The calibration.
        station: The open station.
        now: Date and time, aware.

    Raises:
        CalibrationError: It is out of date, belongs to another station, or the station changed since.
    """
    for trouble in (_wrong_time(calibration, now), _changed(calibration, station), _overdue(calibration, now)):
        if trouble:
            raise CalibrationError(f"{trouble}; {ADVICE}")


def _wrong_time(calibration: NoiseCalibration, now: datetime) -> str:
    if now > calibration.valid_until:
        return f"the noise calibration ran out at {calibration.valid_until:%Y-%m-%d %H:%M %Z}"
    if now < calibration.started_at:
        return (
            f"the noise calibration is dated {calibration.started_at:%Y-%m-%d %H:%M %Z}, in the future: check the clock"
        )
    return ""


def _changed(calibration: NoiseCalibration, station: NoiseStation) -> str:
    if calibration.station != station.sheet.name:
        return f"the noise calibration belongs to station {calibration.station}, not to {station.sheet.name}"
    if calibration.facts != station.sheet.noise:
        return "the station sheet's noise facts changed since the noise calibration"
    for made_with, stands in zip(calibration.instruments, instruments_of(station), strict=True):
        role = stands.role.replace("_", " ")
        if (made_with.role, made_with.identity, made_with.serial) != (stands.role, stands.identity, stands.serial):
            return (
                f"the {role} was {made_with.identity} (serial {made_with.serial}) at the noise calibration "
                f"and is {stands.identity} (serial {stands.serial}) now"
            )
        if made_with.dialect_digest != stands.dialect_digest:
            return f"the dialect of the {role} changed since the noise calibration"
    return ""


def _overdue(calibration: NoiseCalibration, now: datetime) -> str:
    for instrument in calibration.instruments:
        if instrument.calibration_due and now.date().isoformat() > instrument.calibration_due:
            role = instrument.role.replace("_", " ")
            return f"the {role}'s own calibration fell due on {instrument.calibration_due}: have it calibrated, then"
    return ""
