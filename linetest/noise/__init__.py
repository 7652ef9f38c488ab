"""Noise that can be trusted: calibration, uncertainty budget, setting Eb/N0.

The map, in the order data takes:

- `quantities`: what goes into a model, and the functions models are written with
- `budget`: what a model makes of its quantities' uncertainty (GUM)
- `montecarlo`: the same by propagation of distributions (JCGM 101)
- `conformity`: guard bands, specific and global risks (JCGM 106)
- `bandwidth`: noise-equivalent bandwidth from a swept response
- `model`: the measurement's model, from meter readings to Eb/N0
- `station`: what is needed and noted of a station
- `calibration`: a noise calibration as a value
- `current`: whether it still holds
- `sanity`: readings that no working station gives
- `measure`: measuring the noise of a station and the carrier of a unit
- `setting`: the attenuator setting of a step and the Eb/N0 that is really there
"""

from linetest.noise.bandwidth import SweptResponse, noise_bandwidth
from linetest.noise.budget import Budget, Contribution, covariance, coverage_factor, evaluate
from linetest.noise.calibration import NoiseCalibration
from linetest.noise.conformity import GlobalRisks, acceptance_limit_for, global_risks, guard_band, specific_risk
from linetest.noise.current import check_current
from linetest.noise.measure import CalibrationProgress, CarrierReading, calibrate_noise, read_carrier
from linetest.noise.montecarlo import MonteCarloResult, propagate
from linetest.noise.quantities import Quantity
from linetest.noise.setting import (
    EbN0Setting,
    ebn0_budget,
    ebn0_monte_carlo,
    set_ebn0,
    step_covariance_db2,
)
from linetest.noise.station import CalibratedWith, NoiseStation

__all__ = [
    "Budget",
    "CalibratedWith",
    "CalibrationProgress",
    "CarrierReading",
    "Contribution",
    "EbN0Setting",
    "GlobalRisks",
    "MonteCarloResult",
    "NoiseCalibration",
    "NoiseStation",
    "Quantity",
    "SweptResponse",
    "acceptance_limit_for",
    "calibrate_noise",
    "check_current",
    "covariance",
    "coverage_factor",
    "ebn0_budget",
    "ebn0_monte_carlo",
    "evaluate",
    "global_risks",
    "guard_band",
    "noise_bandwidth",
    "propagate",
    "read_carrier",
    "set_ebn0",
    "specific_risk",
    "step_covariance_db2",
]
