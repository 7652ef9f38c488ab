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
