"""Numbers as a reader of a certificate expects them: rounded by their uncertainty, with a real minus sign."""

from __future__ import annotations

import math
from datetime import UTC, datetime

from markupsafe import Markup

from linetest.charts import visible

MINUS = "\N{MINUS SIGN}"
THIN = "\N{NARROW NO-BREAK SPACE}"
NONE = "\N{EN DASH}"


def shown(value: object) -> object:
    """What any text goes through before it is escaped: nothing in it may be invisible or turn its direction.

    Args:
        value: What a template prints.

    Returns:
        The same, text made visible; markup of our own is left as it is.
    """
    return visible(value) if isinstance(value, str) and not isinstance(value, Markup) else value


def utc(at: datetime) -> str:
    """An aware time in UTC, to the second."""
    return f"{at.astimezone(UTC):%Y-%m-%d %H:%M:%S} UTC"


def decimals(value: float, places: int = 2) -> str:
    """A number with fixed decimals and a real minus sign."""
    return f"{value:.{places}f}".replace("-", MINUS)


def grouped(value: int) -> str:
    """A whole number in groups of three, from five digits on."""
    text = f"{abs(value):,}".replace(",", THIN) if abs(value) >= 10_000 else str(abs(value))
    return f"{MINUS if value < 0 else ''}{text}"


def rate(value: float, digits: int = 3) -> Markup:
    """A small number as mantissa and power of ten.

    Args:
        value: The number.
        digits: Significant digits.

    Returns:
        Markup, for example 1.23 × 10 with a raised minus 5.
    """
    if value == 0.0:
        return Markup("0")
    mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
    written = f"{mantissa}{THIN}×{THIN}10<sup>{int(exponent)}</sup>".replace("-", MINUS)
    return Markup(written)  # noqa: S704  (digits and signs of our own)


def percent(share: float) -> str:
    """A share as percent with two decimals, small ones as what they lie below."""
    if 0.0 < share < 0.00005:
        return f"< 0.01{THIN}%"
    return f"{share * 100:.2f}{THIN}%"


def uncertainty_places(standard_uncertainty: float) -> int:
    """Decimals that show an uncertainty with two significant digits.

    Args:
        standard_uncertainty: Standard uncertainty, above 0.

    Returns:
        Number of decimals, 0 or more.

    Source:
        JCGM 100:2008, 7.2.6: at most two significant digits, the estimate rounded to the same place.
    """
    # An uncertainty that rounds up to the next decade (0.0996 to 0.10) needs one decimal less.
    rounded = float(f"{standard_uncertainty:.1e}")
    return max(0, 1 - math.floor(math.log10(rounded)))


def measured(value: float | str, standard_uncertainty: float | None = None) -> str:
    """A reading's value, rounded to the place of its uncertainty; else four digits, few decimals.

    Args:
        value: The value; text passes unchanged.
        standard_uncertainty: Standard uncertainty in the same unit, None or 0 where not stated.

    Returns:
        The number in words.
    """
    if isinstance(value, str):
        return value
    if not math.isfinite(value):
        return "not a number"
    if standard_uncertainty:
        return decimals(value, uncertainty_places(standard_uncertainty))
    if value.is_integer() and abs(value) >= 1000:
        return grouped(int(value))
    if 1e-6 <= abs(value) < 10_000.0:
        magnitude = math.floor(math.log10(abs(value)))
        return decimals(value, max(0, min(3, 3 - magnitude), 1 - magnitude))
    return f"{value:.4g}".replace("-", MINUS)


def spread(standard_uncertainty: float | None) -> str:
    """A standard uncertainty with two significant digits, a dash where none is stated."""
    if not standard_uncertainty:
        return NONE
    return decimals(standard_uncertainty, uncertainty_places(standard_uncertainty))


def limits(lower: float | None, upper: float | None) -> str:
    """Limits of a reading in words, a dash where it is not judged.

    Args:
        lower: Lower limit or None.
        upper: Upper limit or None.

    Returns:
        The limits.
    """
    low = "" if lower is None else f"{lower:g}".replace("-", MINUS)
    high = "" if upper is None else f"{upper:g}".replace("-", MINUS)
    if low and high:
        return f"{low} to {high}"
    if low:
        return f"at least {low}"
    return f"at most {high}" if high else NONE
