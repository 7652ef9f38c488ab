"""The sequencer: runs a unit's checks in order, yields events, ends safe whatever happens.

An instrument's trouble makes the run VOID, never the unit FAIL; a unit's trouble makes it FAIL, never VOID.
"""

from __future__ import annotations

import secrets
import threading
from collections.abc import Callable, Generator, Iterator, Sequence
from contextlib import closing
from dataclasses import dataclass
from datetime import datetime

from linetest import __version__
from linetest.errors import CalibrationError, LinetestError, LinkAborted, LinkError, StationError
from linetest.instruments import Station
from linetest.limits import LimitSheet
from linetest.noise import CarrierReading, NoiseCalibration, check_current, read_carrier
from linetest.procedure.checks import (
    Bay,
    WrongUnitError,
    check_carrier,
    check_identity,
    check_lock,
    check_supply,
)
from linetest.procedure.clock import Clock
from linetest.procedure.events import (
    Disposition,
    Event,
    InstrumentUsed,
    Judged,
    Judgement,
    RunEnded,
    RunStarted,
)
from linetest.procedure.steps import run_step, setting_for, tasks_of

Listener = Callable[[Event], None]


class StoppedError(StationError):
    """The operator, or a signal, stopped the run."""


class CarrierMovedError(StationError):
    """The carrier moved during the run by more than the sheet allows: Eb/N0 was not what was set."""


@dataclass(frozen=True, slots=True)
class RunOrder:
    """What is to be run.

    Attributes:
        serial: Serial as scanned.
        lot: Lot the unit belongs to, empty where unknown.
        operator: Who runs it, empty where unknown.
    """

    serial: str
    lot: str = ""
    operator: str = ""


@dataclass(frozen=True, slots=True)
class Ending:
    """How a run ends."""

    disposition: Disposition
    cause: str
    sentence: str


class Sequencer:
    """Runs units of one model on one station.

    Args:
        station: The open station.
        sheet: The model's limit sheet.
        calibration: The noise calibration in force.
        calibration_id: Its identity in the records.
        clock: Where time comes from.
        stop: Set from anywhere to stop the run at its next exchange.
    """

    def __init__(
        self,
        station: Station,
        sheet: LimitSheet,
        calibration: NoiseCalibration,
        *,
        calibration_id: str,
        clock: Clock,
        stop: threading.Event | None = None,
    ) -> None:
        self._station = station
        self._sheet = sheet
        self._calibration = calibration
        self._calibration_id = calibration_id
        self._clock = clock
        self._stop = stop or threading.Event()

    def run(self, order: RunOrder) -> Generator[Event, None, None]:
        """Run one unit.

        The station is made safe before the last event, and also when the caller abandons the iteration.

        Args:
            order: The unit.

        Yields:
            Everything that happens, from ``RunStarted`` to ``RunEnded``.
        """
        yield self._run_started(order)
        judgements: list[Judged] = []
        trouble: Exception | None = None
        safe = False
        try:
            for happening in self._checks(order):
                if isinstance(happening, Judged):
                    judgements.append(happening)
                yield happening
                self._heed_stop()
            ending = conclude(judgements)
        except LinetestError as reason:
            ending = self._void(reason)
        except Exception as reason:  # noqa: BLE001  (a fault of the program must still end safe and on record)
            trouble = reason
            ending = Ending(Disposition.VOID, "program fault", f"the program itself failed: {reason!r}")
        else:
            safe = True
        finally:
            # Reached on every way out, also when the listener failed and this generator is being closed.
            report = self._station.make_safe()
        unsafe = {role: why for role, why in report.items() if why}
        if safe and unsafe:
            first = "; ".join(f"{role}: {why}" for role, why in unsafe.items())
            ending = Ending(Disposition.VOID, "safe state", f"the station could not be made safe ({first})")
        yield RunEnded(ending.disposition, ending.cause, ending.sentence, unsafe, self._clock.now())
        if trouble is not None:
            raise trouble

    def _run_started(self, order: RunOrder) -> RunStarted:
        at = self._clock.now()
        return RunStarted(
            run_id=new_run_id(at),
            serial=order.serial,
            model=self._sheet.model,
            lot=order.lot,
            station=self._station.sheet.name,
            operator=order.operator,
            at=at,
            sheet_revision=self._sheet.revision,
            sheet_digest=self._sheet.digest,
            software_version=__version__,
            calibration_id=self._calibration_id,
            instruments=instruments_used(self._station),
        )

    def _checks(self, order: RunOrder) -> Iterator[Event]:
        bay = Bay(self._station, self._sheet, self._calibration, self._clock, order.serial)
        check_current(self._calibration, self._station, now=self._clock.now())
        self._station.unit_port.load_unit(order.serial)
        for check in (check_supply, check_identity):
            if (yield from _rejected(check(bay))):
                return
        carriers: list[CarrierReading] = []
        if (yield from _rejected(check_carrier(bay, carriers))):
            return
        yield from self._ber_checks(bay, carriers[0])
        yield from self._carrier_again(bay, carriers[0])

    def _ber_checks(self, bay: Bay, carrier: CarrierReading) -> Iterator[Event]:
        locked = False
        for check in self._sheet.procedure.ber:
            self._station.unit_port.set_mode(check.mode)
            for task in tasks_of(check):
                if not locked:
                    first = setting_for(bay, task, carrier)
                    self._station.attenuator.set_attenuation_db(first.attenuation_db)
                    self._station.noise_source.output_on()
                    if (yield from _rejected(check_lock(bay))):
                        return
                    locked = True
                if (yield from _rejected(run_step(bay, task, carrier))) and check.stop_at_first_reject:
                    return

    def _carrier_again(self, bay: Bay, before: CarrierReading) -> Iterator[Event]:
        """Read the carrier once more: what was set holds only if the carrier stayed."""
        self._station.noise_source.output_off()
        after = read_carrier(self._station, self._calibration, now=self._clock.now, sleep_s=self._clock.sleep_s)
        allowed_db = self._sheet.procedure.carrier.max_change_db
        change_db = after.power_dbm - before.power_dbm
        yield bay.reading("carrier", "carrier power after", after.power_dbm, "dBm", standard_uncertainty=after.u_db)
        yield bay.reading("carrier", "carrier change", change_db, "dB", lower=-allowed_db, upper=allowed_db)
        if abs(change_db) > allowed_db:
            raise CarrierMovedError(
                f"the carrier moved by {change_db:+.2f} dB during the run (allowed: {allowed_db:g} dB), so Eb/N0 "
                "was not what was set: let the unit warm up, check the connectors, test again"
            )

    def _heed_stop(self) -> None:
        if self._stop.is_set():
            raise StoppedError("stopped by the operator or by a signal: test the unit again")

    def _void(self, reason: LinetestError) -> Ending:
        if self._stop.is_set() and isinstance(reason, (LinkAborted, StoppedError)):
            return Ending(Disposition.VOID, "stopped", "stopped by the operator or by a signal: test the unit again")
        return Ending(Disposition.VOID, _cause(reason, self._station), str(reason))


def _rejected(happenings: Iterator[Event]) -> Generator[Event, None, bool]:
    """Pass a check's events on; return whether it rejected the unit."""
    rejected = False
    for happening in happenings:
        if isinstance(happening, Judged) and happening.judgement is Judgement.REJECT:
            rejected = True
        yield happening
    return rejected


def conclude(judgements: Sequence[Judged]) -> Ending:
    """Disposition of a unit from its judgements.

    FAIL where any check rejects; else HOLD where any is undecided; else PASS.

    Args:
        judgements: All judgements of the run, at least one.

    Returns:
        Disposition, cause and sentence.
    """
    for wanted, disposition in (
        (Judgement.REJECT, Disposition.FAIL),
        (Judgement.UNDECIDED, Disposition.HOLD),
    ):
        for judged in judgements:
            if judged.judgement is wanted:
                where = judged.check if judged.step is None else f"{judged.check} step {judged.step}"
                return Ending(disposition, judged.check, f"{where}: {judged.sentence}")
    return Ending(Disposition.PASS, "", "every check accepts")


def _cause(reason: LinetestError, station: Station) -> str:
    match reason:
        case WrongUnitError():
            return "wrong unit"
        case CarrierMovedError():
            return "carrier moved"
        case CalibrationError():
            return "calibration"
        case LinkError():
            role = next((i.role for i in station.sheet.instruments if i.resource == reason.resource), "instrument")
            return f"instrument fault: {role.replace('_', ' ')}"
        case _:
            return "station"


def instruments_used(station: Station) -> tuple[InstrumentUsed, ...]:
    """The instruments of a station as they answered when it was opened.

    Args:
        station: The open station.

    Returns:
        One entry an instrument, in the sheet's order.
    """
    return tuple(
        InstrumentUsed(
            role=instrument.role,
            identity=station.identities[instrument.role],
            serial=instrument.serial,
            calibration_due=instrument.calibration_due.isoformat() if instrument.calibration_due else "",
            certificate=instrument.certificate,
            dialect=instrument.dialect,
            dialect_digest=station.dialect_digests[instrument.role],
        )
        for instrument in station.sheet.instruments
    )


def new_run_id(at: datetime) -> str:
    """A run's identity: when it began and a random part, so that stations never collide.

    Args:
        at: When the run begins, aware.

    Returns:
        Text that sorts by time.
    """
    return f"{at:%Y%m%dT%H%M%S}-{secrets.token_hex(4)}"


def run_unit(sequencer: Sequencer, order: RunOrder, listeners: Sequence[Listener]) -> RunEnded:
    """Run one unit and hand each event to every listener, in their order.

    Args:
        sequencer: The sequencer.
        order: The unit.
        listeners: Who is told; records first, so that nothing is shown that is not kept.

    Returns:
        How the run ended.

    Raises:
        LinetestError: A listener could not do its work (the record, as a rule); the station is safe all the same.
    """
    ended: RunEnded | None = None
    with closing(sequencer.run(order)) as happenings:
        for happening in happenings:
            for listener in listeners:
                listener(happening)
            if isinstance(happening, RunEnded):
                ended = happening
    if ended is None:
        raise StationError("the run ended without a disposition")
    return ended
