"""Eb/N0 for a wanted rate where the curve has no closed inverse."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from linetest.theory.gaussian import ArrayFunction
from linetest.units import FloatArray

_LOWEST_DB = -80.0
_HIGHEST_DB = 40.0
_TABLE_STEP_DB = 0.25
_TOLERANCE_DB = 1e-11
_MOST_ITERATIONS = 80
# A rate below this has too few digits left, near the smallest number a double holds, to be inverted.
_LEAST_RATE = 1e-290


class CurveInverse:
    """Inverse of one falling curve, by bracketed secant steps on the logarithm of the rate.

    The logarithm of an error rate is nearly a straight line over a quarter of a dB, so a few secant steps
    from a tabulated bracket reach full precision; the bracket stays as the safety net.

    Attributes:
        curve: The curve that is inverted: Eb/N0 in dB to rate, falling.
    """

    def __init__(self, curve: ArrayFunction) -> None:
        self.curve = curve
        points_db = np.arange(_LOWEST_DB, _HIGHEST_DB + _TABLE_STEP_DB / 2, _TABLE_STEP_DB)
        rates = curve(points_db)
        kept = rates > _LEAST_RATE
        self._points_db = points_db[kept]
        self._log_rates = np.log(rates[kept])

    def __call__(self, rate: FloatArray) -> FloatArray:
        """Eb/N0 at which the curve takes the wanted rates.

        Args:
            rate: Wanted rates within the curve's range, any shape.

        Returns:
            Eb/N0 in dB of the same shape.
        """
        wanted = np.log(np.ravel(rate))
        right = np.searchsorted(-self._log_rates, -wanted).clip(1, self._log_rates.size - 1)
        found = self._solve(wanted, right)
        return found.reshape(np.shape(rate))

    def _solve(self, wanted: FloatArray, right: npt.NDArray[np.intp]) -> FloatArray:
        low, high = self._points_db[right - 1].copy(), self._points_db[right].copy()
        low_gap, high_gap = self._log_rates[right - 1] - wanted, self._log_rates[right] - wanted
        result = low + (high - low) * low_gap / (low_gap - high_gap)
        open_ = np.arange(wanted.size)
        for _ in range(_MOST_ITERATIONS):
            gap = np.log(self.curve(result[open_])) - wanted[open_]
            above = gap > 0.0
            low[open_], high[open_] = (
                np.where(above, result[open_], low[open_]),
                np.where(above, high[open_], result[open_]),
            )
            # The Illinois rule halves the gap of an end that stays, so that the secant cannot stall there.
            low_gap[open_], high_gap[open_] = (
                np.where(above, gap, low_gap[open_] * 0.5),
                np.where(above, high_gap[open_] * 0.5, gap),
            )
            before = result[open_]
            result[open_] = _secant(low[open_], high[open_], low_gap[open_], high_gap[open_])
            open_ = open_[np.abs(result[open_] - before) > _TOLERANCE_DB]
            if not open_.size:
                break
        return result


def _secant(low: FloatArray, high: FloatArray, low_gap: FloatArray, high_gap: FloatArray) -> FloatArray:
    span = low_gap - high_gap
    with np.errstate(invalid="ignore", divide="ignore"):
        step = np.where(span > 0.0, low_gap / span, 0.5)
    return low + (high - low) * step
