"""Conversions between the units of the trade: dB and ratio, dBm and W, C/N0, Eb/N0, Es/N0.

Scalars and arrays go in, the same shape comes out. Eb/N0 is per *information* bit: a bit the error counter
counts. Everything else on air (parity, sync words, framing) costs Eb/N0.
"""

from __future__ import annotations

from typing import overload

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]


@overload
def db_to_ratio(level_db: float) -> float: ...
@overload
def db_to_ratio(level_db: FloatArray) -> FloatArray: ...
def db_to_ratio(level_db: float | FloatArray) -> float | FloatArray:
    """Power ratio of a level in dB: 10**(dB/10).

    Args:
        level_db: Level in dB, scalar or array of any shape.

    Returns:
        Power ratio, no unit, of the same shape.
    """
    if isinstance(level_db, np.ndarray):
        return np.asarray(np.power(10.0, level_db / 10.0), dtype=np.float64)
    return float(10.0 ** (level_db / 10.0))


@overload
def ratio_to_db(ratio: float) -> float: ...
@overload
def ratio_to_db(ratio: FloatArray) -> FloatArray: ...
def ratio_to_db(ratio: float | FloatArray) -> float | FloatArray:
    """Level in dB of a power ratio: 10 log10(ratio).

    Args:
        ratio: Power ratio above 0, scalar or array of any shape. Zero gives minus infinity.

    Returns:
        Level in dB, of the same shape.
    """
    with np.errstate(divide="ignore"):
        level = 10.0 * np.log10(ratio)
    if isinstance(ratio, np.ndarray):
        return np.asarray(level, dtype=np.float64)
    return float(level)


def dbm_to_w(power_dbm: float) -> float:
    """Power in watts of a level in dBm (0 dBm is 1 mW).

    Args:
        power_dbm: Level in dBm.

    Returns:
        Power in W.
    """
    return 1e-3 * db_to_ratio(power_dbm)


def w_to_dbm(power_w: float) -> float:
    """Level in dBm of a power in watts.

    Args:
        power_w: Power in W; zero gives minus infinity.

    Returns:
        Level in dBm.
    """
    return ratio_to_db(power_w / 1e-3)


def ebn0_db(carrier_dbm: float, n0_dbm_hz: float, bit_rate_bps: float) -> float:
    """Eb/N0 per information bit from carrier power, noise density and information bit rate.

    Eb/N0 = C / (Rb * N0).

    Args:
        carrier_dbm: Carrier power C in dBm at the unit's input.
        n0_dbm_hz: One-sided noise density N0 in dBm/Hz at the same place.
        bit_rate_bps: Information bit rate Rb in bit/s, above 0.

    Returns:
        Eb/N0 in dB.
    """
    return carrier_dbm - n0_dbm_hz - ratio_to_db(bit_rate_bps)


def esn0_db(ebn0_per_bit_db: float, bit_rate_bps: float, symbol_rate_bd: float) -> float:
    """Es/N0 from Eb/N0 per information bit: Es/N0 = Eb/N0 * Rb / Rs.

    Args:
        ebn0_per_bit_db: Eb/N0 per information bit in dB.
        bit_rate_bps: Information bit rate Rb in bit/s.
        symbol_rate_bd: Symbol rate Rs in baud.

    Returns:
        Es/N0 in dB.
    """
    return ebn0_per_bit_db + ratio_to_db(bit_rate_bps / symbol_rate_bd)
