"""Units with hidden truth: the same serial is always the same unit.

The demo lot has faults planted that a line meets; what each must come to is kept beside it for tests and for the
demo's last table.
"""

from __future__ import annotations

import zlib
from dataclasses import dataclass, replace

import numpy as np

GOOD_FIRMWARE = "2.4.1"
OLD_FIRMWARE = "2.3.0"


@dataclass(frozen=True, slots=True)
class ModelTruth:
    """How a model of unit works.

    Attributes:
        model: Its name.
        mode: Name of its mode.
        modulation: ``qpsk``, ``bpsk``.
        bit_rate_bps: Information bit rate, bit/s.
        differential: Whether bits are differences of decisions.
        coded: Whether the K=7 rate 1/2 decoder stands behind the decisions.
    """

    model: str
    mode: str
    modulation: str
    bit_rate_bps: float
    differential: bool = False
    coded: bool = False


MODELS = {
    "BQ4": ModelTruth("BW-Q4", "qpsk-2048", "qpsk", 2.048e6),
    "BQC": ModelTruth("BW-Q4C", "qpsk-1024-r12", "qpsk", 1.024e6, coded=True),
    "BB2": ModelTruth("BW-B2", "de-bpsk-64", "bpsk", 64.0e3, differential=True),
}


def model_truth(modulation: str) -> ModelTruth:
    """An uncoded model at 2.048 Mbit/s, for comparisons with theory.

    Args:
        modulation: ``qpsk`` or ``bpsk``.

    Returns:
        The model.
    """
    return ModelTruth("ideal", "ideal", modulation, 2.048e6)


@dataclass(frozen=True, slots=True)
class InstrumentFault:
    """A fault of an instrument while a unit is in the fixture, the first time it is loaded.

    Attributes:
        role: Whose.
        kind: ``hang`` (no more answers), ``die`` (connection dropped).
        header: The fault begins at the first message that holds this text.
        skip: How many such messages pass before.
    """

    role: str
    kind: str
    header: str
    skip: int = 0


@dataclass(frozen=True, slots=True)
class UnitTruth:
    """Hidden truth of one unit.

    Attributes:
        serial: Serial on its label.
        inner_serial: Serial it answers with.
        model: How its model works.
        firmware: Firmware it answers with.
        carrier_dbm: Carrier power at the node, dBm.
        carrier_step_db: Change of the carrier that comes during the first run, dB.
        loss_db: Flat implementation loss, dB.
        phase_rad: Static carrier phase error, rad.
        jitter_rad: Standard deviation of the carrier phase, rad.
        jitter_bandwidth_hz: Bandwidth of the loop that makes it, Hz.
        gain: I/Q gain imbalance: rails sqrt(1 + gain) and sqrt(1 - gain).
        skew_rad: Quadrature skew, rad.
        floor_ber: Errors that no Eb/N0 takes away.
        current_a: Supply current, A.
        answers: Whether it answers its port.
        locks: Whether its receiver locks.
        lock_s: Time to lock, s.
        fault: An instrument's fault while it is loaded.
    """

    serial: str
    inner_serial: str
    model: ModelTruth
    firmware: str = GOOD_FIRMWARE
    carrier_dbm: float = -20.0
    carrier_step_db: float = 0.0
    loss_db: float = 0.0
    phase_rad: float = 0.0
    jitter_rad: float = 0.0
    jitter_bandwidth_hz: float = 2.0e4
    gain: float = 0.0
    skew_rad: float = 0.0
    floor_ber: float = 0.0
    current_a: float = 0.55
    answers: bool = True
    locks: bool = True
    lock_s: float = 0.03
    fault: InstrumentFault | None = None


@dataclass(frozen=True, slots=True)
class Planted:
    """One unit of the demo lot.

    Attributes:
        serial: Its serial.
        reason: What is planted.
        expected: ``PASS``, ``FAIL``, ``VOID``, or ``EITHER`` for a unit between good and bad.
    """

    serial: str
    reason: str
    expected: str


_GOOD = "good: {loss:.2f} dB loss"
# Serial number, change to a good unit, what it is, what it must come to. Sizes of the impairments cost at least
# 1.3 dB at some step of the model's sheet; a test computes that by quadrature.
_LOT: dict[int, tuple[dict[str, object], str, str]] = {
    104: ({"loss_db": 0.7}, "between good and bad: 0.70 dB loss", "EITHER"),
    105: ({"loss_db": 1.5}, "flat loss 1.5 dB", "FAIL"),
    106: ({"firmware": OLD_FIRMWARE}, "old firmware", "FAIL"),
    108: ({"phase_rad": 0.30}, "static carrier phase error 17 degrees", "FAIL"),
    109: ({"fault": InstrumentFault("power_meter", "hang", "READ:POW")}, "power meter hangs", "VOID"),
    110: ({"jitter_rad": 0.17, "jitter_bandwidth_hz": 5.0e3}, "slow phase jitter", "FAIL"),
    112: ({"answers": False, "current_a": 0.0}, "dead: draws no current", "FAIL"),
    113: ({"gain": 0.55}, "I/Q gain imbalance", "FAIL"),
    115: ({"locks": False}, "receiver does not lock", "FAIL"),
    116: ({"carrier_step_db": -0.5}, "carrier drops 0.5 dB during the run", "VOID"),
    117: ({"loss_db": 0.7}, "between good and bad: 0.70 dB loss", "EITHER"),
    118: ({"floor_ber": 3.0e-4}, "residual error floor", "FAIL"),
    119: ({"inner_serial": "BQ4-000911"}, "wrong label", "VOID"),
    120: ({"current_a": 0.93}, "draws too much current", "FAIL"),
    121: ({"jitter_rad": 0.17, "jitter_bandwidth_hz": 2.0e3}, "slow phase jitter", "FAIL"),
    122: (
        {"fault": InstrumentFault("unit_port", "die", "COUN:UNT", 12)},
        "port drops its connection in a step",
        "VOID",
    ),
}
LOT_SERIALS = tuple(f"BQ4-{number:06d}" for number in range(101, 125))


def unit_truth(serial: str) -> UnitTruth | None:
    """The unit behind a serial.

    Args:
        serial: Serial on the label.

    Returns:
        Its truth, or None where the bench has no such unit.
    """
    head, _, digits = serial.partition("-")
    if head not in MODELS or len(digits) != 6 or not (digits.isascii() and digits.isdigit()):
        return None
    rng = np.random.default_rng([zlib.crc32(serial.encode("ascii")), 2])
    good = UnitTruth(
        serial=serial,
        inner_serial=serial,
        model=MODELS[head],
        carrier_dbm=-20.0 + float(np.clip(0.3 * rng.standard_normal(), -0.8, 0.8)),
        loss_db=float(rng.uniform(0.02, 0.20)),
        jitter_rad=0.02,
        current_a=float(0.55 + 0.01 * rng.standard_normal()),
        lock_s=float(rng.uniform(0.01, 0.05)),
    )
    if serial not in LOT_SERIALS:
        return good
    change = _LOT.get(int(digits), ({}, "", ""))[0]
    return replace(good, **change)  # type: ignore[arg-type]  # the table's keys are fields of the class


def demo_lot() -> tuple[Planted, ...]:
    """The demo lot in its order.

    Returns:
        24 units with what is planted in each and what it must come to.
    """
    planted = []
    for serial in LOT_SERIALS:
        _, reason, expected = _LOT.get(int(serial[-6:]), ({}, "", ""))
        truth = unit_truth(serial)
        if not reason and truth is not None:
            reason, expected = _GOOD.format(loss=truth.loss_db), "PASS"
        planted.append(Planted(serial, reason, expected))
    return tuple(planted)
