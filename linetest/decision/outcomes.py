"""Exact distribution of where a sequential test stops, by dynamic programming over looks and error counts.

For independent errors one pass is enough for every bit error rate: the number of ways to reach a stop does not depend
on the rate, so the probability at another rate is that of the pass times the likelihood ratio of the stop. Errors in
bursts (compound Poisson) need a pass for each rate.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
import numpy.typing as npt
from scipy import special

from linetest.units import FloatArray

IntArray = npt.NDArray[np.int64]
BurstWeights = tuple[tuple[int, float], ...]

INDEPENDENT: BurstWeights = ((1, 1.0),)
TAIL = 1e-18


@dataclass(frozen=True)
class Stops:
    """Where a test can stop, and how likely each stop is at one bit error rate.

    Attributes:
        bits: Bits at the stop, shape (n,).
        errors: Errors at the stop, shape (n,).
        accepted: Whether the stop accepts, shape (n,).
        probability: Probability of the stop at ``ber``, shape (n,).
        ber: The bit error rate of the pass.
    """

    bits: IntArray
    errors: IntArray
    accepted: npt.NDArray[np.bool_]
    probability: FloatArray
    ber: float

    def at(self, ber: FloatArray) -> FloatArray:
        """Probabilities of the stops at other rates, for independent errors.

        Args:
            ber: Bit error rates, shape (m,).

        Returns:
            Probabilities, shape (m, n).
        """
        rate = ber[:, None]
        log_ratio = self.errors * np.log(rate / self.ber) + (self.bits - self.errors) * (
            np.log1p(-rate) - np.log1p(-self.ber)
        )
        with np.errstate(divide="ignore"):
            return np.asarray(np.exp(np.log(self.probability) + log_ratio), dtype=np.float64)


@lru_cache(maxsize=8192)
def increments(bits: int, ber: float, weights: BurstWeights) -> FloatArray:
    """Distribution of the errors in a number of bits.

    Binomial for independent errors (its Poisson limit differs by up to 5 % of a risk above 1e-4), compound Poisson
    for bursts of the given weights.

    Args:
        bits: How many bits.
        ber: Bit error rate.
        weights: (errors of an event, probability) pairs that sum to 1.

    Returns:
        Probabilities of 0, 1, 2 … errors, cut where less than 1e-18 is left.
    """
    mean = bits * ber
    if weights == INDEPENDENT:
        count = np.arange(int(mean + 12.0 * np.sqrt(mean) + 24.0) + 1)
        count = count[count <= bits]
        # Factor by factor: the difference of two log factorials of 1e9 bits would lose ten digits.
        falling = np.concatenate([[0.0], np.cumsum(np.log(bits - count[:-1].astype(np.float64)))])
        log_ways = falling - special.gammaln(count + 1)
        chances = np.exp(log_ways + count * np.log(ber) + (bits - count) * np.log1p(-ber))
    else:
        chances = _compound(mean, weights)
    keep = int(np.flatnonzero(chances > TAIL)[-1]) + 1 if np.any(chances > TAIL) else 1
    kept = np.asarray(chances[:keep], dtype=np.float64)
    return np.asarray(kept / kept.sum(), dtype=np.float64)


def _compound(mean: float, weights: BurstWeights) -> FloatArray:
    sizes = np.array([size for size, _ in weights])
    shares = np.array([share for _, share in weights])
    events = mean / float(sizes @ shares)
    spread = np.sqrt(events * float(sizes**2 @ shares))
    length = 1 << int(np.ceil(np.log2(mean + 14.0 * spread + 16.0 * sizes.max() + 16.0)))
    event = np.zeros(length)
    event[sizes] = shares
    # Generating function of a compound Poisson sum: exp(events * (g(z) - 1)).
    chances = np.fft.irfft(np.exp(events * (np.fft.rfft(event) - 1.0)), length)
    return np.asarray(np.maximum(chances, 0.0), dtype=np.float64)


def walk(look_bits: int, accept: IntArray, reject: IntArray, ber: float, weights: BurstWeights) -> Stops:
    """One exact pass over all looks.

    Args:
        look_bits: Bits a look.
        accept: Largest error count that accepts at each look, -1 where none, shape (looks,).
        reject: Smallest error count that rejects at each look, shape (looks,).
        ber: Bit error rate of the pass.
        weights: Burst weights.

    Returns:
        The stops.
    """
    step = increments(look_bits, ber, weights)
    alive, base = np.ones(1), 0
    where: list[tuple[int, int, FloatArray, bool]] = []
    for look in range(accept.size):
        alive = np.convolve(alive, step)
        first_alive = max(base, int(accept[look]) + 1)
        first_rejected = int(reject[look])
        if first_alive > base:
            where.append((look + 1, base, alive[: first_alive - base], True))
        if first_rejected - base < alive.size:
            beyond = max(first_rejected, first_alive)
            where.append((look + 1, beyond, alive[beyond - base :], False))
        alive = alive[first_alive - base : max(first_rejected - base, 0)]
        base = first_alive
        if not alive.any():
            break
    bits = np.concatenate([np.full(part.size, look * look_bits, dtype=np.int64) for look, _, part, _ in where])
    errors = np.concatenate([first + np.arange(part.size, dtype=np.int64) for _, first, part, _ in where])
    accepted = np.concatenate([np.full(part.size, taken) for _, _, part, taken in where])
    chance = np.concatenate([part for _, _, part, _ in where])
    return Stops(bits, errors, accepted, chance, ber)
