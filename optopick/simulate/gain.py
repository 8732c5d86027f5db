"""The base current a collector current needs, as one smooth law through the points of the CTR curve."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from optopick.physics.types import Array

SOFTNESS = 0.25
"""Width of a bend between two slopes, as a share of the shorter stretch beside it."""

HALVINGS = 20


@dataclass(frozen=True)
class GainLaw:
    """ln of the base current over x = ln of the collector current, both in amperes.

    y(x) = y_0 + slope*(x - x_0) + sum of bend*width*ln(1 + exp((x - knot)/width)): straight stretches in double
    logarithmic measure, as the CTR curve is read, with rounded bends; it goes through every point it was made of, and
    outside them the end slopes go on. Written out, it is also what the circuit file contains.
    """

    x_0: float
    y_0: float
    slope: float
    knots: tuple[float, ...]
    widths: tuple[float, ...]
    bends: tuple[float, ...]

    def at(self, x: float) -> tuple[float, float]:
        """The law y and its slope dy/dx at `x`."""
        y, slope = self.y_0 + self.slope * (x - self.x_0), self.slope
        for knot, width, bend in zip(self.knots, self.widths, self.bends, strict=True):
            z = (x - knot) / width
            # beyond 40 a bend is straight to the last digit, and exp would overflow further on
            if z > 40.0:
                y, slope = y + bend * (x - knot), slope + bend
            elif z > -40.0:
                e = math.exp(z)
                y, slope = y + bend * width * math.log1p(e), slope + bend * e / (1.0 + e)
        return y, slope


def gain_law(i_c: Array, i_b: Array) -> GainLaw:
    """The law through the points (i_c, i_b), two or more, both strictly ascending and above zero [A].

    The bends solve a linear system, one equation a point. They start with SOFTNESS; where the points turn so sharply
    that the law would fall somewhere, the bends are made sharper until it rises throughout, as the straight stretches
    do. Raises ValueError where the points do not ascend.
    """
    x, y = np.log(i_c), np.log(i_b)
    if x.size < 2 or not (np.all(np.diff(x) > 0) and np.all(np.diff(y) > 0)):
        raise ValueError(f"currents that do not ascend: {i_c} and {i_b}")
    gaps = np.diff(x)
    widths = SOFTNESS * np.minimum(gaps[:-1], gaps[1:])
    for _ in range(HALVINGS):
        slope, bends = _through(x, y, widths)
        if np.all(slope + np.concatenate([[0.0], np.cumsum(bends)]) > 0):
            break
        widths = widths / 2
    y_0 = float(y[0] - np.sum(_hinges(x[:1], x[1:-1], widths) @ bends))
    return GainLaw(float(x[0]), y_0, slope, _floats(x[1:-1]), _floats(widths), _floats(bends))


def _through(x: Array, y: Array, widths: Array) -> tuple[float, Array]:
    """First slope and bends of the law through the points."""
    system = np.column_stack([x - x[0], _hinges(x, x[1:-1], widths)])
    # differences to the first point: what all bends together have there goes into y_0
    found = np.linalg.solve((system - system[0])[1:], (y - y[0])[1:])
    return float(found[0]), found[1:]


def _hinges(x: Array, knots: Array, widths: Array) -> Array:
    """A row for each x, a column for each knot: width*ln(1 + exp((x - knot)/width))."""
    return np.asarray(widths * np.logaddexp(0.0, (x[:, None] - knots) / widths))


def _floats(values: Array) -> tuple[float, ...]:
    return tuple(float(v) for v in values)
