"""What a sheet will do before the first unit is tested: who passes, how long it takes, and whether it can be met."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from scipy import special
from scipy.interpolate import PchipInterpolator

from linetest.errors import ParameterError, PlanError, SheetFault
from linetest.limits.derive import StepLimit, derive_step
from linetest.limits.plans import limit_curve
from linetest.limits.sheet import BerCheck, LimitSheet
from linetest.units import FloatArray

# Between the points acceptance is interpolated in its log odds, which are nearly straight in dB.
_GRID_STEP_DB = 0.02
_NODES = 31
# Below this an acceptance is nothing, above one less this it is certain.
_LEAST = 1e-15


def derive_all(
    sheet: LimitSheet, check: BerCheck, *, u_db: float | None = None, shortest_gate_s: float = 1e-3
) -> tuple[StepLimit, ...]:
    """Limits of all steps of a check, each at its nominal Eb/N0.

    Args:
        sheet: The limit sheet.
        check: One of its BER checks.
        u_db: Standard uncertainty of Eb/N0, dB; the most that the check carries where None.
        shortest_gate_s: Shortest gate of the error counter, s.

    Returns:
        One limit a step.

    Raises:
        PlanError: No plan keeps a step's risks.
        ParameterError: A number is outside its rule.
    """
    planned_db = check.max_u_db if u_db is None else u_db
    return tuple(
        derive_step(sheet, check, step_db, ebn0_db=step_db, u_db=planned_db, shortest_gate_s=shortest_gate_s)
        for step_db in check.steps
    )


def passing_probability(steps: Sequence[StepLimit], losses_db: FloatArray, *, shared_u_db: float) -> FloatArray:
    """Probability that a unit passes every step, over its true loss: the operating characteristic.

    For a given error e of Eb/N0 the steps are independent and their probabilities multiply; e is one number for the
    whole run, so that the product is averaged over it (normal).

    Args:
        steps: Limits of the steps.
        losses_db: True implementation losses, the same at every step, dB, any shape.
        shared_u_db: Standard uncertainty of Eb/N0 that the steps share, dB; 0 for the probability given e = 0.

    Returns:
        Probabilities of the shape of `losses_db`.

    Raises:
        ParameterError: There is no step, or a number is outside its rule.
    """
    losses = _checked(steps, losses_db, shared_u_db)
    nodes, weights = np.polynomial.hermite_e.hermegauss(_NODES) if shared_u_db > 0.0 else (np.zeros(1), np.ones(1))
    # An Eb/N0 truly lower by e looks like a loss higher by e.
    seen = losses.ravel()[:, None] + shared_u_db * nodes[None, :]
    passing = np.ones_like(seen)
    for step in steps:
        passing *= _acceptance(step, seen)
    return np.asarray((passing @ (weights / weights.sum())).reshape(losses.shape), dtype=np.float64)


def mean_seconds(steps: Sequence[StepLimit], losses_db: FloatArray) -> FloatArray:
    """Mean counting time of a unit that is measured at every step, over its true loss.

    Args:
        steps: Limits of the steps.
        losses_db: True implementation losses, dB, any shape.

    Returns:
        Seconds, of the shape of `losses_db`.

    Raises:
        ParameterError: There is no step, or a loss is not finite.
    """
    losses = _checked(steps, losses_db, 0.0)
    total = np.zeros(losses.size)
    for step in steps:
        rates = limit_curve(step.scheme)(step.ebn0_db - losses.ravel())
        total += np.asarray(step.guarded.plan.expected_bits(rates)) / step.bit_rate_bps
    return total.reshape(losses.shape)


def _checked(steps: Sequence[StepLimit], losses_db: FloatArray, shared_u_db: float) -> FloatArray:
    losses = np.asarray(losses_db, dtype=np.float64)
    if not steps:
        raise ParameterError("steps", 0, "number at least 1")
    if not np.isfinite(losses).all():
        raise ParameterError("losses_db", "the array", "be finite")
    if not (np.isfinite(shared_u_db) and shared_u_db >= 0.0):
        raise ParameterError("shared_u_db", shared_u_db, "be finite and not negative")
    return losses


def _acceptance(step: StepLimit, seen_db: FloatArray) -> FloatArray:
    """Probability of ACCEPT at losses as seen, exact on a grid and interpolated between."""
    points = int(np.ceil((seen_db.max() - seen_db.min()) / _GRID_STEP_DB)) + 1
    grid = np.unique(seen_db) if seen_db.size <= points else np.linspace(seen_db.min(), seen_db.max(), max(points, 2))
    rates = limit_curve(step.scheme)(step.ebn0_db - grid)
    accepted = np.clip(np.asarray(step.guarded.plan.acceptance_probability(rates)), _LEAST, 1.0 - _LEAST)
    if grid.size == 1:
        return np.full_like(seen_db, float(accepted[0]))
    between = PchipInterpolator(grid, special.logit(accepted))
    return np.asarray(special.expit(between(seen_db)), dtype=np.float64)


def plan_faults(sheet: LimitSheet, *, shortest_gate_s: float = 1e-3) -> tuple[SheetFault, ...]:
    """Why a sheet cannot be met, found by designing every plan at the uncertainty that it must carry.

    Args:
        sheet: The limit sheet, sound in itself.
        shortest_gate_s: Shortest gate of the error counter, s.

    Returns:
        One fault for each step without a plan, and for each check that takes longer than its budget; empty where the
        sheet can be met.
    """
    return tuple(fault for check in sheet.procedure.ber for fault in _check_faults(sheet, check, shortest_gate_s))


def _check_faults(sheet: LimitSheet, check: BerCheck, shortest_gate_s: float) -> Iterator[SheetFault]:
    key = f"procedure.ber[{check.name}]"
    steps: list[StepLimit] = []
    for step_db in check.steps:
        try:
            steps.append(
                derive_step(
                    sheet, check, step_db, ebn0_db=step_db, u_db=check.max_u_db, shortest_gate_s=shortest_gate_s
                )
            )
        except PlanError as reason:
            yield SheetFault(f"{key}.steps", f"{step_db:g}", f"must be a step for which a plan exists: {reason}")
    if len(steps) < len(check.steps):
        return
    good_s = float(mean_seconds(steps, np.array(check.design_loss_db)))
    if good_s > check.time_budget_s:
        yield SheetFault(
            f"{key}.time_budget_s",
            f"{check.time_budget_s:g}",
            f"must be at least the mean counting time of a unit at the design loss, {good_s:.1f} s",
        )
