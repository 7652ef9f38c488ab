"""Noise-equivalent bandwidth from a swept response.

B = integral of |H(f)|^2 df / |H(f0)|^2, by the trapezoidal rule on the table as swept. Its uncertainty: the scatter and
scale of the readings, the interpolation between them (compared with every second point), and what lies beyond the
sweep's ends.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.integrate import trapezoid

from linetest.errors import ParameterError
from linetest.noise.budget import Budget, evaluate
from linetest.noise.quantities import Quantity, Value
from linetest.units import FloatArray, db_to_ratio

LEAST_POINTS = 11
# The ends of the sweep must lie this far below the reference, or too much is cut off to be bounded.
LEAST_SKIRT_DB = 20.0


@dataclass(frozen=True, slots=True)
class SweptResponse:
    """A filter's response as swept.

    Attributes:
        frequencies_hz: Frequencies, ascending, Hz.
        response_db: Power response at each, dB, any common reference.
        reference_hz: Frequency f0 to which the bandwidth refers, Hz, inside the sweep.
        reading_u_db: Standard uncertainty of one reading against another, dB: repeatability, independent.
        scale_percent: Half width of the error of the response's scale: dB read per dB, % (rectangular).
    """

    frequencies_hz: Sequence[float]
    response_db: Sequence[float]
    reference_hz: float
    reading_u_db: float
    scale_percent: float


def noise_bandwidth(sweep: SweptResponse) -> Budget:
    """Noise-equivalent bandwidth with its budget.

    Args:
        sweep: The swept response.

    Returns:
        Bandwidth in Hz with its budget.

    Raises:
        ParameterError: The sweep is too short, not ascending, does not hold its reference, or does not reach down
            the filter's skirts.
    """
    frequencies, response = _checked(sweep)
    reference_db = float(np.interp(sweep.reference_hz, frequencies, response))
    relative_db = response - reference_db
    ratios = db_to_ratio(relative_db)
    bandwidth_hz = float(trapezoid(ratios, frequencies))
    quantities = (
        Quantity("integral of the response", bandwidth_hz, 0.0, "Hz"),
        Quantity("readings", 0.0, _reading_u_hz(frequencies, ratios, sweep.reading_u_db), "Hz"),
        Quantity("reference reading", 0.0, bandwidth_hz * sweep.reading_u_db * math.log(10.0) / 10.0, "Hz"),
        Quantity.within("scale", _scale_half_width_hz(frequencies, relative_db, sweep.scale_percent), "Hz"),
        Quantity.within("interpolation", _interpolation_half_width_hz(frequencies, ratios), "Hz"),
        _beyond_the_ends(frequencies, ratios),
    )
    return evaluate(_sum, quantities)


def _sum(given: Mapping[str, Value]) -> Value:
    return sum(given.values())


def _checked(sweep: SweptResponse) -> tuple[FloatArray, FloatArray]:
    frequencies = np.asarray(sweep.frequencies_hz, dtype=np.float64)
    response = np.asarray(sweep.response_db, dtype=np.float64)
    if frequencies.size < LEAST_POINTS or frequencies.size != response.size:
        raise ParameterError("frequencies_hz", frequencies.size, f"number at least {LEAST_POINTS}, one a response")
    if not (np.isfinite(frequencies).all() and (np.diff(frequencies) > 0.0).all()):
        raise ParameterError("frequencies_hz", "the list", "be finite and ascend")
    if not np.isfinite(response).all():
        raise ParameterError("response_db", "the list", "be finite")
    if not frequencies[0] < sweep.reference_hz < frequencies[-1]:
        raise ParameterError("reference_hz", sweep.reference_hz, "lie inside the sweep")
    if not (sweep.reading_u_db >= 0.0 and sweep.scale_percent >= 0.0):
        raise ParameterError("reading_u_db", (sweep.reading_u_db, sweep.scale_percent), "be 0 or more, like the scale")
    ends = max(response[0], response[-1]) - float(np.interp(sweep.reference_hz, frequencies, response))
    if ends > -LEAST_SKIRT_DB:
        raise ParameterError(
            "response_db",
            round(float(ends), 1),
            f"fall by {LEAST_SKIRT_DB:g} dB at both ends of the sweep: sweep wider",
        )
    return frequencies, response


def _reading_u_hz(frequencies: FloatArray, ratios: FloatArray, reading_u_db: float) -> float:
    """Independent errors of the readings, through the trapezoidal rule's weights."""
    gaps = np.diff(frequencies)
    weights = np.concatenate([[gaps[0]], gaps[:-1] + gaps[1:], [gaps[-1]]]) / 2.0
    relative_u = reading_u_db * math.log(10.0) / 10.0
    return float(np.sqrt(np.sum((weights * ratios) ** 2)) * relative_u)


def _scale_half_width_hz(frequencies: FloatArray, relative_db: FloatArray, scale_percent: float) -> float:
    stretched = db_to_ratio(relative_db * (1.0 + scale_percent / 100.0))
    return abs(float(trapezoid(stretched, frequencies)) - float(trapezoid(db_to_ratio(relative_db), frequencies)))


def _interpolation_half_width_hz(frequencies: FloatArray, ratios: FloatArray) -> float:
    """The rule's error falls with the square of the spacing: a third of what doubling it changes."""
    ends = np.unique(np.concatenate([np.arange(0, frequencies.size, 2), [frequencies.size - 1]]))
    coarse = float(trapezoid(ratios[ends], frequencies[ends]))
    return abs(coarse - float(trapezoid(ratios, frequencies))) / 3.0


def _beyond_the_ends(frequencies: FloatArray, ratios: FloatArray) -> Quantity:
    """Skirts that fall at least as 1/f^2 beyond the sweep hold at most the end's ratio times its distance."""
    centre = float(np.average(frequencies, weights=ratios))
    most_hz = float(ratios[0]) * (centre - frequencies[0]) + float(ratios[-1]) * (frequencies[-1] - centre)
    return Quantity.within("beyond the sweep", most_hz / 2.0, "Hz", value=most_hz / 2.0)
