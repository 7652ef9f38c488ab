"""Bit error steps: set Eb/N0, count in looks, let the plan decide, judge.

A step begins from zero bits at an Eb/N0 that stays fixed until its last look. Bits and errors of a look come
from one latched reading. Counts that cannot be true are the station's trouble, never the unit's.
"""

from __future__ import annotations

from collections.abc import Generator, Iterator
from dataclasses import dataclass
from typing import Any

from linetest.decision import Outcome, Plan, median_unbiased_ber, sequential_interval
from linetest.errors import ParameterError, PlanError, StationError
from linetest.instruments import Counts
from linetest.limits import BerCheck, Mode, StepLimit, derive_step
from linetest.noise import CarrierReading, EbN0Setting, set_ebn0
from linetest.procedure.checks import Bay
from linetest.procedure.events import Event, Judged, Judgement, ReadingTaken, StepProgress, StepStarted
from linetest.theory import required_ebn0_db

SHOW_EVERY_S = 0.05
INTERVAL_LEVEL = 0.95


class CountError(StationError):
    """The error counter said something that cannot be true."""


@dataclass(frozen=True, slots=True)
class StepTask:
    """One step to be done.

    Attributes:
        check: The BER check it belongs to.
        number: Number of the step within its check, from 1.
        nominal_ebn0_db: Eb/N0 that the sheet asks for, dB.
    """

    check: BerCheck
    number: int
    nominal_ebn0_db: float


def tasks_of(check: BerCheck) -> tuple[StepTask, ...]:
    """The steps of a BER check in the sheet's order.

    Args:
        check: The check.

    Returns:
        One task a step.
    """
    return tuple(StepTask(check, number, nominal) for number, nominal in enumerate(check.steps, start=1))


def setting_for(bay: Bay, task: StepTask, carrier: CarrierReading) -> EbN0Setting:
    """The calibrated attenuator setting for a step, with the Eb/N0 that it really gives.

    Args:
        bay: What the check works with.
        task: The step.
        carrier: The unit's carrier, read with the noise off.

    Returns:
        The setting.

    Raises:
        CalibrationError: No calibrated setting comes near enough.
    """
    rate_bps = bay.sheet.mode(task.check.mode).bit_rate_bps
    return set_ebn0(
        bay.calibration,
        carrier,
        rate_bps,
        task.nominal_ebn0_db,
        task.check.setting_rule,
        # The run is VOID only beyond this change, so as much may have happened at a step.
        carrier_change_db=bay.sheet.procedure.carrier.max_change_db,
    )


def run_step(bay: Bay, task: StepTask, carrier: CarrierReading) -> Iterator[Event]:
    """Do one step from setting Eb/N0 to its judgement.

    Args:
        bay: What the check works with.
        task: The step.
        carrier: The unit's carrier, read with the noise off.

    Yields:
        The step's start, its counts as they grow, its readings and its judgement.

    Raises:
        CountError: The counter's answers contradict themselves.
        CalibrationError: No calibrated setting comes near enough.
    """
    mode = bay.sheet.mode(task.check.mode)
    setting = setting_for(bay, task, carrier)
    try:
        limit = _limit(bay, task, setting)
    except PlanError as reason:
        yield _undecided(bay, task, f"the plan cannot be kept at u = {setting.u_db:.3f} dB: {reason}", {})
        return
    bay.station.attenuator.set_attenuation_db(setting.attenuation_db)
    bay.clock.sleep_s(bay.station.sheet.noise.settle_s)
    yield StepStarted(
        check=task.check.name,
        step=task.number,
        nominal_ebn0_db=task.nominal_ebn0_db,
        ebn0_db=setting.ebn0_db,
        u_db=setting.u_db,
        limit_ber=limit.limit_ber,
        good_ber=limit.design_ber,
        max_bits=limit.guarded.plan.max_bits,
        at=bay.clock.now(),
    )
    began_s = bay.clock.monotonic_s()
    counts = yield from _count(bay, task, limit.guarded.plan, mode)
    facts = _facts(task, mode, setting, limit, counts, carrier)
    facts["seconds"] = round(bay.clock.monotonic_s() - began_s, 3)
    yield from _readings(bay, task, setting, counts)
    yield _judge(bay, task, limit, counts, facts)


def _limit(bay: Bay, task: StepTask, setting: EbN0Setting) -> StepLimit:
    return derive_step(
        bay.sheet,
        task.check,
        task.nominal_ebn0_db,
        ebn0_db=setting.ebn0_db,
        u_db=setting.u_db,
        shortest_gate_s=bay.station.unit_port.shortest_gate_s,
    )


def _count(bay: Bay, task: StepTask, plan: Plan, mode: Mode) -> Generator[Event, None, Counts]:
    """Count look after look until the plan decides; returns the last counts."""
    port = bay.station.unit_port
    port.start_count(mode.pattern)
    last = Counts(bits=0, errors=0, lost_bits=0, locked=True)
    shown_s = bay.clock.monotonic_s() - SHOW_EVERY_S
    while True:
        wanted = min(plan.look_bits * (last.bits // plan.look_bits + 1), plan.max_bits)
        gate_s = (wanted - last.bits) / mode.bit_rate_bps
        counts = port.count_until(wanted, timeout_s=2.0 + 2.0 * gate_s)
        _trust(counts, last, wanted)
        last = counts
        outcome = plan.decide(counts.bits, counts.errors)
        now_s = bay.clock.monotonic_s()
        if outcome is not Outcome.CONTINUE or now_s - shown_s >= SHOW_EVERY_S:
            shown_s = now_s
            nearness = plan.nearness(counts.bits, counts.errors)
            yield StepProgress(task.check.name, task.number, counts.bits, counts.errors, nearness, bay.clock.now())
        if outcome is not Outcome.CONTINUE:
            port.stop_count()
            return last


def _trust(counts: Counts, before: Counts, wanted: int) -> None:
    if counts.errors > counts.bits:
        raise CountError(f"the error counter says {counts.errors} errors in {counts.bits} bits; check the counter")
    if counts.bits < wanted:
        raise CountError(f"the error counter stopped at {counts.bits} bits, asked for {wanted}; check its gate")
    if counts.errors < before.errors or counts.lost_bits < before.lost_bits:
        raise CountError(
            f"the error counter fell from {before.errors} to {counts.errors} errors: it was reset while counting"
        )


def _judge(bay: Bay, task: StepTask, limit: StepLimit, counts: Counts, facts: dict[str, Any]) -> Judged:
    plan = limit.guarded.plan
    accepted = plan.decide(counts.bits, counts.errors) is Outcome.ACCEPT
    lost = counts.lost_bits / max(1, counts.bits + counts.lost_bits)
    if lost > task.check.max_lost_fraction:
        allowed = task.check.max_lost_fraction
        return _undecided(bay, task, f"{lost:.2%} of the bits fell into lost alignment, more than {allowed:.2%}", facts)
    if accepted:
        sentence = f"shown inside the guarded limit {plan.limit_ber:.3g} at Eb/N0 {facts['ebn0_db']:.2f} dB"
        judgement = Judgement.ACCEPT
    else:
        sentence = f"not shown inside the guarded limit {plan.limit_ber:.3g} at Eb/N0 {facts['ebn0_db']:.2f} dB"
        judgement = Judgement.REJECT
    counted = f"{counts.errors} errors in {counts.bits} bits, "
    return Judged(task.check.name, task.number, judgement, counted + sentence, bay.clock.now(), facts)


def _undecided(bay: Bay, task: StepTask, sentence: str, facts: dict[str, Any]) -> Judged:
    return Judged(task.check.name, task.number, Judgement.UNDECIDED, sentence, bay.clock.now(), facts)


def _readings(bay: Bay, task: StepTask, setting: EbN0Setting, counts: Counts) -> Iterator[ReadingTaken]:
    check, step = task.check.name, task.number
    yield bay.reading(check, f"step {step} attenuation", setting.attenuation_db, "dB")
    yield bay.reading(check, f"step {step} Eb/N0", setting.ebn0_db, "dB", standard_uncertainty=setting.u_db)
    yield bay.reading(check, f"step {step} bits", float(counts.bits), "bit")
    yield bay.reading(check, f"step {step} errors", float(counts.errors), "bit")
    if counts.lost_bits:
        yield bay.reading(check, f"step {step} lost bits", float(counts.lost_bits), "bit")


def implementation_loss_db(scheme: str, ebn0_db: float, ber: float) -> float | None:
    """Eb/N0 that the unit needed above theory for its bit error rate, in dB.

    Args:
        scheme: The mode's scheme.
        ebn0_db: Eb/N0 really set, dB.
        ber: Estimate of the bit error rate.

    Returns:
        The loss, or None where theory cannot be asked for the Eb/N0 of that rate.
    """
    try:
        return ebn0_db - required_ebn0_db(scheme, ber)
    except ParameterError:
        return None


def _facts(
    task: StepTask,
    mode: Mode,
    setting: EbN0Setting,
    limit: StepLimit,
    counts: Counts,
    carrier: CarrierReading,
) -> dict[str, Any]:
    guarded, plan = limit.guarded, limit.guarded.plan
    # A two-sided interval at 95 % could reach past a limit judged at a risk above 2.5 %.
    level = min(INTERVAL_LEVEL, 1.0 - 2.0 * max(plan.producer_risk, plan.consumer_risk))
    low, high = sequential_interval(plan, counts.bits, counts.errors, confidence=level)
    estimate = median_unbiased_ber(plan, counts.bits, counts.errors)
    loss_db = implementation_loss_db(mode.scheme, setting.ebn0_db, estimate)
    return {
        "nominal_ebn0_db": task.nominal_ebn0_db,
        "ebn0_db": setting.ebn0_db,
        "u_db": setting.u_db,
        "k": setting.k,
        "expanded_u_db": setting.expanded_u_db,
        "scheme": mode.scheme,
        "mode": task.check.mode,
        "bit_rate_bps": mode.bit_rate_bps,
        "pattern": mode.pattern,
        "bits": counts.bits,
        "errors": counts.errors,
        "lost_bits": counts.lost_bits,
        "counted_ber": counts.errors / counts.bits,
        # Errors by bits is biased by the stop; what is printed and judged by eye is the median-unbiased estimate.
        "ber": estimate,
        "interval_low": low,
        "interval_high": high,
        "interval_level": level,
        "theory_ber": limit.theory_ber,
        "limit_ber": limit.limit_ber,
        "guarded_limit_ber": plan.limit_ber,
        "design_ber": limit.design_ber,
        "margin_db": limit.margin_db,
        "design_loss_db": limit.design_loss_db,
        "guard_consumer_db": guarded.guard_consumer_db,
        "guard_producer_db": guarded.guard_producer_db,
        "guard_rule": guarded.rule,
        "producer_risk": plan.producer_risk,
        "consumer_risk": plan.consumer_risk,
        "averaged_producer_risk": guarded.averaged_producer_risk,
        "averaged_consumer_risk": guarded.averaged_consumer_risk,
        "plan": plan.to_json(),
        "burst_weights": [list(pair) for pair in plan.burst_weights],
        "implementation_loss_db": loss_db,
        "attenuation_db": setting.attenuation_db,
        "carrier_dbm": carrier.power_dbm,
    }


__all__ = ["CountError", "StepTask", "implementation_loss_db", "run_step", "setting_for", "tasks_of"]
