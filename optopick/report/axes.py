"""The scales of a plot: where a value lies, and which round values carry a tick."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass

from optopick.units import format_quantity


@dataclass(frozen=True)
class Scale:
    """A linear or logarithmic scale from `low` to `high`, low < high, both positive where logarithmic."""

    low: float
    high: float
    unit: str
    log: bool = False

    def share(self, value: float) -> float:
        """Where a value lies, 0 at `low`, 1 at `high` [1]; not held within."""
        if self.log:
            return math.log(value / self.low) / math.log(self.high / self.low)
        return (value - self.low) / (self.high - self.low)

    def ticks(self, most: int = 6) -> tuple[float, ...]:
        """Round values within the scale."""
        return _log_ticks(self.low, self.high, most) if self.log else _linear_ticks(self.low, self.high, most)

    def words(self, value: float) -> str:
        """A tick's text."""
        return format_quantity(value, self.unit, 3)


def scale_over(values: Iterable[float], unit: str, *, log: bool = False, room: float = 0.04) -> Scale:
    """The scale that holds all finite values with a little room at both ends; a lone value gets a span around it."""
    finite = [value for value in values if math.isfinite(value) and (value > 0 or not log)]
    low, high = (min(finite), max(finite)) if finite else (1.0, 2.0)
    if log:
        stretch = (high / low) ** room if high > low else 2.0
        return Scale(low / stretch, high * stretch, unit, log=True)
    stretch = (high - low) * room if high > low else abs(high) / 2 or 1.0
    return Scale(low - stretch, high + stretch, unit)


def _linear_ticks(low: float, high: float, most: int) -> tuple[float, ...]:
    step = _round_step((high - low) / most)
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    return tuple(k * step for k in range(first, last + 1))


def _round_step(least: float) -> float:
    """The smallest of 1, 2 and 5 times a power of ten that is no less than `least`."""
    power = 10.0 ** math.floor(math.log10(least))
    return next(factor * power for factor in (1.0, 2.0, 5.0, 10.0) if factor * power >= least * (1 - 1e-9))


def _log_ticks(low: float, high: float, most: int) -> tuple[float, ...]:
    decades = range(math.floor(math.log10(low)), math.ceil(math.log10(high)) + 1)
    for factors in ((1, 2, 3, 5, 7), (1, 2, 5), (1, 3), (1,)):
        ticks = [float(f"{factor}e{n}") for n in decades for factor in factors]
        ticks = [tick for tick in ticks if low * (1 - 1e-9) <= tick <= high * (1 + 1e-9)]
        if len(ticks) <= most and ticks:
            return tuple(ticks)
    ticks = ticks[:: math.ceil(len(ticks) / most)] if ticks else []
    return tuple(ticks) or (math.sqrt(low * high),)
