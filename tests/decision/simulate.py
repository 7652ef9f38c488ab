"""Tests of a plan by drawing counts look after look: no dynamic programming, only the boundaries."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from linetest.decision import Plan


@dataclass(frozen=True)
class Simulated:
    """How simulated tests ended."""

    accepted: npt.NDArray[np.bool_]
    bits: npt.NDArray[np.int64]
    errors: npt.NDArray[np.int64]

    @property
    def share_accepted(self) -> float:
        return float(self.accepted.mean())


def simulate(
    plan: Plan,
    ber: float | npt.NDArray[np.float64],
    tests: int,
    rng: np.random.Generator,
    *,
    errors_per_event: int = 1,
) -> Simulated:
    """Run a plan many times; ``ber`` may differ from test to test, errors may come in groups of fixed size."""
    rate = np.broadcast_to(np.asarray(ber, dtype=np.float64), (tests,)) / errors_per_event
    accepts, rejects = plan.accept_errors, plan.reject_errors
    running = np.arange(tests)
    counted = np.zeros(tests, dtype=np.int64)
    accepted = np.zeros(tests, dtype=np.bool_)
    bits = np.zeros(tests, dtype=np.int64)
    for look in range(plan.looks):
        counted[running] += errors_per_event * rng.binomial(plan.look_bits, rate[running])
        now = counted[running]
        accepted[running[now <= accepts[look]]] = True
        stopped = (now <= accepts[look]) | (now >= rejects[look])
        bits[running[stopped]] = (look + 1) * plan.look_bits
        running = running[~stopped]
    assert running.size == 0
    return Simulated(accepted, bits, counted)


def allowed_error(probability: float, tests: int, sigmas: float = 3.9) -> float:
    """Half width that a simulated share keeps with about 99.99 %."""
    return sigmas * float(np.sqrt(probability * (1.0 - probability) / tests)) + 1.0 / tests
