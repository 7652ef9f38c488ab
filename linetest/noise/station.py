"""What a noise calibration needs of a station: a narrow edge that a test's stand-in can have too."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Protocol

from linetest.instruments import StationSheet

# The instruments whose exchange makes a calibration void. The unit's port and the supply do not touch N0.
CALIBRATED_ROLES = ("noise_source", "attenuator", "power_meter")


class Switch(Protocol):
    """An output of the noise source."""

    def output_on(self) -> None:
        """Switch on, verified."""

    def output_off(self) -> None:
        """Switch off, verified."""

    def is_on(self) -> bool:
        """Whether it is on."""


class Steps(Protocol):
    """The step attenuator."""

    def set_attenuation_db(self, attenuation_db: float) -> None:
        """Set the attenuation in dB, verified."""


class Meter(Protocol):
    """The power meter at the node."""

    def set_averaging_s(self, averaging_s: float) -> None:
        """Set how long a reading averages, s."""

    def read_power_dbm(self) -> float:
        """Take one reading, dBm."""


class Carrier(Protocol):
    """The unit's carrier."""

    def carrier_off(self) -> None:
        """Switch off, verified."""


class NoiseStation(Protocol):
    """A station with noise; `linetest.instruments.Station` is one."""

    @property
    def sheet(self) -> StationSheet:
        """Its sheet."""

    @property
    def identities(self) -> Mapping[str, str]:
        """Identity answer by role."""

    @property
    def dialect_digests(self) -> Mapping[str, str]:
        """SHA-256 of the dialect file by role."""

    @property
    def noise_source(self) -> Switch:
        """The noise source."""

    @property
    def attenuator(self) -> Steps:
        """The attenuator in the noise branch."""

    @property
    def power_meter(self) -> Meter:
        """The power meter at the node."""

    @property
    def unit_port(self) -> Carrier:
        """The unit's port."""

    def make_safe(self) -> Mapping[str, str]:
        """Switch everything off; by role the reason why that could not be shown, empty where it is off."""
