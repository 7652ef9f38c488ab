"""The station sheet that belongs to a bench."""

from __future__ import annotations

import re
from collections.abc import Mapping
from datetime import UTC, datetime, timedelta
from pathlib import Path

from linetest.bench.devices import MAKER, MODELS
from linetest.bench.truth import DataSheet

DIALECTS = {
    "noise_source": "scpi-noise-source",
    "attenuator": "scpi-attenuator",
    "power_meter": "scpi-power-meter",
    "supply": "scpi-supply",
    "unit_port": "modem-port",
}
NEEDS_CALIBRATION = {"attenuator": "C-2041", "power_meter": "C-2042", "supply": "C-2043"}


def write_station_sheet(
    path: Path, resources: Mapping[str, str], *, station: str = "A1", sheet: DataSheet | None = None
) -> None:
    """Write the station sheet of a bench.

    Args:
        path: The file.
        resources: VISA resource name by role.
        station: Name of the station.
        sheet: The data sheets of its instruments.
    """
    promised = sheet or DataSheet()
    due = (datetime.now(UTC) + timedelta(days=180)).date()
    lines = [
        "# Station sheet of the simulated station.",
        f'name = "{station}"',
        'safe_off = ["supply", "noise_source", "unit_port"]',
        "",
        "[noise]",
        f"enbw_hz = {promised.enbw_hz:.1f}",
        f"enbw_u_percent = {promised.enbw_u_percent}",
        f"meter_calibration_db = {promised.meter_calibration_db}",
        f"meter_linearity_db = {promised.meter_linearity_db}",
        f"noise_response_db = {promised.noise_response_db}",
        f"mismatch_db = {promised.mismatch_db}",
        f"filter_slope_db = {promised.filter_slope_db}",
        f"attenuator_repeatability_db = {promised.attenuator_repeatability_db}",
        "readings = 4",
        "averaging_s = 0.02",
        "settle_s = 0.005",
        "calibration_valid_h = 12.0",
        "calibration_min_db = 2.0",
        "calibration_max_db = 26.0",
        "calibration_step_db = 0.25",
    ]
    for role, resource in resources.items():
        model, serial = MODELS[role]
        lines += [
            "",
            "[[instrument]]",
            f'role = "{role}"',
            f'resource = "{resource}"',
            f'dialect = "{DIALECTS[role]}"',
            f"identity = '{re.escape(f'{MAKER},{model},{serial},')}.*'",
            f'serial = "{serial}"',
        ]
        if role in NEEDS_CALIBRATION:
            lines += [f"calibration_due = {due.isoformat()}", f'certificate = "{NEEDS_CALIBRATION[role]}"']
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
