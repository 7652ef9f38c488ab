"""Mean bits to a decision against Wald's bound, the best fixed test and "count 100 errors"."""

from __future__ import annotations

from collections.abc import Iterator

from linetest.decision import design_plan, fixed_test_bits, wald_bound
from linetest.theory import bit_error_rate


def rows() -> Iterator[tuple[str, str, str]]:
    """Rows for the steps of an uncoded QPSK sheet, margin 1.0 dB, design loss 0.5 dB, risks 0.01.

    Yields:
        What, ratio, of what.
    """
    for ebn0_db in (6.8, 8.4, 9.6, 10.5, 11.3):
        good, limit = bit_error_rate("qpsk", ebn0_db - 0.5), bit_error_rate("qpsk", ebn0_db - 1.0)
        fixed = fixed_test_bits(good_ber=good, limit_ber=limit, producer_risk=0.01, consumer_risk=0.01)
        plan = design_plan(
            good_ber=good,
            limit_ber=limit,
            producer_risk=0.01,
            consumer_risk=0.01,
            look_bits=max(1, fixed // 60),
            max_bits=2 * fixed,
        )
        at_good, at_limit = wald_bound(
            good_ber=good, limit_ber=limit, producer_risk=plan.producer_risk, consumer_risk=plan.consumer_risk
        )
        mean = plan.expected_bits(good)
        name = f"mean bits of a good unit at {ebn0_db} dB"
        yield name, f"{mean / at_good:.4f}", "Wald's lower bound at the exact risks"
        yield name, f"{mean / fixed:.3f}", "the best fixed test"
        yield name, f"{mean / (100.0 / good):.3f}", "counting 100 errors"
        yield f"mean bits at the margin at {ebn0_db} dB", f"{plan.expected_bits(limit) / at_limit:.4f}", "Wald's bound"
