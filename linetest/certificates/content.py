"""What a certificate says, taken from the record and checked against itself before a word is printed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date
from typing import Any

from linetest.certificates import words
from linetest.errors import CertificateError
from linetest.records import InstrumentRecord, JudgementRecord, ReadingRecord, RunRecord

GUARD_WORDS = {
    "least": "least: the smallest w for which both risks, with u included, meet the limit sheet",
    "U": "U: w equals the expanded uncertainty",
    "0.83U": "0.83U: w is 0.83 of the expanded uncertainty",
    "none": "none: the limit is not guarded",
}
_NUMBERS = (
    "ebn0_db",
    "u_db",
    "k",
    "expanded_u_db",
    "bits",
    "errors",
    "ber",
    "interval_low",
    "interval_high",
    "interval_level",
    "theory_ber",
    "limit_ber",
    "guarded_limit_ber",
    "margin_db",
    "design_loss_db",
    "guard_consumer_db",
    "guard_producer_db",
    "producer_risk",
    "consumer_risk",
    "averaged_producer_risk",
    "averaged_consumer_risk",
    "attenuation_db",
)
_STEP_READINGS = {"attenuation": "attenuation_db", "Eb/N0": "ebn0_db", "bits": "bits", "errors": "errors"}


@dataclass(frozen=True, slots=True)
class Step:
    """One bit error step that was counted.

    Attributes:
        number: Number of the step within its check.
        judgement: `ACCEPT`, `REJECT` or `UNDECIDED`.
        facts: The numbers that led there; complete.
    """

    number: int
    judgement: str
    facts: dict[str, Any]


@dataclass(frozen=True, slots=True)
class BerCheck:
    """A bit error check with its counted steps.

    Attributes:
        name: Name of the check.
        steps: Its steps, one or more.
    """

    name: str
    steps: tuple[Step, ...]

    @property
    def facts(self) -> dict[str, Any]:
        """Facts of the first step, for what all steps share."""
        return self.steps[0].facts

    @property
    def levels(self) -> str:
        """Levels of the intervals, in words."""
        return _joined(f"{step.facts['interval_level'] * 100:.4g}{words.THIN}%" for step in self.steps)

    @property
    def factors(self) -> str:
        """Coverage factors, in words."""
        return _joined(f"{step.facts['k']:.2f}" for step in self.steps)

    @property
    def has_bursts(self) -> bool:
        """Whether the plan takes errors to come in groups."""
        return any(list(map(list, step.facts.get("burst_weights") or [[1, 1.0]])) != [[1, 1.0]] for step in self.steps)


@dataclass(frozen=True, slots=True)
class Row:
    """One reading as printed."""

    name: str
    value: str
    unit: str
    uncertainty: str
    limits: str


@dataclass(frozen=True, slots=True)
class CheckRows:
    """A check with what it concluded and its readings.

    Attributes:
        name: Name of the check, with its step where it is one.
        judgement: What it concluded, a dash where nothing.
        sentence: Why.
        rows: Its readings.
    """

    name: str
    judgement: str
    sentence: str
    rows: tuple[Row, ...]


def ber_checks(run: RunRecord) -> tuple[BerCheck, ...]:
    """Every bit error check of a run with its counted steps, in the order judged.

    Args:
        run: The run.

    Returns:
        The checks; a step judged without counting is not among their steps.

    Raises:
        CertificateError: A step's record lacks a number or contradicts itself.
    """
    found: dict[str, list[Step]] = {}
    for judgement in run.judgements:
        if judgement.step is not None and judgement.facts:
            found.setdefault(judgement.check, []).append(_step(run, judgement))
    return tuple(BerCheck(name, tuple(steps)) for name, steps in found.items())


def check_rows(run: RunRecord) -> tuple[CheckRows, ...]:
    """Every reading of a run under the check that it was judged by.

    Readings of a counted step that say what the step's own line says already are left out.

    Args:
        run: The run.

    Returns:
        The checks in the order of the procedure.
    """
    taken: dict[tuple[str, int | None], list[ReadingRecord]] = {}
    for reading in run.readings:
        taken.setdefault(_place(reading), []).append(reading)
    order = dict.fromkeys([*taken, *((item.check, item.step) for item in run.judgements)])
    judged = {(item.check, item.step): item for item in run.judgements}
    groups = []
    for place in order:
        judgement = judged.get(place)
        facts = judgement.facts if judgement is not None else {}
        rows = tuple(_row(item) for item in taken.get(place, ()) if not _told(item, facts))
        if judgement is not None and judgement.step is not None and facts and not rows:
            continue
        name = place[0] if place[1] is None else f"{place[0]}, step {place[1]}"
        concluded = (judgement.judgement, judgement.sentence) if judgement is not None else (words.NONE, "")
        groups.append(CheckRows(name, *concluded, rows))
    return tuple(groups)


def check_certifiable(run: RunRecord) -> None:
    """Refuse what may not be certified.

    Args:
        run: The run.

    Raises:
        CertificateError: The run did not pass, or its record is not whole, or contradicts the PASS.
    """
    name = f"run {run.run_id} of {run.serial}"
    if run.disposition != "PASS":
        is_now = run.disposition or "still open"
        raise CertificateError(
            f"{name} is {is_now}: only a PASS is certified; a report can be printed of any closed run"
        )
    if not any(judgement.step is not None and judgement.facts for judgement in run.judgements):
        raise CertificateError(f"{name} has no bit error step on record; test the unit again")
    if run.calibration is None or not run.instruments:
        raise CertificateError(f"{name} has no noise calibration or no instruments on record; test the unit again")
    for judgement in run.judgements:
        if judgement.judgement != "ACCEPT":
            raise CertificateError(
                f"{name} is recorded as PASS, but its check {judgement.check} is {judgement.judgement}; "
                "the record contradicts itself: ask for a quality decision"
            )
    if not run.calibration.started_at <= run.started_at <= run.calibration.valid_until:
        raise CertificateError(
            f"{name} was tested outside the validity of its noise calibration {run.calibration.calibration_id}; "
            "calibrate and test the unit again"
        )
    _check_instruments(name, run)


def _check_instruments(name: str, run: RunRecord) -> None:
    for used in run.instruments:
        if used.calibration_due and _due(name, used) < run.started_at.date():
            raise CertificateError(
                f"{name}: the calibration of the {used.role.replace('_', ' ')} {used.serial} fell due on "
                f"{used.calibration_due}, before the test; have it calibrated and test the unit again"
            )


def _due(name: str, used: InstrumentRecord) -> date:
    try:
        return date.fromisoformat(used.calibration_due)
    except ValueError as reason:
        raise CertificateError(
            f"{name}: the calibration due date of {used.role} is {used.calibration_due!r}, which is not a date"
        ) from reason


def _step(run: RunRecord, judgement: JudgementRecord) -> Step:
    """A step whose record is complete and whose interval agrees with its judgement."""
    facts, number = dict(judgement.facts), judgement.step or 0
    where = f"run {run.run_id} of {run.serial}, {judgement.check} step {number}"
    wrong = [name for name in _NUMBERS if not isinstance(facts.get(name), int | float)]
    wrong += [name for name in ("scheme", "guard_rule") if not isinstance(facts.get(name), str)]
    if wrong:
        raise CertificateError(f"{where}: the record does not hold {', '.join(wrong)}; it cannot be printed")
    if not facts["interval_low"] <= facts["ber"] <= facts["interval_high"]:
        raise CertificateError(f"{where}: the interval on record does not hold the bit error rate counted")
    if judgement.judgement == "ACCEPT" and facts["interval_high"] > facts["limit_ber"]:
        raise CertificateError(
            f"{where}: judged ACCEPT, but the interval at {facts['interval_level']:.4g} reaches past the limit; "
            "a certificate may not contradict its own judgement"
        )
    return Step(number, judgement.judgement, facts)


def _place(reading: ReadingRecord) -> tuple[str, int | None]:
    """The check, or the step of it, that a reading belongs to."""
    first, _, rest = reading.name.partition(" ")
    number, _, _ = rest.partition(" ")
    return (reading.check, int(number)) if first == "step" and number.isdecimal() else (reading.check, None)


def _told(reading: ReadingRecord, facts: Any) -> bool:
    """Whether a step's own line tells this reading, with the same value."""
    fact = _STEP_READINGS.get(reading.name.partition(" ")[2].partition(" ")[2])
    return fact is not None and fact in facts and reading.value == facts[fact]


def _row(reading: ReadingRecord) -> Row:
    return Row(
        name=reading.name,
        value=words.measured(reading.value, reading.standard_uncertainty),
        unit=reading.unit,
        uncertainty=words.spread(reading.standard_uncertainty),
        limits=words.limits(reading.lower, reading.upper),
    )


def _joined(texts: Any) -> str:
    return " / ".join(dict.fromkeys(texts))


def guard_rules(checks: Sequence[BerCheck]) -> str:
    """The guard band rules used, in words.

    Args:
        checks: Bit error checks of a run.

    Returns:
        Each rule once.
    """
    rules = dict.fromkeys(str(step.facts["guard_rule"]) for check in checks for step in check.steps)
    return "; ".join(GUARD_WORDS.get(rule, rule) for rule in rules)


def overall_sentence(run: RunRecord, checks: Sequence[BerCheck]) -> str:
    """The conclusion in words.

    Args:
        run: The run.
        checks: Its bit error checks.

    Returns:
        A sentence.
    """
    if run.disposition != "PASS":
        return run.sentence or f"The run ended {run.disposition}."
    count = sum(len(check.steps) for check in checks)
    steps = "the one Eb/N0 step" if count == 1 else f"each of {count} Eb/N0 steps"
    return f"Every check of the procedure ended ACCEPT; at {steps} the unit was shown to be inside its limit."
