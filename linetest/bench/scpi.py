"""A parser of IEEE 488.2 program messages with SCPI headers, one a connection, over shared device state.

Sources: IEEE 488.2 (common commands, status, message exchange), SCPI-1999 volumes 1 and 2 (headers, error numbers);
both from memory.
"""

from __future__ import annotations

import math
import re
import threading
from collections import deque
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from linetest.bench.units import InstrumentFault

NO_ERROR = (0, "No error")
QUEUE_LENGTH = 16
LARGEST_MESSAGE = 1 << 16

Handler = Callable[[Sequence[str]], str | None]


class ScpiError(Exception):
    """A command cannot be obeyed; carries its SCPI error number and text."""

    def __init__(self, number: int, text: str) -> None:
        self.number = number
        self.text = text
        super().__init__(f"{number} {text}")


class HangError(Exception):
    """The simulated instrument hangs: no answer will come."""


@dataclass(frozen=True, slots=True)
class Command:
    """One command or query of an instrument.

    Attributes:
        pattern: Matches its header in short and long form, without leading colon.
        arguments: How many arguments it takes.
        run: Does it; returns the answer of a query.
    """

    pattern: re.Pattern[str]
    arguments: int
    run: Handler


def command(header: str, arguments: int, run: Handler) -> Command:
    """A command from its header as manuals print it: capitals are the short form, brackets are optional.

    Args:
        header: Such as ``OUTPut[:STATe]?``.
        arguments: How many arguments it takes.
        run: Does it.

    Returns:
        The command.
    """
    text = ""
    for part in re.findall(r"\[|\]|:|\?|\*?[A-Za-z]+", header):
        if part == "[":
            text += "(?:"
        elif part == "]":
            text += ")?"
        elif part in {":", "?"}:
            text += re.escape(part)
        else:
            short = "".join(letter for letter in part if not letter.islower())
            rest = part[len(short) :]
            text += re.escape(short) + (f"(?:{rest.upper()})?" if rest else "")
    return Command(re.compile(text, re.IGNORECASE), arguments, run)


class Instrument:
    """A simulated instrument: identity, commands, hooks for faults.

    Args:
        identity: Answer to ``*IDN?``.
        reset: What ``*RST`` does.
        lock: Held while a command runs; a command that waits gives it free meanwhile.
    """

    def __init__(self, identity: str, reset: Callable[[], None], lock: threading.Condition) -> None:
        self.identity = identity
        self.reset = reset
        self.lock = lock
        self.commands: list[Command] = []
        self._fault: InstrumentFault | None = None
        self._passes = 0
        self._hung = False

    def add(self, header: str, arguments: int, run: Handler) -> None:
        """Add a command.

        Args:
            header: As manuals print it.
            arguments: How many arguments it takes.
            run: Does it.
        """
        self.commands.append(command(header, arguments, run))

    def plant(self, fault: InstrumentFault | None) -> None:
        """Plant a fault, or take the one planted away.

        Args:
            fault: The fault.
        """
        self._fault = fault
        self._passes = fault.skip if fault is not None else 0
        self._hung = False

    def suffer(self, message: str) -> None:
        """Let a planted fault act on a message.

        Args:
            message: The program message.

        Raises:
            HangError: No answer will come.
            ConnectionResetError: The connection drops.
        """
        if self._hung:
            raise HangError
        fault = self._fault
        if fault is None or fault.header not in message.upper():
            return
        if self._passes > 0:
            self._passes -= 1
            return
        if fault.kind == "hang":
            self._hung = True
            raise HangError
        self._fault = None  # a dropped connection is accepted again
        raise ConnectionResetError

    def connect(self) -> Conversation:
        """Begin a conversation with a parser and an output queue of its own."""
        return Conversation(self)


class Conversation:
    """One controller's conversation with an instrument.

    Args:
        instrument: The instrument.
    """

    def __init__(self, instrument: Instrument) -> None:
        self._instrument = instrument
        self._input = bytearray()
        self._output: deque[bytes] = deque()
        self._errors: deque[tuple[int, str]] = deque()
        self._events = 0x80  # power on
        self._event_mask = 0
        self._service_mask = 0
        self._common: dict[str, Handler] = {
            "*IDN?": lambda _: self._instrument.identity,
            "*CLS": lambda _: self._clear(),
            "*ESE": lambda given: self._set_mask("_event_mask", given),
            "*ESE?": lambda _: str(self._event_mask),
            "*ESR?": lambda _: self._read_events(),
            "*OPC": lambda _: self._raise_event(0x01),
            "*OPC?": lambda _: "1",
            "*RST": lambda _: self._instrument.reset(),
            "*SRE": lambda given: self._set_mask("_service_mask", given),
            "*SRE?": lambda _: str(self._service_mask),
            "*STB?": lambda _: str(self._status()),
            "*TST?": lambda _: "0",
            "*WAI": lambda _: None,
        }
        self._common_arguments = {"*ESE": 1, "*SRE": 1}
        self._system = [
            command("SYSTem:ERRor[:NEXT]?", 0, lambda _: self._next_error()),
            command("SYSTem:VERSion?", 0, lambda _: "1999.0"),
        ]

    def feed(self, data: bytes) -> None:
        """Take bytes from the controller; each line is one program message.

        Args:
            data: The bytes.

        Raises:
            ConnectionError: The instrument dropped the connection.
        """
        self._input += data
        while b"\n" in self._input:
            line, _, rest = bytes(self._input).partition(b"\n")
            self._input = bytearray(rest)
            self._message(line.decode("latin-1").strip())
        if len(self._input) > LARGEST_MESSAGE:
            self._input.clear()
            self._error(-363, "Input buffer overrun")

    def pending(self) -> bool:
        """Whether an answer waits."""
        return bool(self._output)

    def take(self, limit: int) -> tuple[bytes, bool]:
        """Up to ``limit`` bytes of the oldest answer, and whether it ends there.

        Args:
            limit: Most bytes wanted.

        Returns:
            The bytes, and whether the answer ends with them.
        """
        answer = self._output.popleft()
        if len(answer) > limit:
            self._output.appendleft(answer[limit:])
            return answer[:limit], False
        return answer, True

    def close(self) -> None:
        """End the conversation."""
        self._output.clear()

    def _message(self, text: str) -> None:
        if not text:
            return
        answers: list[str] = []
        path = ""
        try:
            self._instrument.suffer(text)
            with self._instrument.lock:
                for unit in split_outside_quotes(text, ";"):
                    answer, path = self._unit(unit.strip(), path)
                    if answer is not None:
                        answers.append(answer)
        except ScpiError as reason:
            # After a command error the rest of the message is not understood and is dropped.
            self._error(reason.number, reason.text)
        except HangError:
            return
        if answers:
            self._output.append(";".join(answers).encode("latin-1") + b"\n")

    def _unit(self, unit: str, path: str) -> tuple[str | None, str]:
        if not unit:
            return None, path
        header, _, tail = unit.replace("\t", " ").partition(" ")
        arguments = [part.strip() for part in split_outside_quotes(tail, ",")] if tail.strip() else []
        if header.startswith("*"):
            name = header.upper()
            handler = self._common.get(name)
            if handler is None:
                raise ScpiError(-113, "Undefined header")
            _check_arguments(arguments, self._common_arguments.get(name, 0))
            return handler(arguments), path
        full = header[1:] if header.startswith(":") else path + header
        for known in (*self._system, *self._instrument.commands):
            if known.pattern.fullmatch(full):
                _check_arguments(arguments, known.arguments)
                return known.run(arguments), full.rpartition(":")[0] + ":" if ":" in full else ""
        raise ScpiError(-113, "Undefined header")

    def _error(self, number: int, text: str) -> None:
        if len(self._errors) >= QUEUE_LENGTH:
            self._errors[-1] = (-350, "Queue overflow")
        else:
            self._errors.append((number, text))
        bit = {1: 0x20, 2: 0x10, 3: 0x08, 4: 0x04}.get(-number // 100, 0x08)
        self._events |= bit

    def _next_error(self) -> str:
        number, text = self._errors.popleft() if self._errors else NO_ERROR
        return f'{number},"{text}"'

    def _clear(self) -> None:
        self._errors.clear()
        self._events = 0

    def _set_mask(self, name: str, given: Sequence[str]) -> None:
        value = number(given[0])
        if not 0 <= value <= 255:
            raise ScpiError(-222, "Data out of range")
        setattr(self, name, int(value))

    def _read_events(self) -> str:
        events, self._events = self._events, 0
        return str(events)

    def _raise_event(self, bit: int) -> None:
        self._events |= bit

    def _status(self) -> int:
        status = (0x04 if self._errors else 0) | (0x10 if self._output else 0)
        status |= 0x20 if self._events & self._event_mask else 0
        return status | (0x40 if status & self._service_mask else 0)


def split_outside_quotes(text: str, separator: str) -> list[str]:
    """Split a text at a separator that stands outside quoted strings.

    Args:
        text: The text.
        separator: One character.

    Returns:
        The parts.
    """
    parts, quote, current = [], "", ""
    for letter in text:
        if quote:
            quote = "" if letter == quote else quote
        elif letter in {'"', "'"}:
            quote = letter
        elif letter == separator:
            parts.append(current)
            current = ""
            continue
        current += letter
    return [*parts, current]


def _check_arguments(arguments: Sequence[str], wanted: int) -> None:
    if len(arguments) < wanted:
        raise ScpiError(-109, "Missing parameter")
    if len(arguments) > wanted:
        raise ScpiError(-108, "Parameter not allowed")


def number(text: str) -> float:
    """A numeric argument.

    Args:
        text: As it came.

    Returns:
        The value.

    Raises:
        ScpiError: It is no number.
    """
    if not re.fullmatch(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?", text):
        raise ScpiError(-120, "Numeric data error") if text[:1].isdigit() else ScpiError(-104, "Data type error")
    value = float(text)
    if not math.isfinite(value):
        raise ScpiError(-222, "Data out of range")
    return value


def switch(text: str) -> bool:
    """A Boolean argument.

    Args:
        text: As it came.

    Returns:
        On or off.

    Raises:
        ScpiError: It is neither.
    """
    word = text.upper()
    if word in {"ON", "1"}:
        return True
    if word in {"OFF", "0"}:
        return False
    raise ScpiError(-104, "Data type error")


def quoted(text: str) -> str:
    """A string argument.

    Args:
        text: As it came, in quotes.

    Returns:
        What stands between the quotes.

    Raises:
        ScpiError: It is no string.
    """
    if len(text) < 2 or text[0] not in {'"', "'"} or text[-1] != text[0]:
        raise ScpiError(-151, "Invalid string data")
    return text[1:-1]
