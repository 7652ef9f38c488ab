"""Setting Eb/N0: only among calibrated settings, by the sheet's rule, with the Eb/N0 that is really there."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from linetest.errors import CalibrationError, ParameterError
from linetest.noise import CarrierReading, NoiseCalibration, set_ebn0, step_covariance_db2
from linetest.noise.setting import SettingRule
from tests.noise.fakes import SETTINGS_DB, FakeStation
from tests.noise.test_model import RATE_BPS, measured

CALIBRATION, CARRIER = measured(FakeStation())
# Eb/N0 of every calibrated setting by the definition alone.
REACHABLE = CARRIER.power_dbm - np.array(CALIBRATION.n0_dbm_hz) - 10.0 * math.log10(RATE_BPS)


@given(st.floats(REACHABLE.min(), REACHABLE.max()), st.sampled_from(["nearest", "from-below", "from-above"]))
def test_setting_is_the_best_one_that_the_rule_allows(nominal_db: float, rule: SettingRule) -> None:
    found = set_ebn0(CALIBRATION, CARRIER, RATE_BPS, nominal_db, rule)
    index = SETTINGS_DB.index(found.attenuation_db)
    offsets = REACHABLE - nominal_db
    allowed = {
        "nearest": np.full(offsets.size, fill_value=True),
        "from-below": offsets <= 0.0,
        "from-above": offsets >= 0.0,
    }[rule]
    assert allowed[index]
    assert abs(offsets[index]) == np.abs(offsets[allowed]).min()
    assert found.ebn0_db == pytest.approx(REACHABLE[index], abs=0.005 + 1e-9)
    assert found.ebn0_db == round(found.ebn0_db, 2)
    assert found.nominal_ebn0_db == nominal_db
    assert found.n0_dbm_hz == CALIBRATION.n0_dbm_hz[index]
    assert found.expanded_u_db == pytest.approx(found.k * found.u_db)


def test_settings_that_do_not_reach_their_order_are_chosen_by_what_they_give() -> None:
    """Cells with errors: 20.5 dB gives less attenuation than 20.0 dB."""
    station = FakeStation()
    plain = station.set_attenuation_db
    errors = {20.0: 0.4, 20.5: -0.4}

    def off(attenuation_db: float) -> None:
        plain(attenuation_db + errors.get(attenuation_db, 0.0))

    station.set_attenuation_db = off  # type: ignore[method-assign]  # an attenuator with errors
    calibration, carrier = measured(station)
    at_20_db = -20.0 + 72.0 + 20.4 - 63.11
    assert set_ebn0(calibration, carrier, RATE_BPS, at_20_db).attenuation_db == 20.0
    assert set_ebn0(calibration, carrier, RATE_BPS, at_20_db - 0.3).attenuation_db == 20.5


@pytest.mark.parametrize(
    ("nominal_db", "rule"),
    [
        (REACHABLE.min() - 1.0, "nearest"),
        (REACHABLE.max() + 1.0, "nearest"),
        (REACHABLE.min() - 0.01, "from-below"),
        (REACHABLE.max() + 0.01, "from-above"),
        (REACHABLE.max() + 1.0, "from-below"),
    ],
)
def test_beyond_the_calibrated_settings_nothing_is_set(nominal_db: float, rule: SettingRule) -> None:
    with pytest.raises(CalibrationError, match=f"cannot be set {rule}: the settings calibrated, 14 to 26 dB, reach"):
        set_ebn0(CALIBRATION, CARRIER, RATE_BPS, nominal_db, rule)


def test_step_keeps_what_it_shares_with_the_others_of_its_run() -> None:
    """Steps share carrier, bandwidth, response, slope and mismatch: most of u. Own is the least."""
    settings = [set_ebn0(CALIBRATION, CARRIER, RATE_BPS, nominal) for nominal in (6.8, 8.4, 9.6, 10.5)]
    matrix = step_covariance_db2(settings)
    u_db = np.array([setting.u_db for setting in settings])
    assert np.sqrt(np.diag(matrix)) == pytest.approx(u_db)
    correlation = matrix / np.outer(u_db, u_db)
    scatter2 = float(np.var(CARRIER.readings_dbm, ddof=1)) / 4.0
    shared = CALIBRATION.covariance_db2()[0, 1] + 0.03**2 / 3.0 + scatter2
    assert correlation[0, 3] == pytest.approx(shared / u_db[0] ** 2, rel=0.01)
    assert 0.85 < correlation[0, 3] < 0.95


def test_steps_covariance_is_that_of_drawn_errors() -> None:
    """Errors drawn part by part: shared ones once a run, own ones a step."""
    settings = [set_ebn0(CALIBRATION, CARRIER, RATE_BPS, nominal) for nominal in (6.8, 10.5)]
    rng = np.random.default_rng(12)
    common = {line.name: rng.standard_normal(200_000) for line in settings[0].contributions if line.shared}
    errors = [
        np.sum(
            [
                line.contribution * (common[line.name] if line.shared else rng.standard_normal(200_000))
                for line in setting.contributions
            ],
            axis=0,
        )
        for setting in settings
    ]
    assert step_covariance_db2(settings) == pytest.approx(np.cov(errors), rel=0.02)


@pytest.mark.parametrize(
    ("rate_bps", "nominal_db", "rule", "named"),
    [
        (0.0, 8.4, "nearest", "bit_rate_bps is 0.0, but must be finite and above 0"),
        (math.nan, 8.4, "nearest", "bit_rate_bps is nan"),
        (RATE_BPS, math.nan, "nearest", "nominal_ebn0_db is nan, but must be finite"),
        (RATE_BPS, 8.4, "near", "rule is 'near', but must be one of nearest, from-below, from-above"),
    ],
)
def test_wrong_input_is_named(rate_bps: float, nominal_db: float, rule: SettingRule, named: str) -> None:
    with pytest.raises(ParameterError) as caught:
        set_ebn0(CALIBRATION, CARRIER, rate_bps, nominal_db, rule)
    assert named in str(caught.value)


def test_calibration_read_back_from_text_sets_the_same() -> None:
    back = NoiseCalibration.from_json(CALIBRATION.to_json())
    again = CarrierReading(CARRIER.power_dbm, CARRIER.u_db, CARRIER.readings_dbm, CARRIER.at)
    assert set_ebn0(back, again, RATE_BPS, 9.6) == set_ebn0(CALIBRATION, CARRIER, RATE_BPS, 9.6)
