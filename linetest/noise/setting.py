"""Setting Eb/N0: the calibrated attenuator setting that serves a step, and the Eb/N0 that is really there."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Literal

import numpy as np

from linetest.errors import CalibrationError, ParameterError
from linetest.noise import model
from linetest.noise.budget import Budget, Contribution, covariance, evaluate
from linetest.noise.calibration import NoiseCalibration
from linetest.noise.measure import CarrierReading
from linetest.noise.montecarlo import MonteCarloResult, propagate
from linetest.noise.quantities import Quantity
from linetest.noise.station import ADVICE
from linetest.units import FloatArray, ratio_to_db

SettingRule = Literal["nearest", "from-below", "from-above"]
RULES: tuple[SettingRule, ...] = ("nearest", "from-below", "from-above")


@dataclass(frozen=True, slots=True)
class EbN0Setting:
    """The Eb/N0 of a step, as it will really be.

    Attributes:
        attenuation_db: Attenuator setting, one of those calibrated, dB.
        nominal_ebn0_db: Eb/N0 asked for, dB.
        ebn0_db: Eb/N0 that this setting gives, rounded to 0.01 dB.
        u_db: Its standard uncertainty, dB.
        dof: Effective degrees of freedom of `u_db`.
        k: Factor for 95 %.
        expanded_u_db: k times u, dB.
        n0_dbm_hz: N0 at this setting, dBm/Hz.
        contributions: Budget lines.
    """

    attenuation_db: float
    nominal_ebn0_db: float
    ebn0_db: float
    u_db: float
    dof: float
    k: float
    expanded_u_db: float
    n0_dbm_hz: float
    contributions: tuple[Contribution, ...]


def set_ebn0(
    calibration: NoiseCalibration,
    carrier: CarrierReading,
    bit_rate_bps: float,
    nominal_ebn0_db: float,
    rule: SettingRule = "nearest",
    *,
    carrier_change_db: float = 0.0,
) -> EbN0Setting:
    """Choose the calibrated attenuator setting for a step. Nothing is said to any instrument.

    Args:
        calibration: The noise calibration in force.
        carrier: The unit's carrier.
        bit_rate_bps: Information bit rate, bit/s.
        nominal_ebn0_db: Eb/N0 asked for, dB.
        rule: ``nearest``, or the nearest of those not above (``from-below``) or not below (``from-above``).
        carrier_change_db: Greatest change of the carrier that the run allows, dB; enters the budget as half width.

    Returns:
        The setting with the Eb/N0 that is really there and its uncertainty.

    Raises:
        ParameterError: A value is outside its rule.
        CalibrationError: The settings calibrated do not reach the Eb/N0 asked for.
    """
    if rule not in RULES:
        raise ParameterError("rule", rule, f"be one of {', '.join(RULES)}")
    if not (np.isfinite(bit_rate_bps) and bit_rate_bps > 0.0):
        raise ParameterError("bit_rate_bps", bit_rate_bps, "be finite and above 0")
    if not np.isfinite(nominal_ebn0_db):
        raise ParameterError("nominal_ebn0_db", nominal_ebn0_db, "be finite")
    reachable = carrier.power_dbm - np.array(calibration.n0_dbm_hz) - ratio_to_db(bit_rate_bps)
    index = _chosen(calibration, reachable, nominal_ebn0_db, rule)
    found = ebn0_budget(calibration, carrier, bit_rate_bps, index, carrier_change_db=carrier_change_db)
    return EbN0Setting(
        attenuation_db=calibration.settings_db[index],
        nominal_ebn0_db=nominal_ebn0_db,
        ebn0_db=round(found.value, 2),
        u_db=found.u,
        dof=found.dof,
        k=found.k,
        expanded_u_db=found.expanded_u,
        n0_dbm_hz=calibration.n0_dbm_hz[index],
        contributions=found.contributions,
    )


def _chosen(calibration: NoiseCalibration, reachable: FloatArray, nominal_db: float, rule: SettingRule) -> int:
    offsets = reachable - nominal_db
    allowed = {"nearest": np.isfinite(offsets), "from-below": offsets <= 0.0, "from-above": offsets >= 0.0}[rule]
    # Cells have errors of their own, so settings need not reach Eb/N0 in their order.
    gaps = [later - sooner for sooner, later in pairwise(calibration.settings_db)]
    beyond_db = max(gaps, default=0.0)
    outside = nominal_db < reachable.min() - beyond_db or nominal_db > reachable.max() + beyond_db
    if outside or not allowed.any():
        low_db, high_db = calibration.settings_db[0], calibration.settings_db[-1]
        raise CalibrationError(
            f"Eb/N0 {nominal_db:g} dB cannot be set {rule}: the settings calibrated, {low_db:g} to {high_db:g} dB, "
            f"reach {reachable.min():.2f} to {reachable.max():.2f} dB with this carrier; correct the calibration range "
            f"in the station sheet, then {ADVICE}"
        )
    return int(np.argmin(np.where(allowed, np.abs(offsets), np.inf)))


def ebn0_quantities(
    calibration: NoiseCalibration, carrier: CarrierReading, index: int, *, carrier_change_db: float = 0.0
) -> tuple[Quantity, ...]:
    """Input quantities of the Eb/N0 at a calibrated setting.

    Args:
        calibration: The noise calibration.
        carrier: The unit's carrier.
        index: Number of the setting in the calibration, from 0.
        carrier_change_db: Greatest change of the carrier that the run allows, dB.

    Returns:
        The quantities of carrier, noise and setting, those common to carrier and noise once.
    """
    of_carrier = model.carrier_quantities(calibration.facts, calibration.floor_readings_dbm, carrier.readings_dbm)
    of_setting = model.setting_quantities(calibration.facts, carrier_change_db)
    by_name = {item.name: item for item in (*of_carrier, *calibration.quantities(index), *of_setting)}
    return tuple(by_name.values())


def ebn0_budget(
    calibration: NoiseCalibration,
    carrier: CarrierReading,
    bit_rate_bps: float,
    index: int,
    *,
    carrier_change_db: float = 0.0,
) -> Budget:
    """Budget of the Eb/N0 at a calibrated setting (GUM).

    Args:
        calibration: The noise calibration.
        carrier: The unit's carrier.
        bit_rate_bps: Information bit rate, bit/s.
        index: Number of the setting in the calibration, from 0.
        carrier_change_db: Greatest change of the carrier that the run allows, dB.

    Returns:
        Eb/N0 in dB, not rounded, with its budget.
    """
    quantities = ebn0_quantities(calibration, carrier, index, carrier_change_db=carrier_change_db)
    return evaluate(model.ebn0_at(bit_rate_bps), quantities)


def ebn0_monte_carlo(
    calibration: NoiseCalibration,
    carrier: CarrierReading,
    bit_rate_bps: float,
    index: int,
    *,
    rng: np.random.Generator,
    trials: int = 200_000,
    carrier_change_db: float = 0.0,
) -> MonteCarloResult:
    """The same by propagation of distributions (JCGM 101), to stand beside `ebn0_budget`.

    Args:
        calibration: The noise calibration.
        carrier: The unit's carrier.
        bit_rate_bps: Information bit rate, bit/s.
        index: Number of the setting in the calibration, from 0.
        rng: Where chance comes from.
        trials: Number of trials.
        carrier_change_db: Greatest change of the carrier that the run allows, dB.

    Returns:
        Eb/N0 in dB with standard uncertainty and intervals.
    """
    quantities = ebn0_quantities(calibration, carrier, index, carrier_change_db=carrier_change_db)
    return propagate(model.ebn0_at(bit_rate_bps), quantities, rng=rng, trials=trials)


def step_covariance_db2(settings: Sequence[EbN0Setting]) -> FloatArray:
    """Covariance of Eb/N0 between the steps of one run.

    Args:
        settings: The steps' settings, all from one calibration and one carrier reading.

    Returns:
        Array (steps, steps) in dB squared.
    """
    return covariance(setting.contributions for setting in settings)
