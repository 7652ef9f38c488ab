"""Readings that no working station gives are refused, each with its own sentence."""

from __future__ import annotations

import pytest

from linetest.errors import CalibrationError
from linetest.noise.sanity import mean_level_dbm
from tests.noise.fakes import FakeStation
from tests.noise.test_measure import calibrated


def test_noise_source_that_is_not_connected() -> None:
    station = FakeStation()
    station.density_dbm_hz = -150.0
    with pytest.raises(CalibrationError, match=r"dB above the -60\.0 dBm with it off: is the noise source connected"):
        calibrated(station)
    assert not station.noise_on


def test_carrier_left_on_hides_the_noise() -> None:
    station = FakeStation()
    station.carrier_dbm = -10.0
    carrier_off, station.carrier_off = station.carrier_off, lambda: None  # type: ignore[method-assign]  # a stuck port
    station.carrier_on = True
    with pytest.raises(CalibrationError, match="and the unit's carrier off"):
        calibrated(station)
    carrier_off()


def test_attenuator_that_is_stuck() -> None:
    station = FakeStation()
    plain = station.set_attenuation_db

    def stuck(attenuation_db: float) -> None:
        plain(min(attenuation_db, 16.0))

    station.set_attenuation_db = stuck  # type: ignore[method-assign]  # an attenuator that does not move
    with pytest.raises(CalibrationError, match=r"off what the other settings say: check the attenuator"):
        calibrated(station)


def test_cells_a_few_tenths_out_are_no_reason() -> None:
    station = FakeStation()
    plain = station.set_attenuation_db
    errors = {14.5: 0.5, 16.0: -0.5}

    def off(attenuation_db: float) -> None:
        plain(attenuation_db + errors.get(attenuation_db, 0.0))

    station.set_attenuation_db = off  # type: ignore[method-assign]  # an attenuator with errors
    found = calibrated(station)
    assert found.n0_dbm_hz[1] == pytest.approx(-72.0 - 15.0, abs=0.03)


def test_readings_that_scatter() -> None:
    station = FakeStation()
    station.sigma_db = 0.2
    with pytest.raises(CalibrationError, match=r"scatter by 0\.\d+ dB, more than 0\.058 dB"):
        calibrated(station)


def test_noise_that_drifts() -> None:
    station = FakeStation()
    station.drift_db_per_reading = 0.003
    with pytest.raises(
        CalibrationError, match=r"the noise moved by \+0\.\d+ dB during the calibration, more than 0\.11"
    ):
        calibrated(station)


def test_level_of_a_mean_is_of_the_power_not_of_the_decibels() -> None:
    """Mean of 1 mW and 3 mW is 2 mW: 3.0103 dBm."""
    assert mean_level_dbm([0.0, 4.771212547]) == pytest.approx(3.0103, abs=1e-4)
