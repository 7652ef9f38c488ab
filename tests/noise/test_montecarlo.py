"""Propagation of distributions against the examples of JCGM 101, and against the budgets of the same models."""

from __future__ import annotations

import math
from collections.abc import Mapping

import numpy as np
import pytest
from scipy import stats

from linetest.errors import ParameterError
from linetest.noise import Quantity, evaluate, propagate
from linetest.noise.montecarlo import draw
from linetest.noise.quantities import Value
from tests.noise.test_budget import end_gauge_length


def total(given: Mapping[str, Value]) -> Value:
    return sum(given.values())


def test_sum_of_four_normals() -> None:
    """JCGM 101:2008, 9.2.2, table 2 (from memory): u 2.0, 95 % interval -3.92 to 3.92."""
    quantities = [Quantity(f"x{n}", 0.0, 1.0, "1") for n in range(4)]
    found = propagate(total, quantities, rng=np.random.default_rng(1), trials=1_000_000)
    assert found.u == pytest.approx(2.0, abs=0.006)
    # A quantile's own scatter at 1e6 trials is 0.0053; three of them.
    assert found.interval == pytest.approx((-3.92, 3.92), abs=0.016)
    assert evaluate(total, quantities).interval == pytest.approx((-3.92, 3.92), abs=0.005)


def test_sum_of_four_rectangulars_is_narrower_than_the_gum_says() -> None:
    """JCGM 101:2008, 9.2.3, table 3 (from memory): 95 % interval -3.88 to 3.88, the GUM's -3.92 to 3.92."""
    quantities = [Quantity.within(f"x{n}", math.sqrt(3.0), "1") for n in range(4)]
    found = propagate(total, quantities, rng=np.random.default_rng(2), trials=1_000_000)
    exact = 2.0 * math.sqrt(3.0) * (stats.irwinhall(4).ppf(0.975) - 2.0)
    assert exact == pytest.approx(3.88, abs=0.005)
    assert found.interval == pytest.approx((-exact, exact), abs=0.013)
    assert evaluate(total, quantities).interval[1] == pytest.approx(3.92, abs=0.005)


def test_mass_calibration() -> None:
    """JCGM 101:2008, 9.3, table 6 (from memory): 1.2341 mg, u 0.0754; first-order u 0.0539.

    The buoyancy is a product of two quantities of value zero, which the first order cannot see.
    """
    quantities = (
        Quantity("mR", 100_000.0, 0.050, "mg"),
        Quantity("dmR", 1.234, 0.020, "mg"),
        Quantity.within("air", 0.10, "kg/m3", value=1.20),
        Quantity.within("W", 1000.0, "kg/m3", value=8000.0),
        Quantity.within("R", 50.0, "kg/m3", value=8000.0),
    )

    def deviation(given: Mapping[str, Value]) -> Value:
        buoyancy = (given["air"] - 1.2) * (1.0 / given["W"] - 1.0 / given["R"])
        return (given["mR"] + given["dmR"]) * (1.0 + buoyancy) - 100_000.0

    found = propagate(deviation, quantities, rng=np.random.default_rng(3), trials=1_000_000)
    assert found.value == pytest.approx(1.2341, abs=3e-4)
    assert found.u == pytest.approx(0.0754, abs=3e-4)
    assert found.shortest == pytest.approx((1.0834, 1.3825), abs=4e-3)
    first_order = evaluate(deviation, quantities)
    assert first_order.value == pytest.approx(1.2340, abs=5e-5)
    assert first_order.u == pytest.approx(0.0539, abs=5e-5)


def test_gauge_block() -> None:
    """JCGM 101:2008, 9.5, table 11: 32 nm by the GUM, 36 nm by propagation.

    Limits that are themselves inexact (the standard's curvilinear trapezoid) are an uncertain half width times a
    place between -1 and +1.
    """
    quantities = (
        Quantity("ls", 50_000_623.0, 25.0, "nm", "student", 18.0),
        Quantity("d0", 215.0, 6.0, "nm", "student", 24.0),
        Quantity("d1", 0.0, 4.0, "nm", "student", 5.0),
        Quantity("d2", 0.0, 7.0, "nm", "student", 8.0),
        Quantity.within("alpha", 2e-6, "1/degC", value=11.5e-6),
        Quantity("theta mean", -0.1, 0.2, "degC"),
        Quantity.within("theta swing", 0.5, "degC", distribution="arcsine"),
        Quantity.within("half width of d alpha", 0.1e-6, "1/degC", value=1.0e-6),
        Quantity.within("place of d alpha", 1.0, "1"),
        Quantity.within("half width of d theta", 0.025, "degC", value=0.050),
        Quantity.within("place of d theta", 1.0, "1"),
    )

    def length(given: Mapping[str, Value]) -> Value:
        inexact = {
            "d alpha": given["half width of d alpha"] * given["place of d alpha"],
            "d theta": given["half width of d theta"] * given["place of d theta"],
        }
        return end_gauge_length({**given, **inexact})

    found = propagate(length, quantities, rng=np.random.default_rng(4), trials=1_000_000, level=0.99)
    assert found.value == pytest.approx(50_000_838, abs=0.5)
    assert found.u == pytest.approx(36, abs=0.5)
    # The interval the standard prints is flat at its ends: 50 000 745 to 50 000 932 nm, from memory.
    assert found.shortest == pytest.approx((50_000_745, 50_000_932), abs=2.5)
    assert evaluate(length, quantities).u == pytest.approx(32, abs=0.5)


@pytest.mark.parametrize(
    ("quantity", "reference"),
    [
        (Quantity("x", 1.0, 0.5, "1"), stats.norm(1.0, 0.5)),
        (Quantity("x", 1.0, 0.5, "1", "student", 5.0), stats.t(5.0, 1.0, 0.5)),
        (Quantity("x", 1.0, 0.5, "1", "student"), stats.norm(1.0, 0.5)),
        (Quantity.within("x", 0.5, "1", value=1.0), stats.uniform(0.5, 1.0)),
        (Quantity.within("x", 0.5, "1", value=1.0, distribution="triangular"), stats.triang(0.5, 0.5, 1.0)),
        (Quantity.within("x", 0.5, "1", value=1.0, distribution="arcsine"), stats.arcsine(0.5, 1.0)),
    ],
)
def test_samples_have_their_distribution(quantity: Quantity, reference: stats.rv_continuous) -> None:
    samples = draw([quantity], rng=np.random.default_rng(6), trials=50_000)["x"]
    assert stats.kstest(samples, reference.cdf).pvalue > 1e-3


def test_correlated_samples_correlate() -> None:
    quantities = [Quantity("a", 1.0, 0.2, "1"), Quantity("b", 2.0, 0.4, "1"), Quantity("c", 0.0, 1.0, "1")]
    drawn = draw(
        quantities, rng=np.random.default_rng(7), trials=200_000, correlations={("a", "b"): -0.6, ("b", "c"): 0.3}
    )
    matrix = np.corrcoef([drawn["a"], drawn["b"], drawn["c"]])
    assert matrix == pytest.approx(np.array([[1.0, -0.6, 0.0], [-0.6, 1.0, 0.3], [0.0, 0.3, 1.0]]), abs=0.01)
    assert drawn["b"].std() == pytest.approx(0.4, rel=0.01)
    same = draw(quantities[:2], rng=np.random.default_rng(7), trials=1000, correlations={("a", "b"): 1.0})
    assert (same["a"] - 1.0) / 0.2 == pytest.approx((same["b"] - 2.0) / 0.4)


def test_equal_seeds_give_equal_results() -> None:
    quantities = [Quantity("a", 1.0, 0.2, "1"), Quantity.within("b", 0.4, "1")]
    first, second = (propagate(total, quantities, rng=np.random.default_rng(8), trials=5000) for _ in range(2))
    assert first == second


def test_wrong_input_is_named() -> None:
    a, b = Quantity("a", 1.0, 0.2, "1"), Quantity.within("b", 0.4, "1")
    rng = np.random.default_rng(9)
    with pytest.raises(ParameterError, match="trials is 10, but must be at least 1000"):
        propagate(total, [a], rng=rng, trials=10)
    with pytest.raises(ParameterError, match=r"level is 1\.0"):
        propagate(total, [a], rng=rng, level=1.0)
    with pytest.raises(ParameterError, match="join normal quantities only"):
        propagate(total, [a, b], rng=rng, correlations={("a", "b"): 0.5})
    three = [Quantity(name, 0.0, 1.0, "1") for name in "abc"]
    impossible = {("a", "b"): 0.9, ("b", "c"): 0.9, ("a", "c"): -0.9}
    with pytest.raises(ParameterError, match="be possible together"):
        propagate(total, three, rng=rng, correlations=impossible)
