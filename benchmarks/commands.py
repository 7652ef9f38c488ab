"""Start-up of the command line against bare Python."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Iterator

from benchmarks.timing import medians_s


def rows() -> Iterator[tuple[str, str, str]]:
    """Rows of start-up times.

    Yields:
        What, ratio, of what.
    """

    def bare() -> None:
        subprocess.run([sys.executable, "-c", "pass"], check=True)

    def help_page() -> None:
        subprocess.run([sys.executable, "-m", "linetest", "--help"], check=True, stdout=subprocess.DEVNULL)

    times = medians_s({"bare": bare, "help": help_page}, 9)
    yield "linetest --help", f"{times['help'] / times['bare']:.1f}", "python -c pass"
