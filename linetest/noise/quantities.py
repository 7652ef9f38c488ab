"""Quantities that go into a measurement's model, and the functions a model is written with.

Arithmetic operators and the functions of this module take uncertain numbers of GTC, arrays of samples and floats alike,
so that one model serves both ways of propagating uncertainty.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Literal

import GTC
import numpy as np

from linetest.errors import ParameterError

Distribution = Literal["normal", "student", "rectangular", "arcsine", "triangular"]

# A number of GTC, an array of samples, or a float: what the operators make of them is the model's business.
Value = Any
Model = Callable[[Mapping[str, Value]], Value]
Correlations = Mapping[tuple[str, str], float]

# Standard uncertainty of a half width a is a / divisor: JCGM 100, 4.3.7 and 4.3.9; arcsine: EA-4/02, S7 and
# common practice for mismatch with unknown phase.
DIVISORS: Mapping[Distribution, float] = {
    "rectangular": math.sqrt(3.0),
    "triangular": math.sqrt(6.0),
    "arcsine": math.sqrt(2.0),
}


@dataclass(frozen=True, slots=True)
class Quantity:
    """An input of a model.

    Attributes:
        name: Its name, unique in a budget.
        value: Its estimate, in `unit`.
        u: Standard uncertainty, in `unit`, 0 or more.
        unit: Its unit.
        distribution: What is known of it: ``normal``; ``student`` for a mean of readings; ``rectangular``,
            ``triangular`` or ``arcsine`` (U-shaped) between limits.
        dof: Degrees of freedom of `u`.
        shared: Whether results of one calibration and run share its one unknown value.
    """

    name: str
    value: float
    u: float
    unit: str
    distribution: Distribution = "normal"
    dof: float = math.inf
    shared: bool = False

    @classmethod
    def within(
        cls,
        name: str,
        half_width: float,
        unit: str,
        *,
        distribution: Distribution = "rectangular",
        value: float = 0.0,
        shared: bool = False,
    ) -> Quantity:
        """A quantity known to lie within limits.

        Args:
            name: Its name.
            half_width: Half the distance between the limits, in `unit`.
            unit: Its unit.
            distribution: ``rectangular``, ``triangular`` or ``arcsine``.
            value: Middle between the limits, in `unit`.
            shared: Whether results share it.

        Returns:
            The quantity.

        Raises:
            ParameterError: The distribution has no limits, or the half width is negative.
        """
        if distribution not in DIVISORS:
            raise ParameterError("distribution", distribution, f"be one of {', '.join(DIVISORS)}")
        if not half_width >= 0.0:
            raise ParameterError("half_width", half_width, "be 0 or more")
        return cls(name, value, half_width / DIVISORS[distribution], unit, distribution, shared=shared)

    @classmethod
    def mean_of(cls, name: str, readings: Sequence[float], unit: str, *, shared: bool = False) -> Quantity:
        """The mean of readings, its standard uncertainty from their own scatter (type A).

        Args:
            name: Its name.
            readings: At least two.
            unit: Their unit.
            shared: Whether results share it.

        Returns:
            The quantity.

        Raises:
            ParameterError: Fewer than two readings.
        """
        if len(readings) < 2:
            raise ParameterError("readings", len(readings), "number at least 2: one reading shows no scatter")
        values = np.asarray(readings, dtype=np.float64)
        u = float(values.std(ddof=1)) / math.sqrt(values.size)
        return cls(name, float(values.mean()), u, unit, "student", float(values.size - 1), shared)


def log10(value: Value) -> Value:
    """Decimal logarithm of an uncertain number, an array or a float.

    Args:
        value: Above 0.

    Returns:
        The logarithm, of the same kind.
    """
    return np.log10(value) if isinstance(value, np.ndarray) else GTC.log10(value)


def power_ratio_db(value: Value) -> Value:
    """Level in dB of an uncertain power ratio: 10 log10(value).

    Args:
        value: Above 0.

    Returns:
        Level in dB, of the same kind.
    """
    return 10.0 * log10(value)


def power_ratio(level_db: Value) -> Value:
    """Power ratio of an uncertain level in dB: 10**(level/10).

    Args:
        level_db: Level in dB.

    Returns:
        The ratio, of the same kind.
    """
    return 10.0 ** (level_db / 10.0)
