"""A noise calibration as a value: kept as text without loss, and refused when it no longer holds."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from datetime import timedelta

import numpy as np
import pytest

from linetest.errors import CalibrationError
from linetest.noise import NoiseCalibration, check_current
from linetest.noise.calibration import pooled_scatter_db
from tests.noise.fakes import SETTINGS_DB, START, FakeStation, station_sheet
from tests.noise.test_measure import calibrated

SOON = START + timedelta(hours=1)


def test_text_holds_all_and_comes_back_the_same() -> None:
    made = calibrated(FakeStation())
    text = made.to_json()
    back = NoiseCalibration.from_json(text)
    assert back == made
    assert back.to_json() == text
    assert back.digest() == made.digest()
    assert len(json.loads(text)["readings_dbm"]) == len(SETTINGS_DB)


def test_infinite_degrees_of_freedom_survive_the_text() -> None:
    made = replace(calibrated(FakeStation(), (14.0, 20.0)), dof=(math.inf, 3.5))
    assert NoiseCalibration.from_json(made.to_json()).dof == (math.inf, 3.5)


def test_one_reading_changed_changes_the_digest() -> None:
    made = calibrated(FakeStation())
    readings = ((*made.readings_dbm[0][:-1], made.readings_dbm[0][-1] + 1e-9), *made.readings_dbm[1:])
    assert replace(made, readings_dbm=readings).digest() != made.digest()


@pytest.mark.parametrize(
    ("change", "named"),
    [
        (lambda _: "", "JSONDecodeError"),
        (lambda text: text[:-1], "JSONDecodeError"),
        (lambda _: "[1]", "TypeError"),
        (lambda text: text.replace('"format":1', '"format":99'), "format 99 is not 1"),
        (lambda text: text.replace('"station":', '"stat":'), "KeyError"),
        (lambda text: text.replace('"enbw_hz":10000000.0', '"enbw_hz":-1.0'), "ValidationError"),
        (lambda text: text.replace("2030-05-01T06:00", "yesterday"), "Invalid isoformat"),
    ],
)
def test_text_that_is_no_calibration_is_refused(change: object, named: str) -> None:
    assert callable(change)
    text = change(calibrated(FakeStation(), (14.0, 20.0)).to_json())
    with pytest.raises(CalibrationError, match="cannot be read") as caught:
        NoiseCalibration.from_json(text)
    assert named in str(caught.value)
    assert str(caught.value).endswith("run 'linetest station calibrate'")


def test_covariance_between_settings_is_what_they_share() -> None:
    """Shared: bandwidth, response, slope, mismatch. Own: reading, linearity, attenuator."""
    made = calibrated(FakeStation())
    matrix = made.covariance_db2()
    shared = (10.0 * math.log10(1.006)) ** 2 + 0.05**2 / 3.0 + 0.03**2 / 3.0 + 0.04**2 / 2.0
    off_diagonal = matrix[~np.eye(len(SETTINGS_DB), dtype=bool)]
    assert off_diagonal == pytest.approx(shared, rel=0.01)
    scatter_db, dof = pooled_scatter_db(made.readings_dbm)
    own = scatter_db**2 / 4.0 + 0.03**2 / 3.0 + 0.005**2
    assert np.diag(matrix) == pytest.approx(shared + own, rel=0.01)
    assert dof == 3 * len(SETTINGS_DB)


def test_absolute_covariance_has_the_meters_calibration_too() -> None:
    made = calibrated(FakeStation())
    difference = made.covariance_db2(relative=False) - made.covariance_db2()
    assert difference == pytest.approx(np.full_like(difference, 0.20**2 / 3.0), rel=1e-9)
    assert np.sqrt(np.diag(made.covariance_db2(relative=False))) == pytest.approx(made.u_db)


def test_pooled_scatter_is_the_scatter_of_one_reading() -> None:
    readings = [(1.0, 3.0), (5.0, 5.0), (2.0, 4.0)]
    assert pooled_scatter_db(readings) == pytest.approx((math.sqrt((2.0 + 0.0 + 2.0) / 3.0), 3.0))


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
