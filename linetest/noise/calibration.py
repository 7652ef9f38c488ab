"""A noise calibration as a value: what was read, with which instruments, and N0 per attenuator setting."""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass
from datetime import datetime, timedelta
from functools import cached_property
from typing import Any

import numpy as np
from pydantic import ValidationError

from linetest.errors import CalibrationError
from linetest.instruments import NoiseFacts
from linetest.noise import model
from linetest.noise.budget import Budget, Contribution, covariance, evaluate
from linetest.noise.quantities import Quantity
from linetest.noise.station import ADVICE, CalibratedWith, NoiseStation, instruments_of
from linetest.units import FloatArray

FORMAT = 1


@dataclass(frozen=True)
class NoiseCalibration:
    """What ties attenuator settings to N0 at the unit's input.

    Attributes:
        station: Name of the station.
        started_at: When it began.
        ended_at: When it ended.
        valid_until: When it stops holding.
        instruments: The instruments it was made with.
        facts: What the station sheet stated of noise and meter.
        settings_db: Attenuator settings measured, dB, ascending.
        readings_dbm: Meter readings by setting, dBm.
        floor_readings_dbm: Readings with noise and carrier off, dBm.
        closing_readings_dbm: Readings of the first setting, repeated at the end, dBm.
        n0_dbm_hz: N0 by setting, dBm/Hz.
        u_db: Its standard uncertainty by setting, the meter's calibration factor included, dB.
        dof: Effective degrees of freedom by setting.
    """

    station: str
    started_at: datetime
    ended_at: datetime
    valid_until: datetime
    instruments: tuple[CalibratedWith, ...]
    facts: NoiseFacts
    settings_db: tuple[float, ...]
    readings_dbm: tuple[tuple[float, ...], ...]
    floor_readings_dbm: tuple[float, ...]
    closing_readings_dbm: tuple[float, ...]
    n0_dbm_hz: tuple[float, ...]
    u_db: tuple[float, ...]
    dof: tuple[float, ...]

    @classmethod
    def from_readings(
        cls,
        station: NoiseStation,
        *,
        started_at: datetime,
        ended_at: datetime,
        settings_db: Sequence[float],
        readings_dbm: Sequence[Sequence[float]],
        floor_readings_dbm: Sequence[float],
        closing_readings_dbm: Sequence[float],
    ) -> NoiseCalibration:
        """Make a calibration of what was read.

        Args:
            station: The station it was read on.
            started_at: When it began.
            ended_at: When it ended.
            settings_db: Attenuator settings, dB, ascending.
            readings_dbm: Readings by setting, dBm.
            floor_readings_dbm: Readings with noise and carrier off, dBm.
            closing_readings_dbm: Readings of the first setting at the end, dBm.

        Returns:
            The calibration.
        """
        facts = station.sheet.noise
        floor = tuple(floor_readings_dbm)
        table = tuple(tuple(readings) for readings in readings_dbm)
        budgets = [_n0_budget(facts, floor, table, index) for index in range(len(table))]
        return cls(
            station=station.sheet.name,
            started_at=started_at,
            ended_at=ended_at,
            valid_until=started_at + timedelta(hours=facts.calibration_valid_h),
            instruments=instruments_of(station),
            facts=facts,
            settings_db=tuple(settings_db),
            readings_dbm=table,
            floor_readings_dbm=floor,
            closing_readings_dbm=tuple(closing_readings_dbm),
            n0_dbm_hz=tuple(budget.value for budget in budgets),
            u_db=tuple(budget.u for budget in budgets),
            dof=tuple(budget.dof for budget in budgets),
        )

    def quantities(self, index: int) -> tuple[Quantity, ...]:
        """Input quantities of the N0 of a setting.

        Args:
            index: Number of the setting in `settings_db`, from 0.

        Returns:
            The quantities by which `linetest.noise.model.n0_dbm_hz` gives N0.
        """
        return _n0_quantities(self.facts, self.floor_readings_dbm, self.readings_dbm, index)

    def budget(self, index: int) -> Budget:
        """Budget of the N0 of a setting.

        Args:
            index: Number of the setting in `settings_db`, from 0.

        Returns:
            N0 in dBm/Hz with its budget.
        """
        return evaluate(model.n0_dbm_hz, self.quantities(index))

    @cached_property
    def contributions(self) -> tuple[tuple[Contribution, ...], ...]:
        """Budget lines by setting."""
        return tuple(self.budget(index).contributions for index in range(len(self.settings_db)))

    def covariance_db2(self, *, relative: bool = True) -> FloatArray:
        """Covariance of N0 between settings: what they share, and on the diagonal what each owns.

        Args:
            relative: Leave out the meter's calibration factor, which cancels against the carrier's.

        Returns:
            Array (settings, settings) in dB squared.
        """
        left_out = {"meter calibration"} if relative else set()
        return covariance([line for line in lines if line.name not in left_out] for lines in self.contributions)

    def to_json(self) -> str:
        """The calibration as text; equal calibrations give equal text.

        Returns:
            JSON with sorted keys.
        """
        content: dict[str, Any] = {
            "format": FORMAT,
            "station": self.station,
            "started_at": self.started_at.isoformat(),
            "ended_at": self.ended_at.isoformat(),
            "valid_until": self.valid_until.isoformat(),
            "instruments": [asdict(instrument) for instrument in self.instruments],
            "facts": self.facts.model_dump(),
            "settings_db": self.settings_db,
            "readings_dbm": self.readings_dbm,
            "floor_readings_dbm": self.floor_readings_dbm,
            "closing_readings_dbm": self.closing_readings_dbm,
            "n0_dbm_hz": self.n0_dbm_hz,
            "u_db": self.u_db,
            # JSON has no infinity.
            "dof": [None if math.isinf(dof) else dof for dof in self.dof],
        }
        return json.dumps(content, sort_keys=True, separators=(",", ":"), allow_nan=False)

    @classmethod
    def from_json(cls, text: str) -> NoiseCalibration:
        """Read a calibration back.

        Args:
            text: Text of `to_json`.

        Returns:
            The calibration.

        Raises:
            CalibrationError: The text is not one that `to_json` made.
        """
        try:
            return cls._from_content(json.loads(text))
        except (ValueError, KeyError, TypeError, ValidationError) as reason:
            raise CalibrationError(
                f"the noise calibration on record cannot be read ({type(reason).__name__}: {reason}); {ADVICE}"
            ) from reason

    @classmethod
    def _from_content(cls, content: Mapping[str, Any]) -> NoiseCalibration:
        if content["format"] != FORMAT:
            raise ValueError(f"format {content['format']!r} is not {FORMAT}")
        return cls(
            station=content["station"],
            started_at=datetime.fromisoformat(content["started_at"]),
            ended_at=datetime.fromisoformat(content["ended_at"]),
            valid_until=datetime.fromisoformat(content["valid_until"]),
            instruments=tuple(CalibratedWith(**entry) for entry in content["instruments"]),
            facts=NoiseFacts.model_validate(content["facts"]),
            settings_db=tuple(content["settings_db"]),
            readings_dbm=tuple(tuple(readings) for readings in content["readings_dbm"]),
            floor_readings_dbm=tuple(content["floor_readings_dbm"]),
            closing_readings_dbm=tuple(content["closing_readings_dbm"]),
            n0_dbm_hz=tuple(content["n0_dbm_hz"]),
            u_db=tuple(content["u_db"]),
            dof=tuple(math.inf if dof is None else dof for dof in content["dof"]),
        )

    def digest(self) -> str:
        """SHA-256 of the calibration's text.

        Returns:
            64 hexadecimal digits.
        """
        return hashlib.sha256(self.to_json().encode("utf-8")).hexdigest()


def pooled_scatter_db(readings_dbm: Sequence[Sequence[float]]) -> tuple[float, float]:
    """Standard deviation of a single reading, pooled over settings: relative, it is the same at every level.

    Args:
        readings_dbm: Readings by setting, dBm, at least two each.

    Returns:
        Standard deviation in dB and its degrees of freedom.
    """
    squares = sum(float(np.var(readings, ddof=1)) * (len(readings) - 1) for readings in readings_dbm)
    dof = sum(len(readings) - 1 for readings in readings_dbm)
    return math.sqrt(squares / dof), float(dof)


def _n0_quantities(
    facts: NoiseFacts, floor: Sequence[float], table: Sequence[Sequence[float]], index: int
) -> tuple[Quantity, ...]:
    scatter_db, dof = pooled_scatter_db(table)
    return model.noise_quantities(facts, floor, float(np.mean(table[index])), scatter_db, dof)


def _n0_budget(facts: NoiseFacts, floor: Sequence[float], table: Sequence[Sequence[float]], index: int) -> Budget:
    return evaluate(model.n0_dbm_hz, _n0_quantities(facts, floor, table, index))
