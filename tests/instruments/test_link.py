"""A link over a real socket: every fault has its error in bounded time, and an old answer is never a new one."""

from __future__ import annotations

import threading
import time
from collections.abc import Iterator
from dataclasses import replace

import pytest
from pyvisa import errors as visa_errors
from pyvisa.constants import StatusCode

from linetest.errors import (
    InstrumentError,
    LinkAborted,
    LinkError,
    LinkGarbled,
    LinkLost,
    LinkTimeout,
)
from linetest.instruments import Attenuator, Link, StationLibrary, load_dialect
from linetest.instruments.translate import FOREIGN, translated
from tests.instruments.faulty_server import IDENTITY, FaultyServer

DIALECT = replace(load_dialect("scpi-attenuator"), timeout_ms=200, open_timeout_ms=500)


@pytest.fixture
def server() -> Iterator[FaultyServer]:
    with FaultyServer() as running:
        yield running


@pytest.fixture
def library() -> StationLibrary:
    return StationLibrary.create(fallback=None)


@pytest.fixture
def attenuator(server: FaultyServer, library: StationLibrary) -> Iterator[Attenuator]:
    link = Link(server.resource, DIALECT, library, expected_identity=IDENTITY.replace(".", r"\."))
    link.open()
    yield Attenuator(link)
    link.close()


@pytest.mark.parametrize(
    ("fault", "error"),
    [
        ("killed", LinkLost),
        ("hang", LinkTimeout),
        ("late", LinkTimeout),
        ("half", LinkTimeout),
        ("garbage", LinkGarbled),
        ("words", LinkGarbled),
        ("blank", LinkGarbled),
        ("not a number", LinkGarbled),
        ("endless", LinkGarbled),
        ("babble", LinkGarbled),
    ],
)
def test_a_fault_has_its_error_in_bounded_time_and_the_next_answer_is_new(
    server: FaultyServer, attenuator: Attenuator, fault: str, error: type[LinkError]
) -> None:
    server.fault = fault
    began_s = time.monotonic()
    with pytest.raises(error):
        attenuator.read_attenuation_db()
    assert time.monotonic() - began_s < 4.0
    assert attenuator.read_attenuation_db() == 20.0
    assert attenuator.read_attenuation_db() == 20.0


@pytest.mark.parametrize("fault", ["twice", "carriage return"])
def test_what_does_no_harm_is_read_and_what_follows_is_new(
    server: FaultyServer, attenuator: Attenuator, fault: str
) -> None:
    server.fault = fault
    assert attenuator.read_attenuation_db() == 20.0
    time.sleep(0.05)
    assert attenuator.read_attenuation_db() == 20.0


def test_a_rejected_command_is_named_with_the_instruments_own_error(attenuator: Attenuator) -> None:
    with pytest.raises(InstrumentError, match="-113 Undefined header") as caught:
        attenuator.link.ask("BLAH?")
    assert caught.value.command == "BLAH?"
    with pytest.raises(InstrumentError, match="-113"):
        attenuator.link.tell("BLAH 1")


@pytest.mark.parametrize("fault", ["killed at setting", "killed"])
def test_a_setter_is_never_said_twice(server: FaultyServer, attenuator: Attenuator, fault: str) -> None:
    """Whether the connection dies while it is said or while it is read back."""
    server.fault = fault
    with pytest.raises(LinkLost):
        attenuator.set_attenuation_db(20.0)
    assert sum(text.startswith("INP:ATT 20") for text in server.heard) == 1


def test_another_instrument_behind_the_same_address_is_refused(server: FaultyServer, attenuator: Attenuator) -> None:
    server.fault = "killed"
    with pytest.raises(LinkLost):
        attenuator.read_attenuation_db()
    server.identity = "Brackwater Telemetry,AT-64,AT64-9999,1.0"
    with pytest.raises(LinkLost, match="another instrument answers"):
        attenuator.read_attenuation_db()


def test_a_link_whose_peer_did_not_say_who_it_is_is_not_used(server: FaultyServer, attenuator: Attenuator) -> None:
    server.fault = "killed"
    with pytest.raises(LinkLost):
        attenuator.read_attenuation_db()
    server.silent = {"*IDN?"}
    for _ in range(2):
        with pytest.raises(LinkTimeout):
            attenuator.read_attenuation_db()
    assert server.heard.count("INP:ATT?") == 1


def test_a_late_entry_of_the_error_queue_is_not_the_next_answer(attenuator: Attenuator) -> None:
    with pytest.raises(LinkTimeout):
        attenuator.link.tell("late reject")
    assert attenuator.read_attenuation_db() == 20.0


def test_a_cancel_from_another_thread_ends_a_wait(
    server: FaultyServer, attenuator: Attenuator, library: StationLibrary
) -> None:
    server.fault = "hang"
    threading.Timer(0.1, library.cancel.set).start()
    began_s = time.monotonic()
    with pytest.raises(LinkAborted):
        attenuator.link.ask("INP:ATT?", timeout_ms=5000)
    assert time.monotonic() - began_s < 1.0


def test_a_refused_port_is_lost_at_once(library: StationLibrary) -> None:
    with pytest.raises(LinkLost, match="nothing answers there"):
        Link("TCPIP0::127.0.0.1::1::SOCKET", DIALECT, library).open()


def test_a_resource_without_a_library_says_what_to_install(library: StationLibrary) -> None:
    with pytest.raises(LinkLost, match="install linetest with 'network-visa'"):
        Link("GPIB0::5::INSTR", DIALECT, library).open()


def test_queries_through_many_links_leave_no_session_behind(server: FaultyServer, library: StationLibrary) -> None:
    for _ in range(50):
        link = Link(server.resource, DIALECT, library)
        link.open()
        link.close()
    assert len(library.sessions) <= 1


@pytest.mark.parametrize("status", [status for status in StatusCode if status < 0])
def test_every_error_that_visa_defines_becomes_ours(status: StatusCode) -> None:
    assert isinstance(translated(visa_errors.VisaIOError(status), "R", "C"), LinkError)


def test_an_error_number_that_only_a_maker_knows_becomes_ours() -> None:
    assert isinstance(translated(visa_errors.VisaIOError(-1), "R", "C"), LinkLost)


@pytest.mark.parametrize("kind", FOREIGN)
def test_every_foreign_error_becomes_ours(kind: type[Exception]) -> None:
    reason = UnicodeDecodeError("ascii", b"\xff", 0, 1, "no") if kind is UnicodeDecodeError else kind("why")
    assert isinstance(translated(reason, "R", "C"), LinkError)
