"""Uncertainty budgets: a model, its input quantities, and what they make of the result's uncertainty.

GUM (JCGM 100): first-order propagation with correlations, effective degrees of freedom by the Welch-Satterthwaite
formula, and the factor k of Student's t for the level asked for. The arithmetic is GTC's. The same model and the same
quantities serve propagation of distributions by Monte Carlo (`linetest.noise.montecarlo`).

A model takes the quantities by name and returns the result (`linetest.noise.quantities`).
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import GTC
import numpy as np
from GTC import reporting

from linetest.errors import ParameterError
from linetest.noise.quantities import Correlations, Distribution, Model, Quantity, Value


@dataclass(frozen=True, slots=True)
class Contribution:
    """One line of a budget.

    Attributes:
        name: Name of the quantity.
        value: Its estimate, in `unit`.
        unit: Its unit.
        distribution: What is known of it.
        u: Its standard uncertainty, in `unit`.
        dof: Degrees of freedom of `u`.
        shared: Whether results of one calibration and run share it.
        sensitivity: Change of the result by change of the quantity; None where `u` is 0.
        contribution: Sensitivity times `u`, with its sign, in the result's unit.
    """

    name: str
    value: float
    unit: str
    distribution: Distribution
    u: float
    dof: float
    shared: bool
    sensitivity: float | None
    contribution: float


@dataclass(frozen=True, slots=True)
class Budget:
    """A result with its uncertainty and where that comes from.

    Attributes:
        value: The result.
        u: Combined standard uncertainty.
        dof: Effective degrees of freedom.
        level: Level of confidence of `expanded_u`.
        k: Factor for that level.
        contributions: One line a quantity, in the order given.
    """

    value: float
    u: float
    dof: float
    level: float
    k: float
    contributions: tuple[Contribution, ...]

    @property
    def expanded_u(self) -> float:
        """Expanded uncertainty k times u."""
        return self.k * self.u

    @property
    def interval(self) -> tuple[float, float]:
        """The result less and plus its expanded uncertainty."""
        return self.value - self.expanded_u, self.value + self.expanded_u


def coverage_factor(dof: float, level: float = 0.95) -> float:
    """Factor k that gives a level of confidence: two-sided Student's t.

    Args:
        dof: Degrees of freedom, 1 or more; infinite gives the normal distribution's factor.
        level: Level of confidence, between 0 and 1.

    Returns:
        The factor.

    Raises:
        ParameterError: A value is outside its rule.
    """
    if not dof >= 1.0:
        raise ParameterError("dof", dof, "be 1 or more: below that no interval has the level asked for")
    if not 0.0 < level < 1.0:
        raise ParameterError("level", level, "lie between 0 and 1")
    return float(reporting.k_factor(dof, 100.0 * level))


def evaluate(
    model: Model,
    quantities: Sequence[Quantity],
    *,
    correlations: Correlations | None = None,
    level: float = 0.95,
) -> Budget:
    """Propagate uncertainty through a model to first order.

    Args:
        model: The model.
        quantities: Its inputs.
        correlations: Correlation coefficients by pairs of names. Inputs that correlate need infinite degrees of
            freedom, or were observed together and have the same number.
        level: Level of confidence of the expanded uncertainty.

    Returns:
        The result with its budget.

    Raises:
        ParameterError: A name comes twice or is unknown, a number is outside its rule, or correlated inputs
            leave no effective degrees of freedom.
    """
    _check(quantities, correlations or {})
    numbers = _uncertain_numbers(quantities, correlations or {})
    result = model(numbers) + GTC.constant(0.0)
    # No fewer than the least of the inputs: the formula says so, its rounding need not.
    least = min((item.dof for item in quantities), default=math.inf)
    dof = max(least, float(GTC.dof(result))) if GTC.uncertainty(result) > 0.0 else math.inf
    return Budget(
        value=float(GTC.value(result)),
        u=float(GTC.uncertainty(result)),
        dof=dof,
        level=level,
        k=coverage_factor(dof, level),
        contributions=tuple(_contribution(result, numbers[item.name], item) for item in quantities),
    )


def _contribution(result: Value, number: Value, item: Quantity) -> Contribution:
    share = float(reporting.u_component(result, number)) if item.u > 0.0 else 0.0
    return Contribution(
        name=item.name,
        value=item.value,
        unit=item.unit,
        distribution=item.distribution,
        u=item.u,
        dof=item.dof,
        shared=item.shared,
        sensitivity=share / item.u if item.u > 0.0 else None,
        contribution=share,
    )


def _check(quantities: Sequence[Quantity], correlations: Correlations) -> None:
    names = [item.name for item in quantities]
    for item in quantities:
        if names.count(item.name) > 1:
            raise ParameterError("quantities", item.name, "have each name once")
        if not math.isfinite(item.value):
            raise ParameterError(f"value of {item.name}", item.value, "be finite")
        if not (math.isfinite(item.u) and item.u >= 0.0):
            raise ParameterError(f"u of {item.name}", item.u, "be finite and not negative")
        if not item.dof >= 1.0:
            raise ParameterError(f"dof of {item.name}", item.dof, "be 1 or more")
    for pair, coefficient in correlations.items():
        if pair[0] not in names or pair[1] not in names or pair[0] == pair[1]:
            raise ParameterError("correlations", pair, "name two different quantities")
        if not -1.0 <= coefficient <= 1.0:
            raise ParameterError("correlations", coefficient, "lie between -1 and +1")
        first, second = (quantities[names.index(name)].dof for name in pair)
        if first != second:
            raise ParameterError(
                "correlations",
                pair,
                "join inputs with infinite, or with the same and jointly observed, degrees of freedom",
            )


def _uncertain_numbers(quantities: Sequence[Quantity], correlations: Correlations) -> dict[str, Value]:
    numbers: dict[str, Value] = {}
    correlated = {name for pair in correlations for name in pair}
    by_dof: dict[float, list[Quantity]] = {}
    for item in quantities:
        if item.name in correlated and math.isfinite(item.dof):
            by_dof.setdefault(item.dof, []).append(item)
        elif item.u == 0.0:
            numbers[item.name] = GTC.constant(item.value, label=item.name)
        else:
            independent = item.name not in correlated
            numbers[item.name] = GTC.ureal(item.value, item.u, item.dof, label=item.name, independent=independent)
    for dof, group in by_dof.items():
        ensemble = GTC.multiple_ureal(
            [item.value for item in group],
            [item.u for item in group],
            dof,
            label_seq=[item.name for item in group],
        )
        numbers.update(zip((item.name for item in group), ensemble, strict=True))
    for (first, second), coefficient in correlations.items():
        GTC.set_correlation(coefficient, numbers[first], numbers[second])
    return numbers


def covariance(budgets: Iterable[Sequence[Contribution]]) -> np.ndarray[tuple[int, int], np.dtype[np.float64]]:
    """Covariance between results that share some of their quantities and own the others.

    Args:
        budgets: Contributions of each result; shared quantities match by name.

    Returns:
        Array (results, results) in the square of the results' unit.
    """
    lists = list(budgets)
    shared = [{line.name: line.contribution for line in lines if line.shared} for lines in lists]
    names = list(dict.fromkeys(name for entry in shared for name in entry))
    common = np.array([[entry.get(name, 0.0) for name in names] for entry in shared]).reshape(len(lists), len(names))
    own = [sum(line.contribution**2 for line in lines if not line.shared) for lines in lists]
    return np.asarray(common @ common.T + np.diag(own), dtype=np.float64)
