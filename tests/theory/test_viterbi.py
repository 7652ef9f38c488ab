"""The batched decoder against a general-purpose library's, its own coder, and its own table."""

from __future__ import annotations

from itertools import product

import commpy.channelcoding.convcode as theirs
import numpy as np
import pytest

from linetest.theory.decoder_tables import DECODER_ROWS
from linetest.theory.viterbi import (
    PUNCTURING,
    BitArray,
    FrameDecoder,
    encode,
    puncture_mask,
    quantise,
    simulate_decoder,
)
from linetest.units import FloatArray

# The library reads generators with the newest bit last: 171 and 133 (octal) read backwards are 117 and 155.
LIBRARY_TRELLIS = theirs.Trellis(np.array([6]), np.array([[0o117, 0o155]]))


def random_frames(rng: np.random.Generator, steps: int, frames: int) -> BitArray:
    bits = rng.integers(0, 2, (steps, frames), dtype=np.uint8)
    bits[-6:] = 0
    return bits


def levels(coded: BitArray) -> FloatArray:
    return 1.0 - 2.0 * coded.astype(np.float64)


def test_coder_equals_a_general_library() -> None:
    """Trellis of scikit-commpy with six delays and generators 171 and 133 (octal)."""
    bits = random_frames(np.random.default_rng(3), 100, 1)
    expected = theirs.conv_encode(bits[:, 0], LIBRARY_TRELLIS, termination="cont")
    assert encode(bits)[:, :, 0].reshape(-1).tolist() == expected.tolist()


def test_column_distances_are_the_published_ones() -> None:
    """Column distance profile of (133, 171): reference test of the IT++ library."""
    inputs = np.array([[1, *rest] for rest in product((0, 1), repeat=6)], dtype=np.uint8).T
    weights = encode(np.ascontiguousarray(inputs)).sum(axis=1).cumsum(axis=0)
    assert weights.min(axis=1).tolist() == [2, 3, 3, 4, 4, 4, 4]


@pytest.mark.parametrize("rate", PUNCTURING)
def test_noiseless_frames_come_back(rate: str) -> None:
    bits = random_frames(np.random.default_rng(4), 210, 16)
    soft = (32 * levels(encode(bits))).astype(np.int16) * puncture_mask(rate, 210)[:, :, None]
    assert (FrameDecoder(210, 16).decode(soft) == bits).all()
    sent = int(puncture_mask(rate, 210).sum())
    information, channel = (int(part) for part in rate.split("/"))
    assert sent * information == 210 * channel


def test_any_four_wrong_channel_bits_are_corrected() -> None:
    """Free distance 10: up to four wrong hard decisions in a frame never matter."""
    rng = np.random.default_rng(5)
    bits = random_frames(rng, 60, 500)
    soft = levels(encode(bits)).astype(np.int16).reshape(120, 500)
    for frame in range(500):
        soft[rng.choice(120, 4, replace=False), frame] *= -1
    assert (FrameDecoder(60, 500).decode(soft.reshape(60, 2, 500)) == bits).all()


def test_decisions_equal_a_general_library_on_noisy_frames() -> None:
    """Soft-input decoder of scikit-commpy on the same values: the same path."""
    rng = np.random.default_rng(6)
    bits = random_frames(rng, 60, 12)
    received = (32.0 * (levels(encode(bits)) + rng.normal(0.0, 1.0, (60, 2, 12)))).astype(np.float32)
    soft = quantise(received)
    ours = FrameDecoder(60, 12).decode(soft)
    for frame in range(12):
        # Their decoder wants +1 for a ONE, and knows of the return to zero only what certain bits tell it.
        values = np.concatenate([-soft[:, :, frame].reshape(-1) / 32.0, np.full(40, -10.0)])
        found = theirs.viterbi_decode(values, LIBRARY_TRELLIS, tb_depth=80, decoding_type="unquantized")
        assert found[:60].tolist() == ours[:, frame].tolist()
    assert (ours != bits).any(axis=0).sum() > 0


@pytest.mark.parametrize(("code", "level_db"), [("conv-1/2", 1.0), ("conv-1/2", 2.0)])
def test_table_is_met_by_another_seed(code: str, level_db: float) -> None:
    """Difference of two simulations within 4 of its standard deviations."""
    row = next(row for row in DECODER_ROWS[code] if row.ebn0_db == level_db)
    hard = code.endswith("-hard")
    rate = code.removeprefix("conv-").removesuffix("-hard")
    rng = np.random.default_rng(11)
    run = simulate_decoder(rate, level_db, least_events=2000, rng=rng, hard=hard)
    u = np.hypot(row.relative_u * row.bit_error_rate, run.squared_errors**0.5 / run.bits)
    assert abs(run.errors / run.bits - row.bit_error_rate) < 4.0 * u


def test_events_account_for_every_error() -> None:
    run = simulate_decoder("1/2", 2.0, least_events=200, rng=np.random.default_rng(12))
    assert run.events == int(run.weights.sum())
    assert run.errors == int((run.weights * np.arange(run.weights.size)).sum())
