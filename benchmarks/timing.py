"""Side-by-side timing: candidates run interleaved, and ratios are of medians of the same run."""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable, Mapping

Work = Callable[[], object]


def medians_s(candidates: Mapping[str, Work], rounds: int = 7) -> dict[str, float]:
    """Median time of each candidate, all run in turn in every round.

    Args:
        candidates: What to time, by name.
        rounds: How many rounds after one that does not count.

    Returns:
        Median seconds by name.
    """
    times: dict[str, list[float]] = {name: [] for name in candidates}
    for turn in range(rounds + 1):
        for name, work in candidates.items():
            began_s = time.perf_counter()
            work()
            if turn:
                times[name].append(time.perf_counter() - began_s)
    return {name: statistics.median(spent) for name, spent in times.items()}
