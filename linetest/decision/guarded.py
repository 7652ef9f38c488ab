"""Plans that keep their risks although Eb/N0 is uncertain.

The judged quantity is the loss in dB. Its error has two parts: counting, which the plan bounds, and the error e of
Eb/N0, common to all bits of the step. Both risks are averaged over e (normal, standard deviation u). The plan tests
design loss + w_p against margin - w_c; by the rule ``least`` these are the least guard bands for which both averaged
risks meet the sheet.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np

from linetest.decision.design import design_plan
from linetest.decision.outcomes import INDEPENDENT, BurstWeights
from linetest.decision.plan import Plan
from linetest.errors import ParameterError, PlanError
from linetest.units import FloatArray

GuardRule = Literal["least", "U", "0.83U", "none"]
Curve = Callable[[FloatArray], FloatArray]

COVERAGE_FACTOR = 2.0
NODES = 31
SEARCH_DB = 0.25
GRID = 161
TURNS = 10
ROUNDING_DB = 0.001
HAIR_DB = 0.005
FACTORS = {"U": 1.0, "0.83U": 0.83, "none": 0.0}


@dataclass(frozen=True, slots=True)
class GuardedPlan:
    """A plan with its guard bands and the risks that hold with the uncertainty of Eb/N0 included.

    Attributes:
        plan: The plan, between the guarded rates.
        guard_consumer_db: How far inside the margin the plan's limit lies, dB.
        guard_producer_db: How far beyond the design loss the plan's good rate lies, dB.
        rule: How the guard bands were chosen.
        u_db: Standard uncertainty of Eb/N0, dB.
        expanded_u_db: 2 u, dB.
        averaged_producer_risk: Probability of REJECT at the design loss, averaged over the error of Eb/N0.
        averaged_consumer_risk: Probability of ACCEPT at the margin, averaged over the error of Eb/N0.
        margin_ber: Bit error rate at the margin.
        design_ber: Bit error rate at the design loss.
    """

    plan: Plan
    guard_consumer_db: float
    guard_producer_db: float
    rule: GuardRule
    u_db: float
    expanded_u_db: float
    averaged_producer_risk: float
    averaged_consumer_risk: float
    margin_ber: float
    design_ber: float


@dataclass(frozen=True, slots=True)
class _Case:
    curve: Curve
    ebn0_db: float
    u_db: float
    margin_db: float
    design_loss_db: float
    producer_risk: float
    consumer_risk: float
    look_bits: int
    max_bits: int
    burst_weights: BurstWeights

    def rate(self, loss_db: float) -> float:
        return float(self.curve(np.array([self.ebn0_db - loss_db]))[0])

    def plan(self, guard_c_db: float, guard_p_db: float) -> Plan:
        good_loss, limit_loss = self.design_loss_db + guard_p_db, self.margin_db - guard_c_db
        if limit_loss - good_loss < 0.02:
            raise PlanError("the guard bands leave nothing between design loss and margin")
        return design_plan(
            good_ber=self.rate(good_loss),
            limit_ber=self.rate(limit_loss),
            producer_risk=self.producer_risk,
            consumer_risk=self.consumer_risk,
            look_bits=self.look_bits,
            max_bits=self.max_bits,
            burst_weights=self.burst_weights,
        )

    def averaged_acceptance(self, plan: Plan, losses_db: FloatArray) -> FloatArray:
        """Probability of ACCEPT at each loss, averaged over the error of Eb/N0, shape of ``losses_db``."""
        nodes, weights = np.polynomial.hermite_e.hermegauss(NODES)
        rates = self.curve(self.ebn0_db + self.u_db * nodes[None, :] - losses_db[:, None])
        accepted = plan.acceptance_probability(np.minimum(rates, 0.5).ravel()).reshape(rates.shape)
        return np.asarray(accepted @ (weights / weights.sum()), dtype=np.float64)


def design_guarded_plan(
    *,
    curve: Curve,
    ebn0_db: float,
    u_db: float,
    margin_db: float,
    design_loss_db: float,
    producer_risk: float,
    consumer_risk: float,
    look_bits: int,
    max_bits: int,
    burst_weights: BurstWeights = INDEPENDENT,
    rule: GuardRule = "least",
) -> GuardedPlan:
    """Design a step's plan with its guard bands.

    Args:
        curve: Bit error rate over Eb/N0 in dB, arrays in and out.
        ebn0_db: Eb/N0 really set, dB.
        u_db: Its standard uncertainty, dB.
        margin_db: Largest implementation loss allowed, dB.
        design_loss_db: Loss of a good unit, dB, below the margin.
        producer_risk: Largest risk of REJECT at the design loss.
        consumer_risk: Largest risk of ACCEPT at the margin.
        look_bits: Bits from look to look.
        max_bits: Most bits.
        burst_weights: (errors of an event, probability) pairs.
        rule: ``least`` for the least guard bands that keep both averaged risks; ``U``, ``0.83U`` or ``none`` for a
            consumer's guard band of that many expanded uncertainties, whose averaged risks are computed and may exceed
            the sheet's.

    Returns:
        The plan with its guard bands and averaged risks.

    Raises:
        ParameterError: A value outside its rule.
        PlanError: No plan carries both risks at this uncertainty; the sentence names one that could be carried.
    """
    if not np.isfinite(ebn0_db):
        raise ParameterError("ebn0_db", ebn0_db, "be a number in dB")
    if not u_db >= 0.0 or not np.isfinite(u_db):
        raise ParameterError("u_db", u_db, "be 0 or more")
    if not 0.0 <= design_loss_db < margin_db:
        raise ParameterError("design_loss_db", design_loss_db, f"be 0 or more and below the margin of {margin_db:g} dB")
    if rule != "least" and rule not in FACTORS:
        raise ParameterError("rule", rule, f"be least, {', '.join(FACTORS)}")
    case = _Case(
        curve,
        ebn0_db,
        u_db,
        margin_db,
        design_loss_db,
        producer_risk,
        consumer_risk,
        look_bits,
        max_bits,
        burst_weights,
    )
    if rule != "least":
        guard_c_db = FACTORS[rule] * COVERAGE_FACTOR * u_db
        return _guarded(case, case.plan(guard_c_db, 0.0), guard_c_db, 0.0, rule)
    try:
        return _least(case)
    except PlanError as reason:
        raise PlanError(
            f"at Eb/N0 {ebn0_db:.2f} dB a standard uncertainty of {u_db:.3f} dB cannot carry the sheet ({reason}); "
            f"{_carried(case)}"
        ) from reason


def _least(case: _Case) -> GuardedPlan:
    guard_c_db = guard_p_db = 0.6 * case.u_db
    if case.u_db == 0.0:
        return _guarded(case, case.plan(0.0, 0.0), 0.0, 0.0, "least")
    best: GuardedPlan | None = None
    for _ in range(TURNS):
        found = _guarded(case, case.plan(guard_c_db, guard_p_db), guard_c_db, guard_p_db, "least")
        short_c, short_p = _shifts(case, found.plan)
        if _keeps(case, found) and (best is None or _guards(found) < _guards(best)):
            best = found
        # Within a hair of the least guard bands, and on their safe side. Counts are whole numbers, so where few of
        # them decide, a plan's risks jump with the guard bands and the hair may not be reached: then the best one met.
        if best is found and min(short_c, short_p) >= -HAIR_DB:
            break
        guard_c_db = max(0.0, guard_c_db + short_c + ROUNDING_DB)
        guard_p_db = max(0.0, guard_p_db + short_p + ROUNDING_DB)
    if best is None:
        raise PlanError("no guard bands keep both averaged risks")
    return best


def _keeps(case: _Case, found: GuardedPlan) -> bool:
    return found.averaged_consumer_risk <= case.consumer_risk and found.averaged_producer_risk <= case.producer_risk


def _guards(found: GuardedPlan) -> float:
    return found.guard_consumer_db + found.guard_producer_db


def _shifts(case: _Case, plan: Plan) -> tuple[float, float]:
    """How many dB the plan's curve must move for each averaged risk to be met; negative where it is.

    The plan's acceptance is computed exactly on a fine grid of losses and interpolated in the logarithm, because the
    search needs it many times; the risks printed at the end are computed without interpolation.
    """
    nodes, weights = np.polynomial.hermite_e.hermegauss(NODES)
    weights = weights / weights.sum()
    reach_db = SEARCH_DB + case.u_db * float(nodes[-1])
    grid = np.linspace(case.design_loss_db - reach_db, case.margin_db + reach_db, GRID)
    accepted = plan.acceptance_probability(np.minimum(case.curve(case.ebn0_db - grid), 0.5))
    span = np.linspace(-SEARCH_DB, SEARCH_DB, 41)

    def shift(losses_db: FloatArray, chances: FloatArray, risk: float) -> float:
        logs = np.interp(losses_db[:, None] - case.u_db * nodes, grid, np.log(np.maximum(chances, 1e-300)))
        averaged = np.log(np.exp(logs) @ weights)
        # Risks fall as the loss moves away from the boundary; where even the far end is too risky, go that far.
        return SEARCH_DB if averaged[-1] > np.log(risk) else float(np.interp(-np.log(risk), -averaged, span))

    return (
        shift(case.margin_db + span, accepted, case.consumer_risk),
        shift(case.design_loss_db - span, 1.0 - accepted, case.producer_risk),
    )


def _guarded(case: _Case, plan: Plan, guard_c_db: float, guard_p_db: float, rule: GuardRule) -> GuardedPlan:
    at_margin, at_design = case.averaged_acceptance(plan, np.array([case.margin_db, case.design_loss_db]))
    return GuardedPlan(
        plan=plan,
        guard_consumer_db=guard_c_db,
        guard_producer_db=guard_p_db,
        rule=rule,
        u_db=case.u_db,
        expanded_u_db=COVERAGE_FACTOR * case.u_db,
        averaged_producer_risk=float(1.0 - at_design),
        averaged_consumer_risk=float(at_margin),
        margin_ber=case.rate(case.margin_db),
        design_ber=case.rate(case.design_loss_db),
    )


def _carried(case: _Case) -> str:
    from dataclasses import replace

    for part in (0.9, 0.8, 0.65, 0.5, 0.3):
        try:
            _least(replace(case, u_db=case.u_db * part))
        except PlanError:
            continue
        return f"{case.u_db * part:.3f} dB could"
    least_db = case.u_db * part
    return f"nor could {least_db:.3f} dB: give it more bits, larger risks, or more room between design loss and margin"
