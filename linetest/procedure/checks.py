"""The checks of a procedure that come before the bit error steps: identity, supply, carrier, lock.

Each measures with the station's roles, yields what it read, and ends with a judgement. A unit that does not
answer is judged; an instrument that does not answer raises, and the sequencer makes that a VOID.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from linetest.errors import StationError
from linetest.instruments import Station
from linetest.limits import LimitSheet
from linetest.noise import CarrierReading, NoiseCalibration, read_carrier
from linetest.procedure.clock import Clock
from linetest.procedure.events import CheckStarted, Event, Judged, Judgement, ReadingTaken

POLL_S = 0.02


class WrongUnitError(StationError):
    """The unit in the fixture is not the one that was scanned: nothing may be recorded against the scan."""


@dataclass(frozen=True, slots=True)
class Bay:
    """What every check works with: the station, the sheet, the clock and the serial scanned."""

    station: Station
    sheet: LimitSheet
    calibration: NoiseCalibration
    clock: Clock
    serial: str

    def reading(
        self,
        check: str,
        name: str,
        value: float | str,
        unit: str,
        *,
        standard_uncertainty: float | None = None,
        lower: float | None = None,
        upper: float | None = None,
    ) -> ReadingTaken:
        """A reading, stamped with the time now."""
        return ReadingTaken(check, name, value, unit, self.clock.now(), standard_uncertainty, lower, upper)

    def judged(self, check: str, accepted: bool, sentence: str) -> Judged:
        """A judgement of a check without steps, stamped with the time now."""
        judgement = Judgement.ACCEPT if accepted else Judgement.REJECT
        return Judged(check, None, judgement, sentence, self.clock.now())

    def started(self, check: str) -> CheckStarted:
        """The start of a check, stamped with the time now."""
        return CheckStarted(check, self.clock.now())


def check_supply(bay: Bay) -> Iterator[Event]:
    """Power the unit and judge its supply current.

    Args:
        bay: What the check works with.

    Yields:
        Readings of voltage and current, and the judgement.
    """
    limits = bay.sheet.procedure.supply
    supply = bay.station.supply
    yield bay.started("supply")
    supply.set_voltage_v(limits.voltage_v)
    supply.set_current_limit_a(limits.current_limit_a)
    supply.output_on()
    bay.clock.sleep_s(limits.settle_s)
    yield bay.reading("supply", "voltage", supply.read_voltage_v(), "V")
    current_a = supply.read_current_a()
    yield bay.reading("supply", "current", current_a, "A", lower=limits.min_current_a, upper=limits.max_current_a)
    if current_a < limits.min_current_a:
        sentence = f"the unit draws {current_a:.3f} A, less than {limits.min_current_a:.3f} A: open, or dead"
    elif current_a > limits.max_current_a:
        sentence = f"the unit draws {current_a:.3f} A, more than {limits.max_current_a:.3f} A"
    else:
        sentence = f"supply current {current_a:.3f} A is within its limits"
    yield bay.judged("supply", limits.min_current_a <= current_a <= limits.max_current_a, sentence)


def check_identity(bay: Bay) -> Iterator[Event]:
    """Read serial and firmware back from the unit and compare them with the scan and the sheet.

    Args:
        bay: What the check works with.

    Yields:
        What was read back, and the judgement.

    Raises:
        WrongUnitError: Another unit answers than the one scanned.
    """
    yield bay.started("identity")
    answer = bay.station.unit_port.read_identity()
    if not answer.serial:
        yield bay.judged("identity", False, "the unit does not answer its identity query")
        return
    yield bay.reading("identity", "model", answer.model, "")
    yield bay.reading("identity", "serial", answer.serial, "")
    yield bay.reading("identity", "firmware", answer.firmware, "")
    if (answer.serial, answer.model) != (bay.serial, bay.sheet.model):
        raise WrongUnitError(
            f"{bay.serial} was scanned, but the fixture holds {answer.model} {answer.serial}: "
            "check label and unit, then scan again"
        )
    known = answer.firmware in bay.sheet.firmware
    allowed = ", ".join(bay.sheet.firmware)
    sentence = f"firmware {answer.firmware} is {'one of' if known else 'not one of'} those allowed: {allowed}"
    yield bay.judged("identity", known, sentence)


def check_carrier(bay: Bay, kept: list[CarrierReading]) -> Iterator[Event]:
    """Read the unit's carrier with the noise off and judge its level.

    Args:
        bay: What the check works with.
        kept: Receives the reading: the steps need it to set Eb/N0.

    Yields:
        The reading with its uncertainty, and the judgement.
    """
    limits = bay.sheet.procedure.carrier
    yield bay.started("carrier")
    bay.station.unit_port.set_mode(limits.mode)
    bay.station.noise_source.output_off()
    bay.station.unit_port.carrier_on()
    carrier = read_carrier(bay.station, bay.calibration, now=bay.clock.now, sleep_s=bay.clock.sleep_s)
    kept.append(carrier)
    level = carrier.power_dbm
    yield bay.reading(
        "carrier",
        "carrier power before",
        level,
        "dBm",
        standard_uncertainty=carrier.u_db,
        lower=limits.min_dbm,
        upper=limits.max_dbm,
    )
    within = limits.min_dbm <= level <= limits.max_dbm
    bounds = f"{limits.min_dbm:g} to {limits.max_dbm:g} dBm"
    yield bay.judged(
        "carrier", within, f"carrier power {level:.2f} dBm is {'within' if within else 'outside'} {bounds}"
    )


def check_lock(bay: Bay) -> Iterator[Event]:
    """Wait for the unit's receiver to lock to the carrier in noise.

    Args:
        bay: What the check works with; noise and attenuator stand at the first step's setting.

    Yields:
        The time to lock, and the judgement.
    """
    limits = bay.sheet.procedure.lock
    yield bay.started("lock")
    began_s = bay.clock.monotonic_s()
    while not bay.station.unit_port.is_locked():
        if bay.clock.monotonic_s() - began_s > limits.timeout_s:
            yield bay.judged("lock", False, f"the receiver did not lock within {limits.timeout_s:g} s")
            return
        bay.clock.sleep_s(POLL_S)
    took_s = bay.clock.monotonic_s() - began_s
    yield bay.reading("lock", "time to lock", took_s, "s", upper=limits.timeout_s)
    yield bay.judged("lock", True, f"the receiver locked after {took_s:.2f} s")
