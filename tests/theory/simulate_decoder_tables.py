"""Simulates the error rate after Viterbi decoding and prints the rows of `linetest.theory.decoder_tables`.

Run from the repository: ``python -m tests.theory.simulate_decoder_tables 1/2 [--hard] [--events 10000]``.
One row a line: Eb/N0 in dB, seed, bits, errors, events, sum of squared event weights; then the event weights
as JSON. A row takes up to some minutes; the whole table a few hours of one core.
"""

from __future__ import annotations

import argparse
import json

import numpy as np

from linetest.theory.viterbi import PUNCTURING, simulate_decoder

FIRST_DB = {"1/2": 0.0, "2/3": 1.0, "3/4": 1.5, "5/6": 2.0, "7/8": 2.5}
HARD_OFFSET_DB = 2.0
LEAST_RATE = 4e-5
BASE_SEED = 20_250_301


def seed_of(rate: str, ebn0_db: float, *, hard: bool) -> int:
    """A seed of its own for every row, so that rows can be simulated again alone.

    Args:
        rate: Code rate.
        ebn0_db: Eb/N0 in dB, a multiple of 0.25.
        hard: Whether decisions are hard.

    Returns:
        The seed.
    """
    return BASE_SEED * 10_000 + list(PUNCTURING).index(rate) * 1000 + round(ebn0_db * 4) * 2 + hard


def main() -> None:
    """Simulates rows in half-dB steps until the rate falls below 4e-5, or the one asked for."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("rate", choices=PUNCTURING)
    parser.add_argument("--hard", action="store_true")
    parser.add_argument("--events", type=int, default=10_000)
    parser.add_argument("--only-db", type=float)
    asked = parser.parse_args()
    first_db = FIRST_DB[asked.rate] + (HARD_OFFSET_DB if asked.hard else 0.0)
    level_db = first_db if asked.only_db is None else asked.only_db
    while True:
        seed = seed_of(asked.rate, level_db, hard=asked.hard)
        rng = np.random.Generator(np.random.SFC64(seed))
        run = simulate_decoder(asked.rate, level_db, least_events=asked.events, rng=rng, hard=asked.hard)
        row = (level_db, seed, run.bits, run.errors, run.events, run.squared_errors)
        weights = {w: int(count) for w, count in enumerate(run.weights) if count}
        print(row, json.dumps(weights), flush=True)  # noqa: T201  (a script's answer)
        level_db += 0.5
        if asked.only_db is not None or run.errors / run.bits < LEAST_RATE:
            return


if __name__ == "__main__":
    main()
