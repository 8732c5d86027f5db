"""Which resistors there are for one position: a preferred-value series or a list of what is on the shelf."""

from __future__ import annotations

import csv
import difflib
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from itertools import zip_longest
from pathlib import Path

from optopick.brief import Position
from optopick.errors import InputError, Mistake
from optopick.eseries import series_values
from optopick.units import QuantityError, format_resistor, parse_quantity

DEFAULT_LOW = 10.0
DEFAULT_HIGH = 1e6

# Chip resistors: power rating [W], voltage limit [V]. 0.125 W, 150 V: typical 0805 on makers' data sheets (see
# published-checks); the other rows from memory. A shelf list that states its own voltage is better.
_VOLTAGE_LIMITS = ((0.5, 250.0), (0.25, 200.0), (0.125, 150.0), (0.1, 75.0), (0.0625, 50.0))
_SMALLEST_LIMIT = 25.0  # below 0.0625 W; from memory

# The widest tolerance of a preferred-value series (E6). It also catches "0.5" and "1" written for 0.5 % and 1 %.
_WIDEST_TOLERANCE = 0.2

COLUMNS: tuple[str, ...] = ("value", "tolerance", "power", "voltage", "price")


@dataclass(frozen=True)
class ShelfRow:
    """One line of a shelf list: value [ohm], and what it says of tolerance [1], power [W], voltage [V], price.

    None where the cell is empty. line: its line in the file, from 1.
    """

    line: int
    value: float
    tolerance: float | None
    power: float | None
    voltage: float | None
    price: float | None


def voltage_limit(power: float) -> float:
    """Return the voltage limit [V] taken for a resistor of rating `power` [W] whose own limit is not stated.

    The row of the next lower rating where there is none for this one.
    """
    return next((limit for rating, limit in _VOLTAGE_LIMITS if power >= rating), _SMALLEST_LIMIT)


def series_position(
    series: str, low: float, high: float, *, tolerance: float, power: float, voltage: float | None, absent: bool
) -> Position:
    """Return the position stocked with every value of `series` from `low` to `high` [ohm].

    All have the same tolerance [1], power rating [W] and voltage limit [V] (None: from the rating). Raises ValueError
    for an unknown series, or a range that is reversed, not positive, or holds no value.
    """
    values = series_values(series, low, high)
    count = len(values)
    return Position(
        values=values,
        tolerance=(tolerance,) * count,
        power=(power,) * count,
        voltage=(voltage_limit(power) if voltage is None else voltage,) * count,
        price=(None,) * count,
        absent=absent,
        described=f"{series}, {format_resistor(low)} to {format_resistor(high)}",
    )


def shelf_position(path: Path, *, tolerance: float, power: float, voltage: float | None, absent: bool) -> Position:
    """Return the position stocked with the values of the shelf list at `path`.

    tolerance [1], power [W] and voltage [V] (None: from the row's rating) fill the cells that the list leaves empty.
    Raises InputError with every mistake of the file.
    """
    rows = sorted(read_shelf(path), key=lambda row: row.value)
    ratings = tuple(power if row.power is None else row.power for row in rows)
    limits = tuple(row.voltage if row.voltage is not None else voltage for row in rows)
    return Position(
        values=tuple(row.value for row in rows),
        tolerance=tuple(tolerance if row.tolerance is None else row.tolerance for row in rows),
        power=ratings,
        voltage=tuple(
            voltage_limit(rating) if limit is None else limit for rating, limit in zip(ratings, limits, strict=True)
        ),
        price=tuple(row.price for row in rows),
        absent=absent,
        described=f"{path.name}, {len(rows)} value{'s' if len(rows) > 1 else ''}",
    )


def reduced(position: Position, keep: Sequence[int]) -> Position:
    """Return the position with only the values at the indices `keep`, still ascending.

    Raises IndexError for an index outside the position.
    """
    count = len(position.values)
    if any(not 0 <= index < count for index in keep):
        raise IndexError(f"index outside 0 to {count - 1} in {list(keep)}")
    order = sorted(set(keep))
    return Position(
        values=tuple(position.values[index] for index in order),
        tolerance=tuple(position.tolerance[index] for index in order),
        power=tuple(position.power[index] for index in order),
        voltage=tuple(position.voltage[index] for index in order),
        price=tuple(position.price[index] for index in order),
        absent=position.absent,
        described=position.described,
    )


def read_shelf(path: Path) -> tuple[ShelfRow, ...]:
    """Read a shelf list: a CSV file with a column `value` and, if wanted, `tolerance`, `power`, `voltage`, `price`.

    Lines that begin with # and empty lines are passed over; rows come back in the file's order. Raises InputError with
    every mistake: unreadable file, unknown or repeated column, unreadable or impossible cell, value listed twice.
    """
    mistakes: list[Mistake] = []
    lines = _records(path, mistakes)
    header = next(lines, None)
    if header is None:
        mistakes.append(Mistake(path.name, "no header line", f"columns {', '.join(COLUMNS)}; only value is required"))
        raise InputError(mistakes)
    _check_header(path.name, header, mistakes)
    rows = _read_rows(path.name, header[1], lines, mistakes)
    if not rows and not mistakes:
        mistakes.append(Mistake(path.name, "no values", "one resistor value a line"))
    if mistakes:
        raise InputError(mistakes)
    return tuple(rows)


def _records(path: Path, mistakes: list[Mistake]) -> Iterator[tuple[int, list[str]]]:
    """Yield line number and cells of every line that is neither empty nor a comment."""
    for number, line in enumerate(_text(path).split("\n"), start=1):
        if not line.strip() or line.lstrip().startswith("#"):
            continue
        try:
            # one line at a time keeps the file's own line numbers; no cell of a shelf list spans two lines
            cells = next(csv.reader([line], strict=True))
        except csv.Error:
            mistakes.append(
                Mistake(f"{path.name} line {number}", f'"{line.strip()}"', "cells with their quotes closed")
            )
        else:
            yield number, [cell.strip() for cell in cells]


def _text(path: Path) -> str:
    try:
        return path.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError:
        raise InputError([Mistake(str(path), "bytes that are not UTF-8", "a CSV file in UTF-8")]) from None
    except OSError as error:
        found = (error.strerror or "an unreadable file").lower()
        raise InputError([Mistake(str(path), found, "a CSV file that can be read")]) from None


def _check_header(name: str, header: tuple[int, list[str]], mistakes: list[Mistake]) -> None:
    number, names = header
    where = f"{name} line {number}"
    for column in dict.fromkeys(names):
        if column not in COLUMNS:
            mistakes.append(Mistake(where, f'column "{column}"', _nearest_column(column)))
        if names.count(column) > 1:
            mistakes.append(Mistake(where, f'column "{column}" {names.count(column)} times', "each column once"))
    if "value" not in names:
        mistakes.append(Mistake(where, "no column value", "a column value with the resistances"))


def _nearest_column(column: str) -> str:
    near = difflib.get_close_matches(column.lower(), COLUMNS, n=1)
    known = f"one of {', '.join(COLUMNS)}"
    return f'{known} (did you mean "{near[0]}"?)' if near else known


def _read_rows(
    name: str, columns: list[str], lines: Iterator[tuple[int, list[str]]], mistakes: list[Mistake]
) -> list[ShelfRow]:
    rows: list[ShelfRow] = []
    seen: dict[float, int] = {}
    for number, cells in lines:
        where = f"{name} line {number}"
        if len(cells) > len(columns):
            mistakes.append(Mistake(where, f"{len(cells)} cells", f"at most {len(columns)}, as in the header"))
            continue
        row = _read_row(where, dict(zip_longest(columns, cells, fillvalue="")), number, mistakes)
        if row is not None and row.value in seen:
            expected = f"each value once (also on line {seen[row.value]})"
            mistakes.append(Mistake(f"{where}, column value", format_resistor(row.value), expected))
        elif row is not None:
            seen[row.value] = number
            rows.append(row)
    return rows


def _read_row(where: str, cells: dict[str, str], number: int, mistakes: list[Mistake]) -> ShelfRow | None:
    """Read one line, None if its value cannot be read; without a column `value` only the other cells are checked."""
    read: dict[str, float | None] = {}
    for column, reader in _READERS.items():
        cell = cells.get(column, "")
        try:
            # an empty cell goes to the default, save the value itself, where the reader's refusal is the right message
            read[column] = reader(cell) if cell or (column == "value" and "value" in cells) else None
        except QuantityError as error:
            mistakes.append(Mistake(f"{where}, column {column}", error.found, error.expected))
    value = read.get("value")
    if value is None:
        return None
    return ShelfRow(number, value, read.get("tolerance"), read.get("power"), read.get("voltage"), read.get("price"))


def _positive(unit: str) -> Callable[[str], float]:
    def read(cell: str) -> float:
        value = parse_quantity(cell, unit)
        if value <= 0:
            raise QuantityError(f'"{cell}"', "more than zero")
        return value

    return read


def _tolerance(cell: str) -> float:
    value = parse_quantity(cell, "1")
    if not 0 <= value <= _WIDEST_TOLERANCE:
        raise QuantityError(f'"{cell}"', 'a tolerance from 0 to 20 %, such as "1 %"')
    return value


def _price(cell: str) -> float:
    expected = 'a price of one piece such as "0.02"'
    try:
        value = parse_quantity(cell, "1")
    except QuantityError as error:
        raise QuantityError(error.found, expected) from None
    if value < 0 or "%" in cell:
        raise QuantityError(f'"{cell}"', expected)
    return value


_READERS: dict[str, Callable[[str], float]] = {
    "value": _positive("ohm"),
    "tolerance": _tolerance,
    "power": _positive("W"),
    "voltage": _positive("V"),
    "price": _price,
}
