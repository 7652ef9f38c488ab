"""Roles: what an instrument does for us, as a few verbs with units.

Each setter is verified by reading back where the dialect has the query. A number that cannot be one (the standard's
not-a-number, infinity, text) is a garbled answer, never a value.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from linetest.errors import LinkGarbled, ParameterError
from linetest.instruments.link import INFINITE, Link

_TEXT = re.compile(r"[\x20-\x7e]*")


@dataclass(frozen=True, slots=True)
class UnitIdentity:
    """What the unit says of itself; empty texts where it does not answer."""

    model: str
    serial: str
    firmware: str


@dataclass(frozen=True, slots=True)
class Counts:
    """One latched reading of an error counter.

    Attributes:
        bits: Bits counted since counting began.
        errors: Bit errors among them.
        lost_bits: Bits that fell into lost alignment, not among those counted.
        locked: Whether the receiver holds lock.
    """

    bits: int
    errors: int
    lost_bits: int
    locked: bool


class Role:
    """An instrument in its role.

    Args:
        link: The conversation with it.
    """

    def __init__(self, link: Link) -> None:
        self.link = link

    def _has(self, verb: str) -> bool:
        return verb in self.link.dialect.verbs

    def _set(self, verb: str, **facts: object) -> None:
        rule = self.link.dialect.verbs[verb]
        self.link.tell(rule.text.format(**facts), timeout_ms=rule.timeout_ms)

    def _ask(self, verb: str, *, timeout_ms: int | None = None, **facts: object) -> str:
        rule = self.link.dialect.verbs[verb]
        text = rule.text.format(**facts)
        answer = self.link.ask(text, timeout_ms=timeout_ms or rule.timeout_ms)
        if rule.pattern is None:
            return answer.strip()
        found = rule.pattern.fullmatch(answer.strip())
        if found is None or found["v"] is None:
            raise self._garbled(text, f"the answer {answer[:60]!r} does not look like {rule.pattern.pattern!r}")
        return found["v"]

    def _ask_number(self, verb: str) -> float:
        text = self._ask(verb)
        try:
            value = float(text)
        except ValueError:
            raise self._garbled(verb, f"the answer {text[:60]!r} is not a number") from None
        # 9.91e37 is the standard's not-a-number and would pass any lower limit; ±9.9e37 is its infinity.
        if not math.isfinite(value) or abs(value) >= INFINITE:
            raise self._garbled(verb, f"the answer {text!r} stands for no valid measurement (overload or no signal)")
        return value

    def _ask_switch(self, verb: str) -> bool:
        text = self._ask(verb).upper()
        if text in {"1", "+1", "ON"}:
            return True
        if text in {"0", "+0", "OFF"}:
            return False
        raise self._garbled(verb, f"the answer {text[:60]!r} is neither on nor off")

    def _garbled(self, command: str, sentence: str) -> LinkGarbled:
        self.link.mark_dirty()
        return LinkGarbled(self.link.resource, command, sentence)

    def _verify(self, what: str, wanted: object, found: object, *, agree: bool) -> None:
        if not agree:
            raise self._garbled(what, f"was set to {wanted} but reads back {found}; the instrument does not obey")


class _Switched(Role):
    """An instrument with an output."""

    def output_on(self) -> None:
        """Switch the output on, verified.

        Raises:
            LinkError: It could not be said or does not read back.
        """
        self._set("output_on")
        self._verify("output", "on", "off", agree=self.is_on())

    def output_off(self) -> None:
        """Switch the output off, verified.

        Raises:
            LinkError: It could not be said or does not read back.
        """
        self._set("output_off")
        self._verify("output", "off", "on", agree=not self.is_on())

    def is_on(self) -> bool:
        """Whether the output is on.

        Returns:
            What the instrument says.

        Raises:
            LinkError: No valid answer.
        """
        return self._ask_switch("is_on")


class NoiseSource(_Switched):
    """A source of white noise."""


class Attenuator(Role):
    """A step attenuator in the noise branch."""

    TOLERANCE_DB = 0.001

    def set_attenuation_db(self, attenuation_db: float) -> None:
        """Set the attenuation, verified.

        Args:
            attenuation_db: Attenuation in dB.

        Raises:
            LinkError: It could not be said or does not read back.
        """
        self._set("set_attenuation", value=f"{attenuation_db:.2f}")
        found_db = self.read_attenuation_db()
        agree = abs(found_db - attenuation_db) <= self.TOLERANCE_DB
        self._verify("attenuation", f"{attenuation_db:.2f} dB", f"{found_db:.2f} dB", agree=agree)

    def read_attenuation_db(self) -> float:
        """The attenuation set, as the instrument says.

        Returns:
            Attenuation in dB.

        Raises:
            LinkError: No valid answer.
        """
        return self._ask_number("read_attenuation")


class PowerMeter(Role):
    """A power meter at the node where carrier and noise meet."""

    def set_averaging_s(self, averaging_s: float) -> None:
        """Set how long a reading averages.

        Args:
            averaging_s: Time in s, above 0.

        Raises:
            LinkError: It could not be said.
        """
        self._set("set_averaging", value=f"{averaging_s:g}")

    def read_power_dbm(self) -> float:
        """Take one reading.

        Returns:
            Power in dBm.

        Raises:
            LinkError: No valid answer; an overload is not a valid answer.
        """
        return self._ask_number("read_power")


class Supply(_Switched):
    """The DC supply of the unit."""

    TOLERANCE_V = 0.5

    def set_voltage_v(self, voltage_v: float) -> None:
        """Set the voltage.

        Args:
            voltage_v: Voltage in V.

        Raises:
            LinkError: It could not be said.
        """
        self._set("set_voltage", value=f"{voltage_v:.3f}")

    def set_current_limit_a(self, current_a: float) -> None:
        """Set the current limit.

        Args:
            current_a: Current in A.

        Raises:
            LinkError: It could not be said.
        """
        self._set("set_current_limit", value=f"{current_a:.3f}")

    def read_voltage_v(self) -> float:
        """Voltage at the output.

        Returns:
            Voltage in V.

        Raises:
            LinkError: No valid answer.
        """
        return self._ask_number("read_voltage")

    def read_current_a(self) -> float:
        """Current drawn.

        Returns:
            Current in A.

        Raises:
            LinkError: No valid answer.
        """
        return self._ask_number("read_current")


class UnitPort(Role):
    """The fixture's port to the unit: identity, mode, carrier, lock and error counter."""

    @property
    def shortest_gate_s(self) -> float:
        """Shortest gate of the error counter, s."""
        return self.link.dialect.shortest_gate_s

    def load_unit(self, serial: str) -> bool:
        """Tell a handler which unit to place in the fixture.

        Args:
            serial: Serial as scanned.

        Returns:
            Whether there is a handler; where there is none, a person places the unit.

        Raises:
            ParameterError: The serial holds characters that cannot be said.
            LinkError: The handler does not obey.
        """
        if not self._has("load_unit"):
            return False
        self._set("load_unit", serial=_sayable("serial", serial))
        return True

    def read_identity(self) -> UnitIdentity:
        """What the unit says of itself.

        Returns:
            Model, serial and firmware; empty where the unit does not answer.

        Raises:
            LinkError: The port itself gives no valid answer.
        """
        answer = self._ask("read_identity")
        found = re.fullmatch(r'"([^"]*)"\s*,\s*"([^"]*)"\s*,\s*"([^"]*)"', answer)
        if found is None:
            raise self._garbled("read_identity", f"the answer {answer[:60]!r} is not three texts")
        return UnitIdentity(model=found[1], serial=found[2], firmware=found[3])

    def set_mode(self, mode: str) -> None:
        """Put the unit into a mode.

        Args:
            mode: Name of the mode.

        Raises:
            ParameterError: The name holds characters that cannot be said.
            LinkError: The port does not obey.
        """
        self._set("set_mode", mode=_sayable("mode", mode))

    def carrier_on(self) -> None:
        """Switch the unit's carrier on, verified.

        Raises:
            LinkError: It could not be said or does not read back.
        """
        self._set("carrier_on")
        self._verify("carrier", "on", "off", agree=self.carrier_is_on())

    def carrier_off(self) -> None:
        """Switch the unit's carrier off, verified.

        Raises:
            LinkError: It could not be said or does not read back.
        """
        self._set("carrier_off")
        self._verify("carrier", "off", "on", agree=not self.carrier_is_on())

    def carrier_is_on(self) -> bool:
        """Whether the unit's carrier is on.

        Returns:
            What the port says.

        Raises:
            LinkError: No valid answer.
        """
        return self._ask_switch("carrier_is_on")

    def is_locked(self) -> bool:
        """Whether the unit's receiver is locked.

        Returns:
            What the port says.

        Raises:
            LinkError: No valid answer.
        """
        return self._ask_switch("is_locked")

    def start_count(self, pattern: str) -> None:
        """Start counting from zero.

        Args:
            pattern: Name of the test pattern.

        Raises:
            ParameterError: The name holds characters that cannot be said.
            LinkError: The port does not obey.
        """
        self._set("start_count", pattern=_sayable("pattern", pattern))

    def count_until(self, bits: int, *, timeout_s: float) -> Counts:
        """Wait until that many bits are counted, and read all counts latched together.

        Args:
            bits: Bits wanted since counting began.
            timeout_s: Longest wait in s.

        Returns:
            The counts; the bits may be more than asked, never fewer from a sound counter.

        Raises:
            LinkError: No valid answer in time.
        """
        answer = self._ask("count_until", bits=bits, timeout_ms=max(1, round(timeout_s * 1000.0)))
        found = re.fullmatch(r"\+?(\d+)\s*,\s*\+?(\d+)\s*,\s*\+?(\d+)\s*,\s*([01])", answer)
        if found is None:
            raise self._garbled("count_until", f"the answer {answer[:60]!r} is not counts")
        return Counts(int(found[1]), int(found[2]), int(found[3]), found[4] == "1")

    def stop_count(self) -> None:
        """Stop counting.

        Raises:
            LinkError: The port does not obey.
        """
        self._set("stop_count")


def _sayable(parameter: str, text: str) -> str:
    """A text that may stand between quotes in a message, or an error: a quote or line end would end it early."""
    if not _TEXT.fullmatch(text) or '"' in text or not text:
        raise ParameterError(parameter, text, "be printable ASCII without quotes")
    return text
