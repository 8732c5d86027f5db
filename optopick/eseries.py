"""Preferred values of IEC 60063: E3 to E192, by the standard's rule and its exceptions."""

from __future__ import annotations

import math
from functools import cache

SERIES: tuple[str, ...] = ("E3", "E6", "E12", "E24", "E48", "E96", "E192")

# IEC 60063: where the standard's list is not round(10^(i/n)), by step i. Eight in E24, which E3 to E12 are taken
# from, and one (9.20) in E192, which E48 and E96 are taken from.
_E24_EXCEPTIONS = {10: 27, 11: 30, 12: 33, 13: 36, 14: 39, 15: 43, 16: 47, 22: 82}
_E192_EXCEPTIONS = {185: 920}

# A limit that went through arithmetic still includes the value it names; the finest step, E192, is 1.2 %.
_SLACK = 1e-9


@cache
def decade(name: str) -> tuple[int, ...]:
    """Return one decade of series `name` as integers, ascending: two digits up to E24 (10 to 99), else three.

    Value i of a series of n is 10^(i/n) rounded to those digits, save the exceptions of IEC 60063; a smaller series is
    every second, fourth, eighth value of E24 or E192. Raises ValueError for an unknown name.
    """
    count = _count(name)
    if count <= 24:
        return _full(24, 2, _E24_EXCEPTIONS)[:: 24 // count]
    return _full(192, 3, _E192_EXCEPTIONS)[:: 192 // count]


def series_values(name: str, low: float, high: float) -> tuple[float, ...]:
    """Return the values of series `name` from `low` to `high` (both included), ascending, in the unit of the limits.

    Each is the float nearest to the decimal value: 0.47, never 0.47000000000000003. Raises ValueError for an unknown
    name, limits that are not positive and finite, limits in falling order, or a range with no value in it.
    """
    if not (0 < low <= high < math.inf):
        raise ValueError(f"range {low:g} to {high:g}; expected two positive values, the lowest first")
    values = tuple(value for value in _decades(name, low, high) if low * (1 - _SLACK) <= value <= high * (1 + _SLACK))
    if not values:
        raise ValueError(f"no value of {name} lies from {low:g} to {high:g}; expected a range with one at least")
    return values


def neighbours(name: str, value: float) -> tuple[float, float]:
    """Return the largest value of series `name` at or below `value` and the smallest at or above it.

    Raises ValueError for an unknown name or a value that is not positive and finite.
    """
    around = _around(name, value)
    below = max(member for member in around if member <= value * (1 + _SLACK))
    above = min(member for member in around if member >= value * (1 - _SLACK))
    return below, above


def nearest(name: str, value: float) -> float:
    """Return the value of series `name` nearest to `value` in ratio, the smaller of two equally near.

    Raises ValueError for an unknown name or a value that is not positive and finite.
    """
    below, above = neighbours(name, value)
    return below if value / below <= above / value else above


def _count(name: str) -> int:
    if name not in SERIES:
        raise ValueError(f'unknown series "{name}"; expected one of {", ".join(SERIES)}')
    return int(name[1:])


def _full(count: int, digits: int, exceptions: dict[int, int]) -> tuple[int, ...]:
    scale = 10 ** (digits - 1)
    return tuple(exceptions.get(step, round(scale * 10 ** (step / count))) for step in range(count))


def _decades(name: str, low: float, high: float) -> tuple[float, ...]:
    """Return every value of the decades that `low` to `high` touch."""
    members = decade(name)
    shift = 1 if members[0] == 10 else 2
    # from text, because 47 * 10^-2 in binary is not the float nearest to 0.47
    return tuple(
        float(f"{member}e{exponent - shift}")
        for exponent in range(_exponent(low), _exponent(high) + 1)
        for member in members
    )


def _exponent(value: float) -> int:
    return int(f"{value:e}".partition("e")[2])


def _around(name: str, value: float) -> tuple[float, ...]:
    if not (0 < value < math.inf):
        raise ValueError(f"value {value:g}; expected a positive, finite one")
    return _decades(name, value / 10, value * 10)
