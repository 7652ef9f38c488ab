"""The wheel carries limits and templates: it works outside the checkout, in an environment of its own."""

from __future__ import annotations

import os
import subprocess
import sys
import venv
from pathlib import Path

import pytest

CHECKOUT = Path(__file__).parent.parent


@pytest.fixture(scope="module")
def command(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("installed")
    venv.create(folder / "venv", with_pip=True)
    python = folder / "venv" / "bin" / "python"
    # `pip install .`, with its dependencies, as anybody would.
    quiet = ["--quiet", "--disable-pip-version-check", "--no-cache-dir"]
    subprocess.run([python, "-m", "pip", "install", *quiet, str(CHECKOUT)], check=True, cwd=folder)
    return folder / "venv" / "bin" / "linetest"


def test_the_demo_runs_from_an_installed_wheel(command: Path, tmp_path: Path) -> None:
    """The whole lot: each planted fault must end in its disposition, or the command's exit code says so."""
    environment = {key: value for key, value in os.environ.items() if not key.startswith(("LINETEST_", "PYTHONPATH"))}
    environment |= {"XDG_STATE_HOME": str(tmp_path / "state"), "XDG_CONFIG_HOME": str(tmp_path / "config")}
    done = subprocess.run(
        [command, "demo", "--folder", str(tmp_path / "out")],
        cwd=tmp_path,
        env=environment,
        capture_output=True,
        text=True,
        timeout=240,
        check=False,
    )
    assert done.returncode == 0, done.stdout + done.stderr
    (output,) = (tmp_path / "out").iterdir()
    assert (output / "records.db").is_file()
    assert (output / "yield.html").is_file()
    certificates = list((output / "certificates").iterdir())
    assert len(certificates) >= 11
    assert "✘" not in done.stdout


def test_the_python_of_the_checkout_is_not_used(command: Path) -> None:
    assert str(command.parent) != str(Path(sys.executable).parent)
