"""``python -m linetest`` is the command line."""

from linetest.cli import main

main()
