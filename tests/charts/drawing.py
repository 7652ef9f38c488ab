"""Reading a drawn chart back: what a reader with a ruler would do."""

from __future__ import annotations

import re
from dataclasses import dataclass
from xml.etree import ElementTree as ET

SVG = "{http://www.w3.org/2000/svg}"


def parse(markup: str) -> ET.Element:
    """The picture as a tree; Python's XML parser is the judge of its form."""
    return ET.fromstring(markup)  # noqa: S314  (our own drawing)


def by_class(root: ET.Element, kind: str) -> list[ET.Element]:
    """Every element that has a class."""
    return [element for element in root.iter() if kind in element.get("class", "").split()]


def words(root: ET.Element) -> list[str]:
    """The content of every text element."""
    return ["".join(element.itertext()) for element in root.iter(f"{SVG}text")]


@dataclass(frozen=True)
class Ruler:
    """Straight-line reading between two labelled ticks."""

    first: float
    first_value: float
    last: float
    last_value: float

    def __call__(self, position: float) -> float:
        share = (position - self.first) / (self.last - self.first)
        return self.first_value + share * (self.last_value - self.first_value)


def rulers(root: ET.Element) -> tuple[Ruler, Ruler]:
    """Rulers of a BER chart, from its tick labels: Eb/N0 in dB along x, exponent of ten along y."""
    across, up = [], []
    for text in root.iter(f"{SVG}text"):
        content = "".join(text.itertext()).replace("\N{MINUS SIGN}", "-")
        x, y = float(text.get("x", "nan")), float(text.get("y", "nan"))
        raised = text.find(f"{SVG}tspan")
        if raised is not None and raised.text:
            up.append((y - 4.0, float(raised.text.replace("\N{MINUS SIGN}", "-"))))
        elif text.get("text-anchor") == "middle" and re.fullmatch(r"-?\d+(\.\d+)?", content):
            across.append((x, float(content)))
    across.sort()
    up.sort()
    return Ruler(*across[0], *across[-1]), Ruler(*up[0], *up[-1])


def trace(path: ET.Element) -> list[tuple[float, float]]:
    """Points of a path of one move and straight lines."""
    numbers = [float(text) for text in re.findall(r"-?\d+(?:\.\d+)?", path.get("d", ""))]
    return list(zip(numbers[::2], numbers[1::2], strict=True))
