"""Time on the bench."""

from __future__ import annotations

import time


class BenchClock:
    """Time on the bench: as on the wall, faster by a factor, or virtual (advanced by waiting).

    Args:
        speed: How many times faster than life; infinity is virtual time.
    """

    def __init__(self, speed: float) -> None:
        self.speed = speed
        self._virtual_s = 0.0
        self._began_s = time.monotonic()

    @property
    def virtual(self) -> bool:
        """Whether waiting costs nothing."""
        return self.speed == float("inf")

    def now_s(self) -> float:
        """Seconds on the bench."""
        if self.virtual:
            return self._virtual_s
        return (time.monotonic() - self._began_s) * self.speed

    def advance_s(self, seconds: float) -> None:
        """Let virtual time pass.

        Args:
            seconds: How long.
        """
        self._virtual_s += max(0.0, seconds)
