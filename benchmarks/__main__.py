"""Prints the table of ratios."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from benchmarks import commands, decisions, links, monte_carlo, units

Row = tuple[str, str, str]
PARTS: tuple[Callable[[], Iterator[Row]], ...] = (
    decisions.rows,
    monte_carlo.rows,
    links.rows,
    units.rows,
    commands.rows,
)


def main() -> None:
    """Run every part and print its rows as they come."""
    print(f"{'what':62} {'ratio':>12}  of what")
    for part in PARTS:
        for what, ratio, against in part():
            print(f"{what:62} {ratio:>12}  {against}", flush=True)


main()
