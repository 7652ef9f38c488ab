"""Propagation of distributions by Monte Carlo (JCGM 101): the same models and quantities as the budgets."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from linetest.errors import ParameterError
from linetest.noise.quantities import DIVISORS, Correlations, Model, Quantity
from linetest.units import FloatArray


@dataclass(frozen=True, slots=True)
class MonteCarloResult:
    """A result by propagation of distributions.

    Attributes:
        value: Mean of the trials.
        u: Their standard deviation.
        level: Level of the intervals.
        interval: Interval with equal shares of the trials on both sides.
        shortest: Shortest interval that holds the level.
        trials: Number of trials.
    """

    value: float
    u: float
    level: float
    interval: tuple[float, float]
    shortest: tuple[float, float]
    trials: int


def propagate(
    model: Model,
    quantities: Sequence[Quantity],
    *,
    rng: np.random.Generator,
    trials: int = 200_000,
    correlations: Correlations | None = None,
    level: float = 0.95,
) -> MonteCarloResult:
    """Propagate distributions through a model.

    Args:
        model: The model, applied once to arrays of samples.
        quantities: Its inputs.
        rng: Where chance comes from.
        trials: Number of trials, at least 1000.
        correlations: Correlation coefficients by pairs of names; both of a pair must be normal.
        level: Level of the intervals.

    Returns:
        Mean, standard deviation and intervals.

    Raises:
        ParameterError: Too few trials, a correlation between inputs that are not normal, or coefficients
            that no joint distribution has.
    """
    if trials < 1000:
        raise ParameterError("trials", trials, "be at least 1000")
    if not 0.0 < level < 1.0:
        raise ParameterError("level", level, "lie between 0 and 1")
    samples = draw(quantities, rng=rng, trials=trials, correlations=correlations)
    results = np.sort(np.broadcast_to(np.asarray(model(samples), dtype=np.float64), (trials,)))
    covered = round(level * trials)
    low = (trials - covered) // 2
    widths = results[covered:] - results[: trials - covered]
    best = int(np.argmin(widths))
    return MonteCarloResult(
        value=float(results.mean()),
        u=float(results.std(ddof=1)),
        level=level,
        interval=(float(results[low]), float(results[low + covered])),
        shortest=(float(results[best]), float(results[best + covered])),
        trials=trials,
    )


def draw(
    quantities: Sequence[Quantity],
    *,
    rng: np.random.Generator,
    trials: int,
    correlations: Correlations | None = None,
) -> dict[str, FloatArray]:
    """Samples of input quantities from what is known of them.

    Args:
        quantities: The inputs.
        rng: Where chance comes from.
        trials: Number of samples of each.
        correlations: Correlation coefficients by pairs of names; both of a pair must be normal.

    Returns:
        Arrays (trials,) by name.

    Raises:
        ParameterError: A correlation between inputs that are not normal, or coefficients that no joint
            distribution has.
    """
    pairs = dict(correlations or {})
    joined = [item for item in quantities if any(item.name in pair for pair in pairs)]
    for item in joined:
        if item.distribution != "normal":
            raise ParameterError("correlations", item.name, "join normal quantities only when drawing samples")
    samples = {item.name: _draw_one(item, rng, trials) for item in quantities if item not in joined}
    samples.update(_draw_joined(joined, pairs, rng, trials))
    return samples


def _draw_one(item: Quantity, rng: np.random.Generator, trials: int) -> FloatArray:
    half_width = item.u * DIVISORS.get(item.distribution, 1.0)
    match item.distribution:
        case "normal":
            unit = rng.standard_normal(trials)
        case "student":
            # JCGM 101, 6.4.9.2: the mean of n readings has Student's t with n - 1 degrees, scaled by s/sqrt(n).
            unit = rng.standard_normal(trials) if math.isinf(item.dof) else rng.standard_t(item.dof, trials)
        case "rectangular":
            unit = rng.uniform(-1.0, 1.0, trials)
        case "triangular":
            unit = rng.triangular(-1.0, 0.0, 1.0, trials)
        case "arcsine":
            unit = np.sin(rng.uniform(0.0, 2.0 * np.pi, trials))
    return np.asarray(item.value + half_width * unit, dtype=np.float64)


def _draw_joined(
    joined: Sequence[Quantity], pairs: Correlations, rng: np.random.Generator, trials: int
) -> dict[str, FloatArray]:
    if not joined:
        return {}
    names = [item.name for item in joined]
    matrix = np.eye(len(joined))
    for (first, second), coefficient in pairs.items():
        row, column = names.index(first), names.index(second)
        matrix[row, column] = matrix[column, row] = coefficient
    values, vectors = np.linalg.eigh(matrix)
    if values.min() < -1e-9:
        raise ParameterError("correlations", dict(pairs), "be possible together: the matrix has a negative eigenvalue")
    # An eigenvalue of exactly 0 (full correlation) is allowed, so the factor comes from these, not from Cholesky.
    factor = vectors * np.sqrt(np.clip(values, 0.0, None))
    unit = rng.standard_normal((trials, len(joined))) @ factor.T
    return {item.name: item.value + item.u * unit[:, index] for index, item in enumerate(joined)}
