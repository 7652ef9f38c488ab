"""Every error that linetest raises on purpose, in one tree with one root.

::

    LinetestError
    ├── ParameterError         a function was given a value outside its rule (also a ValueError)
    ├── SettingsError          a setting, folder or shipped file cannot be used
    ├── SheetError             a limit sheet, station sheet or dialect file breaks its rules
    ├── PlanError              no plan exists for the risks and bits asked for
    ├── SerialError            a serial does not match its model's pattern, or nobody knows it
    ├── RecordError            the database cannot be opened, read or written
    ├── CertificateError       a certificate cannot be issued from what the record holds
    └── StationError           the station cannot judge a unit now (exit code 3)
        ├── CalibrationError   the noise calibration is missing, out of date or contradicts the station
        ├── StationBusyError   another program holds the station
        └── LinkError          one instrument's conversation went wrong
            ├── LinkTimeout    no answer in time
            ├── LinkLost       the peer is gone, or refused
            ├── LinkGarbled    an answer came that cannot be what was asked for
            ├── LinkAborted    the conversation was cancelled on purpose
            └── InstrumentError  the instrument reported an error for a command

An error carries its facts as attributes and says in one sentence what happened, where, and what to do.
A unit that fails is not an error: it is a judgement with an exit code of its own.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import ClassVar


class LinetestError(Exception):
    """Root of all errors that linetest raises on purpose.

    Attributes:
        exit_code: What the command line returns when this error ends it.
    """

    exit_code: ClassVar[int] = 2


class ParameterError(LinetestError, ValueError):
    """A function was given a value outside its rule.

    Attributes:
        parameter: Name of the parameter.
        value: The value received.
        rule: The rule it breaks, as a clause that follows "must".
    """

    def __init__(self, parameter: str, value: object, rule: str) -> None:
        self.parameter = parameter
        self.value = value
        self.rule = rule
        super().__init__(f"{parameter} is {value!r}, but must {rule}")


class SettingsError(LinetestError):
    """A setting, a folder or a shipped file cannot be used."""


@dataclass(frozen=True, slots=True)
class SheetFault:
    """One fault of a sheet.

    Attributes:
        key: Where in the file, as a dotted path.
        value: The value found there, as text.
        rule: The rule it breaks.
    """

    key: str
    value: str
    rule: str

    def __str__(self) -> str:
        return f"{self.key} = {self.value}: {self.rule}"


class SheetError(LinetestError):
    """A limit sheet, station sheet or dialect file breaks its rules; all faults at once.

    Attributes:
        path: The file.
        faults: Every fault found, in the file's order.
    """

    def __init__(self, path: Path | str, faults: Sequence[SheetFault]) -> None:
        self.path = Path(path)
        self.faults = tuple(faults)
        count = "1 fault" if len(self.faults) == 1 else f"{len(self.faults)} faults"
        lines = "".join(f"\n  {fault}" for fault in self.faults)
        super().__init__(f"{self.path} has {count} to correct:{lines}")


class PlanError(LinetestError):
    """No plan exists for the risks, error rates and bits asked for."""


class SerialError(LinetestError):
    """A serial does not match its model's pattern, or no record knows it.

    Attributes:
        serial: The serial as it was read.
    """

    def __init__(self, serial: str, sentence: str) -> None:
        self.serial = serial
        super().__init__(sentence)


class RecordError(LinetestError):
    """The database cannot be opened, read or written."""


class CertificateError(LinetestError):
    """A certificate cannot be issued from what the record holds."""


class StationError(LinetestError):
    """The station cannot judge a unit now. Never a unit's fault."""

    exit_code: ClassVar[int] = 3


class CalibrationError(StationError):
    """The noise calibration is missing, out of date, or contradicts the station."""


class StationBusyError(StationError):
    """Another program holds the station."""


class LinkError(StationError):
    """One instrument's conversation went wrong.

    Attributes:
        resource: VISA resource name of the instrument.
        command: What was being said when it went wrong, empty where nothing was.
    """

    def __init__(self, resource: str, command: str, sentence: str) -> None:
        self.resource = resource
        self.command = command
        where = f"{resource}, at {command!r}" if command else resource
        super().__init__(f"{where}: {sentence}")


class LinkTimeout(LinkError):  # noqa: N818  (the trade says "timeout", not "timeout error")
    """No answer in time."""


class LinkLost(LinkError):  # noqa: N818  (named for what happened, like its siblings)
    """The peer is gone, or refused the conversation."""


class LinkGarbled(LinkError):  # noqa: N818  (named for what happened, like its siblings)
    """An answer came that cannot be the answer to what was asked."""


class LinkAborted(LinkError):  # noqa: N818  (named for what happened, like its siblings)
    """The conversation was cancelled on purpose."""


class InstrumentError(LinkError):
    """The instrument reported an error for a command.

    Attributes:
        reports: The error queue's entries, oldest first, as (number, text).
    """

    def __init__(self, resource: str, command: str, reports: Sequence[tuple[int, str]]) -> None:
        self.reports = tuple(reports)
        listed = "; ".join(f"{number} {text}" for number, text in self.reports)
        super().__init__(resource, command, f"the instrument reports {listed}")
