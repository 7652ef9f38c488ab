"""Budgets against the published examples of the GUM and of EA-4/02, through the project's own code."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

import GTC
import numpy as np
import pytest
from scipy import stats

from linetest.errors import ParameterError
from linetest.noise import Quantity, covariance, coverage_factor, evaluate
from linetest.noise.quantities import Value


def end_gauge() -> tuple[Quantity, ...]:
    """Inputs of JCGM 100:2008, H.1: lengths in nm, temperatures in degC."""
    return (
        Quantity("ls", 50_000_623.0, 25.0, "nm", "student", 18.0),
        Quantity("d0", 215.0, 5.8, "nm", "student", 24.0),
        Quantity("d1", 0.0, 3.9, "nm", "student", 5.0),
        Quantity("d2", 0.0, 6.7, "nm", "student", 8.0),
        Quantity.within("alpha", 2e-6, "1/degC", value=11.5e-6),
        Quantity("theta mean", -0.1, 0.2, "degC"),
        Quantity.within("theta swing", 0.5, "degC", distribution="arcsine"),
        Quantity("d alpha", 0.0, 1e-6 / math.sqrt(3.0), "1/degC", "rectangular", 50.0),
        Quantity("d theta", 0.0, 0.05 / math.sqrt(3.0), "degC", "rectangular", 2.0),
    )


def end_gauge_length(given: Mapping[str, Value]) -> Value:
    """JCGM 100:2008, equation (H.3)."""
    theta = given["theta mean"] + given["theta swing"]
    compared = given["d0"] + given["d1"] + given["d2"]
    stretch = given["d alpha"] * theta + given["alpha"] * given["d theta"]
    return given["ls"] + compared - given["ls"] * stretch


def test_end_gauge_of_the_gum() -> None:
    """JCGM 100:2008, H.1: 50 000 838 nm, u 32 nm, 16 degrees of freedom, U 93 nm at 99 %; lines as GTC prints them."""
    found = evaluate(end_gauge_length, end_gauge(), level=0.99)
    assert found.value == pytest.approx(50_000_838, abs=0.5)
    assert found.u == pytest.approx(32, abs=0.5)
    assert found.u == pytest.approx(31.664, abs=5e-3)
    assert math.floor(found.dof) == 16
    lines = {line.name: abs(line.contribution) for line in found.contributions}
    for name, printed in (("ls", 25), ("d theta", 16.599), ("d2", 6.7), ("d0", 5.8), ("d1", 3.9), ("d alpha", 2.88679)):
        assert lines[name] == pytest.approx(printed, abs=5e-3)
    assert lines["alpha"] == lines["theta mean"] == lines["theta swing"] == 0.0
    # The GUM truncates 16.7 degrees of freedom to 16: k = 2.92, U = 93 nm.
    assert coverage_factor(16.0, 0.99) == pytest.approx(2.92, abs=5e-3)
    assert coverage_factor(16.0, 0.99) * found.u == pytest.approx(93, abs=0.6)
    assert coverage_factor(17.0, 0.99) < found.k < coverage_factor(16.0, 0.99)
    assert found.interval == (found.value - found.expanded_u, found.value + found.expanded_u)


def test_simultaneous_resistance_and_reactance_of_the_gum() -> None:
    """JCGM 100:2008, H.2 (from memory): five joint observations; R 127.732(71), X 219.847(295), Z 254.260(236) ohm."""
    quantities = (
        Quantity("V", 4.9990, 0.0032, "V", "student", 4.0),
        Quantity("I", 19.6610e-3, 0.0095e-3, "A", "student", 4.0),
        Quantity("phi", 1.04446, 0.00075, "rad", "student", 4.0),
    )
    correlations = {("V", "I"): -0.36, ("V", "phi"): 0.86, ("I", "phi"): -0.65}
    for model, value, u in (
        (lambda given: given["V"] / given["I"] * GTC.cos(given["phi"]), 127.732, 0.071),
        (lambda given: given["V"] / given["I"] * GTC.sin(given["phi"]), 219.847, 0.295),
        (lambda given: given["V"] / given["I"], 254.260, 0.236),
    ):
        found = evaluate(model, quantities, correlations=correlations)
        assert found.value == pytest.approx(value, abs=1.5e-3)
        # Correlations are printed to two digits, which moves u by a few percent.
        assert found.u == pytest.approx(u, rel=0.03)
        assert found.dof == pytest.approx(4.0)


def test_calibration_line_of_the_gum() -> None:
    """JCGM 100:2008, H.3.4: correction at 30 degC from intercept and slope that correlate: -0.1494, u 0.0041 degC."""
    quantities = (
        Quantity("y1", -0.1712, 0.0029, "degC", "student", 9.0),
        Quantity("y2", 0.00218, 0.00067, "1", "student", 9.0),
    )
    found = evaluate(lambda given: given["y1"] + 10.0 * given["y2"], quantities, correlations={("y1", "y2"): -0.930})
    assert found.value == pytest.approx(-0.1494, abs=6e-5)
    assert found.u == pytest.approx(0.0041, abs=6e-5)
    assert found.dof == pytest.approx(9.0)


def test_power_sensor_of_ea_4_02() -> None:
    """EA-4/02, S6: calibration factor 0.933 with u 0.0161764 and 286 degrees of freedom; U 0.032 at 95.45 % (k = 2)."""
    assert coverage_factor(286.0, 0.9545) == pytest.approx(2.0, abs=0.02)
    assert coverage_factor(286.0, 0.9545) * 0.0161764 == pytest.approx(0.032, abs=6e-4)


@pytest.mark.parametrize(("dof", "k"), [(1, 12.71), (2, 4.30), (4, 2.78), (10, 2.23), (20, 2.09), (50, 2.01)])
def test_factors_for_95_percent_are_students(dof: float, k: float) -> None:
    """JCGM 100:2008, table G.2."""
    assert coverage_factor(dof) == pytest.approx(k, abs=5e-3)


def test_factor_of_infinite_degrees_of_freedom_is_the_normal_distributions() -> None:
    assert coverage_factor(math.inf) == pytest.approx(stats.norm.ppf(0.975), rel=1e-9)
    assert coverage_factor(12.34, 0.9) == pytest.approx(stats.t.ppf(0.95, 12.34), rel=1e-6)


def test_effective_degrees_of_freedom_by_welch_and_satterthwaite() -> None:
    """JCGM 100:2008, G.4.1, equation (G.2b)."""
    parts = [(0.03, 3.0), (0.02, 11.0), (0.04, math.inf)]
    quantities = [Quantity(f"x{n}", 0.0, u, "dB", dof=dof) for n, (u, dof) in enumerate(parts)]
    found = evaluate(lambda given: sum(given.values()), quantities)
    u2 = sum(u * u for u, _ in parts)
    assert found.u == pytest.approx(math.sqrt(u2))
    assert found.dof == pytest.approx(u2**2 / (0.03**4 / 3.0 + 0.02**4 / 11.0))


def test_full_correlation_adds_and_cancels() -> None:
    """JCGM 100:2008, 5.2.2, note 1: with r = 1 the uncertainties add as numbers."""
    both = [Quantity("a", 1.0, 0.3, "dB"), Quantity("b", 2.0, 0.4, "dB")]
    assert evaluate(lambda g: g["a"] + g["b"], both, correlations={("a", "b"): 1.0}).u == pytest.approx(0.7)
    assert evaluate(lambda g: g["a"] - g["b"], both, correlations={("a", "b"): 1.0}).u == pytest.approx(0.1)
    assert evaluate(lambda g: g["a"] - g["b"], both).u == pytest.approx(0.5)


def test_exact_input_has_a_line_of_zero() -> None:
    found = evaluate(lambda g: g["a"] * g["b"], [Quantity("a", 2.0, 0.0, "1"), Quantity("b", 3.0, 0.1, "dB")])
    exact, uncertain = found.contributions
    assert (exact.contribution, exact.sensitivity) == (0.0, None)
    assert uncertain.contribution == pytest.approx(0.2)
    assert uncertain.sensitivity == pytest.approx(2.0)
    nothing = evaluate(lambda g: g["a"], [Quantity("a", 2.0, 0.0, "1")])
    assert (nothing.value, nothing.u, nothing.dof) == (2.0, 0.0, math.inf)


def test_covariance_is_what_results_share() -> None:
    """Two results with one common and one own input each, against the covariance of drawn samples."""
    common = Quantity("common", 0.0, 0.05, "dB", shared=True)
    budgets = [
        evaluate(lambda g: 2.0 * g["common"] + g["own"], [common, Quantity("own", 0.0, 0.03, "dB")]),
        evaluate(lambda g: -1.0 * g["common"] + g["own"], [common, Quantity("own", 0.0, 0.04, "dB")]),
    ]
    matrix = covariance(budget.contributions for budget in budgets)
    rng = np.random.default_rng(5)
    shared, first, second = rng.standard_normal((3, 400_000))
    drawn = np.cov(2.0 * 0.05 * shared + 0.03 * first, -0.05 * shared + 0.04 * second)
    assert matrix == pytest.approx(drawn, rel=0.02)
    assert np.sqrt(np.diag(matrix)) == pytest.approx([budget.u for budget in budgets])


A, B = Quantity("a", 1.0, 0.1, "dB"), Quantity("b", 1.0, 0.1, "dB")


@pytest.mark.parametrize(
    ("quantities", "correlations", "sentence"),
    [
        ([A, A], {}, "quantities is 'a', but must have each name once"),
        ([A, Quantity("b", math.nan, 0.1, "dB")], {}, "value of b is nan, but must be finite"),
        ([A, Quantity("b", 1.0, -0.1, "dB")], {}, "u of b is -0.1, but must be finite and not negative"),
        ([A, Quantity("b", 1.0, 0.1, "dB", dof=0.0)], {}, "dof of b is 0.0, but must be 1 or more"),
        ([A, B], {("a", "c"): 0.5}, "must name two different quantities"),
        ([A, B], {("a", "a"): 0.5}, "must name two different quantities"),
        ([A, B], {("a", "b"): 1.5}, "correlations is 1.5, but must lie between -1 and"),
    ],
)
def test_wrong_input_is_named(
    quantities: Sequence[Quantity], correlations: Mapping[tuple[str, str], float], sentence: str
) -> None:
    with pytest.raises(ParameterError) as caught:
        evaluate(lambda g: g["a"] + g["b"], quantities, correlations=correlations)
    assert sentence in str(caught.value)


def test_correlation_that_leaves_no_degrees_of_freedom_is_refused() -> None:
    """Welch and Satterthwaite's formula holds for independent inputs only (JCGM 100:2008, G.4.1)."""
    both = [Quantity("a", 1.0, 0.1, "dB", dof=3.0), Quantity("b", 1.0, 0.1, "dB", dof=9.0)]
    with pytest.raises(ParameterError, match="jointly observed, degrees of freedom"):
        evaluate(lambda g: g["a"] + g["b"], both, correlations={("a", "b"): 0.5})


@pytest.mark.parametrize(
    ("dof", "level", "named"), [(0.5, 0.95, "dof is 0.5"), (math.nan, 0.95, "dof is nan"), (3.0, 1.0, "level is 1.0")]
)
def test_wrong_factor_is_refused(dof: float, level: float, named: str) -> None:
    with pytest.raises(ParameterError, match=named):
        coverage_factor(dof, level)
