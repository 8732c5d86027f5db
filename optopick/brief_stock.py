"""The resistor positions of a brief: from a series, a shelf file, or a list of values in the brief itself."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import cast

from optopick.brief import Position
from optopick.errors import InputError
from optopick.read_keys import Mistakes, Values
from optopick.stock import series_position, shelf_position, voltage_limit
from optopick.units import format_resistor

POSITIONS = ("r_led", "r_load", "r_be", "r_shunt")


@dataclass(frozen=True)
class _Ratings:
    """What holds for every resistor of a position that says nothing of its own; voltage None: from the power."""

    tolerance: float
    power: float
    voltage: float | None
    absent: bool


def read_positions(values: Values, mistakes: Mistakes) -> dict[str, Position]:
    """Return every position that the brief stocks without a mistake, noting the mistakes of the others."""
    positions = {}
    for name in POSITIONS:
        position = _position(f"stock.{name}", values, mistakes)
        if position is not None:
            pieces = values.get(f"stock.{name}.pieces") if name == "r_led" else 1
            positions[name] = replace(position, pieces=int(cast(int, pieces or 1)))
    return positions


def _position(section: str, values: Values, mistakes: Mistakes) -> Position | None:
    by_series, by_values = (f"{section}.{name}" in values.given for name in ("series", "values"))
    if by_series == by_values:
        if section in values.sections:
            found = "series and values" if by_series else "neither series nor values"
            mistakes.add(tuple(section.split(".")), found, 'one of the two, such as series = "E24"')
        return None
    ratings = _ratings(section, values)
    if ratings is None:
        return None
    return (
        _from_series(section, values, ratings, mistakes) if by_series else _listed(section, values, ratings, mistakes)
    )


def _ratings(section: str, values: Values) -> _Ratings | None:
    """Return the ratings of a position; None if one of them is a mistake that is noted already."""
    own = f"{section}.tolerance"
    tolerance = own if own in values.given else "stock.tolerance"
    voltage = f"{section}.voltage"
    if not values.has(tolerance, f"{section}.power") or (voltage in values.given and not values.has(voltage)):
        return None
    # from here on a missing voltage means: follow the power rating
    absent = bool(values.get(f"{section}.absent"))
    return _Ratings(values.number(tolerance), values.number(f"{section}.power"), values.optional(voltage), absent)


def _from_series(section: str, values: Values, ratings: _Ratings, mistakes: Mistakes) -> Position | None:
    ends = (f"{section}.from", f"{section}.to")
    if not values.has(f"{section}.series", *ends):
        return None
    series, low, high = values.text(f"{section}.series"), *(values.number(end) for end in ends)
    # blame an end that the brief gives, not the default beside it
    path = tuple(next((end for end in ends if end in values.given), section).split("."))
    if low > high:
        mistakes.add(path, f"from {format_resistor(low)} to {format_resistor(high)}", "the lowest value first")
        return None
    try:
        return series_position(
            series,
            low,
            high,
            tolerance=ratings.tolerance,
            power=ratings.power,
            voltage=ratings.voltage,
            absent=ratings.absent,
        )
    except ValueError:  # the range lies between two neighbours of the series
        found = f"no value of {series} from {format_resistor(low)} to {format_resistor(high)}"
        mistakes.add(path, found, "a range with one value at least")
        return None


def _listed(section: str, values: Values, ratings: _Ratings, mistakes: Mistakes) -> Position | None:
    for name in ("from", "to"):
        if f"{section}.{name}" in values.given:
            mistakes.add((*section.split("."), name), "a limit of a series", "no such key beside values")
    stock = values.get(f"{section}.values")
    if isinstance(stock, tuple):
        return _inline(cast("tuple[float, ...]", stock), ratings)
    return _from_shelf(stock, ratings, mistakes) if isinstance(stock, Path) else None


def _from_shelf(path: Path, ratings: _Ratings, mistakes: Mistakes) -> Position | None:
    try:
        return shelf_position(
            path,
            tolerance=ratings.tolerance,
            power=ratings.power,
            voltage=ratings.voltage,
            absent=ratings.absent,
        )
    except InputError as error:
        mistakes.take(error.mistakes)
        return None


def _inline(ohms: tuple[float, ...], ratings: _Ratings) -> Position:
    count = len(ohms)
    voltage = voltage_limit(ratings.power) if ratings.voltage is None else ratings.voltage
    return Position(
        values=tuple(sorted(ohms)),
        tolerance=(ratings.tolerance,) * count,
        power=(ratings.power,) * count,
        voltage=(voltage,) * count,
        price=(None,) * count,
        absent=ratings.absent,
        described=f"{count} value{'s' if count > 1 else ''} listed in the brief",
    )
