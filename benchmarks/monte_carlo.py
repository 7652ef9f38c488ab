"""Symbols a second: simulation of errors against naive numpy, a general-purpose library and random numbers alone."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial

import numpy as np

from benchmarks.timing import medians_s
from linetest.bench import ErrorProcess, UnitTruth, count_by_symbols, model_truth

SYMBOLS = 1 << 19


def naive(ebn0_db: float, rng: np.random.Generator) -> int:
    """QPSK as one writes it first: whole arrays, complex128."""
    bits = rng.integers(0, 2, (SYMBOLS, 2))
    sent = (1 - 2 * bits[:, 0]) + 1j * (1 - 2 * bits[:, 1])
    sigma = np.sqrt(0.5 / 10 ** (ebn0_db / 10))
    received = sent + sigma * (rng.standard_normal(SYMBOLS) + 1j * rng.standard_normal(SYMBOLS))
    decided = np.stack([received.real < 0, received.imag < 0], axis=1)
    return int((decided != bits).sum())


def library(ebn0_db: float, rng: np.random.Generator) -> int:
    """The same by a general-purpose library, on a share of the symbols because it is slow."""
    from commpy.modulation import PSKModem

    modem = PSKModem(4)
    bits = rng.integers(0, 2, 2 * (SYMBOLS // 64))
    sent = modem.modulate(bits)
    sigma = np.sqrt(0.5 / (2 * 10 ** (ebn0_db / 10)))
    received = sent + sigma * (rng.standard_normal(sent.size) + 1j * rng.standard_normal(sent.size))
    return int((modem.demodulate(received, "hard") != bits).sum())


def rows() -> Iterator[tuple[str, str, str]]:
    """Rows at three error rates.

    Yields:
        What, ratio, of what.
    """
    unit = UnitTruth(serial="", inner_serial="", model=model_truth("qpsk"))
    rng = np.random.default_rng(5)
    times = medians_s(
        {
            "naive": lambda: naive(6.8, rng),
            "symbols": lambda: count_by_symbols(unit, SYMBOLS, 6.8, rng),
            "library": lambda: library(6.8, rng),
            "random": lambda: rng.standard_normal(2 * SYMBOLS),
        }
    )
    each = "symbol by symbol, symbols a second"
    yield each, f"{times['naive'] / times['symbols']:.2f}", "naive numpy"
    yield each, f"{64 * times['library'] / times['symbols']:.0f}", "a general-purpose library"
    yield each, f"{times['random'] / times['symbols']:.2f}", "its random numbers alone"
    for ebn0_db, rate, share in ((6.8, "1e-3", 64), (9.8, "5e-6", 4096), (12.0, "1e-8", 65536)):
        bits = 2 * SYMBOLS * share
        tail = medians_s(
            {
                "naive": partial(naive, ebn0_db, rng),
                "tail": partial(ErrorProcess(unit, "prbs23", rng).advance, bits, ebn0_db),
            },
            5,
        )
        ratio = share * tail["naive"] / tail["tail"]
        yield f"exact tail simulation at BER {rate}, symbols a second", f"{ratio:.3g}", "naive numpy"
