"""The limit sheets that ship: sound, sourced, and what they cost in time."""

from __future__ import annotations

import re

import pytest

from linetest.limits import LimitSheet, derive_step, list_sheets, load_model
from linetest.limits.plans import plan_for, plan_request
from linetest.theory.decoder_tables import DECODER_ROWS
from tests.limits.conftest import SHIPPED


@pytest.fixture(scope="module")
def sheets() -> list[LimitSheet]:
    return list_sheets(SHIPPED)


def test_one_sheet_a_model(sheets: list[LimitSheet]) -> None:
    assert [sheet.model for sheet in sheets] == ["BW-B2", "BW-Q4", "BW-Q4C"]


def test_a_serial_belongs_to_one_model(sheets: list[LimitSheet]) -> None:
    for serial, model in (("BQ4-000123", "BW-Q4"), ("BQC-000123", "BW-Q4C"), ("BB2-000123", "BW-B2")):
        assert [sheet.model for sheet in sheets if re.fullmatch(sheet.serial_pattern, serial)] == [model]


@pytest.mark.parametrize(
    ("model", "scheme", "bit_rate_bps", "symbol_rate_bd"),
    [
        ("BW-Q4", "qpsk", 2.048e6, 1.024e6),
        ("BW-Q4C", "qpsk+conv-1/2", 1.024e6, 1.024e6),
        ("BW-B2", "de-bpsk", 64e3, 64e3),
    ],
)
def test_modes_are_the_products(model: str, scheme: str, bit_rate_bps: float, symbol_rate_bd: float) -> None:
    mode = load_model(model, SHIPPED).modes[0]
    assert (mode.scheme, mode.bit_rate_bps, mode.symbol_rate_bd) == (scheme, bit_rate_bps, symbol_rate_bd)


def test_good_units_take_no_longer_than_the_sheet_says() -> None:
    """A unit at the design loss with u = 0.06 dB: a second or two at 2.048 Mbit/s."""
    sheet = load_model("BW-Q4", SHIPPED)
    check, rate_bps = sheet.procedure.ber[0], sheet.modes[0].bit_rate_bps
    total_s = 0.0
    for step in check.steps:
        limit = derive_step(sheet, check, step, ebn0_db=step, u_db=0.06, shortest_gate_s=1e-3)
        total_s += float(limit.guarded.plan.expected_bits(limit.design_ber)) / rate_bps
    assert 0.5 < total_s < check.time_budget_s


def test_grouped_errors_cost_their_dispersion_in_bits() -> None:
    """Pairs of errors: twice the bits of single errors at the same rates, nearly (compound Poisson counts)."""
    sheet = load_model("BW-B2", SHIPPED)
    check, mode = sheet.procedure.ber[0], sheet.modes[0]
    request = plan_request(check, mode, ebn0_db=6.8, u_db=0.06, shortest_gate_s=1e-3)
    paired = plan_for(request)[1].plan
    single = plan_for(
        plan_request(
            check, mode.model_copy(update={"burst_weights": ((1, 1.0),)}), ebn0_db=6.8, u_db=0.06, shortest_gate_s=1e-3
        )
    )[1].plan
    ratio = float(paired.expected_bits(paired.good_ber)) / float(single.expected_bits(single.good_ber))
    assert 1.8 < ratio < 2.2


def test_burst_weights_of_the_decoder_lie_between_its_simulated_neighbours() -> None:
    """Sheet's weights were simulated at 3.2 dB; the theory's tables have 3.0 and 3.5 dB from other seeds."""
    rows = {row.ebn0_db: row.squared_errors / row.errors for row in DECODER_ROWS["conv-1/2"]}
    dispersion = load_model("BW-Q4C", SHIPPED).modes[0].dispersion
    assert rows[3.5] < dispersion < rows[3.0]


@pytest.mark.parametrize("offset_db", [-0.4, -0.35, -0.07, -0.02, 0.13, 0.4])
def test_every_step_can_be_planned_wherever_the_attenuator_lands(offset_db: float) -> None:
    """At the station's uncertainty a good unit must never wait for a decision because no plan was found."""
    sheet = load_model("BW-Q4")
    check = sheet.procedure.ber[0]
    for nominal_db in check.steps:
        ebn0_db = round(nominal_db + offset_db, 2)
        for u_db in (0.058, 0.065, check.max_u_db):
            guarded = derive_step(sheet, check, nominal_db, ebn0_db=ebn0_db, u_db=u_db, shortest_gate_s=0.001).guarded
            assert guarded.averaged_consumer_risk <= check.consumer_risk
            assert guarded.averaged_producer_risk <= check.step_producer_risk
