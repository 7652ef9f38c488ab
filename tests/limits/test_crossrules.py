"""Rules between tables: what curves can carry, and what the most bits allow."""

from __future__ import annotations

import pytest

from linetest.errors import SheetError
from linetest.limits import load_model, load_sheet
from linetest.limits.crossrules import reachable_ebn0_db
from tests.limits.conftest import WriteSheet


def only_fault(write_sheet: WriteSheet, *changes: tuple[str, str]) -> str:
    file = write_sheet(*changes, base="bw-q4c.toml", name="bw-q4c.toml")
    with pytest.raises(SheetError) as caught:
        load_sheet(file)
    assert len(caught.value.faults) == 1
    return str(caught.value.faults[0])


def test_step_below_the_trusted_region_of_its_curve_is_refused(write_sheet: WriteSheet) -> None:
    """Less margin (1 dB) and tolerance (0.4 dB) the limit would lie at -0.2 dB, where nothing is known."""
    found = only_fault(write_sheet, ("steps = [4.6, 5.0]", "steps = [1.2, 5.0]"))
    assert found.startswith("procedure.ber[ber].steps = 1.2: must, less margin and tolerance, be at least 0.000 dB")


def test_tolerance_counts_only_on_the_side_of_the_setting_rule(write_sheet: WriteSheet) -> None:
    changes = (
        ("steps = [4.6, 5.0]", "steps = [1.2, 5.0]"),
        ('setting_rule = "nearest"', 'setting_rule = "from-above"'),
    )
    assert load_sheet(write_sheet(*changes, base="bw-q4c.toml", name="bw-q4c.toml")).model == "BW-Q4C"
    check = load_model("BW-Q4").procedure.ber[0]
    ends = {
        rule: reachable_ebn0_db(check.model_copy(update={"setting_rule": rule}), 8.4)
        for rule in ("nearest", "from-below", "from-above")
    }
    assert ends["nearest"] == pytest.approx((8.0, 8.8))
    assert ends["from-below"] == pytest.approx((8.0, 8.4))
    assert ends["from-above"] == pytest.approx((8.4, 8.8))


def test_code_too_steep_for_a_plan_is_refused(write_sheet: WriteSheet) -> None:
    """With a Reed-Solomon outer code half a dB is a factor of thousands: no count can hold such a limit."""
    found = only_fault(
        write_sheet,
        ('scheme = "qpsk+conv-1/2"', 'scheme = "qpsk+conv-1/2+rs-204-188"'),
        ("symbol_rate_bd = 1_024_000", "symbol_rate_bd = 1_111_148.9"),
        ("steps = [4.6, 5.0]", "steps = [3.6]"),
        ("tolerance_db = 0.4", "tolerance_db = 0.01"),
    )
    assert "must not differ by more than a factor 30" in found
    assert "judge the channel or the inner decoder instead" in found


def test_fewer_bits_than_the_best_fixed_test_are_refused(write_sheet: WriteSheet) -> None:
    found = only_fault(write_sheet, ("max_bits = 150_000_000", "max_bits = 20_000_000"))
    assert found.startswith("procedure.ber[ber].max_bits = 20000000: must be at least the best fixed test,")
    assert found.endswith("at step 5 dB")
