"""What a limit sheet holds: frozen, strict, each number with its source."""

from __future__ import annotations

import re

import pytest
from pydantic import ValidationError

from linetest.errors import ParameterError
from linetest.limits import BerCheck, LimitSheet, Mode, load_model

MODE = {
    "name": "m",
    "scheme": "qpsk",
    "bit_rate_bps": 2.048e6,
    "symbol_rate_bd": 1.024e6,
    "pattern": "prbs23",
    "burst_weights": [[1, 1.0]],
}
MODE_SOURCE = {key: "somewhere" for key in MODE if key != "name"}


def mode(**changes: object) -> Mode:
    return Mode.model_validate({**MODE, "source": MODE_SOURCE, **changes})


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


@pytest.mark.parametrize(
    ("scheme", "weights", "bit_rate_bps", "symbol_rate_bd"),
    [
        ("bpsk", [[1, 1.0]], 64e3, 64e3),
        ("de-bpsk", [[2, 1.0]], 64e3, 64e3),
        ("qpsk", [[1, 1.0]], 2.048e6, 1.024e6),
        ("qpsk+conv-1/2", [[1, 0.5], [4, 0.5]], 1.024e6, 1.024e6),
        # ETSI EN 300 421: at 27.5 MBd, rate 1/2 and 188/204 carry 25.343 Mbit/s of transport stream (by arithmetic).
        ("qpsk+conv-1/2+rs-204-188", [[1, 0.5], [4, 0.5]], 25.343e6, 27.5e6),
    ],
)
def test_rates_agree_with_modulation_and_coding(
    scheme: str, weights: list[list[float]], bit_rate_bps: float, symbol_rate_bd: float
) -> None:
    assert (
        mode(scheme=scheme, burst_weights=weights, bit_rate_bps=bit_rate_bps, symbol_rate_bd=symbol_rate_bd).scheme
        == scheme
    )


@pytest.mark.parametrize(("symbol_rate_bd", "sound"), [(1_024_200, True), (1_023_800, True), (1_024_300, False)])
def test_rates_may_differ_by_a_thousandth_of_a_db(symbol_rate_bd: float, sound: bool) -> None:
    """0.001 dB is 230 parts in a million: 236 Bd of 1 024 000."""
    if sound:
        assert mode(symbol_rate_bd=symbol_rate_bd).symbol_rate_bd == symbol_rate_bd
    else:
        with pytest.raises(ValidationError, match=r"-0\.001 dB off what modulation and coding give"):
            mode(symbol_rate_bd=symbol_rate_bd)


@pytest.mark.parametrize("scheme", ["de-bpsk", "de-qpsk", "qpsk+conv-1/2"])
def test_scheme_whose_errors_come_in_groups_must_say_so(scheme: str) -> None:
    with pytest.raises(ValidationError, match="never makes single errors only"):
        mode(scheme=scheme)


def test_dispersion_is_second_over_first_moment() -> None:
    assert mode().dispersion == 1.0
    assert mode(burst_weights=[[2, 1.0]]).dispersion == 2.0
    # E[w^2]/E[w] of 1 (share 3/4) and 5 (share 1/4) is 7/2.
    assert mode(burst_weights=[[1, 0.75], [5, 0.25]]).dispersion == pytest.approx(3.5)


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
