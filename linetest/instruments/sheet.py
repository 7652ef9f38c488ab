"""The station sheet: which instruments stand where, in TOML, checked before anything is opened."""

from __future__ import annotations

import re
import tomllib
from datetime import date
from pathlib import Path
from typing import Annotated, Any

from pydantic import BaseModel, ConfigDict, Field, ValidationError, field_validator, model_validator

from linetest.errors import SheetError, SheetFault
from linetest.instruments.dialect import ROLES

Positive = Annotated[float, Field(gt=0, allow_inf_nan=False)]
NotNegative = Annotated[float, Field(ge=0, allow_inf_nan=False)]


class _Strict(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid", strict=True)


class InstrumentEntry(_Strict):
    """One instrument of the station.

    Attributes:
        role: What it does for us.
        resource: VISA resource name.
        dialect: Name of a shipped dialect, or a dialect file beside the sheet.
        identity: Regular expression that its whole identity answer must match.
        serial: Its serial.
        calibration_due: Day its calibration falls due; none where it needs none.
        certificate: Number of its calibration certificate.
    """

    role: str
    resource: str
    dialect: str
    identity: str
    serial: str
    calibration_due: date | None = None
    certificate: str = ""

    @field_validator("role")
    @classmethod
    def _known_role(cls, role: str) -> str:
        if role not in ROLES:
            raise ValueError(f"must be one of {', '.join(ROLES)}")
        return role

    @field_validator("identity")
    @classmethod
    def _compiles(cls, identity: str) -> str:
        try:
            re.compile(identity)
        except re.error as reason:
            raise ValueError(f"must be a regular expression: {reason}") from None
        return identity

    @field_validator("resource")
    @classmethod
    def _is_resource(cls, resource: str) -> str:
        from pyvisa import rname

        try:
            rname.parse_resource_name(resource)
        except rname.InvalidResourceName as reason:
            raise ValueError(f"must be a VISA resource name: {reason}") from None
        # VISA would read this one as VXI-11 to a host of that name; a raw socket needs a port.
        if re.fullmatch(r"TCPIP\d*::[^:]+", resource, flags=re.IGNORECASE):
            raise ValueError("must say which kind: …::<port>::SOCKET, …::hislip0::INSTR or …::inst0::INSTR")
        return resource


class NoiseFacts(_Strict):
    """What is known of the noise and of the meter that reads it; the half widths are of the stated distributions.

    Attributes:
        enbw_hz: Noise-equivalent bandwidth of the noise filter, Hz.
        enbw_u_percent: Its standard uncertainty, % (normal).
        meter_calibration_db: Meter's calibration factor, half width dB (rectangular); common to carrier and noise.
        meter_linearity_db: Meter's linearity, half width dB (rectangular); own at each level.
        noise_response_db: Meter's response to noise against carrier, half width dB (rectangular).
        mismatch_db: Difference of mismatch between the branches, half width dB (U-shaped).
        filter_slope_db: N0 in the unit's band against the filter's mean, half width dB (rectangular).
        attenuator_repeatability_db: Attenuator's repeatability, standard deviation dB (normal).
        readings: Readings per level.
        averaging_s: Averaging time of a reading, s.
        settle_s: Pause after a change, s.
        calibration_valid_h: How long a noise calibration holds, h.
        calibration_min_db: Smallest attenuator setting to calibrate, dB.
        calibration_max_db: Largest, dB.
        calibration_step_db: Distance between settings, dB.
    """

    enbw_hz: Positive
    enbw_u_percent: NotNegative
    meter_calibration_db: NotNegative
    meter_linearity_db: NotNegative
    noise_response_db: NotNegative
    mismatch_db: NotNegative
    filter_slope_db: NotNegative
    attenuator_repeatability_db: NotNegative
    readings: Annotated[int, Field(ge=2, le=1000)]
    averaging_s: Positive
    settle_s: NotNegative
    calibration_valid_h: Positive
    calibration_min_db: NotNegative
    calibration_max_db: NotNegative
    calibration_step_db: Positive

    @model_validator(mode="after")
    def _range(self) -> NoiseFacts:
        if self.calibration_max_db <= self.calibration_min_db:
            raise ValueError("calibration_max_db must be above calibration_min_db")
        return self

    @property
    def settings_db(self) -> tuple[float, ...]:
        """The attenuator settings that a noise calibration measures, dB, ascending."""
        steps = int(round((self.calibration_max_db - self.calibration_min_db) / self.calibration_step_db, 6))
        return tuple(round(self.calibration_min_db + n * self.calibration_step_db, 2) for n in range(steps + 1))


class StationSheet(_Strict):
    """A station.

    Attributes:
        name: Its name.
        noise: What is known of its noise.
        instruments: Its instruments, one a role.
        safe_off: Roles with something to switch off, in the order of switching off.
    """

    name: Annotated[str, Field(pattern=r"^[A-Za-z0-9][A-Za-z0-9_-]{0,31}$")]
    noise: NoiseFacts
    instruments: Annotated[tuple[InstrumentEntry, ...], Field(alias="instrument", strict=False)]
    safe_off: Annotated[tuple[str, ...], Field(strict=False)] = ("supply", "noise_source", "unit_port")

    @model_validator(mode="after")
    def _complete(self) -> StationSheet:
        roles = [entry.role for entry in self.instruments]
        missing = [role for role in ROLES if role not in roles]
        twice = sorted({role for role in roles if roles.count(role) > 1})
        needed = {"noise_source", "unit_port", "supply"}
        if missing or twice:
            raise ValueError(
                f"every role once: missing {', '.join(missing) or 'none'}, twice {', '.join(twice) or 'none'}"
            )
        if set(self.safe_off) != needed or len(self.safe_off) != len(needed):
            raise ValueError(f"safe_off must order {', '.join(sorted(needed))}, each once")
        return self

    def entry(self, role: str) -> InstrumentEntry:
        """The instrument in a role.

        Args:
            role: The role.

        Returns:
            Its entry.
        """
        return next(entry for entry in self.instruments if entry.role == role)


def load_station_sheet(path: Path) -> StationSheet:
    """Read and check a station sheet.

    Args:
        path: The file.

    Returns:
        The sheet.

    Raises:
        SheetError: The file cannot be read or breaks its rules; all faults at once.
    """
    try:
        content = tomllib.loads(path.read_text(encoding="utf-8"))
    except OSError as reason:
        raise SheetError(path, [SheetFault("(file)", str(path), f"cannot be read: {reason.strerror}")]) from reason
    except (UnicodeDecodeError, tomllib.TOMLDecodeError) as reason:
        raise SheetError(path, [SheetFault("(file)", path.name, f"is not TOML: {reason}")]) from reason
    try:
        return StationSheet.model_validate(content)
    except ValidationError as reason:
        raise SheetError(path, [_fault(dict(entry)) for entry in reason.errors()]) from None


def _fault(entry: dict[str, Any]) -> SheetFault:
    key = ".".join(str(part) for part in entry["loc"]) or "(sheet)"
    value = entry["input"]
    shown = "(missing)" if entry["type"] == "missing" else repr(value) if not isinstance(value, dict) else "{…}"
    return SheetFault(key, shown, str(entry["msg"]).removeprefix("Value error, "))
