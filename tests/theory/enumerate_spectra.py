"""Enumerates the distance spectra of the punctured K=7 codes from generators and puncturing alone.

Run from the repository: ``python -m tests.theory.enumerate_spectra`` prints the integers that
`linetest.theory.convolutional` holds. It shares nothing with the package but the definition of the code.

An error event leaves the all-zero path in one branch and meets it again at a branch boundary, where a branch
is one period of the puncturing. Counting bit by bit instead would end some events of high distance too early
and give other integers from the eighth term on.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import numpy.typing as npt

IntArray = npt.NDArray[np.int64]

MEMORY = 6
GENERATORS = (0o171, 0o133)
# Which output bits of each period are sent: ETSI EN 300 421, table 2.
PUNCTURED = {
    "1/2": ("1", "1"),
    "2/3": ("10", "11"),
    "3/4": ("101", "110"),
    "5/6": ("10101", "11010"),
    "7/8": ("1000101", "1111010"),
}


def transitions(rate: str, phase: int) -> Iterator[tuple[int, int, int, int]]:
    """Every transition of one step: state, following state, information bit, sent weight.

    Args:
        rate: Code rate.
        phase: Step within the puncturing period.

    Yields:
        The transitions.
    """
    sent = [pattern[phase] == "1" for pattern in PUNCTURED[rate]]
    for state in range(1 << MEMORY):
        for bit in (0, 1):
            window = bit << MEMORY | state
            outputs = [(window & generator).bit_count() & 1 for generator in GENERATORS]
            yield state, window >> 1, bit, sum(out for out, kept in zip(outputs, sent, strict=True) if kept)


def spectrum(rate: str, most_distance: int) -> tuple[IntArray, IntArray]:
    """Number of error events and sum of their information weights by distance.

    Args:
        rate: Code rate.
        most_distance: Greatest distance looked at.

    Returns:
        Multiplicities and information weights, index = distance.
    """
    shape = (1 << MEMORY, most_distance + 1)
    paths, weights = np.zeros(shape, dtype=np.int64), np.zeros(shape, dtype=np.int64)
    paths[0, 0] = 1
    events, event_weights = np.zeros((2, most_distance + 1), dtype=np.int64)
    period = len(PUNCTURED[rate][0])
    first = True
    while paths.any():
        for phase in range(period):
            paths, weights = _step(rate, phase, paths, weights)
        if first:
            paths[0, 0] -= 1  # the branch that never left the all-zero path
            first = False
        events += paths[0]
        event_weights += weights[0]
        paths[0] = weights[0] = 0
    return events, event_weights


def _step(rate: str, phase: int, paths: IntArray, weights: IntArray) -> tuple[IntArray, IntArray]:
    new_paths, new_weights = np.zeros_like(paths), np.zeros_like(weights)
    width = paths.shape[1]
    for state, following, bit, weight in transitions(rate, phase):
        new_paths[following, weight:] += paths[state, : width - weight]
        new_weights[following, weight:] += weights[state, : width - weight] + bit * paths[state, : width - weight]
    return new_paths, new_weights


def main() -> None:
    """Prints every spectrum from its free distance on."""
    for rate in PUNCTURED:
        events, weights = spectrum(rate, 40 if rate == "1/2" else 20)
        free = int(np.flatnonzero(events)[0])
        print(rate, "free distance", free)  # noqa: T201  (a script's answer)
        print("  events ", events[free:].tolist())  # noqa: T201
        print("  weights", weights[free:].tolist())  # noqa: T201


if __name__ == "__main__":
    main()
