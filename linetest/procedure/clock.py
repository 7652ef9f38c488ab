"""Time, handed in: the wall clock of a real station, or the virtual one of a bench in process."""

from __future__ import annotations

import time
from datetime import UTC, datetime
from typing import Protocol


class Clock(Protocol):
    """What the procedure needs of time."""

    def now(self) -> datetime:
        """Date and time, aware, in UTC."""

    def monotonic_s(self) -> float:
        """Seconds that never run backwards."""

    def sleep_s(self, seconds: float) -> None:
        """Let that many seconds pass."""


class SystemClock:
    """The wall clock."""

    def now(self) -> datetime:
        """Date and time, aware, in UTC."""
        return datetime.now(UTC)

    def monotonic_s(self) -> float:
        """Seconds that never run backwards."""
        return time.monotonic()

    def sleep_s(self, seconds: float) -> None:
        """Let that many seconds pass."""
        time.sleep(max(0.0, seconds))
