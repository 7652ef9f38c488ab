"""A run's record of the demo world, as the store would hand it out; every number is made up, but consistent."""

from __future__ import annotations

from dataclasses import replace
from datetime import UTC, datetime, timedelta
from typing import Any

from linetest.decision import interval
from linetest.records import (
    CalibrationRecord,
    InstrumentRecord,
    JudgementRecord,
    ReadingRecord,
    RunRecord,
    StepCountRecord,
)
from linetest.theory import bit_error_rate

BEGAN = datetime(2026, 3, 2, 9, 14, 5, tzinfo=UTC)
STEPS = (
    (6.8, 6.79, 22_528, 21, 25.25),
    (8.4, 8.43, 126_976, 15, 23.5),
    (9.6, 9.58, 833_536, 15, 22.5),
    (10.5, 10.52, 4_489_216, 0, 21.5),
)
ROLES = ("noise_source", "attenuator", "power_meter", "supply", "unit_port")


def step_facts(nominal_db: float, ebn0_db: float, bits: int, errors: int, attenuation_db: float) -> dict[str, Any]:
    """Facts of a step of BW-Q4 with margin 1 dB, as the procedure keeps them."""
    low, high = interval(bits, errors)
    return {
        "nominal_ebn0_db": nominal_db,
        "ebn0_db": ebn0_db,
        "u_db": 0.058,
        "k": 1.98,
        "expanded_u_db": 0.115,
        "scheme": "qpsk",
        "mode": "qpsk-2048k",
        "bit_rate_bps": 2_048_000.0,
        "pattern": "prbs15",
        "bits": bits,
        "errors": errors,
        "lost_bits": 0,
        "counted_ber": errors / bits,
        "ber": 1.02 * errors / bits,
        "interval_low": low,
        "interval_high": high,
        "interval_level": 0.95,
        "theory_ber": bit_error_rate("qpsk", ebn0_db),
        "limit_ber": bit_error_rate("qpsk", ebn0_db - 1.0),
        "guarded_limit_ber": bit_error_rate("qpsk", ebn0_db - 0.968),
        "design_ber": bit_error_rate("qpsk", ebn0_db - 0.5),
        "margin_db": 1.0,
        "design_loss_db": 0.5,
        "guard_consumer_db": 0.032,
        "guard_producer_db": 0.021,
        "guard_rule": "least",
        "producer_risk": 0.0018,
        "consumer_risk": 0.0049,
        "averaged_producer_risk": 0.0025,
        "averaged_consumer_risk": 0.0099,
        "plan": "{}",
        "burst_weights": [[1, 1.0]],
        "seconds": bits / 2_048_000.0,
        "implementation_loss_db": 0.31 if errors else None,
        "attenuation_db": attenuation_db,
        "carrier_dbm": -20.13,
    }


def passed_run(**changes: Any) -> RunRecord:
    """A run of BQ4-000123 that passed, with any field replaced."""
    judgements = [
        JudgementRecord("supply", None, "ACCEPT", "supply current 0.553 A is within its limits"),
        JudgementRecord("identity", None, "ACCEPT", "firmware 2.4.1 is one of those allowed: 2.4.0, 2.4.1"),
        JudgementRecord("carrier", None, "ACCEPT", "carrier power -20.13 dBm is within -22 to -18 dBm"),
        JudgementRecord("lock", None, "ACCEPT", "the receiver locked after 0.08 s"),
        *(
            JudgementRecord("ber", number, "ACCEPT", "shown inside the guarded limit", step_facts(*step))
            for number, step in enumerate(STEPS, start=1)
        ),
        JudgementRecord(
            "carrier drift", None, "ACCEPT", "carrier moved by 0.01 dB during the run, at most 0.1 dB allowed"
        ),
    ]
    run = RunRecord(
        run_id="0197f3b2c4d8",
        serial="BQ4-000123",
        model="BW-Q4",
        lot="L2601",
        station="A1",
        operator="M. Okafor",
        started_at=BEGAN,
        ended_at=BEGAN + timedelta(seconds=5),
        disposition="PASS",
        cause="",
        sentence="every check accepted",
        firmware="2.4.1",
        sheet_revision="3",
        sheet_digest="5f2d" * 16,
        software_version="0.1.0",
        instruments=tuple(
            InstrumentRecord(
                role,
                f"BRACKWATER,SIM-{number}00,{number}4711,1.0",
                f"{number}4711",
                "" if role == "unit_port" else "2026-08-31",
                "" if role == "unit_port" else f"CAL-2025-0{number}17",
                f"dialect-{number}",
                f"{number}a9c" * 16,
            )
            for number, role in enumerate(ROLES, start=1)
        ),
        calibration=CalibrationRecord(
            "cal-0197f3a1", BEGAN - timedelta(hours=2), BEGAN + timedelta(hours=10), "77e0" * 16, 10.0e6
        ),
        readings=tuple(_readings()),
        judgements=tuple(judgements),
        step_counts=tuple(
            StepCountRecord("ber", number, step[1], step[2], step[3]) for number, step in enumerate(STEPS, 1)
        ),
    )
    return replace(run, **changes)


def failed_run(**changes: Any) -> RunRecord:
    """A run that failed at its third step."""
    run = passed_run()
    kept = run.judgements[:6]
    facts = step_facts(9.6, 9.58, 101_000, 14, 22.5)
    rejected = JudgementRecord(
        "ber", 3, "REJECT", "14 errors in 101000 bits, not shown inside the guarded limit", facts
    )
    failed = replace(
        run,
        disposition="FAIL",
        cause="ber",
        sentence="ber step 3: 14 errors in 101000 bits, not shown inside the guarded limit",
        judgements=(*kept, rejected),
        readings=tuple(reading for reading in run.readings if not reading.name.startswith(("step 3", "step 4"))),
    )
    return replace(failed, **changes)


def _readings() -> list[ReadingRecord]:
    def reading(check: str, name: str, value: float | str, unit: str, *more: float | None) -> ReadingRecord:
        u, lower, upper = (*more, None, None, None)[:3]
        return ReadingRecord(check, name, value, unit, u, lower, upper, BEGAN)

    taken = [
        reading("supply", "voltage", 12.004, "V"),
        reading("supply", "current", 0.5531, "A", None, 0.4, 0.7),
        reading("identity", "model", "BW-Q4", ""),
        reading("identity", "serial", "BQ4-000123", ""),
        reading("identity", "firmware", "2.4.1", ""),
        reading("carrier", "carrier power before", -20.13172, "dBm", 0.1204, -22.0, -18.0),
        reading("lock", "time to lock", 0.08, "s", None, None, 2.0),
    ]
    for number, (_, ebn0_db, bits, errors, attenuation_db) in enumerate(STEPS, start=1):
        taken += [
            reading("ber", f"step {number} attenuation", attenuation_db, "dB"),
            reading("ber", f"step {number} Eb/N0", ebn0_db, "dB", 0.058),
            reading("ber", f"step {number} bits", float(bits), "bit"),
            reading("ber", f"step {number} errors", float(errors), "bit"),
        ]
    return [*taken, reading("carrier drift", "carrier power after", -20.1421, "dBm", 0.1204)]
