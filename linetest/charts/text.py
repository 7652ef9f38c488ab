"""Text that is safe and readable inside SVG and HTML, whatever it came from."""

from __future__ import annotations

import html
import re

# Controls and surrogates break XML; direction and zero-width characters make a text look like another one.
_INVISIBLE = re.compile(
    "[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\u00ad\u061c\u180e\u200b-\u200f\u2028-\u202e\u2060-\u206f"
    "\ud800-\udfff\ufeff\ufff9-\ufffb\ufffe\uffff]"
)
MINUS = "\N{MINUS SIGN}"


def visible(text: str) -> str:
    """Text with every control, direction and zero-width character shown as its code point.

    Args:
        text: Any text.

    Returns:
        The text with, for example, a right-to-left override written as `<U+202E>`; not yet escaped.
    """
    return _INVISIBLE.sub(lambda found: f"<U+{ord(found.group()):04X}>", text)


def escaped(text: str) -> str:
    """Text made visible and escaped for element content and for quoted attributes.

    Args:
        text: Any text.

    Returns:
        Text without markup.
    """
    return html.escape(visible(text), quote=True)


def shortened(text: str, length: int) -> str:
    """Text cut to a length, with an ellipsis where something was cut.

    Args:
        text: Any text.
        length: Most characters, 2 or more.

    Returns:
        The text or its beginning.
    """
    return text if len(text) <= length else text[: length - 1].rstrip() + "…"


def power_of_ten(exponent: int) -> str:
    """A decade as SVG text: 10 with a raised exponent, 1 and 10 written out.

    Args:
        exponent: The exponent.

    Returns:
        SVG markup for the content of a `text` element.
    """
    if exponent in {0, 1}:
        return str(10**exponent)
    sign = MINUS if exponent < 0 else ""
    return f'10<tspan dy="-4.5" font-size="8.5">{sign}{abs(exponent)}</tspan>'


def number(value: float) -> str:
    """A coordinate in as few characters as a tenth of a unit needs.

    Args:
        value: Coordinate in user units.

    Returns:
        The number without trailing zeros.
    """
    text = f"{value:.1f}".removesuffix(".0")
    return "0" if text == "-0" else text


def plain_scientific(value: float, digits: int = 2) -> str:
    """A small number for a text alternative: `2.1e-5` as `2.1 × 10^-5`.

    Args:
        value: The number.
        digits: Significant digits.

    Returns:
        Text without markup.
    """
    if value == 0.0:
        return "0"
    mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
    return f"{mantissa} × 10^{int(exponent)}"
