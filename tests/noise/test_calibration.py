"""A noise calibration as a value: kept as text without loss, and refused when it no longer holds."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from datetime import timedelta

import numpy as np
import pytest

from linetest.errors import CalibrationError
from linetest.noise import NoiseCalibration
from linetest.noise.calibration import pooled_scatter_db
from tests.noise.fakes import SETTINGS_DB, START, FakeStation
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
