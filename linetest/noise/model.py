"""The measurement's model: from meter readings to N0, carrier and Eb/N0 at the unit's input.

All levels in dB or dBm, powers in mW, with P(x) = 10**(x/10)::

    C      = 10 lg(P(r_C) - F) - K - lin_C
    N0     = 10 lg(P(r_N) - F) - K - lin_N - resp - 10 lg B + slope + mismatch + rep
    Eb/N0  = C - N0 - 10 lg Rb + rep' + round

with r the mean reading of carrier or noise, F what the meter shows with both off, K the error of the meter's
calibration factor, lin its linearity at each level, resp its response to noise against a carrier, B the
noise-equivalent bandwidth, slope N0 in the unit's band against the mean over the filter, mismatch the difference
between the branches, rep the attenuator's repeatability at calibration and rep' when the setting is returned to,
and round the rounding of Eb/N0 to 0.01 dB. K is the same unknown number in C and N0 and cancels.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

import numpy as np

from linetest.instruments import NoiseFacts
from linetest.noise.quantities import Quantity, Value, power_ratio, power_ratio_db
from linetest.units import db_to_ratio

ROUNDING_DB = 0.01


def common_quantities(facts: NoiseFacts, floor_readings_dbm: Sequence[float]) -> tuple[Quantity, ...]:
    """Quantities that every N0 of a calibration shares.

    Args:
        facts: What the station sheet states of the noise and of the meter.
        floor_readings_dbm: Readings with noise and carrier off, dBm.

    Returns:
        The quantities.
    """
    floor_mw = float(np.mean(db_to_ratio(np.asarray(floor_readings_dbm, dtype=np.float64))))
    return (
        Quantity.within("meter calibration", facts.meter_calibration_db, "dB", shared=True),
        # Nobody knows how much of it is the meter's own and how much is noise that reaches the unit too.
        Quantity.within("floor", floor_mw, "mW", value=floor_mw, shared=True),
        Quantity("noise bandwidth", facts.enbw_hz, facts.enbw_hz * facts.enbw_u_percent / 100.0, "Hz", shared=True),
        Quantity.within("noise response", facts.noise_response_db, "dB", shared=True),
        Quantity.within("filter slope", facts.filter_slope_db, "dB", shared=True),
        Quantity.within("mismatch", facts.mismatch_db, "dB", distribution="arcsine", shared=True),
    )


def noise_quantities(
    facts: NoiseFacts, floor_readings_dbm: Sequence[float], mean_dbm: float, scatter_db: float, dof: float
) -> tuple[Quantity, ...]:
    """Quantities of the N0 of one attenuator setting.

    Args:
        facts: What the station sheet states.
        floor_readings_dbm: Readings with noise and carrier off, dBm.
        mean_dbm: Mean of the setting's readings, dBm.
        scatter_db: Standard deviation of a single reading, pooled over the calibration, dB.
        dof: Degrees of freedom of `scatter_db`.

    Returns:
        The quantities: those of the reading and those shared.
    """
    u_reading_db = scatter_db / math.sqrt(facts.readings)
    return (
        Quantity("noise reading", mean_dbm, u_reading_db, "dBm", "student", dof),
        Quantity.within("linearity at noise", facts.meter_linearity_db, "dB"),
        Quantity("attenuator, calibration", 0.0, facts.attenuator_repeatability_db, "dB"),
        *common_quantities(facts, floor_readings_dbm),
    )


def carrier_quantities(
    facts: NoiseFacts, floor_readings_dbm: Sequence[float], readings_dbm: Sequence[float]
) -> tuple[Quantity, ...]:
    """Quantities of the carrier power; all steps of a run share them.

    Args:
        facts: What the station sheet states.
        floor_readings_dbm: Readings with noise and carrier off, dBm.
        readings_dbm: Readings with the carrier on and the noise off, dBm.

    Returns:
        The quantities.
    """
    calibration, floor, *_ = common_quantities(facts, floor_readings_dbm)
    return (
        Quantity.mean_of("carrier reading", readings_dbm, "dBm", shared=True),
        Quantity.within("linearity at carrier", facts.meter_linearity_db, "dB", shared=True),
        calibration,
        floor,
    )


def setting_quantities(facts: NoiseFacts, carrier_change_db: float) -> tuple[Quantity, ...]:
    """Quantities that come in when a step is set.

    Args:
        facts: What the station sheet states.
        carrier_change_db: Greatest change of the carrier allowed within a run, dB.

    Returns:
        The quantities.
    """
    return (
        Quantity("attenuator, setting", 0.0, facts.attenuator_repeatability_db, "dB"),
        Quantity.within("carrier change", carrier_change_db, "dB", shared=True),
        Quantity.within("rounding", ROUNDING_DB / 2.0, "dB"),
    )


def carrier_dbm(given: Mapping[str, Value]) -> Value:
    """Carrier power C at the node.

    Args:
        given: The quantities of `carrier_quantities` by name.

    Returns:
        Power in dBm.
    """
    power_mw = power_ratio(given["carrier reading"]) - given["floor"]
    return power_ratio_db(power_mw) - given["meter calibration"] - given["linearity at carrier"]


def n0_dbm_hz(given: Mapping[str, Value]) -> Value:
    """Noise density N0 at the unit's input, on the scale of the carrier read at the node.

    Args:
        given: The quantities of `noise_quantities` by name.

    Returns:
        Density in dBm/Hz.
    """
    power_mw = power_ratio(given["noise reading"]) - given["floor"]
    return (
        power_ratio_db(power_mw)
        - given["meter calibration"]
        - given["linearity at noise"]
        - given["noise response"]
        - power_ratio_db(given["noise bandwidth"])
        + given["filter slope"]
        + given["mismatch"]
        + given["attenuator, calibration"]
    )


def ebn0_at(bit_rate_bps: float) -> _EbN0:
    """The model of Eb/N0 at a bit rate.

    Args:
        bit_rate_bps: Information bit rate, bit/s, known exactly.

    Returns:
        Model from the quantities of carrier, noise and setting to Eb/N0 in dB.
    """
    return _EbN0(10.0 * math.log10(bit_rate_bps))


class _EbN0:
    """Eb/N0 = C - N0 - 10 lg Rb, in dB."""

    __slots__ = ("_rate_db",)

    def __init__(self, rate_db: float) -> None:
        self._rate_db = rate_db

    def __call__(self, given: Mapping[str, Value]) -> Value:
        """Eb/N0 in dB from the quantities by name."""
        return (
            carrier_dbm(given)
            - n0_dbm_hz(given)
            - self._rate_db
            + given["attenuator, setting"]
            + given["carrier change"]
            + given["rounding"]
        )
