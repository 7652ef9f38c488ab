"""Coded curves: through the simulated points, onto the bound, under the bound everywhere."""

from __future__ import annotations

import numpy as np
import pytest

from linetest.errors import ParameterError
from linetest.theory import (
    bit_error_rate,
    curve_uncertainty_db,
    required_ebn0_db,
    trusted_ber_range,
    union_bound,
)
from linetest.theory.coded import DecodedCurve, union_bound_of
from linetest.theory.decoder_tables import DECODER_ROWS
from linetest.theory.inverse import CurveInverse

every_code = pytest.mark.parametrize("code", DECODER_ROWS)


@every_code
def test_curve_passes_through_every_simulated_point(code: str) -> None:
    for row in DECODER_ROWS[code]:
        assert bit_error_rate(f"qpsk+{code}", row.ebn0_db) == pytest.approx(row.bit_error_rate, rel=1e-9)


@every_code
def test_bound_lies_above_the_curve_and_meets_it(code: str) -> None:
    curve = DecodedCurve(code)
    levels_db = np.linspace(curve.first_db, curve.last_db + 5.0, 500)
    ratio = union_bound(f"qpsk+{code}", levels_db) / bit_error_rate(f"qpsk+{code}", levels_db)
    assert (ratio >= 1.0).all()
    assert ratio[-1] < 1.001


@every_code
def test_curve_bends_smoothly_where_simulation_ends(code: str) -> None:
    curve = DecodedCurve(code)
    logs = np.log(curve(curve.last_db + np.array([-2e-4, -1e-4, 0.0, 1e-4, 2e-4])))
    slopes = np.diff(logs) / 1e-4
    assert slopes == pytest.approx(slopes[0], rel=1e-3)


@every_code
def test_points_have_the_events_their_uncertainty_needs(code: str) -> None:
    """At least 10 000 independent error events a point, or the 0.5 % of a dB that replaces them."""
    for row in DECODER_ROWS[code]:
        assert row.events >= 10_000
        assert row.relative_u >= row.events**-0.5
    levels_db = np.linspace(DECODER_ROWS[code][0].ebn0_db, DECODER_ROWS[code][-1].ebn0_db + 3.0, 300)
    u_db = curve_uncertainty_db(f"qpsk+{code}", levels_db)
    assert (u_db > 0.0).all()
    assert u_db.max() < 0.02
    assert u_db[-1] < 0.001


def test_closed_forms_have_no_uncertainty_of_their_own() -> None:
    assert curve_uncertainty_db("qpsk", 5.0) == 0.0
    assert curve_uncertainty_db("8psk", np.ones(3)).tolist() == [0.0, 0.0, 0.0]


def test_outer_code_takes_the_inner_uncertainty_at_the_inner_level() -> None:
    shift_db = 10.0 * np.log10(188 / 204)
    inner = curve_uncertainty_db("qpsk+conv-1/2", 3.0 + shift_db)
    assert curve_uncertainty_db("qpsk+conv-1/2+rs-204-188", 3.0) == pytest.approx(inner)


def test_rate_one_half_needs_what_the_trade_says() -> None:
    """Common practice: K = 7, rate 1/2, soft decisions: about 4.2 dB at 1e-5, 5.4 dB of coding gain."""
    assert required_ebn0_db("qpsk+conv-1/2", 1e-5) == pytest.approx(4.2, abs=0.1)


def test_nothing_is_said_below_the_first_simulated_point() -> None:
    first = DECODER_ROWS["conv-1/2"][0]
    assert trusted_ber_range("qpsk+conv-1/2") == pytest.approx((0.0, first.bit_error_rate))
    edge_db = required_ebn0_db("qpsk+conv-1/2", trusted_ber_range("qpsk+conv-1/2")[1])
    assert bit_error_rate("qpsk+conv-1/2", edge_db) == pytest.approx(first.bit_error_rate)
    with pytest.raises(ParameterError, match=r"ebn0_db is -0.1, but must be at least 0.000 dB for qpsk\+conv-1/2"):
        bit_error_rate("qpsk+conv-1/2", -0.1)
    with pytest.raises(ParameterError, match=r"bit_error_rate is 0.2, but must be at most 0.154 for qpsk\+conv"):
        required_ebn0_db("qpsk+conv-1/2", 0.2)
    with pytest.raises(ParameterError, match=r"scheme is '8psk\+conv-1/2', but must be one of bpsk.*after a plus"):
        bit_error_rate("8psk+conv-1/2", 5.0)


def test_bound_alone_would_be_too_loose_for_a_limit_near_1e_5() -> None:
    """In dB the bound of rate 1/2 needs more than it should: below 0.03 dB only from about 7e-6 down."""
    for rate, excess_db in ((8.1e-5, 0.10), (1.6e-5, 0.048), (2.9e-6, 0.013)):
        bound = CurveInverse(union_bound_of("conv-1/2"))
        needed_db = float(bound(np.asarray(rate))) - required_ebn0_db("qpsk+conv-1/2", rate)
        assert needed_db == pytest.approx(excess_db, abs=0.012)
