"""The bench's hidden truth: what its instruments really do, drawn by seed from what their data sheets allow.

Only tests may read it. Through VISA nothing of it can be asked.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from linetest.units import db_to_ratio, ratio_to_db


@dataclass(frozen=True, slots=True)
class DataSheet:
    """What the data sheets of the bench's instruments promise; written on its station sheet, and kept.

    Half widths in dB unless the name says otherwise; shapes as on the station sheet.
    """

    enbw_hz: float = 10.0e6
    enbw_u_percent: float = 0.6
    meter_calibration_db: float = 0.20
    meter_linearity_db: float = 0.03
    noise_response_db: float = 0.05
    mismatch_db: float = 0.04
    filter_slope_db: float = 0.03
    attenuator_repeatability_db: float = 0.005


NOMINAL_DENSITY_DBM_HZ = -72.0
DENSITY_SPREAD_DB = 0.3
ATTENUATOR_STEP_DB = 0.25
ATTENUATOR_MAX_DB = 63.75
ATTENUATOR_ERROR_DB = 0.3
SOURCE_OFF_DB = 40.0
METER_FLOOR_DBM = -60.0
METER_OVERLOAD_DBM = 10.0
METER_SIGMA_DB = 0.01
METER_SIGMA_AT_S = 0.02
MUTED_CARRIER_DB = 80.0
LINEARITY_CELL_DB = 0.25
LINEARITY_RAMP = 0.2


@dataclass(frozen=True)
class Truth:
    """The hidden errors of one bench.

    Attributes:
        density_dbm_hz: Mean noise density over the filter at the node with no attenuation, dBm/Hz.
        enbw_hz: True noise-equivalent bandwidth, Hz.
        slope_db: N0 in the unit's band against that mean, dB.
        mismatch_db: What mismatch adds to N0 against C between node and unit, dB.
        meter_offset_db: Error of the meter's calibration factor, dB.
        noise_response_db: How much more the meter shows for noise than for a carrier of the same power, dB.
        attenuation_db: True attenuation of every setting, dB; setting n is n times 0.25 dB.
        linearity_db: Meter's linearity error by level, in cells of 0.25 dB with a ramp to the next, dB.
    """

    density_dbm_hz: float
    enbw_hz: float
    slope_db: float
    mismatch_db: float
    meter_offset_db: float
    noise_response_db: float
    attenuation_db: np.ndarray = field(repr=False)
    linearity_db: np.ndarray = field(repr=False)

    @classmethod
    def draw(cls, seed: int, sheet: DataSheet | None = None) -> Truth:
        """Draw a bench's truth from its data sheets.

        Args:
            seed: The same seed is the same bench.
            sheet: The data sheets.

        Returns:
            The truth.
        """
        promised = sheet or DataSheet()
        rng = np.random.default_rng([seed, 1])

        def rectangular(half_width_db: float) -> float:
            return float(rng.uniform(-half_width_db, half_width_db))

        settings = np.arange(round(ATTENUATOR_MAX_DB / ATTENUATOR_STEP_DB) + 1) * ATTENUATOR_STEP_DB
        return cls(
            density_dbm_hz=NOMINAL_DENSITY_DBM_HZ + DENSITY_SPREAD_DB * float(rng.standard_normal()),
            enbw_hz=promised.enbw_hz * (1.0 + promised.enbw_u_percent / 100.0 * float(rng.standard_normal())),
            slope_db=rectangular(promised.filter_slope_db),
            mismatch_db=promised.mismatch_db * float(np.sin(rng.uniform(0.0, 2.0 * np.pi))),
            meter_offset_db=rectangular(promised.meter_calibration_db),
            noise_response_db=rectangular(promised.noise_response_db),
            attenuation_db=settings + rng.uniform(-ATTENUATOR_ERROR_DB, ATTENUATOR_ERROR_DB, settings.size),
            linearity_db=rng.uniform(-promised.meter_linearity_db, promised.meter_linearity_db, 1024),
        )

    def true_attenuation_db(self, setting_db: float) -> float:
        """True attenuation of a setting.

        Args:
            setting_db: The setting, a whole number of steps, dB.

        Returns:
            Attenuation, dB.
        """
        return float(self.attenuation_db[round(setting_db / ATTENUATOR_STEP_DB)])

    def n0_dbm_hz(self, setting_db: float, off_setting_db: float = 0.0) -> float:
        """N0 at the unit's input, on the scale of the carrier read at the node.

        Args:
            setting_db: Attenuator setting, dB.
            off_setting_db: What the attenuator's repeatability adds this time, dB.

        Returns:
            N0, dBm/Hz.
        """
        attenuation_db = self.true_attenuation_db(setting_db) + off_setting_db
        return self.density_dbm_hz - attenuation_db + self.slope_db + self.mismatch_db

    def noise_dbm(self, setting_db: float, off_setting_db: float = 0.0) -> float:
        """Noise power at the node.

        Args:
            setting_db: Attenuator setting, dB.
            off_setting_db: What the attenuator's repeatability adds this time, dB.

        Returns:
            Power, dBm.
        """
        attenuation_db = self.true_attenuation_db(setting_db) + off_setting_db
        return self.density_dbm_hz + ratio_to_db(self.enbw_hz) - attenuation_db

    def shown_dbm(self, carrier_dbm: float, noise_dbm: float, rng: np.random.Generator, averaging_s: float) -> float:
        """What the meter shows for carrier and noise at the node.

        Args:
            carrier_dbm: Carrier power, dBm; minus infinity where there is none.
            noise_dbm: Noise power, dBm.
            rng: Where the reading's repeatability comes from.
            averaging_s: Averaging time, s.

        Returns:
            The reading, dBm.
        """
        power_mw = db_to_ratio(carrier_dbm) + db_to_ratio(noise_dbm + self.noise_response_db)
        level_dbm = ratio_to_db(power_mw + db_to_ratio(METER_FLOOR_DBM))
        # A meter's error changes smoothly with level: a reading that scatters must not jump between errors.
        place = level_dbm / LINEARITY_CELL_DB
        cell = int(np.floor(place)) % self.linearity_db.size
        beside = (cell + 1) % self.linearity_db.size
        error_db = float(
            np.interp(place % 1.0, (1.0 - LINEARITY_RAMP, 1.0), (self.linearity_db[cell], self.linearity_db[beside]))
        )
        # Averaging over T in a noise bandwidth B leaves a relative spread of 1/sqrt(BT).
        sigma_db = METER_SIGMA_DB * float(np.sqrt(METER_SIGMA_AT_S / averaging_s))
        spread_db = sigma_db * float(rng.standard_normal())
        return level_dbm + self.meter_offset_db + error_db + spread_db
