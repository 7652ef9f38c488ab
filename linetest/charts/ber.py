"""Bit error rate against Eb/N0: theory, limit, and what was counted."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

import numpy as np

from linetest.charts.frame import across, down, label, path, sheet
from linetest.charts.scales import DecadeScale, LinearScale, decades_around
from linetest.charts.text import escaped, number, plain_scientific, power_of_ten, shortened
from linetest.errors import ParameterError
from linetest.theory import SCHEMES, bit_error_rate

WIDTH, HEIGHT = 680.0, 356.0
LEFT, RIGHT, TOP, BOTTOM = 56.0, 660.0, 12.0, 314.0
CURVE_POINTS = 61
LEAST_SPAN_DB = 3.5  # narrower, the fall of the curves and the distance between them cannot be seen
CurveKind = Literal["theory", "second", "limit"]


@dataclass(frozen=True, slots=True)
class BerCurve:
    """A curve to be drawn.

    Attributes:
        kind: `theory`, `second` (another theory beside it), or `limit` (the region beyond is shaded).
        label: Its name, written beside it.
        ebn0_db: Eb/N0 per information bit, dB, rising.
        ber: Bit error rate at each, falling.
    """

    kind: CurveKind
    label: str
    ebn0_db: Sequence[float]
    ber: Sequence[float]


@dataclass(frozen=True, slots=True)
class BerPoint:
    """What was counted at one Eb/N0.

    Attributes:
        ebn0_db: Eb/N0 really set, dB.
        bits: Bits counted, 1 or more.
        errors: Errors among them; with none, the upper end of the interval is drawn as an upper limit.
        low: Lower end of the interval of the bit error rate.
        high: Upper end.
        expanded_u_db: Expanded uncertainty of Eb/N0, dB, drawn as half width of a horizontal bar.
        name: Short name written beside the point, as the step's number.
        judgement: `ACCEPT` (dot), `REJECT` (cross), anything else (hollow dot).
        guarded_limit_ber: Limit that the plan tested against, None to leave it out.
        estimate: Bit error rate to draw; after a sequential stop errors by bits is biased and may lie outside the
            interval. None for errors by bits.
    """

    ebn0_db: float
    bits: int
    errors: int
    low: float
    high: float
    expanded_u_db: float = 0.0
    name: str = ""
    judgement: str = "ACCEPT"
    guarded_limit_ber: float | None = None
    estimate: float | None = None

    def __post_init__(self) -> None:
        if not 0 <= self.errors <= self.bits or self.bits < 1:
            raise ParameterError("errors", self.errors, f"lie between 0 and the {self.bits} bits counted")
        if not 0.0 <= self.low <= self.ber <= self.high <= 1.0:
            raise ParameterError("low, high", (self.low, self.high), f"hold the bit error rate of {self.ber:.3g}")

    @property
    def ber(self) -> float:
        """The estimate where there is one, else errors by bits."""
        return self.errors / self.bits if self.estimate is None else self.estimate


def theory_curve(
    scheme: str,
    ebn0_low_db: float,
    ebn0_high_db: float,
    *,
    loss_db: float = 0.0,
    kind: CurveKind = "theory",
    name: str = "",
) -> BerCurve:
    """Theory of a scheme, or the same moved to the right by a loss, as a curve to be drawn.

    Args:
        scheme: One of the schemes of theory.
        ebn0_low_db: Where the curve begins, dB.
        ebn0_high_db: Where it ends, dB.
        loss_db: How far it is moved to higher Eb/N0, dB; the margin for a limit curve.
        kind: How it is drawn.
        name: Written beside it; the scheme and the loss by default.

    Returns:
        The curve, without the places that theory does not reach.

    Raises:
        ParameterError: The scheme is unknown.
    """
    step_db = (ebn0_high_db - ebn0_low_db) / (CURVE_POINTS - 1)
    grid = [ebn0_low_db + step_db * index for index in range(CURVE_POINTS)]
    rates = _known_rates(scheme, [round(point - loss_db, 6) for point in grid])
    known = [(place, rate) for place, rate in zip(grid, rates, strict=True) if rate is not None]
    shift = f" + {loss_db:g} dB" if loss_db else ""
    return BerCurve(
        kind,
        name or f"theory {scheme.upper()}{shift}",
        [place for place, _ in known],
        [rate for _, rate in known],
    )


def _known_rates(scheme: str, levels_db: Sequence[float]) -> list[float | None]:
    """Theory at each level; None where the scheme's theory does not reach."""
    try:
        return [float(rate) for rate in bit_error_rate(scheme, np.asarray(levels_db, dtype=np.float64))]
    except ParameterError:
        if scheme not in SCHEMES:
            raise
    rates: list[float | None] = []
    for level_db in levels_db:
        try:
            rates.append(bit_error_rate(scheme, float(level_db)))
        except ParameterError:
            rates.append(None)
    return rates


def ber_range_db(points: Sequence[BerPoint]) -> tuple[float, float]:
    """Range of Eb/N0 that shows all points with air around them.

    Args:
        points: One point or more.

    Returns:
        Low and high end, dB, multiples of 0.5, at least `LEAST_SPAN_DB` apart.
    """
    low = min(point.ebn0_db for point in points)
    high = max(point.ebn0_db for point in points)
    air = max(0.6, (LEAST_SPAN_DB - (high - low)) / 2.0)
    return math.floor(2.0 * (low - air)) / 2.0, math.ceil(2.0 * (high + air)) / 2.0


def ber_chart(
    curves: Sequence[BerCurve],
    points: Sequence[BerPoint],
    *,
    title: str = "Bit error rate against Eb/N0",
    ident: str = "ber",
    interval_level: float = 0.95,
    standalone: bool = False,
) -> str:
    """Draw counted bit error rates beside theory and limit, log BER against Eb/N0.

    Args:
        curves: Curves, any number.
        points: Points counted, any number; curves and points may not both be empty.
        title: Short name of the picture.
        ident: Identifier unique on the page, letters, digits and hyphens.
        interval_level: Level of the vertical bars, said in the text alternative.
        standalone: True for a file of its own.

    Returns:
        SVG markup.

    Raises:
        ParameterError: There is nothing to draw.
    """
    curves = [curve for curve in curves if curve.ber]
    x, y = _axes(curves, points)
    parts = [_grid(x, y), f'<clipPath id="{ident}-c"><path d="{_box()}"/></clipPath><g clip-path="url(#{ident}-c)">']
    parts += [_drawn_curve(curve, x, y) for curve in curves]
    parts += [_guard(point, x, y) for point in points]
    parts.append("</g>")
    parts += [_curve_label(curve, x, y, [x(point.ebn0_db) for point in points]) for curve in curves]
    parts.append(path("frame", _box()))
    parts += [_drawn_point(point, x, y) for point in points]
    return sheet(
        "".join(parts),
        size=(WIDTH, HEIGHT),
        ident=ident,
        title=title,
        description=_description(curves, points, interval_level),
        standalone=standalone,
    )


def _axes(curves: Sequence[BerCurve], points: Sequence[BerPoint]) -> tuple[LinearScale, DecadeScale]:
    if not curves and not points:
        raise ParameterError("points", (), "hold a point where there is no curve")
    if points:
        low_db, high_db = ber_range_db(points)
        rates = [point.low for point in points if point.low > 0.0] + [point.high for point in points]
        inside = [
            rate
            for curve in curves
            for place, rate in zip(curve.ebn0_db, curve.ber, strict=True)
            if any(abs(place - point.ebn0_db) < 0.3 for point in points)
        ]
    else:
        low_db = min(place for curve in curves for place in curve.ebn0_db)
        high_db = max(place for curve in curves for place in curve.ebn0_db)
        rates, inside = [], [rate for curve in curves for rate in curve.ber]
    return LinearScale(low_db, high_db, LEFT, RIGHT), decades_around(rates + inside, BOTTOM, TOP, lowest=-12)


def _box() -> str:
    return f"M{number(LEFT)} {number(TOP)}H{number(RIGHT)}V{number(BOTTOM)}H{number(LEFT)}Z"


@lru_cache(maxsize=64)
def _grid(x: LinearScale, y: DecadeScale) -> str:
    """Lines and labels of the scales; a lot's units share a few."""
    hair = "".join(across(LEFT, RIGHT, y(value)) for value in y.minor()) if len(y.decades) <= 7 else ""
    ticks = x.ticks(12)
    rule = "".join(across(LEFT, RIGHT, y(10.0**exponent)) for exponent in y.decades)
    rule += "".join(down(x(value), TOP, BOTTOM) for value in ticks)
    texts = [label(LEFT - 7, y(10.0**exponent) + 4, power_of_ten(exponent), anchor="end") for exponent in y.decades]
    texts += [label(x(value), BOTTOM + 16, f"{value:g}", anchor="middle") for value in ticks]
    middle = (TOP + BOTTOM) / 2.0
    texts.append(
        label((LEFT + RIGHT) / 2.0, BOTTOM + 35, "Eb/N0 in dB, per information bit", kind="mid", anchor="middle")
    )
    turned = f'transform="rotate(-90 13 {number(middle)})"'
    texts.append(label(13, middle, "Bit error rate", kind="mid", anchor="middle", extra=turned))
    return path("hair", hair) + path("rule", rule) + "".join(texts)


def _trace(curve: BerCurve, x: LinearScale, y: DecadeScale) -> list[tuple[float, float]]:
    """Positions of a curve, without what lies far outside the picture."""
    floor = 10.0 ** (y.low_exponent - 1)
    return [(x(place), y(rate)) for place, rate in zip(curve.ebn0_db, curve.ber, strict=True) if rate > floor]


def _drawn_curve(curve: BerCurve, x: LinearScale, y: DecadeScale) -> str:
    trace = _trace(curve, x, y)
    if not trace:
        return ""
    line = "M" + "L".join(f"{number(across_)} {number(down_)}" for across_, down_ in trace)
    if curve.kind != "limit":
        return path(curve.kind, line)
    last, first = number(trace[-1][0]), number(trace[0][0])
    beyond = (
        f"{line}H{number(RIGHT)}V{number(TOP)}H{first}Z" if float(last) < RIGHT else f"{line}V{number(TOP)}H{first}Z"
    )
    return path("beyond", beyond) + path("limit", line)


def _curve_label(curve: BerCurve, x: LinearScale, y: DecadeScale, taken: Sequence[float]) -> str:
    """The curve's name beside it: the limit's to its right, theory's to its left where no point is near.

    A second theory would have its name among the points, so it stands in the corner and names its stroke.
    """
    trace = [spot for spot in _trace(curve, x, y) if LEFT <= spot[0] <= RIGHT and TOP <= spot[1] <= BOTTOM]
    if not trace:
        return ""
    text = escaped(shortened(curve.label, 44))
    if curve.kind == "second":
        return label(LEFT + 12, BOTTOM - 12, f"dotted: {text}", kind="mid halo")
    if curve.kind == "limit":
        spot = trace[len(trace) // 3]
        return label(spot[0] + 10, spot[1] - 5, text, kind="t-limit halo")
    middle = trace[len(trace) // 2 : max(len(trace) // 2 + 1, len(trace) * 9 // 10)]
    spot = max(middle, key=lambda place: min((abs(place[0] - 25.0 - point) for point in taken), default=0.0))
    return label(spot[0] - 8, spot[1] + 13, text, kind="t-theory halo", anchor="end")


def _guard(point: BerPoint, x: LinearScale, y: DecadeScale) -> str:
    if point.guarded_limit_ber is None or point.guarded_limit_ber <= 0.0:
        return ""
    middle = x(point.ebn0_db)
    return path("guard", across(middle - 11, middle + 11, y(point.guarded_limit_ber)))


def _drawn_point(point: BerPoint, x: LinearScale, y: DecadeScale) -> str:
    middle = x(point.ebn0_db)
    top = min(BOTTOM, max(TOP, y(point.high))) if point.high > 0.0 else BOTTOM
    bottom = min(BOTTOM, y(point.low)) if point.low > 0.0 else min(BOTTOM - 2.0, top + 42.0)
    bars = down(middle, top, bottom) + across(middle - 4, middle + 4, top)
    if point.low > 0.0:
        bars += across(middle - 4, middle + 4, bottom)
    else:
        bars += f"M{number(middle - 3.5)} {number(bottom - 6)}l3.5 6 3.5 -6"
    centre = y(point.ber) if point.errors else top
    if point.expanded_u_db > 0.0:
        bars += across(x(point.ebn0_db - point.expanded_u_db), x(point.ebn0_db + point.expanded_u_db), centre)
    mark = _mark(point, middle, centre) if point.errors else ""
    name = label(middle + 9, centre - 8, escaped(shortened(point.name, 12)), kind="halo") if point.name else ""
    return path("err", bars) + mark + name


def _mark(point: BerPoint, middle: float, centre: float) -> str:
    if point.judgement == "REJECT":
        return path("cross", f"M{number(middle - 4.5)} {number(centre - 4.5)}l9 9m0 -9l-9 9")
    kind = "dot" if point.judgement == "ACCEPT" else "hollow"
    return f'<circle class="{kind}" cx="{number(middle)}" cy="{number(centre)}" r="4.2"/>'


def _description(curves: Sequence[BerCurve], points: Sequence[BerPoint], level: float) -> str:
    told = []
    if curves:
        told.append("Curves: " + "; ".join(curve.label for curve in curves) + ".")
    for point in points:
        name = f"{point.name}: " if point.name else ""
        where = f"{name}at {point.ebn0_db:.2f} dB "
        span = f"{level:.4g} interval {plain_scientific(point.low)} to {plain_scientific(point.high)}"
        if point.errors:
            told.append(f"{where}{plain_scientific(point.ber, 3)} ({point.errors} errors), {span}, {point.judgement}.")
        else:
            told.append(
                f"{where}no error in {point.bits} bits, below {plain_scientific(point.high)}, {point.judgement}."
            )
    return " ".join(told)
