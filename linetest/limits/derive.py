"""From curve to limit: what a step is judged by at the Eb/N0 really set, with its derivation kept beside it.

BER_limit = theory(Eb/N0 - margin). The plan tells a unit at the design loss from one at the margin with both
risks averaged over the uncertainty of Eb/N0. Nothing here measures; the same sheet, Eb/N0 and uncertainty give
the same limit on any machine.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from linetest.decision import GuardedPlan
from linetest.errors import ParameterError, PlanError
from linetest.limits.plans import curve_u_db, plan_for, plan_request
from linetest.limits.sheet import BerCheck, LimitSheet
from linetest.theory import bit_error_rate


@dataclass(frozen=True)
class StepLimit:
    """What one step of one unit is judged by.

    Attributes:
        check: Name of the BER check.
        mode: Name of the mode.
        scheme: Modulation and coding.
        bit_rate_bps: Information bit rate, bit/s.
        nominal_ebn0_db: Eb/N0 that the sheet asks for, dB.
        ebn0_db: Eb/N0 really set, dB.
        u_db: Its standard uncertainty, dB.
        curve_u_db: Standard uncertainty of the curve itself at the limit, as a shift along Eb/N0, dB; 0 for closed
            forms. The plan holds for both together, rounded up: `guarded.u_db`.
        margin_db: Implementation loss a unit must not exceed, dB.
        design_loss_db: Implementation loss of a good unit, dB.
        theory_ber: The scheme's bit error rate at `ebn0_db`.
        limit_ber: The same at `ebn0_db` - `margin_db`.
        design_ber: The same at `ebn0_db` - `design_loss_db`.
        best_fixed_bits: Bits of the best fixed test of `design_ber` against `limit_ber`.
        guarded: The plan with its guard bands and risks.
        sources: Source of each number of the sheet that entered, by key.
    """

    check: str
    mode: str
    scheme: str
    bit_rate_bps: float
    nominal_ebn0_db: float
    ebn0_db: float
    u_db: float
    curve_u_db: float
    margin_db: float
    design_loss_db: float
    theory_ber: float
    limit_ber: float
    design_ber: float
    best_fixed_bits: int
    guarded: GuardedPlan
    sources: tuple[tuple[str, str], ...]

    @property
    def derivation(self) -> dict[str, Any]:
        """How the limit came about, as plain data for JSON: from the curve to the numbers counted against."""
        guarded, plan = self.guarded, self.guarded.plan
        return {
            "check": self.check,
            "mode": self.mode,
            "scheme": self.scheme,
            "bit_rate_bps": self.bit_rate_bps,
            "nominal_ebn0_db": self.nominal_ebn0_db,
            "ebn0_db": self.ebn0_db,
            "u_db": self.u_db,
            "curve_u_db": self.curve_u_db,
            "planned_u_db": guarded.u_db,
            "theory_ber": self.theory_ber,
            "margin_db": self.margin_db,
            "limit_ber": self.limit_ber,
            "design_loss_db": self.design_loss_db,
            "design_ber": self.design_ber,
            "guard_rule": guarded.rule,
            "guard_consumer_db": guarded.guard_consumer_db,
            "guard_producer_db": guarded.guard_producer_db,
            "guarded_limit_ber": plan.limit_ber,
            "guarded_good_ber": plan.good_ber,
            "counting_consumer_risk": plan.consumer_risk,
            "counting_producer_risk": plan.producer_risk,
            "averaged_consumer_risk": guarded.averaged_consumer_risk,
            "averaged_producer_risk": guarded.averaged_producer_risk,
            "burst_weights": [list(pair) for pair in plan.burst_weights],
            "best_fixed_bits": self.best_fixed_bits,
            "look_bits": plan.look_bits,
            "max_bits": plan.max_bits,
            "sources": dict(self.sources),
        }


def derive_step(
    sheet: LimitSheet,
    check: BerCheck,
    nominal_ebn0_db: float,
    *,
    ebn0_db: float,
    u_db: float,
    shortest_gate_s: float,
) -> StepLimit:
    """The limit and plan of a step at the Eb/N0 really set.

    Args:
        sheet: The limit sheet.
        check: One of its BER checks.
        nominal_ebn0_db: One of the check's steps, dB.
        ebn0_db: Eb/N0 really set, dB.
        u_db: Its standard uncertainty, dB.
        shortest_gate_s: Shortest gate of the error counter, s.

    Returns:
        The limit, with its derivation.

    Raises:
        ParameterError: The step is not the check's, or a number is outside its rule.
        PlanError: The Eb/N0 set is too far from the nominal one, its uncertainty is more than the sheet
            carries, or no plan keeps the risks within the most bits.
    """
    _check_numbers(check, nominal_ebn0_db, ebn0_db, u_db, shortest_gate_s)
    mode = sheet.mode(check.mode)
    request = plan_request(check, mode, ebn0_db=ebn0_db, u_db=u_db, shortest_gate_s=shortest_gate_s)
    best_fixed_bits, guarded = plan_for(request)
    return StepLimit(
        check=check.name,
        mode=mode.name,
        scheme=mode.scheme,
        bit_rate_bps=mode.bit_rate_bps,
        nominal_ebn0_db=nominal_ebn0_db,
        ebn0_db=ebn0_db,
        u_db=u_db,
        curve_u_db=curve_u_db(check, mode, ebn0_db),
        margin_db=check.margin_db,
        design_loss_db=check.design_loss_db,
        theory_ber=bit_error_rate(mode.scheme, ebn0_db),
        limit_ber=bit_error_rate(mode.scheme, ebn0_db - check.margin_db),
        design_ber=bit_error_rate(mode.scheme, ebn0_db - check.design_loss_db),
        best_fixed_bits=best_fixed_bits,
        guarded=guarded,
        sources=tuple(sorted({**mode.source, **check.source}.items())),
    )


def _check_numbers(
    check: BerCheck, nominal_ebn0_db: float, ebn0_db: float, u_db: float, shortest_gate_s: float
) -> None:
    if nominal_ebn0_db not in check.steps:
        steps = ", ".join(f"{step:g}" for step in check.steps)
        raise ParameterError("nominal_ebn0_db", nominal_ebn0_db, f"be a step of {check.name} ({steps} dB)")
    if not math.isfinite(ebn0_db):
        raise ParameterError("ebn0_db", ebn0_db, "be finite")
    if not (math.isfinite(u_db) and u_db >= 0.0):
        raise ParameterError("u_db", u_db, "be finite and not negative")
    if not (math.isfinite(shortest_gate_s) and shortest_gate_s > 0.0):
        raise ParameterError("shortest_gate_s", shortest_gate_s, "be finite and above 0")
    offset_db = ebn0_db - nominal_ebn0_db
    # Both are rounded to 0.01 dB; a difference of exactly the tolerance must not fail by its last bit.
    if abs(offset_db) > check.tolerance_db + 1e-9:
        raise PlanError(
            f"Eb/N0 would be {ebn0_db:.2f} dB, {offset_db:+.2f} dB off the nominal {nominal_ebn0_db:g} dB; "
            f"{check.name} allows {check.tolerance_db:g} dB: calibrate the noise in finer steps"
        )
    if u_db > check.max_u_db:
        raise PlanError(
            f"the standard uncertainty of Eb/N0 is {u_db:.3f} dB, more than the {check.max_u_db:g} dB that "
            f"{check.name} carries: improve the noise calibration"
        )
