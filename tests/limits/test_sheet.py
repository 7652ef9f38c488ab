"""What a limit sheet holds: frozen, strict, each number with its source."""

from __future__ import annotations

import re

import pytest
from pydantic import ValidationError

from linetest.errors import ParameterError
from linetest.limits import BerCheck, LimitSheet, load_model


def test_nothing_can_be_changed_after_reading() -> None:
    sheet = load_model("BW-Q4")
    with pytest.raises(ValidationError, match="frozen"):
        sheet.procedure.ber[0].margin_db = 2.0
    with pytest.raises(ValidationError, match="frozen"):
        sheet.revision = "2"


def test_unknown_mode_and_check_name_those_known() -> None:
    sheet = load_model("BW-Q4")
    with pytest.raises(ParameterError, match="name is 'x', but must be one of qpsk-2048"):
        sheet.mode("x")
    with pytest.raises(ParameterError, match="name is 'x', but must be one of ber"):
        sheet.check("x")


def test_margin_and_steps_hold_their_order() -> None:
    check = load_model("BW-Q4").procedure.ber[0]
    raw = {**check.model_dump(), "source": check.source}
    assert BerCheck.model_validate(raw) == check
    with pytest.raises(ValidationError, match="must be less than margin_db"):
        BerCheck.model_validate({**raw, "design_loss_db": 1.0})
    with pytest.raises(ValidationError, match="must ascend, each step once"):
        BerCheck.model_validate({**raw, "steps": [6.8, 6.8]})
    with pytest.raises(ValidationError, match="must have at least one entry"):
        BerCheck.model_validate({**raw, "steps": []})


@pytest.mark.parametrize("serial", ["BQ4-000123"])
@pytest.mark.parametrize("hostile", ["", "../", "<b>", "/x", " ", "\n", '"', "&", "%00", ";"])
def test_no_pattern_that_a_sheet_may_have_lets_paths_or_markup_in(serial: str, hostile: str) -> None:
    sheet = load_model("BW-Q4")
    assert re.fullmatch(sheet.serial_pattern, serial)
    for wrong in (hostile + serial, serial + hostile, serial[:5] + hostile + serial[5:]):
        assert wrong == serial or not re.fullmatch(sheet.serial_pattern, wrong)


def test_sheet_needs_a_source_for_each_of_its_own_limits() -> None:
    sheet = load_model("BW-Q4")
    assert set(sheet.source) == {"serial_pattern", "firmware"}
    assert set(LimitSheet.model_fields) - LimitSheet.UNSOURCED - {"source"} == set(sheet.source)
