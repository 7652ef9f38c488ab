"""The command line. Each command parses, calls, prints; heavy rooms are imported only inside the commands.

Exit codes: 0 done or PASS, 1 FAIL, 2 wrong use or wrong file, 3 VOID (station), 4 HOLD.
"""

from __future__ import annotations

import sys


def main() -> None:
    """Run the command line; every error of linetest becomes one clear sentence and an exit code."""
    from linetest.cli.app import app
    from linetest.errors import LinetestError

    try:
        app()
    except LinetestError as reason:
        print(f"linetest: {reason}", file=sys.stderr)  # noqa: T201  (the command line is where sentences go)
        sys.exit(reason.exit_code)
    except BrokenPipeError:
        # The reader of our output went away; there is nobody left to tell.
        sys.stderr.close()
        sys.exit(0)
