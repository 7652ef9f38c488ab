"""A plan: the stopping rule of a step, as a value.

Two straight lines over the bits counted: at or below the lower one the step is accepted, at or above the upper one
rejected; at the last look the plan decides. Its risks are exact for looks at every multiple of ``look_bits``; a look
that comes late uses the lines at its real bits.
"""

from __future__ import annotations

import hashlib
import json
from dataclasses import asdict, dataclass
from enum import StrEnum
from functools import lru_cache
from typing import overload

import numpy as np

from linetest.decision.intervals import check_counts
from linetest.decision.outcomes import INDEPENDENT, BurstWeights, IntArray, Stops, walk
from linetest.errors import ParameterError
from linetest.units import FloatArray

LOST_AT_MOST = 1e-9


class Outcome(StrEnum):
    """What a plan says after a look."""

    CONTINUE = "CONTINUE"
    ACCEPT = "ACCEPT"
    REJECT = "REJECT"


@dataclass(frozen=True, slots=True)
class Plan:
    """The stopping rule of a step.

    Attributes:
        good_ber: Bit error rate at which rejecting is the producer's risk.
        limit_ber: Bit error rate at which accepting is the consumer's risk.
        look_bits: Bits from look to look.
        looks: Number of looks; the last one decides.
        slope: Errors a bit, of both lines.
        accept_gap: Errors that the accepting line lies below slope times bits.
        reject_gap: Errors that the rejecting line lies above slope times bits.
        last_accept_errors: Largest error count that accepts at the last look.
        producer_risk: Exact probability of REJECT at ``good_ber``.
        consumer_risk: Exact probability of ACCEPT at ``limit_ber``.
        burst_weights: (errors of an event, probability) pairs.
    """

    good_ber: float
    limit_ber: float
    look_bits: int
    looks: int
    slope: float
    accept_gap: float
    reject_gap: float
    last_accept_errors: int
    producer_risk: float
    consumer_risk: float
    burst_weights: BurstWeights = INDEPENDENT

    @property
    def max_bits(self) -> int:
        """Bits at the last look."""
        return self.look_bits * self.looks

    @property
    def accept_errors(self) -> tuple[int, ...]:
        """Largest error count that accepts at each look; -1 where none does."""
        return tuple(int(count) for count in self.boundaries()[0])

    @property
    def reject_errors(self) -> tuple[int, ...]:
        """Smallest error count that rejects at each look."""
        return tuple(int(count) for count in self.boundaries()[1])

    def boundaries(self) -> tuple[IntArray, IntArray]:
        """Accepting and rejecting error counts of all looks.

        Returns:
            Two arrays of shape (looks,).
        """
        return boundary_counts(
            self.look_bits, self.looks, self.slope, self.accept_gap, self.reject_gap, self.last_accept_errors
        )

    def decide(self, bits: int, errors: int) -> Outcome:
        """What the counts of a look say.

        Args:
            bits: Bits counted since the step began.
            errors: Errors among them.

        Returns:
            CONTINUE, ACCEPT or REJECT.

        Raises:
            ParameterError: Counts that cannot be.
        """
        check_counts(bits, errors)
        middle = self.slope * bits
        if bits >= self.max_bits:
            # Beyond the last look the line through its decision continues.
            late = int(self.slope * (bits - self.max_bits))
            return Outcome.ACCEPT if errors <= self.last_accept_errors + late else Outcome.REJECT
        if errors <= middle - self.accept_gap:
            return Outcome.ACCEPT
        if errors >= middle + self.reject_gap:
            return Outcome.REJECT
        return Outcome.CONTINUE

    def nearness(self, bits: int, errors: int) -> float:
        """How near a decision is.

        Args:
            bits: Bits counted since the step began.
            errors: Errors among them.

        Returns:
            From -1 at the rejecting line to +1 at the accepting one.
        """
        above = self.slope * bits + self.reject_gap - errors
        return float(np.clip(2.0 * above / (self.accept_gap + self.reject_gap) - 1.0, -1.0, 1.0))

    def stops(self, ber: float | None = None) -> Stops:
        """Where the plan can stop.

        Args:
            ber: Bit error rate of the probabilities; between good and limit where None.

        Returns:
            The stops.
        """
        return _stops(self, float(np.sqrt(self.good_ber * self.limit_ber)) if ber is None else ber)

    @overload
    def acceptance_probability(self, ber: float) -> float: ...
    @overload
    def acceptance_probability(self, ber: FloatArray) -> FloatArray: ...
    def acceptance_probability(self, ber: float | FloatArray) -> float | FloatArray:
        """Exact probability of ACCEPT.

        Args:
            ber: Bit error rate, scalar or array of any shape.

        Returns:
            Probability, same shape.

        Raises:
            ParameterError: A rate outside 0 to 0.5.
        """
        return self._expected(ber, of_bits=False)

    @overload
    def expected_bits(self, ber: float) -> float: ...
    @overload
    def expected_bits(self, ber: FloatArray) -> FloatArray: ...
    def expected_bits(self, ber: float | FloatArray) -> float | FloatArray:
        """Exact mean number of bits to the decision.

        Args:
            ber: Bit error rate, scalar or array of any shape.

        Returns:
            Bits, same shape.

        Raises:
            ParameterError: A rate outside 0 to 0.5.
        """
        return self._expected(ber, of_bits=True)

    def _expected(self, ber: float | FloatArray, *, of_bits: bool) -> float | FloatArray:
        rates = np.atleast_1d(np.asarray(ber, dtype=np.float64))
        if not np.all((rates >= 0.0) & (rates <= 0.5)):
            raise ParameterError("ber", ber, "lie between 0 and 0.5")
        flat = np.maximum(rates.ravel(), 1e-300)
        if self.burst_weights == INDEPENDENT:
            stops = self.stops()
            chances = stops.at(flat)
            values = chances @ (stops.bits if of_bits else stops.accepted).astype(np.float64)
            # Stops too unlikely for the shared pass are not in it; a rate that needs them gets a pass of its own.
            for far in np.flatnonzero(np.abs(chances.sum(axis=1) - 1.0) > LOST_AT_MOST):
                own = self.stops(float(flat[far]))
                values[far] = own.probability @ (own.bits if of_bits else own.accepted).astype(np.float64)
        else:
            passes = [self.stops(float(rate)) for rate in flat]
            values = np.array([s.probability @ (s.bits if of_bits else s.accepted).astype(np.float64) for s in passes])
        shaped = np.asarray(values, dtype=np.float64).reshape(rates.shape)
        return shaped if isinstance(ber, np.ndarray) else float(shaped.ravel()[0])

    def to_json(self) -> str:
        """The plan as canonical JSON: equal plans give equal bytes.

        Returns:
            The text.
        """
        return json.dumps(asdict(self), sort_keys=True, separators=(",", ":"))

    @classmethod
    def from_json(cls, text: str) -> Plan:
        """A plan from its JSON.

        Args:
            text: What :meth:`to_json` gave.

        Returns:
            The equal plan.

        Raises:
            ParameterError: The text is not a plan.
        """
        try:
            facts = json.loads(text)
            facts["burst_weights"] = tuple((int(size), float(share)) for size, share in facts["burst_weights"])
            return cls(**facts)
        except (ValueError, TypeError, KeyError) as reason:
            raise ParameterError("text", text[:60], "be the JSON of a plan") from reason

    def digest(self) -> str:
        """SHA-256 of the plan's JSON.

        Returns:
            Hexadecimal text.
        """
        return hashlib.sha256(self.to_json().encode("ascii")).hexdigest()


def boundary_counts(
    look_bits: int, looks: int, slope: float, accept_gap: float, reject_gap: float, last_accept: int
) -> tuple[IntArray, IntArray]:
    """Integer boundaries of two lines at every look.

    Args:
        look_bits: Bits a look.
        looks: Number of looks.
        slope: Errors a bit.
        accept_gap: Errors that the accepting line lies below slope times bits.
        reject_gap: Errors that the rejecting line lies above it.
        last_accept: Largest count that accepts at the last look.

    Returns:
        Accepting counts (-1 where none) and rejecting counts, shape (looks,).
    """
    # Bits first, as decide() has them: the two must agree to the last bit of the floating point.
    middle = slope * (look_bits * np.arange(1, looks + 1, dtype=np.int64))
    accept = np.maximum(np.floor(middle - accept_gap), -1.0).astype(np.int64)
    reject = np.ceil(middle + reject_gap).astype(np.int64)
    accept[-1], reject[-1] = last_accept, last_accept + 1
    return accept, reject


@lru_cache(maxsize=256)
def _stops(plan: Plan, ber: float) -> Stops:
    accept, reject = plan.boundaries()
    return walk(plan.look_bits, accept, reject, ber, plan.burst_weights)
