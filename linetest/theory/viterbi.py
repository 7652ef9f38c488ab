"""Viterbi decoding of the K=7 (171, 133) code, many frames side by side, and its simulated error rates.

The trellis runs over all 64 states of all frames at once: one step is a handful of array operations, so the
interpreter's share is small from a few hundred frames on. Soft values are integers; 32 steps between zero
and a noiseless bit cost less than 0.001 dB.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

BitArray = npt.NDArray[np.uint8]
SoftArray = npt.NDArray[np.int16]

CONSTRAINT_LENGTH = 7
# Octal, the newest bit first: CCSDS 131.0-B and ETSI EN 300 421 clause 4.4.3.
GENERATORS = (0o171, 0o133)

# Which of the two coder outputs are sent, over one period: ETSI EN 300 421, table 2.
PUNCTURING: dict[str, tuple[tuple[int, ...], tuple[int, ...]]] = {
    "1/2": ((1,), (1,)),
    "2/3": ((1, 0), (1, 1)),
    "3/4": ((1, 0, 1), (1, 1, 0)),
    "5/6": ((1, 0, 1, 0, 1), (1, 1, 0, 1, 0)),
    "7/8": ((1, 0, 0, 0, 1, 0, 1), (1, 1, 1, 1, 0, 1, 0)),
}

_MEMORY = CONSTRAINT_LENGTH - 1
_STATES = 1 << _MEMORY
_SOFT_STEPS = 32
_SOFT_LIMIT = 127
# The best metric grows by at most 254 a step and leads the others by less than 4000: 64 steps fit in 16 bits.
_STEPS_BETWEEN_RESCALING = 64
_UNREACHED = -8000


def encode(bits: BitArray) -> BitArray:
    """Code bits of frames that start from the all-zero state, before puncturing.

    Args:
        bits: Information bits, shape (steps, frames).

    Returns:
        Code bits, shape (steps, 2, frames).
    """
    steps, frames = bits.shape
    padded = np.zeros((steps + _MEMORY, frames), dtype=np.uint8)
    padded[_MEMORY:] = bits
    coded = np.zeros((steps, 2, frames), dtype=np.uint8)
    for output, generator in enumerate(GENERATORS):
        for delay in range(CONSTRAINT_LENGTH):
            if generator >> (_MEMORY - delay) & 1:
                coded[:, output] ^= padded[_MEMORY - delay : _MEMORY - delay + steps]
    return coded


def puncture_mask(rate: str, steps: int) -> npt.NDArray[np.bool_]:
    """Which code bits of a frame are sent.

    Args:
        rate: One of `PUNCTURING`.
        steps: Information bits of the frame.

    Returns:
        True where a code bit is sent, shape (steps, 2).
    """
    period = np.array(PUNCTURING[rate], dtype=np.bool_).T
    return np.resize(period, (steps, 2))


class FrameDecoder:
    """Decoder of frames of one shape; it keeps its memory from batch to batch.

    Fresh memory costs more than the arithmetic that fills it, so the survivors of all states are kept.

    Attributes:
        steps: Information bits of a frame, including the six that return the coder to zero.
        frames: Frames decoded side by side.
    """

    def __init__(self, steps: int, frames: int) -> None:
        self.steps, self.frames = steps, frames
        self._from_odd = np.empty((steps, _STATES, frames), dtype=np.bool_)
        self._metrics = np.empty((2, _STATES, frames), dtype=np.int16)
        self._branches = np.empty((3, _STATES // 2, frames), dtype=np.int16)
        self._four = np.empty((4, frames), dtype=np.int16)

    def decode(self, soft: SoftArray) -> BitArray:
        """Most likely information bits of frames that start and end in the all-zero state.

        Args:
            soft: Received code bits, positive for ZERO, 0 where nothing was sent, within +-127;
                shape (steps, 2, frames).

        Returns:
            Information bits, shape (steps, frames).
        """
        self._run_forward(soft)
        return self._trace_back()

    def _run_forward(self, soft: SoftArray) -> None:
        metric, following = self._metrics
        metric[:] = _UNREACHED
        metric[0] = 0
        for step in range(self.steps):
            self._add_compare_select(soft[step], metric, following, self._from_odd[step])
            metric, following = following, metric
            if step % _STEPS_BETWEEN_RESCALING == 0:
                metric -= metric.max(axis=0)

    def _add_compare_select(
        self, soft: SoftArray, metric: SoftArray, following: SoftArray, from_odd: npt.NDArray[np.bool_]
    ) -> None:
        half = _STATES // 2
        four = self._four
        branch, through_even, through_odd = self._branches
        np.add(soft[0], soft[1], out=four[0])
        np.subtract(soft[0], soft[1], out=four[1])
        np.negative(four[1], out=four[2])
        np.negative(four[0], out=four[3])
        np.take(four, _EVEN_BRANCHES, axis=0, out=branch, mode="clip")
        even, odd = metric[0::2], metric[1::2]
        for rows, even_gains, odd_gains in (
            (slice(0, half), np.add, np.subtract),
            (slice(half, None), np.subtract, np.add),
        ):
            even_gains(even, branch, out=through_even)
            odd_gains(odd, branch, out=through_odd)
            np.greater(through_odd, through_even, out=from_odd[rows])
            np.maximum(through_even, through_odd, out=following[rows])

    def _trace_back(self) -> BitArray:
        bits = np.empty((self.steps, self.frames), dtype=np.uint8)
        state = np.zeros(self.frames, dtype=np.intp)
        column = np.arange(self.frames)
        for step in range(self.steps - 1, -1, -1):
            np.right_shift(state, _MEMORY - 1, out=bits[step], casting="unsafe")
            from_odd = self._from_odd[step].reshape(-1).take(state * self.frames + column)
            state = ((state << 1) & (_STATES - 1)) | from_odd
        return bits


def _even_branches() -> npt.NDArray[np.intp]:
    """Which of the four branch metrics a ZERO takes out of each even state.

    The state holds the last six bits, newest first; both generators have both end taps, so that the branch
    of a ONE, and that of the odd neighbour, carry the opposite code bits.
    """
    combination = []
    for state in range(0, _STATES, 2):
        first, second = ((state & generator).bit_count() & 1 for generator in GENERATORS)
        combination.append(2 * first + second)
    return np.array(combination)


_EVEN_BRANCHES = _even_branches()


@dataclass(frozen=True, slots=True)
class DecoderRun:
    """What a simulation of the decoder counted.

    Attributes:
        bits: Information bits compared.
        errors: Wrong bits among them.
        events: Error events: groups of wrong bits that six right bits in a row (the coder's memory, after
            which the decoded path is back on the sent one) separate.
        weights: Events by number of wrong bits; entry w counts those with w.
    """

    bits: int
    errors: int
    events: int
    weights: npt.NDArray[np.int64]

    @property
    def squared_errors(self) -> int:
        """Sum of the squared weights: the variance of `errors`, as events come independently."""
        return int((self.weights * np.arange(self.weights.size) ** 2).sum())


_GUARD_STEPS = 64
_MOST_WEIGHT = 512


def simulate_decoder(
    rate: str, ebn0_db: float, *, least_events: int, rng: np.random.Generator, hard: bool = False
) -> DecoderRun:
    """Errors after decoding, for random data on antipodal channel bits in white Gaussian noise.

    Args:
        rate: One of `PUNCTURING`.
        ebn0_db: Eb/N0 per information bit in dB.
        least_events: Error events to wait for; whole batches are counted, so that stopping adds no bias
            beyond one part in `least_events`.
        rng: Source of chance.
        hard: True for hard decisions ahead of the decoder.

    Returns:
        The counts.
    """
    link = _SimulatedLink(rate, ebn0_db, rng, hard=hard)
    bits = errors = events = 0
    weights = np.zeros(_MOST_WEIGHT, dtype=np.int64)
    while events < least_events:
        wrong = link.next_batch()
        counted = _event_weights(wrong)
        bits += wrong.size
        errors += int(counted.sum())
        events += counted.size
        weights += np.bincount(np.minimum(counted, _MOST_WEIGHT - 1), minlength=_MOST_WEIGHT)
    return DecoderRun(bits, errors, events, weights)


class _SimulatedLink:
    """Random data, coder, puncturing, noise and decoder, batch after batch."""

    _STEPS = 840  # a multiple of every puncturing period
    _FRAMES = 512
    _STRETCH = 24  # steps whose noise stays in a core's second-level cache

    def __init__(self, rate: str, ebn0_db: float, rng: np.random.Generator, *, hard: bool) -> None:
        self._rng, self._hard = rng, hard
        self._mask = puncture_mask(rate, self._STEPS).astype(np.int16)[:, :, None]
        code_rate = self._STEPS / int(self._mask.sum())
        self._sigma = np.float32(_SOFT_STEPS / np.sqrt(2.0 * code_rate * 10.0 ** (ebn0_db / 10.0)))
        self._decoder = FrameDecoder(self._STEPS, self._FRAMES)
        self._soft = np.empty((self._STEPS, 2, self._FRAMES), dtype=np.int16)
        self._noise = np.empty((self._STRETCH, 2, self._FRAMES), dtype=np.float32)

    def next_batch(self) -> npt.NDArray[np.bool_]:
        """Where decoded bits are wrong, without the frames' ends; shape (frames, steps)."""
        packed = self._rng.integers(0, 256, (self._STEPS, self._FRAMES // 8), dtype=np.uint8)
        sent = np.unpackbits(packed, axis=1)
        sent[-_MEMORY:] = 0
        levels = (_SOFT_STEPS - 2 * _SOFT_STEPS * encode(sent).view(np.int8)).astype(np.int8)
        for start in range(0, self._STEPS, self._STRETCH):
            stretch = slice(start, start + self._STRETCH)
            self._rng.standard_normal(dtype=np.float32, out=self._noise)
            self._noise *= self._sigma
            self._noise += levels[stretch]
            self._soft[stretch] = quantise(self._noise, hard=self._hard)
        self._soft *= self._mask
        wrong = self._decoder.decode(self._soft) != sent
        return np.ascontiguousarray(wrong[_GUARD_STEPS:-_GUARD_STEPS].T)


def quantise(received: npt.NDArray[np.float32], *, hard: bool = False) -> SoftArray:
    """Soft values of received code bits.

    Args:
        received: Received code bits, +-32 without noise, positive for ZERO.
        hard: True to keep the sign only.

    Returns:
        Soft values within +-127, or +-1.
    """
    if hard:
        return np.where(received >= 0.0, 1, -1).astype(np.int16)
    np.rint(received, out=received)
    np.clip(received, -_SOFT_LIMIT, _SOFT_LIMIT, out=received)
    return received.astype(np.int16)


def _event_weights(wrong: npt.NDArray[np.bool_]) -> npt.NDArray[np.int64]:
    """Wrong bits of each error event of a batch."""
    at = np.flatnonzero(wrong)
    if not at.size:
        return np.zeros(0, dtype=np.int64)
    frame = at // wrong.shape[1]
    starts = np.flatnonzero(np.concatenate([[True], (np.diff(at) > _MEMORY) | (np.diff(frame) > 0)]))
    return np.diff(np.concatenate([starts, [at.size]])).astype(np.int64)
