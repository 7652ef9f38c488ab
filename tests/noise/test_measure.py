"""Measuring noise and carrier: the order of things, and that whatever goes wrong leaves the noise off."""

from __future__ import annotations

import math

import numpy as np
import pytest

from linetest.errors import CalibrationError, LinkGarbled, LinkTimeout, ParameterError
from linetest.noise import CalibrationProgress, NoiseCalibration, calibrate_noise, read_carrier
from tests.noise.fakes import SETTINGS_DB, START, FakeClock, FakeStation, station_sheet


def calibrated(station: FakeStation, settings_db: tuple[float, ...] = SETTINGS_DB) -> NoiseCalibration:
    clock = FakeClock()
    return calibrate_noise(station, settings_db, now=clock.now, sleep_s=clock.sleep_s)


def test_floor_first_then_every_setting_then_the_first_again() -> None:
    station = FakeStation()
    told: list[CalibrationProgress] = []
    clock = FakeClock()
    found = calibrate_noise(station, (14.0, 20.0), now=clock.now, sleep_s=clock.sleep_s, progress=told.append)
    four = ["power?"] * 4
    assert station.exchanges == [
        "carrier off",
        "noise off",
        "averaging 0.02",
        "attenuation 20",
        *four,
        "noise on",
        *("attenuation 14", *four, "attenuation 20", *four, "attenuation 14", *four),
        "noise off",
    ]
    assert [(step.done, step.total, step.attenuation_db) for step in told] == [
        (1, 4, None),
        (2, 4, 14.0),
        (3, 4, 20.0),
        (4, 4, 14.0),
    ]
    assert found.started_at == START
    assert (found.ended_at - START).total_seconds() == pytest.approx(4 * 0.005)
    assert (found.valid_until - START).total_seconds() == 12 * 3600


def test_n0_is_the_noise_read_less_the_floor_over_the_bandwidth() -> None:
    """N0 = N / B: -72 dBm/Hz less the attenuation, within the readings' own scatter (0.01 dB / 2, five sigma)."""
    station = FakeStation()
    found = calibrated(station)
    wanted = -72.0 - np.array(SETTINGS_DB)
    assert np.abs(np.array(found.n0_dbm_hz) - wanted).max() < 0.025
    assert len(found.readings_dbm) == len(SETTINGS_DB)
    assert all(len(readings) == 4 for readings in found.readings_dbm)


def test_floor_is_subtracted() -> None:
    """With the noise 12 dB above a floor of -60 dBm the raw reading would be 0.27 dB too high."""
    station = FakeStation()
    station.sigma_db = 1e-6
    station.density_dbm_hz = -92.0
    found = calibrated(station, (26.0,))
    raw_dbm = float(np.mean(found.readings_dbm[0])) - 70.0
    assert raw_dbm - found.n0_dbm_hz[0] == pytest.approx(10 * math.log10(1 + 10**-1.2), abs=0.01)
    assert found.n0_dbm_hz[0] == pytest.approx(-92.0 - 26.0, abs=0.001)


@pytest.mark.parametrize("settings_db", [(), (20.0, 14.0), (14.0, 14.0), (-0.25, 14.0)])
def test_settings_must_ascend(settings_db: tuple[float, ...]) -> None:
    station = FakeStation()
    with pytest.raises(ParameterError, match=r"settings_db is .* but must ascend from 0 or more"):
        calibrated(station, settings_db)
    assert station.exchanges == []


EXCHANGES = 24


@pytest.mark.parametrize("number", range(EXCHANGES))
@pytest.mark.parametrize(
    "failure",
    [
        LinkTimeout("TCPIP0::fake::inst0::INSTR", "READ?", "no answer within 2 s"),
        LinkGarbled("TCPIP0::fake::inst0::INSTR", "READ?", "the answer '9.91E37' stands for no valid measurement"),
        KeyboardInterrupt(),
    ],
    ids=["dead", "not a number", "interrupted"],
)
def test_trouble_at_any_exchange_leaves_the_noise_off_and_no_calibration(number: int, failure: BaseException) -> None:
    """Two settings: carrier and noise off, averaging, floor, noise on, readings; each exchange in turn fails."""
    station = FakeStation()
    station.fail_at, station.failure = number, failure
    with pytest.raises(type(failure)) as caught:
        calibrated(station, (14.0, 20.0))
    assert caught.value is failure
    assert len(station.exchanges) == number + 1
    assert not station.noise_on
    assert station.safe_calls == 1


def test_noise_that_cannot_be_switched_off_by_the_verb_is_switched_off_over_a_fresh_link() -> None:
    station = FakeStation()
    calibrated(station, (14.0, 20.0))
    last = len(station.exchanges) - 1
    station = FakeStation()
    station.fail_at = last
    found = calibrated(station, (14.0, 20.0))
    assert found.settings_db == (14.0, 20.0)
    assert not station.noise_on
    assert station.safe_calls == 1


def test_noise_that_stays_on_is_said_so() -> None:
    station = FakeStation()
    calibrated(station, (14.0, 20.0))
    last = len(station.exchanges) - 1
    station = FakeStation()
    station.fail_at, station.unsafe = last, {"noise_source": "no answer within 2 s"}
    with pytest.raises(CalibrationError, match=r"could not be switched off .*noise source: no answer.* by hand"):
        calibrated(station, (14.0, 20.0))


def test_carrier_is_read_with_the_noise_off() -> None:
    station = FakeStation()
    calibration = calibrated(station)
    station.carrier_on, station.noise_on = True, True
    station.exchanges.clear()
    clock = FakeClock()
    found = read_carrier(station, calibration, now=clock.now, sleep_s=clock.sleep_s)
    assert station.exchanges == ["noise?", "noise off", "attenuation 26", "averaging 0.02", *["power?"] * 4]
    assert found.power_dbm == pytest.approx(-20.0, abs=0.025)
    assert found.at == START + (clock.at - START)
    assert len(found.readings_dbm) == 4


def test_uncertainty_of_the_carrier_holds_the_meters_calibration() -> None:
    """Rectangular 0.20 and 0.03 dB, and the readings' own scatter."""
    station = FakeStation()
    calibration = calibrated(station)
    station.carrier_on = True
    clock = FakeClock()
    found = read_carrier(station, calibration, now=clock.now, sleep_s=clock.sleep_s)
    scatter = float(np.std(found.readings_dbm, ddof=1)) / 2.0
    wanted = math.sqrt(0.20**2 / 3.0 + 0.03**2 / 3.0 + scatter**2)
    assert found.u_db == pytest.approx(wanted, rel=1e-3)


def test_dead_carrier_reads_as_the_floor_not_as_an_error() -> None:
    station = FakeStation()
    calibration = calibrated(station)
    clock = FakeClock()
    found = read_carrier(station, calibration, now=clock.now, sleep_s=clock.sleep_s)
    assert -62.0 < found.power_dbm < -58.0


def test_carrier_reading_that_fails_is_not_a_reading() -> None:
    station = FakeStation()
    calibration = calibrated(station)
    station.exchanges.clear()
    station.fail_at = 5
    clock = FakeClock()
    with pytest.raises(LinkTimeout):
        read_carrier(station, calibration, now=clock.now, sleep_s=clock.sleep_s)


def test_more_readings_where_the_sheet_asks_for_more() -> None:
    station = FakeStation(station_sheet(readings=9))
    found = calibrated(station, (14.0, 20.0))
    assert {len(readings) for readings in found.readings_dbm} == {9}
    assert len(found.floor_readings_dbm) == len(found.closing_readings_dbm) == 9
