"""The sheet a chart is drawn on: its outer element, text alternative, and the marks all charts share."""

from __future__ import annotations

from linetest.charts.style import CHART_STYLE
from linetest.charts.text import escaped, number


def sheet(body: str, *, size: tuple[float, float], ident: str, title: str, description: str, standalone: bool) -> str:
    """A whole SVG picture around a drawing.

    Args:
        body: The drawing's markup.
        size: Width and height, user units.
        ident: Identifier of the picture, letters, digits and hyphens, unique on its page.
        title: Short name of the picture, for readers who cannot see it.
        description: What the picture shows, in words and numbers.
        standalone: True puts style and ground into the picture, for a file of its own; on a page the page's
            style holds `CHART_STYLE` once.

    Returns:
        SVG markup without script and without outside references.
    """
    width, height = (number(side) for side in size)
    own = f'<style>{CHART_STYLE}</style><rect class="ground" width="100%" height="100%"/>' if standalone else ""
    return (
        f'<svg class="lc" xmlns="http://www.w3.org/2000/svg" width="{width}" height="{height}" '
        f'viewBox="0 0 {width} {height}" role="img" aria-labelledby="{ident}-t {ident}-d">'
        f'<title id="{ident}-t">{escaped(title)}</title><desc id="{ident}-d">{escaped(description)}</desc>'
        f"{own}{body}</svg>"
    )


def label(x: float, y: float, markup: str, *, kind: str = "", anchor: str = "", extra: str = "") -> str:
    """A text element.

    Args:
        x: Position of the anchor, user units.
        y: Position of the baseline, user units.
        markup: Content, already escaped.
        kind: Class names.
        anchor: `middle`, `end`, or empty for the start.
        extra: Further attributes.

    Returns:
        SVG markup.
    """
    named = f' class="{kind}"' if kind else ""
    anchored = f' text-anchor="{anchor}"' if anchor else ""
    spaced = f" {extra}" if extra else ""
    return f'<text x="{number(x)}" y="{number(y)}"{named}{anchored}{spaced}>{markup}</text>'


def path(kind: str, drawing: str, extra: str = "") -> str:
    """A path element.

    Args:
        kind: Class names.
        drawing: Path data.
        extra: Further attributes.

    Returns:
        SVG markup.
    """
    spaced = f" {extra}" if extra else ""
    return f'<path class="{kind}" d="{drawing}"{spaced}/>'


def across(x_from: float, x_to: float, y: float) -> str:
    """Path data of a horizontal line, user units."""
    return f"M{number(x_from)} {number(y)}H{number(x_to)}"


def down(x: float, y_from: float, y_to: float) -> str:
    """Path data of a vertical line, user units."""
    return f"M{number(x)} {number(y_from)}V{number(y_to)}"
