"""Plans of steps: what a plan follows from, and the plan, designed once for equal content."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

import numpy as np

from linetest.decision import GuardedPlan, design_guarded_plan, fixed_test_bits
from linetest.limits.sheet import BerCheck
from linetest.limits.tables import Mode
from linetest.theory import bit_error_rate, curve_uncertainty_db, required_ebn0_db, trusted_ber_range
from linetest.units import FloatArray

# A look no finer than this share of the best fixed test costs less than 1 % in mean bits.
LOOKS_PER_FIXED_TEST = 60

# Units differ by less than this in u; planning for the next multiple above lets them share plans.
PLANNED_U_STEP_DB = 0.005

GuardRule = Literal["least", "U", "0.83U", "none"]


@dataclass(frozen=True)
class PlanRequest:
    """All that a plan of a step follows from; equal requests give equal plans.

    Attributes:
        scheme: Modulation and coding.
        burst_weights: How errors come in groups.
        bit_rate_bps: Information bit rate, bit/s.
        ebn0_db: Eb/N0 really set, dB.
        u_db: Standard uncertainty planned for, dB.
        margin_db: Margin, dB.
        design_loss_db: Design loss, dB.
        producer_risk: Producer's risk of the step.
        consumer_risk: Consumer's risk of the step.
        guard_rule: How guard bands follow from u.
        max_bits: Most bits by the sheet.
        max_fixed_tests: Most bits in best fixed tests.
        shortest_gate_s: Shortest gate of the error counter, s.
    """

    scheme: str
    burst_weights: tuple[tuple[int, float], ...]
    bit_rate_bps: float
    ebn0_db: float
    u_db: float
    margin_db: float
    design_loss_db: float
    producer_risk: float
    consumer_risk: float
    guard_rule: GuardRule
    max_bits: int
    max_fixed_tests: float
    shortest_gate_s: float


def limit_curve(scheme: str) -> Callable[[FloatArray], FloatArray]:
    """Curve for averaging over the error of Eb/N0: theory, also a little outside its trusted region.

    Where nothing is known of a coded scheme, the worst rate known stands in: it only weighs errors of Eb/N0 of
    many standard uncertainties, at which the unit is rejected anyway.

    Args:
        scheme: Modulation and coding.

    Returns:
        Function from Eb/N0 in dB to bit error rate, arrays of any shape.
    """
    greatest = trusted_ber_range(scheme)[1]
    least_db = -math.inf if greatest >= 0.5 else required_ebn0_db(scheme, greatest)

    def curve(ebn0_db: FloatArray) -> FloatArray:
        return bit_error_rate(scheme, np.maximum(np.asarray(ebn0_db, dtype=np.float64), least_db))

    return curve


def plan_request(check: BerCheck, mode: Mode, *, ebn0_db: float, u_db: float, shortest_gate_s: float) -> PlanRequest:
    """What the plan of a step follows from.

    Args:
        check: The BER check.
        mode: Its mode.
        ebn0_db: Eb/N0 really set, dB.
        u_db: Its standard uncertainty, dB. Planned for, together with the curve's own, is the next multiple of
            `PLANNED_U_STEP_DB` above, but not for more than the check carries unless there is more.
        shortest_gate_s: Shortest gate of the error counter, s.

    Returns:
        The request, equal for equal content.
    """
    both_db = math.hypot(u_db, curve_u_db(check, mode, ebn0_db))
    planned_u_db = round(math.ceil(round(both_db / PLANNED_U_STEP_DB, 6)) * PLANNED_U_STEP_DB, 6)
    return PlanRequest(
        scheme=mode.scheme,
        burst_weights=mode.burst_weights,
        bit_rate_bps=mode.bit_rate_bps,
        ebn0_db=ebn0_db,
        u_db=max(both_db, min(planned_u_db, check.max_u_db)),
        margin_db=check.margin_db,
        design_loss_db=check.design_loss_db,
        producer_risk=check.step_producer_risk,
        consumer_risk=check.consumer_risk,
        guard_rule=check.guard_rule,
        max_bits=check.max_bits,
        max_fixed_tests=check.max_fixed_tests,
        shortest_gate_s=shortest_gate_s,
    )


def curve_u_db(check: BerCheck, mode: Mode, ebn0_db: float) -> float:
    """Standard uncertainty of the curve at a step's limit; it moves the limit as an error of Eb/N0 does.

    Args:
        check: The BER check.
        mode: Its mode.
        ebn0_db: Eb/N0 really set, dB.

    Returns:
        Standard uncertainty as a shift along Eb/N0, dB.
    """
    return curve_uncertainty_db(mode.scheme, ebn0_db - check.margin_db)


@lru_cache(maxsize=4096)
def plan_for(request: PlanRequest) -> tuple[int, GuardedPlan]:
    """The plan that a request asks for; asked again, the same object.

    Args:
        request: What the plan follows from.

    Returns:
        Bits of the best fixed test without guard bands, and the plan.

    Raises:
        PlanError: No plan keeps the risks.
        ParameterError: Eb/N0 less the margin is outside the curve's trusted region.
    """
    limit_ber = bit_error_rate(request.scheme, request.ebn0_db - request.margin_db)
    design_ber = bit_error_rate(request.scheme, request.ebn0_db - request.design_loss_db)
    best_fixed_bits = fixed_test_bits(
        good_ber=design_ber,
        limit_ber=limit_ber,
        producer_risk=request.producer_risk,
        consumer_risk=request.consumer_risk,
        burst_weights=request.burst_weights,
    )
    gate_bits = math.ceil(request.bit_rate_bps * request.shortest_gate_s)
    look_bits = max(best_fixed_bits // LOOKS_PER_FIXED_TEST, gate_bits, 1)
    guarded = design_guarded_plan(
        curve=limit_curve(request.scheme),
        ebn0_db=request.ebn0_db,
        u_db=request.u_db,
        margin_db=request.margin_db,
        design_loss_db=request.design_loss_db,
        producer_risk=request.producer_risk,
        consumer_risk=request.consumer_risk,
        look_bits=look_bits,
        max_bits=min(request.max_bits, math.ceil(request.max_fixed_tests * best_fixed_bits)),
        burst_weights=request.burst_weights,
        rule=request.guard_rule,
    )
    return best_fixed_bits, guarded
