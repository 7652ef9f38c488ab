"""Intersymbol interference as a small Gauss rule: a few levels with weights that stand for all patterns.

The sum of many small independent terms has more values than can be listed. A Gauss rule with n nodes has the
same first 2n - 1 moments; averaging a smooth function such as a Gaussian tail over its nodes is then exact
to the digits of a double long before n reaches 20 (S. Benedetto et al., IEEE Trans. Commun. 21(3), 1973,
pp. 181-190).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from linetest.units import FloatArray

_MOST_NODES = 20
_TERMS_ONE_BY_ONE = 40


@dataclass(frozen=True)
class Levels:
    """A discrete distribution.

    Attributes:
        values: Levels, shape (n,).
        weights: Their probabilities, shape (n,).
    """

    values: FloatArray
    weights: FloatArray

    def plus(self, other: Levels) -> Levels:
        """Distribution of the sum with another independent variable.

        Args:
            other: Distribution of the other.

        Returns:
            The sum's, with as many values as the product of both.
        """
        values = self.values[:, None] + other.values[None, :]
        weights = self.weights[:, None] * other.weights[None, :]
        return Levels(values.reshape(-1), weights.reshape(-1))

    def condensed(self, nodes: int = _MOST_NODES) -> Levels:
        """Gauss rule with the same moments, where that is smaller.

        Args:
            nodes: Most nodes to use.

        Returns:
            The rule, or the distribution itself if it is small enough.
        """
        return self if self.values.size <= nodes else _gauss_rule(self, nodes)


NOTHING = Levels(np.zeros(1), np.ones(1))


def sum_of_terms(alphabet: FloatArray, factors: FloatArray) -> Levels:
    """Distribution of a sum of independent symbols of one rail, each with a factor.

    The greatest factors are added one by one; the rest, tiny, are one variable with three levels and the
    right variance and kurtosis of a normal one.

    Args:
        alphabet: Equally likely levels of a symbol, symmetrical about 0, shape (m,).
        factors: Factor of each term, shape (n,).

    Returns:
        The distribution as a small rule.
    """
    order = np.argsort(-np.abs(factors))
    total = NOTHING
    share = np.full(alphabet.size, 1.0 / alphabet.size)
    for factor in factors[order[:_TERMS_ONE_BY_ONE]]:
        total = total.plus(Levels(alphabet * factor, share)).condensed()
    rest = float(np.square(factors[order[_TERMS_ONE_BY_ONE:]]).sum() * np.square(alphabet).mean())
    if rest > 0.0:
        reach = np.sqrt(3.0 * rest) * np.array([-1.0, 0.0, 1.0])
        total = total.plus(Levels(reach, np.array([1.0, 4.0, 1.0]) / 6.0)).condensed()
    return total


def _gauss_rule(levels: Levels, nodes: int) -> Levels:
    """Lanczos recursion on the measure, every vector made orthogonal to all before it."""
    scale = float(np.abs(levels.values).max()) or 1.0
    values = levels.values / scale
    basis = np.zeros((nodes, values.size))
    diagonal, beside = np.zeros(nodes), np.zeros(nodes)
    basis[0] = np.sqrt(levels.weights)
    for n in range(nodes):
        following = values * basis[n]
        diagonal[n] = following @ basis[n]
        for _ in range(2):
            following -= basis[: n + 1].T @ (basis[: n + 1] @ following)
        beside[n] = np.linalg.norm(following)
        if n + 1 == nodes or beside[n] < 1e-13:
            nodes = n + 1
            break
        basis[n + 1] = following / beside[n]
    matrix = np.diag(diagonal[:nodes]) + np.diag(beside[: nodes - 1], 1) + np.diag(beside[: nodes - 1], -1)
    found, vectors = np.linalg.eigh(matrix)
    return Levels(found * scale, np.square(vectors[0]) * levels.weights.sum())
