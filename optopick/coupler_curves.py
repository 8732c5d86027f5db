"""Curves of a data sheet as short lists of points, on plain numbers."""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise


@dataclass(frozen=True)
class Curve:
    """Two or more points: `x` strictly ascending, `y` > 0."""

    x: tuple[float, ...]
    y: tuple[float, ...]

    def covers(self, x: float) -> bool:
        """Tell whether `x` lies within the points, give or take a rounding step."""
        slack = 1e-9 * (self.x[-1] - self.x[0])
        return self.x[0] - slack <= x <= self.x[-1] + slack

    def linear_at(self, x: float) -> float:
        """Return y at `x` within the points, linear between them."""
        return _between(self.x, self.y, x)

    def log_at(self, x: float) -> float:
        """Return y at `x` > 0, linear between the points in the logarithms of both; outside, the end slopes go on."""
        return math.exp(_between(self._log_x, self._log_y, math.log(x)))

    def divided_by(self, y: float) -> Curve:
        """Return the curve with every y divided by `y`."""
        return Curve(self.x, tuple(value / y for value in self.y))

    def with_x_times(self, factor: float) -> Curve:
        """Return the curve with every x multiplied by `factor`."""
        return Curve(tuple(value * factor for value in self.x), self.y)

    @property
    def carries_more(self) -> bool:
        """Tell whether x*y rises from each point to the next: more LED current gives more output current."""
        return all(second > first for first, second in pairwise(x * y for x, y in zip(self.x, self.y, strict=True)))

    def x_carrying(self, product: float) -> float:
        """Return x > 0 with x*y(x) = `product` > 0: the LED current that carries an output current.

        Needs `carries_more`. Infinite where the last point does not reach `product`; below the first point its slope
        goes on. Same law as `optopick.physics.transfer.led_current_for`, for one number.
        """
        log_xy = [a + b for a, b in zip(self._log_x, self._log_y, strict=True)]
        wanted = math.log(product)
        return math.inf if wanted > log_xy[-1] else math.exp(_between(log_xy, self._log_x, wanted))

    @cached_property
    def _log_x(self) -> tuple[float, ...]:
        return tuple(map(math.log, self.x))

    @cached_property
    def _log_y(self) -> tuple[float, ...]:
        return tuple(map(math.log, self.y))


def read_points(text: str) -> Curve:
    """Read "0.5:0.55 1:0.72 5:1" into a curve. Raises ValueError with what is wrong, in words, of the first fault."""
    points = [_point(word) for word in text.split()]
    if len(points) < 2:
        raise ValueError("two points or more, such as 1:0.72 5:1")
    if any(second[0] <= first[0] for first, second in pairwise(points)):
        raise ValueError("points whose first numbers ascend")
    if any(y <= 0 for _, y in points):
        raise ValueError("second numbers above zero")
    return Curve(tuple(x for x, _ in points), tuple(y for _, y in points))


def _point(word: str) -> tuple[float, float]:
    expected = f"pairs of numbers such as 1:0.72 with blanks between, not {word}"
    first, colon, second = word.partition(":")
    # float() reads "nan", "1_0" and foreign digits too
    if not colon or not set(first + second) <= set("0123456789+-.eE"):
        raise ValueError(expected)
    try:
        x, y = float(first), float(second)
    except ValueError:
        raise ValueError(expected) from None
    if not (math.isfinite(x) and math.isfinite(y)):
        raise ValueError(expected)
    return x, y


def _between(xs: Sequence[float], ys: Sequence[float], x: float) -> float:
    """Piecewise linear through the points, with the end slopes outside."""
    k = min(max(bisect_right(xs, x), 1), len(xs) - 1)
    share = (x - xs[k - 1]) / (xs[k] - xs[k - 1])
    return ys[k - 1] + share * (ys[k] - ys[k - 1])
