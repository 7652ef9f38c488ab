"""What a certificate may say: complete, and never against itself."""

from __future__ import annotations

from dataclasses import replace
from datetime import timedelta
from typing import Any

import pytest

from linetest.certificates.content import ber_checks, check_certifiable, check_rows, guard_rules, overall_sentence
from linetest.errors import CertificateError
from linetest.records import JudgementRecord, ReadingRecord, RunRecord
from tests.certificates.sample import BEGAN, failed_run, passed_run, step_facts


def with_facts(run: RunRecord, step: int, **facts: Any) -> RunRecord:
    """The run with some facts of a step replaced; a fact of None is removed."""
    judgements = tuple(
        replace(item, facts={key: value for key, value in {**item.facts, **facts}.items() if value is not None})
        if item.step == step
        else item
        for item in run.judgements
    )
    return replace(run, judgements=judgements)


def test_a_passed_run_is_certifiable() -> None:
    check_certifiable(passed_run())


@pytest.mark.parametrize("disposition", ["FAIL", "HOLD", "VOID", ""])
def test_only_a_pass_is_certified(disposition: str) -> None:
    with pytest.raises(CertificateError, match=f"is {disposition or 'still open'}: only a PASS is certified"):
        check_certifiable(passed_run(disposition=disposition))


def test_a_pass_with_a_check_that_did_not_accept_is_refused() -> None:
    with pytest.raises(CertificateError, match="its check ber is REJECT; the record contradicts itself"):
        check_certifiable(failed_run(disposition="PASS"))


def test_a_pass_without_steps_calibration_or_instruments_is_refused() -> None:
    with pytest.raises(CertificateError, match="no bit error step on record"):
        check_certifiable(passed_run(judgements=passed_run().judgements[:4]))
    with pytest.raises(CertificateError, match="no noise calibration or no instruments"):
        check_certifiable(passed_run(calibration=None))
    with pytest.raises(CertificateError, match="no noise calibration or no instruments"):
        check_certifiable(passed_run(instruments=()))


def test_a_test_outside_the_validity_of_the_noise_calibration_is_refused() -> None:
    with pytest.raises(CertificateError, match="outside the validity of its noise calibration cal-0197f3a1"):
        check_certifiable(passed_run(started_at=BEGAN + timedelta(hours=11)))


def test_an_instrument_past_its_due_date_is_refused_and_on_the_day_is_not() -> None:
    run = passed_run()
    meter = run.instruments[2]
    due = {"2026-03-01": False, "2026-03-02": True}
    for day, allowed in due.items():
        used = (*run.instruments[:2], replace(meter, calibration_due=day), *run.instruments[3:])
        if allowed:
            check_certifiable(replace(run, instruments=used))
        else:
            with pytest.raises(CertificateError, match="power meter 34711 fell due on 2026-03-01, before the test"):
                check_certifiable(replace(run, instruments=used))


def test_a_due_date_that_is_no_date_is_refused() -> None:
    run = passed_run()
    used = (replace(run.instruments[0], calibration_due="soon"), *run.instruments[1:])
    with pytest.raises(CertificateError, match="'soon', which is not a date"):
        check_certifiable(replace(run, instruments=used))


def test_an_accept_whose_interval_reaches_past_the_limit_is_refused() -> None:
    with pytest.raises(
        CertificateError, match=r"step 2: judged ACCEPT, but the interval at 0\.95 reaches past the limit"
    ):
        ber_checks(with_facts(passed_run(), 2, interval_high=5e-4))


def test_an_interval_that_does_not_hold_the_rate_is_refused() -> None:
    with pytest.raises(CertificateError, match="does not hold the bit error rate counted"):
        ber_checks(with_facts(passed_run(), 1, interval_low=1.2e-3))


def test_a_step_without_a_number_names_it() -> None:
    with pytest.raises(
        CertificateError, match="ber step 3: the record does not hold averaged_consumer_risk, guard_rule"
    ):
        ber_checks(with_facts(passed_run(), 3, averaged_consumer_risk=None, guard_rule=None))


def test_every_reading_is_told_exactly_once() -> None:
    """In its check's rows, or, for a step's count and setting, in the step's own line."""
    run = passed_run()
    rows = [row.name for group in check_rows(run) for row in group.rows]
    in_lines = [reading.name for reading in run.readings if reading.check == "ber"]
    assert sorted(rows + in_lines) == sorted(reading.name for reading in run.readings)
    assert len(in_lines) == 16


def test_a_step_reading_that_its_line_does_not_tell_gets_a_row() -> None:
    run = passed_run()
    lost = ReadingRecord("ber", "step 2 lost bits", 40.0, "bit", None, None, None, BEGAN)
    contradicting = ReadingRecord("ber", "step 2 errors", 99.0, "bit", None, None, None, BEGAN)
    groups = check_rows(replace(run, readings=(*run.readings, lost, contradicting)))
    (group,) = [group for group in groups if group.name == "ber, step 2"]
    assert [(row.name, row.value) for row in group.rows] == [("step 2 lost bits", "40.00"), ("step 2 errors", "99.00")]
    assert group.judgement == "ACCEPT"


def test_a_step_undecided_without_counting_is_told_with_its_reason() -> None:
    undecided = JudgementRecord("ber", 1, "UNDECIDED", "the plan cannot be kept at u = 0.200 dB")
    run = passed_run(disposition="HOLD", judgements=(undecided,), readings=())
    assert ber_checks(run) == ()
    (group,) = check_rows(run)
    assert (group.name, group.judgement, group.sentence) == ("ber, step 1", "UNDECIDED", undecided.sentence)


def test_words_for_all_steps_together() -> None:
    checks = ber_checks(passed_run())
    assert checks[0].levels == "95\u202f%"
    assert checks[0].factors == "1.98"
    assert not checks[0].has_bursts
    assert guard_rules(checks).startswith("least: the smallest w")
    assert "each of 4 Eb/N0 steps" in overall_sentence(passed_run(), checks)
    assert overall_sentence(failed_run(), checks) == failed_run().sentence


def test_bursts_of_a_mode_are_seen() -> None:
    facts = {**step_facts(6.8, 6.79, 22_528, 21, 25.0), "burst_weights": [[1, 0.0], [2, 1.0]]}
    run = passed_run(judgements=(JudgementRecord("ber", 1, "ACCEPT", "", facts),))
    assert ber_checks(run)[0].has_bursts
