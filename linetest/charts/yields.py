"""Shares with their exact intervals, one row a group: a dot on a common scale, and the counts in words."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from linetest.charts.frame import across, down, label, path, sheet
from linetest.charts.scales import LinearScale
from linetest.charts.text import escaped, number, shortened
from linetest.errors import ParameterError

WIDTH = 680.0
LEFT, RIGHT = 150.0, 548.0
ROW, TOP, FOOT = 21.0, 10.0, 40.0


@dataclass(frozen=True, slots=True)
class YieldRow:
    """One group of units.

    Attributes:
        name: Name of the group.
        passed: Units passed.
        units: Units counted.
        low: Lower end of the interval of the share passed, 0 to 1.
        high: Upper end, 0 to 1.
    """

    name: str
    passed: int
    units: int
    low: float
    high: float

    def __post_init__(self) -> None:
        if not 0 <= self.passed <= self.units or self.units < 1:
            raise ParameterError("passed", self.passed, f"lie between 0 and the {self.units} units counted")
        if not 0.0 <= self.low <= self.passed / self.units <= self.high <= 1.0:
            raise ParameterError("low, high", (self.low, self.high), "hold the share passed")

    @property
    def share(self) -> float:
        """Share passed, 0 to 1."""
        return self.passed / self.units


def yield_chart(
    rows: Sequence[YieldRow],
    *,
    overall: YieldRow | None = None,
    title: str = "First-pass yield",
    ident: str = "yield",
    interval_level: float = 0.95,
    standalone: bool = False,
) -> str:
    """Draw the yield of groups as dots with intervals on a scale from 0 to 100 %.

    Args:
        rows: The groups, top to bottom.
        overall: All groups together; drawn as a line with a band behind them.
        title: Short name of the picture.
        ident: Identifier unique on the page, letters, digits and hyphens.
        interval_level: Level of the bars, said in the text alternative.
        standalone: True for a file of its own.

    Returns:
        SVG markup.

    Raises:
        ParameterError: There is no row.
    """
    if not rows:
        raise ParameterError("rows", (), "hold one group or more")
    x = LinearScale(0.0, 100.0, LEFT, RIGHT)
    bottom = TOP + ROW * len(rows)
    ticks = x.ticks(5)
    parts = [path("rule", "".join(down(x(value), TOP, bottom) for value in ticks))]
    if overall is not None:
        left, right = x(100.0 * overall.low), x(100.0 * overall.high)
        parts.append(path("band", f"M{number(left)} {number(TOP)}H{number(right)}V{number(bottom)}H{number(left)}Z"))
        parts.append(path("theory", down(x(100.0 * overall.share), TOP, bottom)))
    parts += [_row(row, x, TOP + ROW * (index + 0.5)) for index, row in enumerate(rows)]
    parts.append(path("frame", across(LEFT, RIGHT, bottom)))
    parts += [label(x(value), bottom + 15, f"{value:g} %", anchor="middle", kind="mid") for value in ticks]
    return sheet(
        "".join(parts),
        size=(WIDTH, bottom + FOOT - 18),
        ident=ident,
        title=title,
        description=_description(rows, overall, interval_level),
        standalone=standalone,
    )


def _row(row: YieldRow, x: LinearScale, middle: float) -> str:
    low, high, share = x(100.0 * row.low), x(100.0 * row.high), x(100.0 * row.share)
    bar = across(low, high, middle) + down(low, middle - 3.5, middle + 3.5) + down(high, middle - 3.5, middle + 3.5)
    return (
        label(LEFT - 12, middle + 4, escaped(shortened(row.name, 22)), anchor="end")
        + path("err", bar)
        + f'<circle class="dot" cx="{number(share)}" cy="{number(middle)}" r="4"/>'
        + label(RIGHT + 14, middle + 4, f"{row.passed} of {row.units}")
        + label(WIDTH - 4, middle + 4, f"{100.0 * row.share:.1f} %", anchor="end")
    )


def _description(rows: Sequence[YieldRow], overall: YieldRow | None, level: float) -> str:
    told = [_told(row) for row in rows]
    whole = f"All together: {_told(overall)} " if overall is not None else ""
    return f"{whole}{' '.join(told)} Bars are {100.0 * level:g} % intervals."


def _told(row: YieldRow) -> str:
    span = f"{100.0 * row.low:.1f} to {100.0 * row.high:.1f} %"
    return f"{row.name}: {row.passed} of {row.units} passed, {100.0 * row.share:.1f} % ({span})."
