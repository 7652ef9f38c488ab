"""Axes: where a value lies on the paper, and where the lines of the scale go."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from linetest.errors import ParameterError

_NICE = (1.0, 2.0, 5.0, 10.0)


@dataclass(frozen=True, slots=True)
class LinearScale:
    """A straight scale from a range of values to a range of user units.

    Attributes:
        low: Value at `start`.
        high: Value at `end`.
        start: Position of `low`, user units.
        end: Position of `high`, user units.
    """

    low: float
    high: float
    start: float
    end: float

    def __post_init__(self) -> None:
        if not (math.isfinite(self.low) and math.isfinite(self.high) and self.low < self.high):
            raise ParameterError("low, high", (self.low, self.high), "be finite and rise")

    def __call__(self, value: float) -> float:
        """Position of a value, user units; values beyond the range lie beyond the ends."""
        return self.start + (value - self.low) / (self.high - self.low) * (self.end - self.start)

    def ticks(self, most: int = 8) -> tuple[float, ...]:
        """Round values inside the range, at most so many.

        Args:
            most: Most ticks wanted, 2 or more.

        Returns:
            The values, rising, a step of 1, 2 or 5 times a power of ten apart.
        """
        rough = (self.high - self.low) / most
        decade = 10.0 ** math.floor(math.log10(rough))
        step = next(nice * decade for nice in _NICE if nice * decade >= rough * (1.0 - 1e-9))
        first = math.ceil(self.low / step - 1e-9)
        last = math.floor(self.high / step + 1e-9)
        places = max(0, -math.floor(math.log10(step) + 1e-9))
        return tuple(round(step * count, places) for count in range(first, last + 1))


@dataclass(frozen=True, slots=True)
class DecadeScale:
    """A logarithmic scale that begins and ends on whole decades.

    Attributes:
        low_exponent: Exponent of ten at `start`.
        high_exponent: Exponent of ten at `end`.
        start: Position of the low end, user units.
        end: Position of the high end, user units.
    """

    low_exponent: int
    high_exponent: int
    start: float
    end: float

    def __post_init__(self) -> None:
        if self.low_exponent >= self.high_exponent:
            raise ParameterError("low_exponent", self.low_exponent, f"lie below {self.high_exponent}")

    def __call__(self, value: float) -> float:
        """Position of a positive value, user units."""
        share = (math.log10(value) - self.low_exponent) / (self.high_exponent - self.low_exponent)
        return self.start + share * (self.end - self.start)

    @property
    def decades(self) -> range:
        """Exponents of the decade lines."""
        return range(self.low_exponent, self.high_exponent + 1)

    def minor(self) -> tuple[float, ...]:
        """Values 2 to 9 of every decade, rising."""
        return tuple(
            digit * 10.0**exponent
            for exponent in range(self.low_exponent, self.high_exponent)
            for digit in range(2, 10)
        )


def decades_around(values: Sequence[float], start: float, end: float, *, lowest: int = -15) -> DecadeScale:
    """The smallest decade scale that holds all values.

    Args:
        values: Positive values; zero and below are left out.
        start: Position of the low end, user units.
        end: Position of the high end, user units.
        lowest: Exponent below which the scale does not go.

    Returns:
        The scale, at least one decade.

    Raises:
        ParameterError: No value is positive and finite.
    """
    kept = [value for value in values if value > 0.0 and math.isfinite(value)]
    if not kept:
        raise ParameterError("values", tuple(values), "hold a positive, finite value")
    low = max(lowest, math.floor(math.log10(min(kept)) + 1e-9))
    high = max(low + 1, math.ceil(math.log10(max(kept)) - 1e-9))
    return DecadeScale(low, high, start, end)
