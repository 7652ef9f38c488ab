"""One unit from scan to disposition: each planted truth of the bench ends in the disposition that it must."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from linetest.bench import demo_lot
from linetest.errors import LinkTimeout
from linetest.noise import CarrierReading, EbN0Setting, NoiseCalibration, set_ebn0
from linetest.procedure import Disposition, Judged, Judgement, ReadingTaken, RunEnded, RunOrder, RunStarted, StepStarted
from linetest.procedure.sequencer import conclude, run_unit
from linetest.units import ebn0_db
from tests.world import START, World

LOT = {planted.serial: planted for planted in demo_lot()}


@pytest.fixture(scope="module")
def world(tmp_path_factory: pytest.TempPathFactory) -> World:
    return World(tmp_path_factory.mktemp("world"))


@pytest.mark.parametrize("serial", [s for s, planted in LOT.items() if planted.expected != "EITHER"])
def test_every_planted_truth_ends_in_its_disposition(world: World, serial: str) -> None:
    ended, _ = world.run(serial)
    assert ended.disposition == LOT[serial].expected, f"{LOT[serial].reason}: {ended.sentence}"
    assert not ended.unsafe
    assert world.is_dark()


@pytest.mark.parametrize(
    ("serial", "cause"),
    [
        ("BQ4-000106", "identity"),
        ("BQ4-000112", "supply"),
        ("BQ4-000115", "lock"),
        ("BQ4-000105", "ber"),
        ("BQ4-000119", "wrong unit"),
    ],
)
def test_the_cause_names_the_check_or_the_trouble(world: World, serial: str, cause: str) -> None:
    ended, _ = world.run(serial)
    assert ended.cause == cause


def test_an_instrument_that_hangs_voids_the_run_and_the_next_unit_works(tmp_path: Path) -> None:
    fresh = World(tmp_path, seed=2)
    ended, _ = fresh.run("BQ4-000109")
    assert (ended.disposition, ended.cause) == (Disposition.VOID, "instrument fault: power meter")
    again, _ = fresh.run("BQ4-000109")
    assert again.disposition is Disposition.PASS


def test_events_come_in_order_and_steps_hold_the_eb_n0_really_set(world: World) -> None:
    ended, events = world.run("BQ4-000101")
    assert ended.disposition is Disposition.PASS
    assert isinstance(events[0], RunStarted)
    assert isinstance(events[-1], RunEnded)
    checks = [event.check for event in events if isinstance(event, Judged)]
    assert checks == ["supply", "identity", "carrier", "lock", "ber", "ber", "ber", "ber"]
    steps = [event for event in events if isinstance(event, StepStarted)]
    nominal = [step.nominal_ebn0_db for step in steps]
    assert nominal == list(world.limits.procedure.ber[0].steps)
    unit = world.bench.unit
    assert unit is not None
    judged = [event for event in events if isinstance(event, Judged) and event.step is not None]
    for step, judgement in zip(steps, judged, strict=True):
        truth_db = ebn0_db(
            unit.carrier_dbm,
            world.bench.truth.n0_dbm_hz(judgement.facts["attenuation_db"]),
            unit.model.bit_rate_bps,
        )
        # Four standard uncertainties: a bench beyond them would be one in 16 000.
        assert abs(step.ebn0_db - truth_db) < 4.0 * step.u_db
        assert judgement.facts["interval_low"] <= judgement.facts["ber"] <= judgement.facts["interval_high"]
        assert judgement.facts["interval_high"] < judgement.facts["limit_ber"]


def test_the_carrier_is_read_before_the_first_and_after_the_last_step(world: World) -> None:
    _, events = world.run("BQ4-000102")
    names = [event.name for event in events if isinstance(event, ReadingTaken) and event.check == "carrier"]
    assert names == ["carrier power before", "carrier power after", "carrier change"]


def test_the_change_of_the_carrier_that_a_run_allows_is_in_the_uncertainty(
    world: World, monkeypatch: pytest.MonkeyPatch
) -> None:
    """GUM 4.3.7: a quantity known only to lie within half width a has standard uncertainty a/sqrt(3)."""
    carriers: list[CarrierReading] = []

    def noted(calibration: NoiseCalibration, carrier: CarrierReading, *rest: Any, **more: Any) -> EbN0Setting:
        carriers.append(carrier)
        return set_ebn0(calibration, carrier, *rest, **more)

    monkeypatch.setattr("linetest.procedure.steps.set_ebn0", noted)
    _, events = world.run("BQ4-000103")
    (step, *_) = [event for event in events if isinstance(event, StepStarted)]
    still = set_ebn0(world.calibration, carriers[0], 2.048e6, step.nominal_ebn0_db)
    allowed_db = world.limits.procedure.carrier.max_change_db
    assert step.u_db**2 - still.u_db**2 == pytest.approx(allowed_db**2 / 3.0, rel=1e-6)


def test_a_listener_that_fails_leaves_the_station_safe(world: World) -> None:
    def fails_at_first_step(event: object) -> None:
        if isinstance(event, StepStarted):
            raise RuntimeError("listener")

    with pytest.raises(RuntimeError, match="listener"):
        run_unit(world.sequencer(), RunOrder("BQ4-000101"), [fails_at_first_step])
    assert world.is_dark()


def test_a_fault_of_the_program_is_recorded_void_safe_and_raised(world: World, monkeypatch: pytest.MonkeyPatch) -> None:
    def broken(*_: object, **__: object) -> None:
        raise ZeroDivisionError

    monkeypatch.setattr("linetest.procedure.steps.derive_step", broken)
    events: list[object] = []
    with pytest.raises(ZeroDivisionError):
        run_unit(world.sequencer(), RunOrder("BQ4-000101"), [events.append])
    ended = events[-1]
    assert isinstance(ended, RunEnded)
    assert (ended.disposition, ended.cause) == (Disposition.VOID, "program fault")
    assert world.is_dark()


def test_an_output_that_cannot_be_switched_off_is_said(world: World, monkeypatch: pytest.MonkeyPatch) -> None:
    def deaf() -> None:
        raise LinkTimeout("TCPIP0::x::1::SOCKET", "OUTP OFF", "no answer in time")

    monkeypatch.setattr(world.station.supply, "output_off", deaf)
    ended, _ = world.run("BQ4-000101")
    assert (ended.disposition, ended.cause) == (Disposition.VOID, "safe state")
    assert "no answer" in ended.unsafe["supply"]


def _judged(*judgements: Judgement) -> Iterator[Judged]:
    for judgement in judgements:
        yield Judged("ber", None, judgement, "why", START)


def test_reject_outweighs_undecided_and_undecided_outweighs_accept() -> None:
    accept, reject, undecided = Judgement.ACCEPT, Judgement.REJECT, Judgement.UNDECIDED
    assert conclude(list(_judged(accept, undecided, reject))).disposition is Disposition.FAIL
    assert conclude(list(_judged(accept, undecided))).disposition is Disposition.HOLD
    assert conclude(list(_judged(accept, accept))).disposition is Disposition.PASS
