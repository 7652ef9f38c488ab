"""The printed interval holds the truth: a thousand simulated stations with errors of their own, over VISA."""

from __future__ import annotations

import math
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path

import numpy as np
import pytest

from linetest.bench import Bench, write_station_sheet
from linetest.errors import LinkError
from linetest.instruments import Station, StationLibrary, load_station_sheet, open_station
from linetest.noise import calibrate_noise, covariance, ebn0_budget, read_carrier
from linetest.noise.budget import Contribution
from linetest.units import FloatArray

RATE_BPS = 2.048e6
SETTINGS_DB = (14.0, 20.0, 26.0)
STATIONS = 1000


def now() -> datetime:
    return datetime(2030, 5, 1, 6, 0, tzinfo=UTC)


def no_sleep(_: float) -> None:
    """The bench runs on time of its own."""


@contextmanager
def opened(bench: Bench, file: Path) -> Iterator[Station]:
    """The bench as an open station."""
    write_station_sheet(file, bench.resources)
    # Due dates on a bench's sheet count from today; nothing here depends on the date.
    devices = {bench.resources[role]: device for role, device in bench.devices.items()}
    library = StationLibrary.create(devices, fallback=None)
    station = open_station(load_station_sheet(file), library=library, now=lambda: datetime.now(UTC))
    try:
        yield station
    finally:
        station.close()


@dataclass(frozen=True)
class Outcomes:
    """What a thousand stations printed and what was true; arrays (stations, settings)."""

    values: FloatArray
    u_db: FloatArray
    expanded_u_db: FloatArray
    truths: FloatArray
    lines: list[list[tuple[Contribution, ...]]]


def one_station(
    seed: int, file: Path
) -> tuple[list[tuple[float, float, float, float]], list[tuple[Contribution, ...]]]:
    bench = Bench(seed=seed)
    rows, lines = [], []
    with opened(bench, file) as station:
        calibration = calibrate_noise(station, SETTINGS_DB, now=now, sleep_s=no_sleep)
        station.unit_port.load_unit("BQ4-000101")
        station.supply.set_voltage_v(12.0)
        station.supply.output_on()
        station.unit_port.set_mode("qpsk-2048")
        station.unit_port.carrier_on()
        carrier = read_carrier(station, calibration, now=now, sleep_s=no_sleep)
        station.noise_source.output_on()
        for index, setting_db in enumerate(SETTINGS_DB):
            station.attenuator.set_attenuation_db(setting_db)
            found = ebn0_budget(calibration, carrier, RATE_BPS, index)
            rows.append((found.value, found.u, found.expanded_u, bench.true_ebn0_db()))
            lines.append(found.contributions)
    return rows, lines


@pytest.fixture(scope="module")
def outcomes(tmp_path_factory: pytest.TempPathFactory) -> Outcomes:
    file = tmp_path_factory.mktemp("stations") / "station.toml"
    found = [one_station(seed, file) for seed in range(1, STATIONS + 1)]
    table = np.array([rows for rows, _ in found])
    values, u_db, expanded_u_db, truths = np.moveaxis(table, 2, 0)
    return Outcomes(values, u_db, expanded_u_db, truths, [lines for _, lines in found])


def test_interval_of_95_percent_holds_the_truth_at_every_setting(outcomes: Outcomes) -> None:
    hits = np.abs(outcomes.values - outcomes.truths) <= outcomes.expanded_u_db
    assert np.all((hits[:200].mean(axis=0) >= 0.92) & (hits[:200].mean(axis=0) <= 0.985))
    assert 0.92 <= hits[:200].mean() <= 0.98
    assert np.all((hits.mean(axis=0) >= 0.93) & (hits.mean(axis=0) <= 0.97))


def test_standard_uncertainty_is_the_scatter_of_the_errors(outcomes: Outcomes) -> None:
    relative = (outcomes.values - outcomes.truths) / outcomes.u_db
    # Standard deviation of 1000 values scatters by 2.2 %; four of them.
    assert relative.std(axis=0) == pytest.approx(np.ones(len(SETTINGS_DB)), abs=0.09)
    assert np.abs(relative.mean(axis=0)).max() < 4.0 / math.sqrt(STATIONS)


def test_covariance_between_settings_is_that_of_the_errors(outcomes: Outcomes) -> None:
    """Shared parts cancel between two settings of a run: the difference scatters three times less."""
    difference = (outcomes.values - outcomes.truths)[:, 0] - (outcomes.values - outcomes.truths)[:, -1]
    matrices = [covariance(lines) for lines in outcomes.lines]
    kept = np.sqrt([matrix[0, 0] + matrix[-1, -1] - 2.0 * matrix[0, -1] for matrix in matrices])
    ignored = np.sqrt([matrix[0, 0] + matrix[-1, -1] for matrix in matrices])
    assert (difference / kept).std() == pytest.approx(1.0, abs=0.09)
    assert (difference / ignored).std() < 0.5


def test_without_the_correlation_of_carrier_and_noise_the_interval_would_be_wrong(outcomes: Outcomes) -> None:
    """Taken as two numbers, the meter's calibration factor (0.20 dB) makes every interval three times too wide."""
    twice_db2 = 2.0 * 0.20**2 / 3.0
    ignored = 1.96 * np.sqrt(outcomes.u_db**2 + twice_db2)
    hits = np.abs(outcomes.values - outcomes.truths) <= ignored
    assert np.all(hits.mean(axis=0) > 0.99)


def test_overloaded_meter_makes_no_calibration_and_leaves_the_noise_off(tmp_path: Path) -> None:
    """A source 40 dB too strong: the meter answers 9.9E37, which is no number."""
    bench = Bench(seed=1)
    bench.truth = replace(bench.truth, density_dbm_hz=-32.0)
    with opened(bench, tmp_path / "station.toml") as station:
        with pytest.raises(LinkError, match="no valid measurement"):
            calibrate_noise(station, SETTINGS_DB, now=now, sleep_s=no_sleep)
        assert not bench.noise_on
        assert not bench.supply_on


def test_meter_offset_common_to_carrier_and_noise_does_not_move_ebn0(tmp_path: Path) -> None:
    """0.3 dB on both: less than 0.02 dB of Eb/N0 (of which the readings' own scatter is 0.01)."""
    found = []
    for offset_db in (0.0, 0.3):
        bench = Bench(seed=5)
        flat = np.zeros_like(bench.truth.linearity_db)
        bench.truth = replace(bench.truth, meter_offset_db=offset_db, linearity_db=flat)
        with opened(bench, tmp_path / "station.toml") as station:
            calibration = calibrate_noise(station, (20.0,), now=now, sleep_s=no_sleep)
            station.unit_port.load_unit("BQ4-000101")
            station.supply.set_voltage_v(12.0)
            station.supply.output_on()
            station.unit_port.set_mode("qpsk-2048")
            station.unit_port.carrier_on()
            carrier = read_carrier(station, calibration, now=now, sleep_s=no_sleep)
        found.append((carrier.power_dbm, ebn0_budget(calibration, carrier, RATE_BPS, 0).value))
    assert found[1][0] - found[0][0] == pytest.approx(0.3, abs=0.02)
    assert abs(found[1][1] - found[0][1]) < 0.02
