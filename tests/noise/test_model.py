"""The measurement's model: what cancels, what does not, and the sizes of the parts by hand."""

from __future__ import annotations

import math

import numpy as np
import pytest

from linetest.noise import CarrierReading, NoiseCalibration, ebn0_budget, ebn0_monte_carlo, read_carrier
from linetest.noise.budget import Contribution
from tests.noise.fakes import SETTINGS_DB, START, FakeClock, FakeStation, station_sheet
from tests.noise.test_measure import calibrated

RATE_BPS = 2.048e6
INDEX = 12


def measured(station: FakeStation) -> tuple[NoiseCalibration, CarrierReading]:
    calibration = calibrated(station)
    station.carrier_on = True
    clock = FakeClock()
    return calibration, read_carrier(station, calibration, now=clock.now, sleep_s=clock.sleep_s)


def lines_of(station: FakeStation, index: int = INDEX) -> dict[str, Contribution]:
    found = ebn0_budget(*measured(station), RATE_BPS, index)
    return {line.name: line for line in found.contributions}


def test_ebn0_is_carrier_over_noise_density_and_bit_rate() -> None:
    """-20 dBm, -72 dBm/Hz behind 20 dB, 10 lg 2.048e6 = 63.114 dB: Eb/N0 8.886 dB."""
    station = FakeStation()
    station.sigma_db = 1e-6
    found = ebn0_budget(*measured(station), RATE_BPS, INDEX)
    assert SETTINGS_DB[INDEX] == 20.0
    assert found.value == pytest.approx(-20.0 + 72.0 + 20.0 - 63.1133, abs=2e-3)


def test_calibration_factor_of_the_meter_cancels() -> None:
    """The same unknown number stands in C and N0; a meter 0.3 dB out moves both levels and not their difference."""
    line = lines_of(FakeStation())["meter calibration"]
    assert line.u == pytest.approx(0.20 / math.sqrt(3.0))
    assert line.contribution == pytest.approx(0.0, abs=1e-12)
    sound, offset = FakeStation(seed=3), FakeStation(seed=3)
    offset.show = lambda level_dbm: level_dbm + 0.3
    (_, right), (_, wrong) = measured(sound), measured(offset)
    assert wrong.power_dbm - right.power_dbm == pytest.approx(0.3, abs=2e-3)
    values = [ebn0_budget(*measured(FakeStation(seed=3)), RATE_BPS, INDEX).value for _ in range(2)]
    assert values[0] == values[1]
    offset = FakeStation(seed=3)
    offset.show = lambda level_dbm: level_dbm + 0.3
    assert ebn0_budget(*measured(offset), RATE_BPS, INDEX).value == pytest.approx(values[0], abs=2e-3)


@pytest.mark.parametrize(
    ("name", "size_db"),
    [
        ("noise bandwidth", 10.0 * math.log10(1.006)),
        ("noise response", 0.05 / math.sqrt(3.0)),
        ("filter slope", 0.03 / math.sqrt(3.0)),
        ("mismatch", 0.04 / math.sqrt(2.0)),
        ("linearity at noise", 0.03 / math.sqrt(3.0)),
        ("linearity at carrier", 0.03 / math.sqrt(3.0)),
        ("attenuator, calibration", 0.005),
        ("attenuator, setting", 0.005),
        ("rounding", 0.005 / math.sqrt(3.0)),
        ("carrier change", 0.0),
    ],
)
def test_each_part_has_the_size_that_the_data_sheet_gives(name: str, size_db: float) -> None:
    assert abs(lines_of(FakeStation())[name].contribution) == pytest.approx(size_db, rel=4e-3, abs=1e-12)


def test_floor_counts_as_unknown_from_none_to_all() -> None:
    """At 26 dB the floor (-60 dBm and what leaks, -68 dBm) lies 31.4 dB under the noise."""
    floor_mw = 10.0**-6.0 + 10.0**-6.8
    line = lines_of(FakeStation(), index=len(SETTINGS_DB) - 1)["floor"]
    noise_mw = 10.0 ** ((-72.0 + 70.0 - 26.0) / 10.0)
    carrier_mw = 10.0**-2.0
    per_mw = 10.0 / math.log(10.0) * (1.0 / noise_mw - 1.0 / carrier_mw)
    assert line.contribution == pytest.approx(floor_mw / math.sqrt(3.0) * per_mw, rel=0.02)


def test_standard_uncertainty_of_the_demo_station_is_six_hundredths_of_a_db() -> None:
    found = ebn0_budget(*measured(FakeStation()), RATE_BPS, INDEX)
    assert found.u == pytest.approx(0.0575, abs=0.001)
    assert found.dof > 1000.0
    assert found.k == pytest.approx(1.96, abs=0.005)


def test_carrier_that_may_move_enters_as_its_limit() -> None:
    calibration, carrier = measured(FakeStation())
    still = ebn0_budget(calibration, carrier, RATE_BPS, INDEX)
    moving = ebn0_budget(calibration, carrier, RATE_BPS, INDEX, carrier_change_db=0.1)
    assert moving.u**2 - still.u**2 == pytest.approx(0.1**2 / 3.0)


def test_few_readings_that_scatter_lower_the_degrees_of_freedom() -> None:
    """Two carrier readings 0.2 dB apart: one degree of freedom carries most of u, and k says so.

    u of their mean is 0.1 dB, of all the rest 0.0575 dB, so that Welch and Satterthwaite's formula gives
    (0.1**2 + 0.0575**2)**2 / 0.1**4 = 1.77.
    """
    calibration = calibrated(FakeStation())
    carrier = CarrierReading(-20.0, 0.2, (-20.1, -19.9), START)
    found = ebn0_budget(calibration, carrier, RATE_BPS, INDEX)
    assert found.dof == pytest.approx(1.77, abs=0.02)
    assert found.k > 4.0


def test_exact_station_leaves_the_readings() -> None:
    """With nothing stated but readings, u is their scatter alone."""
    names = ("meter_linearity_db", "noise_response_db", "mismatch_db", "filter_slope_db", "enbw_u_percent")
    facts = dict.fromkeys((*names, "meter_calibration_db", "attenuator_repeatability_db"), 0.0)
    calibration, carrier = measured(FakeStation(station_sheet("A1", **facts)))
    lines = ebn0_budget(calibration, carrier, RATE_BPS, INDEX).contributions
    assert {line.name for line in lines if abs(line.contribution) > 3e-3} <= {"noise reading", "carrier reading"}


def test_monte_carlo_of_the_same_model_agrees() -> None:
    """Means within five standard errors; the interval a little narrower, as most parts have limits (JCGM 101)."""
    calibration, carrier = measured(FakeStation())
    gum = ebn0_budget(calibration, carrier, RATE_BPS, INDEX)
    drawn = ebn0_monte_carlo(calibration, carrier, RATE_BPS, INDEX, rng=np.random.default_rng(11), trials=400_000)
    assert drawn.value == pytest.approx(gum.value, abs=5.0 * gum.u / math.sqrt(drawn.trials))
    assert drawn.u == pytest.approx(gum.u, rel=0.02)
    half_width = (drawn.interval[1] - drawn.interval[0]) / 2.0
    assert 0.95 < half_width / gum.expanded_u < 1.01
