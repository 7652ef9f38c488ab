"""Bit error rates of impaired links, exact by quadrature.

Every scheme here decides rail by rail: a bit depends on which side of one or two thresholds a rail's level
falls. Given the carrier phase, the symbols and the neighbours' share, that level is a Gaussian variable about
a known mean; its chance of being on the wrong side is averaged over all of these.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from typing import overload

import numpy as np
import numpy.typing as npt
from scipy.optimize import brentq

from linetest.errors import ParameterError
from linetest.theory.curves import required_ebn0_db
from linetest.theory.gaussian import amplitude, as_float_array, checked_ebn0_db, gaussian_tail, in_shape_of
from linetest.theory.impairments import Impairments
from linetest.theory.interference import NOTHING, Levels, sum_of_terms
from linetest.theory.symbols import constellation, octal_axes
from linetest.theory.uncoded import differentially_encoded
from linetest.theory.waveform import raised_cosine
from linetest.units import FloatArray

IMPAIRED_SCHEMES = ("bpsk", "qpsk", "oqpsk", "8psk", "16qam", "de-bpsk", "de-qpsk")

_BINARY = np.array([1.0, -1.0])
_QUATERNARY = np.array([3.0, 1.0, -1.0, -3.0]) / np.sqrt(5.0)
_EDGE_16 = 2.0 / np.sqrt(5.0)
_ISI_SYMBOLS = 400


@dataclass(frozen=True)
class _Rail:
    """Means of one rail's level, scaled so that a perfect rail has unit mean square.

    Attributes:
        outer: True where a level beyond the outer thresholds was sent, shape (k,).
        toward: Mean level, positive on the side of the symbol sent, shape (phases, k).
        weight: Chance of each case, shape (k,).
    """

    outer: npt.NDArray[np.bool_]
    toward: FloatArray
    weight: FloatArray


@lru_cache(maxsize=128)
def _neighbours(offset: float, rolloff: float, *, binary: bool) -> tuple[float, Levels, Levels]:
    """Own sample of the pulse, the neighbours' share of the same rail, and all of a rail half a symbol off."""
    alphabet = _BINARY if binary else _QUATERNARY
    if offset == 0.0:
        same = NOTHING
    else:
        at = np.setdiff1d(np.arange(-_ISI_SYMBOLS, _ISI_SYMBOLS + 1.0), [0.0])
        same = sum_of_terms(alphabet, raised_cosine(at + offset, rolloff))
    half_off = np.arange(0.5 - _ISI_SYMBOLS, _ISI_SYMBOLS) + offset
    staggered = sum_of_terms(alphabet, raised_cosine(half_off, rolloff))
    return float(raised_cosine(np.asarray(offset), rolloff)), same, staggered


@lru_cache(maxsize=64)
def _geometry(scheme: str, impairments: Impairments) -> tuple[tuple[_Rail, ...], FloatArray]:
    """All that does not depend on Eb/N0: the rails and the weights of the phases."""
    rails = () if scheme == "8psk" else tuple(_rails(scheme, impairments))
    return rails, impairments.phases()[1]


def _rails(scheme: str, impairments: Impairments) -> Iterator[_Rail]:
    """The rails that carry bits, for every phase node."""
    phases = impairments.phases()[0]
    turn = np.exp(1j * phases)[:, None]
    i_axis, q_axis, leak = impairments.axes()
    single = scheme.endswith("bpsk")
    if single:
        # One rail holds all the power: its gain and angle are those of the carrier itself.
        i_axis, q_axis = complex(1.0 / np.sqrt(1.0 + impairments.leakage_power)), 0j
        leak /= np.sqrt(2.0)
    alphabet = _QUATERNARY if scheme == "16qam" else _BINARY
    own, same, staggered = _neighbours(impairments.timing_offset, impairments.rolloff, binary=scheme != "16qam")
    share = np.full(alphabet.size, 1.0 / alphabet.size)
    whole = Levels(alphabet * own, share).plus(same)
    # Without leaked carrier negative symbols are the mirror of positive ones.
    kept = alphabet > 0.0 if leak == 0.0 else np.ones(alphabet.size, dtype=np.bool_)
    symbol = Levels(alphabet[kept], share[kept] / share[kept].sum())
    other = NOTHING if single else staggered if scheme == "oqpsk" else whole
    sent, near, far, weight = _cases(symbol, same, other)
    for own_axis, other_axis, view in ((i_axis, q_axis, 1.0), (q_axis, i_axis, -1j)):
        mean = ((turn * own_axis * view).real * (own * sent + near)[None, :]) + (
            (turn * other_axis * view).real * far[None, :] + (turn * leak * view).real
        )
        yield _Rail(np.abs(sent) > _EDGE_16, np.asarray(mean * np.sign(sent)), weight)
        if single:
            return


def _cases(symbol: Levels, same: Levels, other: Levels) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    shape = (symbol.values.size, same.values.size, other.values.size)
    sent = np.broadcast_to(symbol.values[:, None, None], shape).reshape(-1)
    near = np.broadcast_to(same.values[None, :, None], shape).reshape(-1)
    far = np.broadcast_to(other.values[None, None, :], shape).reshape(-1)
    weight = symbol.weights[:, None, None] * same.weights[None, :, None] * other.weights[None, None, :]
    return sent, near, far, weight.reshape(-1)


def _rail_error(rail: _Rail, noise_scale: FloatArray, *, quaternary: bool) -> FloatArray:
    """Bit error rate of one rail for each level and phase; the scale is the inverse of the noise's deviation."""
    toward = rail.toward
    wrong_side = gaussian_tail(noise_scale * toward)
    if not quaternary:
        return np.asarray(wrong_side @ rail.weight)
    beyond = gaussian_tail(noise_scale * (_EDGE_16 - toward)) + gaussian_tail(noise_scale * (_EDGE_16 + toward))
    within = gaussian_tail(noise_scale * (toward - _EDGE_16)) - gaussian_tail(noise_scale * (toward + _EDGE_16))
    return np.asarray(0.5 * (wrong_side + np.where(rail.outer, within, beyond)) @ rail.weight)


def _octal_error(impairments: Impairments, noise_scale: FloatArray) -> FloatArray:
    """Bit error rate of 8PSK for each level and phase.

    Two bits depend on the side of one line each, the third on the sides of two lines at right angles, on
    which noise acts independently.
    """
    points = constellation("8psk").points
    i_axis, q_axis, leak = impairments.axes()
    sent = points.real * i_axis + points.imag * q_axis + leak / np.sqrt(2.0)
    turned = np.exp(1j * impairments.phases()[0])[:, None] * sent
    sides = [noise_scale * (turned * np.conj(axis)).real for axis in octal_axes()]
    below = [gaussian_tail(side) for side in sides]
    above = [gaussian_tail(-side) for side in sides]
    differ = below[2] * above[3] + above[2] * below[3]
    agree = below[2] * below[3] + above[2] * above[3]
    bits = [(np.arange(8) >> place & 1) > 0 for place in (2, 1, 0)]
    wrong = [np.where(bits[0], above[0], below[0]), np.where(bits[1], above[1], below[1])]
    wrong.append(np.where(bits[2], agree, differ))
    return np.asarray((wrong[0] + wrong[1] + wrong[2]).mean(axis=-1) / 3.0)


_BITS_PER_RAIL = {"8psk": 3.0, "16qam": 2.0}
# As many evaluations of the tail as stay in a core's second-level cache.
_AT_ONCE = 100_000


def _noisy_rate(scheme: str, ebn0_db: FloatArray, impairments: Impairments) -> FloatArray:
    """Bit error rate that noise causes, averaged over symbols, neighbours and carrier phase."""
    rails, phase_weight = _geometry(scheme, impairments)
    cases = 8 if not rails else rails[0].weight.size
    scale = amplitude(ebn0_db - impairments.loss_db) * np.sqrt(2.0 * _BITS_PER_RAIL.get(scheme, 1.0))
    step = max(1, _AT_ONCE // (phase_weight.size * cases))
    rates = np.empty(scale.size)
    for start in range(0, scale.size, step):
        part = scale[start : start + step, None, None]
        if scheme == "8psk":
            by_phase = _octal_error(impairments, part)
        else:
            errors = [_rail_error(rail, part, quaternary=scheme == "16qam") for rail in rails]
            by_phase = np.asarray(sum(errors) / len(errors))
        if scheme.startswith("de-"):
            by_phase = differentially_encoded(by_phase)
        rates[start : start + step] = by_phase @ phase_weight
    return rates


@overload
def impaired_bit_error_rate(
    scheme: str, ebn0_db: float, impairments: Impairments, *, bit_rate_bps: float | None = None
) -> float: ...
@overload
def impaired_bit_error_rate(
    scheme: str, ebn0_db: FloatArray, impairments: Impairments, *, bit_rate_bps: float | None = None
) -> FloatArray: ...
def impaired_bit_error_rate(
    scheme: str,
    ebn0_db: float | FloatArray,
    impairments: Impairments,
    *,
    bit_rate_bps: float | None = None,
) -> float | FloatArray:
    """Bit error rate of an impaired link in white Gaussian noise.

    Thresholds stay where the perfect constellation of the same total power has them. Differential decoding
    takes neighbouring decisions at the same carrier phase; that of QPSK takes both rails' mean rate, exact
    where they are equal and to first order where not.

    Args:
        scheme: One of `IMPAIRED_SCHEMES`.
        ebn0_db: Eb/N0 per information bit in dB, scalar or array of any shape.
        impairments: The imperfections.
        bit_rate_bps: Information bit rate in bit/s; needed with cycle slips.

    Returns:
        Bit error rate of the same shape.

    Raises:
        ParameterError: The scheme has no impaired form, an Eb/N0 is not finite, the bit rate is missing, or
            8PSK is asked for with a timing offset.
    """
    slips = _slip_rate(impairments, bit_rate_bps)
    _check_scheme(scheme, impairments)
    levels = checked_ebn0_db(ebn0_db)
    noisy = _noisy_rate(scheme, levels.reshape(-1), impairments).reshape(levels.shape)
    floor = impairments.error_floor
    return in_shape_of(ebn0_db, np.asarray(floor + noisy * (1.0 - 2.0 * floor) + slips))


def _check_scheme(scheme: str, impairments: Impairments) -> None:
    if scheme not in IMPAIRED_SCHEMES:
        raise ParameterError("scheme", scheme, f"be one of {', '.join(IMPAIRED_SCHEMES)} to be impaired")
    if scheme == "8psk" and impairments.timing_offset != 0.0:
        rule = "be 0 for 8psk: its rails are not independent, and only independent rails are averaged"
        raise ParameterError("timing_offset", impairments.timing_offset, rule)


def _slip_rate(impairments: Impairments, bit_rate_bps: float | None) -> float:
    if impairments.cycle_slips_per_s == 0.0:
        return 0.0
    if bit_rate_bps is None or not bit_rate_bps > 0.0:
        raise ParameterError("bit_rate_bps", bit_rate_bps, "be above 0 where carrier cycles slip")
    return impairments.cycle_slips_per_s * impairments.errors_per_slip / bit_rate_bps


_MOST_LOSS_DB = 60.0
_LEAST_RATE = 1e-300


@overload
def impaired_ebn0_db(
    scheme: str, bit_error_rate: float, impairments: Impairments, *, bit_rate_bps: float | None = None
) -> float: ...
@overload
def impaired_ebn0_db(
    scheme: str, bit_error_rate: FloatArray, impairments: Impairments, *, bit_rate_bps: float | None = None
) -> FloatArray: ...
def impaired_ebn0_db(
    scheme: str,
    bit_error_rate: float | FloatArray,
    impairments: Impairments,
    *,
    bit_rate_bps: float | None = None,
) -> float | FloatArray:
    """Eb/N0 that an impaired link needs for a bit error rate.

    Args:
        scheme: One of `IMPAIRED_SCHEMES`.
        bit_error_rate: Wanted bit error rate, above what remains without noise, below 0.5.
        impairments: The imperfections.
        bit_rate_bps: Information bit rate in bit/s; needed with cycle slips.

    Returns:
        Eb/N0 in dB of the same shape.

    Raises:
        ParameterError: As for `impaired_bit_error_rate`, or the rate is never reached.
    """
    _check_scheme(scheme, impairments)
    rates = as_float_array("bit_error_rate", bit_error_rate)
    perfect_db = np.atleast_1d(required_ebn0_db(scheme, rates))

    def misses(level_db: float, wanted: float) -> float:
        rate = impaired_bit_error_rate(scheme, level_db, impairments, bit_rate_bps=bit_rate_bps)
        return float(np.log(max(rate, _LEAST_RATE)) - np.log(wanted))

    found = np.empty(perfect_db.size)
    for place, (start_db, wanted) in enumerate(zip(perfect_db.reshape(-1), rates.reshape(-1), strict=True)):
        end_db = float(start_db) + _MOST_LOSS_DB
        if misses(end_db, float(wanted)) > 0.0:
            left = impaired_bit_error_rate(scheme, end_db, impairments, bit_rate_bps=bit_rate_bps)
            rule = f"be above {left:.3g}: that much remains of these impairments without noise"
            raise ParameterError("bit_error_rate", float(wanted), rule)
        found[place] = brentq(misses, float(start_db) - 3.0, end_db, args=(float(wanted),), xtol=1e-11, rtol=1e-14)
    return in_shape_of(bit_error_rate, found.reshape(rates.shape))
