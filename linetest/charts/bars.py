"""Bars with a number each: contributions to an uncertainty, causes of rejects."""

from __future__ import annotations

import math
from collections.abc import Sequence

from linetest.charts.frame import label, sheet
from linetest.charts.frame import path as drawn_path
from linetest.charts.scales import LinearScale
from linetest.charts.text import escaped, number, shortened
from linetest.errors import ParameterError

WIDTH, LEFT, RIGHT = 680.0, 214.0, 556.0
ROW, TOP = 21.0, 8.0


def bar_chart(
    rows: Sequence[tuple[str, float, str]],
    *,
    title: str,
    ident: str,
    strong: str = "",
    standalone: bool = False,
) -> str:
    """Draw bars from a common zero, longest as given, each with its name and its number in words.

    Args:
        rows: Name, length 0 or more, and the text written at the bar's end; top to bottom.
        title: Short name of the picture.
        ident: Identifier unique on the page, letters, digits and hyphens.
        strong: Name of the row drawn in the strong colour, as a sum.
        standalone: True for a file of its own.

    Returns:
        SVG markup.

    Raises:
        ParameterError: There is no row, or a length is negative or not finite.
    """
    if not rows:
        raise ParameterError("rows", (), "hold one row or more")
    for name, length, _ in rows:
        if not (math.isfinite(length) and length >= 0.0):
            raise ParameterError(f"length of {name}", length, "be finite and 0 or more")
    longest = max(length for _, length, _ in rows)
    x = LinearScale(0.0, longest or 1.0, LEFT, RIGHT)
    bottom = TOP + ROW * len(rows)
    parts = []
    for index, (name, length, told) in enumerate(rows):
        above = TOP + ROW * index + 4.0
        kind = "sum" if name == strong else "bar"
        end = x(length)
        parts += [
            label(LEFT - 10, above + 11, escaped(shortened(name, 34)), anchor="end"),
            f'<rect class="{kind}" x="{number(LEFT)}" y="{number(above)}" width="{number(end - LEFT)}" height="14"/>',
            label(end + 7, above + 11, escaped(told)),
        ]
    zero = f"M{number(LEFT)} {number(TOP)}V{number(bottom + 2)}"
    parts.append(drawn_path("frame", zero))
    described = "; ".join(f"{name}: {told}" for name, _, told in rows) + "."
    return sheet(
        "".join(parts), size=(WIDTH, bottom + 8), ident=ident, title=title, description=described, standalone=standalone
    )


def contributions_chart(
    contributions_db: Sequence[tuple[str, float]],
    *,
    title: str = "Contributions to the uncertainty of Eb/N0",
    ident: str = "budget",
    standalone: bool = False,
) -> str:
    """Draw an uncertainty budget: the contributions, largest first, under their root sum of squares.

    Args:
        contributions_db: Name and signed contribution (sensitivity times standard uncertainty), dB; independent.
        title: Short name of the picture.
        ident: Identifier unique on the page, letters, digits and hyphens.
        standalone: True for a file of its own.

    Returns:
        SVG markup.

    Raises:
        ParameterError: There is no contribution, or one is not finite.

    Source:
        JCGM 100:2008, 5.1.2: the combined standard uncertainty of independent inputs.
    """
    if not contributions_db:
        raise ParameterError("contributions_db", (), "hold one contribution or more")
    combined = math.sqrt(sum(value * value for _, value in contributions_db))
    ordered = sorted(contributions_db, key=lambda pair: -abs(pair[1]))
    whole = "combined"
    rows = [(whole, combined, f"{combined:.3f} dB")]
    for name, value in ordered:
        part = 100.0 * value * value / combined**2 if combined else 0.0
        rows.append((name, abs(value), f"{abs(value):.3f} dB, {part:.0f} %"))
    return bar_chart(rows, title=title, ident=ident, strong=whole, standalone=standalone)
