"""Plans of steps: looks, most bits, and the uncertainty planned for."""

from __future__ import annotations

import numpy as np
import pytest

from linetest.limits import LimitSheet, limit_curve, load_model
from linetest.limits.plans import curve_u_db, plan_request
from tests.limits.test_derive import GATE_S, derived


@pytest.fixture(scope="module")
def sheet() -> LimitSheet:
    return load_model("BW-Q4")


def test_look_is_never_shorter_than_the_counters_gate(sheet: LimitSheet) -> None:
    low, high = derived(sheet, 6.8, 6.8, 0.06), derived(sheet, 10.5, 10.5, 0.06)
    assert low.best_fixed_bits / 60 < 2048
    assert low.guarded.plan.look_bits == 2048
    assert high.guarded.plan.look_bits == high.best_fixed_bits // 60 > 2048
    assert high.guarded.plan.max_bits <= sheet.procedure.ber[0].max_bits


def test_uncertainty_of_a_simulated_curve_adds_to_that_of_ebn0() -> None:
    coded = load_model("BW-Q4C")
    check, mode = coded.procedure.ber[0], coded.modes[0]
    own_db = curve_u_db(check, mode, 4.6)
    assert own_db > 0.0
    request = plan_request(check, mode, ebn0_db=4.6, u_db=0.06, shortest_gate_s=GATE_S)
    assert request.u_db >= np.hypot(0.06, own_db)
    assert request.u_db - np.hypot(0.06, own_db) < 0.005
    uncoded = load_model("BW-Q4")
    assert curve_u_db(uncoded.procedure.ber[0], uncoded.modes[0], 4.6) == 0.0


def test_curve_of_a_coded_scheme_goes_on_at_its_worst_known_rate() -> None:
    curve = limit_curve("qpsk+conv-1/2")
    levels = np.array([-3.0, 0.0, 1.0, 3.0])
    rates = curve(levels)
    assert rates[0] == pytest.approx(rates[1], rel=1e-6)
    assert rates[1] > rates[2] > rates[3]
