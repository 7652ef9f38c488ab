"""Readings that no working station gives, refused before they become a calibration."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from linetest.errors import CalibrationError
from linetest.instruments import NoiseFacts
from linetest.units import FloatArray, db_to_ratio

# Less than this above the floor, subtracting it would cost more uncertainty than the budget has.
LEAST_ABOVE_FLOOR_DB = 10.0
# Repeating the first setting differs by 0.01 dB when all is well, and by the linearity where the level meanwhile
# crossed from one stretch of the meter's curve to the next.
MOST_DRIFT_DB = 0.05
# Cells are good to a few tenths of a dB; a stuck or missing attenuator is out by the whole range.
MOST_STEP_ERROR_DB = 1.5
# Single readings scatter by 4.34 dB/sqrt(B T) from the noise alone (radiometer equation); far more is disturbance.
MOST_SCATTER = 6.0


def mean_level_dbm(readings_dbm: Sequence[float]) -> float:
    """Level of the mean power of readings.

    Args:
        readings_dbm: Readings in dBm.

    Returns:
        Level in dBm.
    """
    return 10.0 * math.log10(float(np.mean(db_to_ratio(np.asarray(readings_dbm, dtype=np.float64)))))


def check_readings(
    facts: NoiseFacts,
    settings_db: Sequence[float],
    table: Sequence[Sequence[float]],
    floor: Sequence[float],
    closing: Sequence[float],
) -> None:
    """Refuse readings that no working station gives.

    Args:
        facts: What the station sheet states.
        settings_db: Attenuator settings, dB.
        table: Readings by setting, dBm.
        floor: Readings with noise and carrier off, dBm.
        closing: Readings of the first setting at the end, dBm.

    Raises:
        CalibrationError: The noise is too near the floor, does not follow the attenuator, scatters, or moved.
    """
    levels = np.array([float(np.mean(readings)) for readings in table])
    _above_floor(settings_db, levels, mean_level_dbm(floor))
    _follows(settings_db, levels)
    _steady(facts, settings_db, table)
    _not_moved(float(np.mean(closing)) - float(levels[0]), MOST_DRIFT_DB + 2.0 * facts.meter_linearity_db)


def _above_floor(settings_db: Sequence[float], levels: FloatArray, floor_dbm: float) -> None:
    above = levels - floor_dbm
    worst = int(np.argmin(above))
    if above[worst] < LEAST_ABOVE_FLOOR_DB:
        raise CalibrationError(
            f"at {settings_db[worst]:g} dB the noise reads {levels[worst]:.1f} dBm, only {above[worst]:.1f} dB above "
            f"the {floor_dbm:.1f} dBm with it off: is the noise source connected, and the unit's carrier off?"
        )


def _follows(settings_db: Sequence[float], levels: FloatArray) -> None:
    source = levels + np.array(settings_db)
    off = source - np.median(source)
    worst = int(np.argmax(np.abs(off)))
    if abs(off[worst]) > MOST_STEP_ERROR_DB:
        raise CalibrationError(
            f"the noise at {settings_db[worst]:g} dB is {off[worst]:+.1f} dB off what the other settings say: check "
            "the attenuator and its connectors"
        )


def _steady(facts: NoiseFacts, settings_db: Sequence[float], table: Sequence[Sequence[float]]) -> None:
    most_db = MOST_SCATTER * 10.0 / math.log(10.0) / math.sqrt(facts.enbw_hz * facts.averaging_s)
    scatters = [float(np.std(readings, ddof=1)) for readings in table]
    worst = int(np.argmax(scatters))
    if scatters[worst] > most_db:
        raise CalibrationError(
            f"readings at {settings_db[worst]:g} dB scatter by {scatters[worst]:.3f} dB, more than {most_db:.3f} dB: "
            "something disturbs the node, or a connector is loose"
        )


def _not_moved(drift_db: float, most_db: float) -> None:
    if abs(drift_db) > most_db:
        raise CalibrationError(
            f"the noise moved by {drift_db:+.3f} dB during the calibration, more than {most_db:g} dB: let the "
            "station warm up, then calibrate again"
        )
