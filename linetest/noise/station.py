"""What a noise calibration needs of a station, and notes of it: a narrow edge that a test's stand-in can have too."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Protocol

from linetest.instruments import StationSheet

# The instruments whose exchange makes a calibration void. The unit's port and the supply do not touch N0.
CALIBRATED_ROLES = ("noise_source", "attenuator", "power_meter")

ADVICE = "run 'linetest station calibrate'"


@dataclass(frozen=True, slots=True)
class CalibratedWith:
    """An instrument that the calibration was made with, and holds for.

    Attributes:
        role: Its role.
        identity: Its answer to the identity query.
        serial: Its serial by the station sheet.
        certificate: Number of its calibration certificate, empty where it needs none.
        calibration_due: Day its own calibration falls due, ISO date, empty where it needs none.
        dialect_digest: SHA-256 of the dialect file spoken with it.
    """

    role: str
    identity: str
    serial: str
    certificate: str
    calibration_due: str
    dialect_digest: str


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


def instruments_of(station: NoiseStation) -> tuple[CalibratedWith, ...]:
    """The instruments that a noise calibration holds for, as they stand now.

    Args:
        station: The open station.

    Returns:
        One entry a role.
    """
    entries = {role: station.sheet.entry(role) for role in CALIBRATED_ROLES}
    return tuple(
        CalibratedWith(
            role=role,
            identity=station.identities[role],
            serial=entry.serial,
            certificate=entry.certificate,
            calibration_due=entry.calibration_due.isoformat() if entry.calibration_due else "",
            dialect_digest=station.dialect_digests[role],
        )
        for role, entry in entries.items()
    )
