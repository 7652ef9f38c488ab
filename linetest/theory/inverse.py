"""Eb/N0 for a wanted rate where the curve has no closed inverse."""

from __future__ import annotations

import numpy as np

from linetest.theory.gaussian import ArrayFunction
from linetest.units import FloatArray

_TABLE_STEP_DB = 0.05
_TOLERANCE_DB = 1e-10
_MOST_STEPS = 30
# Below this a rate has too few digits left, close to the smallest number a double holds; towards 0.5 the
# curve is flat and Eb/N0 means little.
_LEAST_RATE, _GREATEST_RATE = 1e-290, 0.499999


def straightened(rate: FloatArray) -> FloatArray:
    """ln(-ln(2 rate)): nearly a straight line against dB, in the tail as well as towards 0.5.

    In the tail -ln(2 rate) is proportional to Eb/N0, near 0.5 it is 1 - 2 rate, which is proportional to
    a power of Eb/N0; the logarithm makes both straight lines in dB.

    Args:
        rate: Rates above 0 and below 0.5.

    Returns:
        Values of the same shape, rising with Eb/N0.
    """
    return np.asarray(np.log(-np.log(2.0 * rate)), dtype=np.float64)


class CurveInverse:
    """Inverse of one falling curve: a table for the start, then Newton steps on the straightened rate.

    Two evaluations of the curve reach 1e-10 dB almost everywhere, because the straightened curve bends so
    little that the table's slope serves.

    Attributes:
        curve: The curve that is inverted: Eb/N0 in dB to rate, falling.
    """

    def __init__(self, curve: ArrayFunction, lowest_db: float = -60.0, highest_db: float = 40.0) -> None:
        self.curve = curve
        points_db = np.linspace(lowest_db, highest_db, round((highest_db - lowest_db) / _TABLE_STEP_DB) + 1)
        rates = curve(points_db)
        kept = (rates > _LEAST_RATE) & (rates < _GREATEST_RATE)
        self._points_db = points_db[kept]
        self._straight = straightened(rates[kept])
        self._slope = np.gradient(self._points_db, self._straight)

    def __call__(self, rate: FloatArray) -> FloatArray:
        """Eb/N0 at which the curve takes the wanted rates.

        Args:
            rate: Wanted rates within the curve's range, any shape.

        Returns:
            Eb/N0 in dB of the same shape.
        """
        wanted = straightened(np.ravel(rate))
        found = np.interp(wanted, self._straight, self._points_db)
        slope = np.interp(wanted, self._straight, self._slope)
        todo = np.arange(wanted.size)
        for _ in range(_MOST_STEPS):
            step_db = (wanted[todo] - straightened(self.curve(found[todo]))) * slope[todo]
            found[todo] += step_db
            todo = todo[np.abs(step_db) > _TOLERANCE_DB]
            if not todo.size:
                break
        return np.asarray(found, dtype=np.float64).reshape(np.shape(rate))
