"""IEEE 488.2 messages and SCPI headers (error numbers of SCPI-1999, volume 2; from memory)."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from linetest.bench import Bench


def _say(role: str, *messages: str) -> str:
    conversation = Bench(seed=1).devices[role].connect()
    for message in messages:
        conversation.feed(message.encode("latin-1") + b"\n")
    answers = b""
    while conversation.pending():
        answers += conversation.take(1 << 16)[0]
    return answers.decode("latin-1")


@pytest.mark.parametrize("header", ["INP:ATT", "INPut:ATTenuation", ":inp:attenuation", "INPUT:ATT"])
def test_short_and_long_forms_in_any_case_are_one_command(header: str) -> None:
    assert _say("attenuator", f"{header} 20.25", f"{header}?") == "20.25\n"


@pytest.mark.parametrize(
    ("message", "number"),
    [
        ("INPU:ATT 3", -113),
        ("INP:ATT", -109),
        ("INP:ATT 3,4", -108),
        ("INP:ATT 99", -222),
        ("INP:ATT 3.1", -222),
        ("INP:ATT loud", -104),
        ("*ESE 999", -222),
        ("INP:ATT 1e999", -222),
        ("INP:ATT 5;INP:ATT?", -113),
    ],
)
def test_what_cannot_be_obeyed_is_reported_by_its_number(message: str, number: int) -> None:
    assert _say("attenuator", message, "SYST:ERR?").startswith(f"{number},")
    assert _say("attenuator", message, "SYST:ERR?", "SYST:ERR?").endswith('0,"No error"\n')


def test_after_a_command_error_the_rest_of_the_message_is_dropped() -> None:
    assert _say("attenuator", "BLAH 1;:SYST:ERR?") == ""


def test_a_message_of_several_queries_has_one_answer() -> None:
    assert _say("attenuator", "*ESE 17;*ESE?;:INP:ATT?") == "17;63.75\n"


def test_the_error_queue_overflows_as_the_standard_says() -> None:
    said = _say("attenuator", *["BLAH"] * 20, *["SYST:ERR?"] * 17).splitlines()
    assert said[15].startswith("-350,")
    assert said[16] == '0,"No error"'


def test_power_on_and_command_errors_stand_in_the_event_register_once() -> None:
    assert _say("supply", "BLAH", "*ESR?", "*ESR?") == "160\n0\n"


@pytest.mark.parametrize("message", ["INP:ATT 5;ATT?", "INP:ATT 5;:INP:ATT?", "INP:ATT 5;*OPC;ATT?", "INP:ATT\t5;ATT?"])
def test_a_leading_colon_returns_to_the_root_and_without_it_the_path_carries_over(message: str) -> None:
    assert _say("attenuator", message) == "5.00\n"


def test_a_message_may_come_in_pieces() -> None:
    conversation = Bench(seed=1).devices["attenuator"].connect()
    for piece in (b"INP:A", b"TT 7.5;AT", b"T?", b"\n"):
        assert not conversation.pending()
        conversation.feed(piece)
    assert conversation.take(99) == (b"7.50\n", True)


def test_the_status_byte_shows_error_queue_and_event_summary() -> None:
    assert _say("supply", "*CLS", "*STB?") == "0\n"
    assert _say("supply", "*CLS", "BLAH", "*STB?") == "4\n"
    assert _say("supply", "*CLS", "*ESE 32", "*SRE 32", "BLAH", "*STB?") == "100\n"


@pytest.mark.parametrize("serial", ["BQ4-\xb2\xb2\xb2\xb2\xb2\xb2", "BQ4-12345", "", "nobody"])
def test_a_unit_that_the_handler_does_not_have_is_reported(serial: str) -> None:
    assert _say("unit_port", f'FIXT:LOAD "{serial}"', "SYST:ERR?").startswith("-241,")


HEADERS = ("FIXT:LOAD", "UNIT:MODE", "UNIT:CARR", "COUN:STAR", "COUN:UNT?", "COUN:STOP", "UNIT:IDEN?", "*ESE", "*RST")


@given(
    st.lists(st.tuples(st.sampled_from(HEADERS), st.text(st.characters(max_codepoint=255), max_size=12)), max_size=6)
)
@settings(max_examples=300, deadline=None)
def test_no_argument_of_a_real_header_crashes_the_parser(said: list[tuple[str, str]]) -> None:
    conversation = Bench(seed=1).devices["unit_port"].connect()
    for header, argument in said:
        conversation.feed(f"{header} {argument}".encode("latin-1") + b"\n")
    while conversation.pending():
        conversation.take(1 << 16)
    conversation.feed(b"\n*ESE 5;*ESE?\n")
    assert conversation.take(99) == (b"5\n", True)


@given(st.binary(max_size=200))
@settings(max_examples=300, deadline=None)
def test_no_bytes_crash_the_parser_and_it_still_answers(data: bytes) -> None:
    conversation = Bench(seed=1).devices["unit_port"].connect()
    conversation.feed(data + b"\n*CLS\n")
    while conversation.pending():
        conversation.take(1 << 16)
    conversation.feed(b"*ESE 5;*ESE?\n")
    assert conversation.take(99) == (b"5\n", True)


def test_nothing_of_the_truth_can_be_asked() -> None:
    for role, device in Bench(seed=1).devices.items():
        asked = " ".join(known.pattern.pattern for known in device.commands)
        assert "TRUTH" not in asked.upper(), role
        assert "LOSS" not in asked.upper(), role
