"""Whether a noise calibration still holds: its time, its station, its instruments."""

from __future__ import annotations

from datetime import timedelta

import pytest

from linetest.errors import CalibrationError
from linetest.noise import NoiseCalibration, check_current
from tests.noise.fakes import START, FakeStation, station_sheet
from tests.noise.test_measure import calibrated

SOON = START + timedelta(hours=1)


def test_calibration_holds_on_its_station_within_its_time() -> None:
    station = FakeStation()
    made = calibrated(station)
    for at in (START, SOON, START + timedelta(hours=12)):
        check_current(made, station, now=at)
        check_current(NoiseCalibration.from_json(made.to_json()), station, now=at)


@pytest.mark.parametrize(
    ("after", "sentence"),
    [
        (timedelta(hours=12, seconds=1), "the noise calibration ran out at 2030-05-01 18:00 UTC"),
        (timedelta(seconds=-1), "is dated 2030-05-01 06:00 UTC, in the future: check the clock"),
    ],
)
def test_calibration_out_of_its_time_is_refused(after: timedelta, sentence: str) -> None:
    station = FakeStation()
    with pytest.raises(CalibrationError) as caught:
        check_current(calibrated(station), station, now=START + after)
    assert sentence in str(caught.value)
    assert str(caught.value).endswith("run 'linetest station calibrate'")


def test_other_station_is_refused() -> None:
    other = FakeStation(station_sheet("A2"))
    with pytest.raises(CalibrationError, match="belongs to station A1, not to A2"):
        check_current(calibrated(FakeStation()), other, now=SOON)


def test_other_noise_facts_are_refused() -> None:
    other = FakeStation(station_sheet(enbw_hz=10.7e6))
    with pytest.raises(CalibrationError, match="noise facts changed since the noise calibration"):
        check_current(calibrated(FakeStation()), other, now=SOON)


@pytest.mark.parametrize("role", ["noise_source", "attenuator", "power_meter"])
def test_exchanged_instrument_is_found_by_its_identity(role: str) -> None:
    """An attenuator swapped without a new calibration must not go unnoticed."""
    station = FakeStation()
    made = calibrated(station)
    station.identities[role] = "Brackwater,other,8,1.0"
    with pytest.raises(CalibrationError, match=f"the {role.replace('_', ' ')} was Brackwater,{role},7,1.0"):
        check_current(made, station, now=SOON)


def test_other_dialect_is_found() -> None:
    station = FakeStation()
    made = calibrated(station)
    station.dialect_digests["power_meter"] = "f" * 64
    with pytest.raises(CalibrationError, match="dialect of the power meter changed"):
        check_current(made, station, now=SOON)


@pytest.mark.parametrize("role", ["supply", "unit_port"])
def test_instruments_that_do_not_touch_the_noise_may_be_exchanged(role: str) -> None:
    station = FakeStation()
    made = calibrated(station)
    station.identities[role] = "Brackwater,other,8,1.0"
    check_current(made, station, now=SOON)


def test_instrument_whose_own_calibration_fell_due_is_found() -> None:
    station = FakeStation(station_sheet(calibration_valid_h=24.0 * 400))
    made = calibrated(station)
    check_current(made, station, now=START.replace(month=6, day=30, hour=23))
    with pytest.raises(CalibrationError, match="the power meter's own calibration fell due on 2030-06-30"):
        check_current(made, station, now=START.replace(month=7, day=1))
