"""Bit error rates of coded schemes: simulated where the union bound is loose, the bound where it is tight.

Just above the last simulated point the bound still lies some percent too high. Its excess (in the logarithm)
falls by a steady factor per dB, as the last two points show; beyond the last point it goes on falling so,
and the curve becomes the bound.
"""

from __future__ import annotations

from functools import partial

import numpy as np
from scipy.interpolate import CubicSpline

from linetest.theory.convolutional import SPECTRA, hard_decision_bound, soft_decision_bound
from linetest.theory.decoder_tables import DECODER_ROWS
from linetest.theory.gaussian import ArrayFunction
from linetest.theory.inverse import straightened
from linetest.units import FloatArray

_HARD = "-hard"
_SLOPE_STEP_DB = 1e-3


def union_bound_of(code: str) -> ArrayFunction:
    """Union bound of a convolutional code.

    Args:
        code: Name such as ``conv-1/2``, with ``-hard`` at the end for hard decisions.

    Returns:
        Eb/N0 in dB to an upper bound of the bit error rate.
    """
    spectrum = SPECTRA[code.removesuffix(_HARD)]
    return partial(hard_decision_bound if code.endswith(_HARD) else soft_decision_bound, spectrum)


class DecodedCurve:
    """Bit error rate after Viterbi decoding of one code.

    Attributes:
        bound: The union bound.
        first_db: Eb/N0 of the first simulated point; below it nothing is known.
        last_db: Eb/N0 of the last simulated point; above it the curve leans on the bound.
        greatest_rate: Bit error rate at `first_db`.
    """

    def __init__(self, code: str) -> None:
        rows = DECODER_ROWS[code]
        self.bound = union_bound_of(code)
        self._points_db = np.array([row.ebn0_db for row in rows])
        rates = np.array([row.bit_error_rate for row in rows])
        self.first_db, self.last_db = float(self._points_db[0]), float(self._points_db[-1])
        self.greatest_rate = float(rates[0])
        self._excess, self._decay_per_db = self._fit_excess(rates)
        ahead = straightened(self._lean_on_bound(self.last_db + np.array([0.0, _SLOPE_STEP_DB])))
        last_slope = float(ahead[1] - ahead[0]) / _SLOPE_STEP_DB
        self._spline = CubicSpline(self._points_db, straightened(rates), bc_type=((2, 0.0), (1, last_slope)))
        slopes = np.abs(np.gradient(np.log(rates), self._points_db))
        self._u_db = np.array([row.relative_u for row in rows]) / slopes
        self._excess_db = self._excess / float(slopes[-1])

    def _fit_excess(self, rates: FloatArray) -> tuple[float, float]:
        excess = np.log(self.bound(self._points_db) / rates)
        before, last = np.maximum(excess[-2:], 0.0)
        decay = np.log(last / before) / (self._points_db[-1] - self._points_db[-2]) if last > 0.0 else 0.0
        return float(last), float(min(decay, 0.0))

    def _lean_on_bound(self, ebn0_db: FloatArray) -> FloatArray:
        excess = self._excess * np.exp(self._decay_per_db * (ebn0_db - self.last_db))
        return self.bound(ebn0_db) * np.exp(-excess)

    def __call__(self, ebn0_db: FloatArray) -> FloatArray:
        """Bit error rate at the levels.

        Args:
            ebn0_db: Eb/N0 per information bit in dB, any shape; below `first_db` the curve is continued
                for inverting only and means nothing.

        Returns:
            Bit error rate of the same shape.
        """
        below = ebn0_db < self.last_db
        rates = np.empty_like(ebn0_db)
        rates[below] = 0.5 * np.exp(-np.exp(self._spline(ebn0_db[below])))
        rates[~below] = self._lean_on_bound(ebn0_db[~below])
        return rates

    def uncertainty_db(self, ebn0_db: FloatArray) -> FloatArray:
        """Standard uncertainty of the curve as a shift along Eb/N0.

        Between simulated points the greater of both neighbours. Beyond the last one that uncertainty fades
        with the bound's excess; in addition the model of the fading may be wrong by up to the part that has
        faded, a rectangle that is nothing at the last point and nothing where the bound is tight.

        Args:
            ebn0_db: Eb/N0 in dB, any shape.

        Returns:
            Standard uncertainty in dB of the same shape.
        """
        at = np.searchsorted(self._points_db, ebn0_db).clip(1, self._points_db.size - 1)
        simulated = np.maximum(self._u_db[at - 1], self._u_db[at])
        fade = np.exp(self._decay_per_db * np.maximum(ebn0_db - self.last_db, 0.0))
        model = self._excess_db * fade * (1.0 - fade) / np.sqrt(3.0)
        return np.asarray(np.hypot(simulated * fade, model), dtype=np.float64)
