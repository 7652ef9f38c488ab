"""Runs the real command in a process of its own, with folders of its own."""

from __future__ import annotations

import os
import subprocess
import sys
from dataclasses import dataclass
from pathlib import Path


@dataclass(frozen=True)
class Place:
    """Where a test's station, records and locks are."""

    folder: Path

    @property
    def sheet(self) -> Path:
        return self.folder / "station.toml"

    @property
    def database(self) -> str:
        return f"sqlite:///{self.folder / 'records.db'}"

    @property
    def environment(self) -> dict[str, str]:
        return os.environ | {
            "LINETEST_STATION_SHEET": str(self.sheet),
            "LINETEST_DATABASE_URL": self.database,
            "LINETEST_CERTIFICATES_FOLDER": str(self.folder / "certificates"),
            "XDG_STATE_HOME": str(self.folder / "state"),
            "XDG_CONFIG_HOME": str(self.folder / "config"),
            "COLUMNS": "200",
            "PYTHONUNBUFFERED": "1",
        }

    def run(self, *arguments: str, text: str = "") -> subprocess.CompletedProcess[str]:
        """Run a command to its end."""
        return subprocess.run(
            [sys.executable, "-m", "linetest", *arguments],
            env=self.environment,
            input=text,
            capture_output=True,
            text=True,
            timeout=120,
            check=False,
        )

    def start(self, *arguments: str) -> subprocess.Popen[str]:
        """Start a command and leave it running."""
        return subprocess.Popen(
            [sys.executable, "-m", "linetest", *arguments],
            env=self.environment,
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
        )
