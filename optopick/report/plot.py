"""The frame of a plot that keeps its text size at any width: a fixed gutter, shares of the rest for what is drawn.

Lines live in a square of 1000 by 1000 that is stretched to the room there is; text and marks sit at percentages.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

from markupsafe import Markup

from optopick.report.axes import Scale
from optopick.report.svg import Point, element, percent, picture, polyline, text

GUTTER, RIGHT, ABOVE, BELOW = 66.0, 14.0, 28.0, 44.0
"""Room [px] around the plot: for tick texts at the left and below, for the axis name above."""

ROW = 22.0
"""Height [px] of one line of the key below a plot."""

SQUARE = 1000.0
SERIES = 5
"""Colours and dash patterns that the palette has, `series-1` on."""


@dataclass(frozen=True)
class Frame:
    """Two scales with their names, and the plot's height [px]."""

    x: Scale
    x_name: str
    y: Scale
    y_name: str
    height: float = 240.0

    def at(self, x: float, y: float) -> tuple[str, str]:
        """A point as percentages of the plot."""
        return percent(self.x.share(x)), percent(1 - self.y.share(y))

    def line(self, points: Iterable[Point], class_: str) -> Markup:
        """A curve in the stretched square, interrupted where a value is not finite."""
        drawn = (
            polyline(((SQUARE * self.x.share(x), SQUARE * (1 - self.y.share(y))) for x, y in part), f"curve {class_}")
            for part in finite_parts(points)
        )
        return stretched(*drawn)

    def level(self, name: str, value: float) -> Markup:
        """A dashed horizontal line with its name on it."""
        y = percent(1 - self.y.share(value))
        rule = element("line", x1="0", x2="100%", y1=y, y2=y, class_="level")
        return rule + element("g", text(("100%", y), name, "halo", "end"), transform="translate(-4 -5)")

    def mark(self, x: float, y: float, class_: str, radius: float = 4.0) -> Markup:
        """A round mark at a point."""
        cx, cy = self.at(x, y)
        return element("circle", cx=cx, cy=cy, r=radius, class_=class_)

    def drawn(self, name: str, described: str, *inside: Markup, key: Sequence[str] = (), class_: str = "") -> Markup:
        """The whole picture: ticks, names, what is inside, the key below."""
        area = element("svg", *self._grid(), *inside, y=ABOVE, width="100%", height=self.height, overflow="visible")
        names = text((-GUTTER, 14), self.y_name, "axis-name")
        names += text(("100%", ABOVE + self.height + 38), self.x_name, "axis-name", "end")
        total = ABOVE + self.height + BELOW + ROW * len(key)
        parts = (names, area, _key(key, ABOVE + self.height + BELOW))
        return plot_picture(name, described, *parts, height=total, gutter=GUTTER, class_=class_)

    def _grid(self) -> Iterator[Markup]:
        for tick in self.y.ticks(5):
            y = percent(1 - self.y.share(tick))
            yield element("line", x1="0", x2="100%", y1=y, y2=y, class_="grid")
            label = text(("0", y), self.y.words(tick), "tick", "end")
            yield element("g", label, transform="translate(-8 4)")
        for tick in self.x.ticks(5):
            share = self.x.share(tick)
            yield element("line", x1=percent(share), x2=percent(share), y1="0", y2="100%", class_="grid")
            anchor = "end" if share > 0.93 else "middle"
            yield text((percent(share), self.height + 18), self.x.words(tick), "tick", anchor)
        yield element("rect", x="0", y="0", width="100%", height="100%", class_="edge")


def plot_picture(
    name: str, described: str, *children: Markup, height: float, gutter: float = 0.0, class_: str = ""
) -> Markup:
    """A picture as wide as the page gives it: its box is the plot itself, the texts at the left hang over.

    Margins of the box do this in every browser; a sum of pixels and percentages inside an SVG does not.
    """
    style = f"margin-left:{gutter:g}px;width:calc(100% - {gutter + RIGHT:g}px)"
    return picture(
        name, described, *children, height=height, overflow="visible", style=style, class_=f"plot {class_}".rstrip()
    )


def stretched(*children: Markup) -> Markup:
    """Shapes in the square of 1000 by 1000, stretched over the plot and cut at its edges."""
    return element(
        "svg",
        *children,
        width="100%",
        height="100%",
        viewBox=f"0 0 {SQUARE:g} {SQUARE:g}",
        preserveAspectRatio="none",
    )


def finite_parts(points: Iterable[Point]) -> Iterator[list[Point]]:
    """The stretches of points between those that are not finite."""
    part: list[Point] = []
    for x, y in points:
        if math.isfinite(x) and math.isfinite(y):
            part.append((x, y))
        elif part:
            yield part
            part = []
    if part:
        yield part


def series_class(k: int) -> str:
    """The class that gives the k-th curve its colour and dashes."""
    return f"series-{k % SERIES + 1}"


def _key(names: Sequence[str], top: float) -> Markup:
    """One row for each curve: a piece of its line and its name."""
    rows = []
    for k, name in enumerate(names):
        y = top + ROW * k + 12
        rows.append(element("line", x1="0", x2=34, y1=y, y2=y, class_=f"curve {series_class(k)}"))
        rows.append(text((44, y + 4), name))
    return Markup("").join(rows)
