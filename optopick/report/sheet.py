"""A sheet to draw a circuit on: symbols and wires by schemdraw at places in pixels, text and colours our own."""

from __future__ import annotations

import re
import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from functools import cache
from importlib import import_module
from itertools import pairwise
from typing import Any
from xml.etree import ElementTree

from markupsafe import Markup

from optopick.report.svg import Point, element, short, text

UNIT = 36.0
"""Pixels to one unit of schemdraw: half an inch at 72 to the inch."""

_NUMBER = re.compile(r"-?\d+\.?\d*(?:e-?\d+)?")
_FILLS = {"fill:none": "outline", "fill:white": "hollow"}
_SHAPES = {"path", "polygon", "polyline", "circle", "ellipse", "rect"}


class Sheet:
    """Collects symbols and wires from schemdraw, and text of our own."""

    def __init__(self) -> None:
        self.symbols, drawing = schemdraw()
        self.drawing: Any = drawing(canvas="svg", show=False)
        self.words: list[Markup] = []
        self.outlines: list[Markup] = []

    def part(self, symbol: Any, begin: Point, end: Point) -> None:  # noqa: ANN401 - schemdraw's own element
        """A part with two ends."""
        self.drawing.add(symbol.at(_units(begin)).to(_units(end)))

    def put(self, symbol: Any, at: Point) -> Any:  # noqa: ANN401 - schemdraw's own element
        """A part at one point, unturned."""
        return self.drawing.add(symbol.right().at(_units(at)))

    def wire(self, *points: Point) -> None:
        """A line through points."""
        for begin, end in pairwise(points):
            self.part(self.symbols.Line(), begin, end)

    def triangle(self, tip: Point, length: float, half: float) -> None:
        """A stage that passes a signal on, to the right: a triangle with its tip at a point."""
        (x, y), back = tip, tip[0] - length
        corners = ((back, y - half), (back, y + half), (x, y))
        places = " ".join(f"{short(across)},{short(down)}" for across, down in corners)
        self.outlines.append(element("polygon", points=places, class_="outline"))

    def joint(self, *points: Point) -> None:
        """Dots where wires meet."""
        for point in points:
            self.put(self.symbols.Dot(radius=0.085), point)

    def resistor(self, begin: Point, end: Point) -> None:
        """A resistor between two points."""
        self.part(self.symbols.ResistorIEC(), begin, end)

    def say(self, at: Point, *lines: str | Markup, class_: str = "", anchor: str = "start") -> None:
        """Lines of text below each other; the first is a symbol's name where it is Markup."""
        for k, line in enumerate(lines):
            self.words.append(text((at[0], at[1] + 19 * k), line, class_, anchor))

    def shapes(self) -> Markup:
        """Everything drawn, without text."""
        return Markup("").join((*_shapes(self.drawing.get_imagedata("svg")), *self.outlines))


def _units(point: Point) -> tuple[float, float]:
    return point[0] / UNIT, -point[1] / UNIT


@cache
def schemdraw() -> tuple[Any, Any]:
    """Schemdraw's symbols and its Drawing."""
    with _without("matplotlib"):
        package = import_module("schemdraw")
        return import_module("schemdraw.elements"), package.Drawing


@contextmanager
def _without(name: str) -> Iterator[None]:
    """Keep a package from being imported meanwhile: schemdraw would take two seconds to load matplotlib for nothing."""
    loaded = name in sys.modules
    if not loaded:
        sys.modules[name] = None  # type: ignore[assignment]  # the documented way to make an import fail
    try:
        yield
    finally:
        if not loaded:
            del sys.modules[name]


def _shapes(data: bytes) -> Iterator[Markup]:
    """Schemdraw's shapes without their styles: outlines, filled and hollow ones told apart by class."""
    for node in ElementTree.fromstring(data).iter():
        name = node.tag.rpartition("}")[2]
        if name in _SHAPES:
            style = node.attrib.pop("style", "")
            kind = next((kind for fill, kind in _FILLS.items() if fill in style), "filled")
            places = {
                key: _NUMBER.sub(lambda found: short(float(found[0])), value) for key, value in node.attrib.items()
            }
            yield element(name, class_=kind, **places)


def pixels(point: Sequence[float]) -> Point:
    """A place of schemdraw's in pixels."""
    return point[0] * UNIT, -point[1] * UNIT
