"""From the text of a coupler table to typed cells, with every mistake and its line."""

from __future__ import annotations

import csv
import difflib
import json
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import lru_cache
from itertools import chain, pairwise
from pathlib import Path

from optopick.coupler import Kind
from optopick.coupler_columns import UNITS, Column, schema
from optopick.coupler_curves import Curve, read_points
from optopick.coupler_files import Place, read_file, reads
from optopick.errors import InputError, Mistake
from optopick.units import QuantityError, parse_quantity

Cell = float | str | bool | Curve
"""What a filled cell holds: quantities in SI, curves in table units as the file gives them."""

_EMPTY = frozenset(("", "-", "–", "—", "n/a", "na"))
_NUMBER = re.compile(r"[+-]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][+-]?[0-9]+)?")
_DELIMITERS = ",;\t"
# A limit written as a quantity with another prefix ("1 A") must not fail for a rounding step.
_SLACK = 1e-9


@dataclass(frozen=True)
class Row:
    """One line of the table: its first line in the file, from 1, and its filled cells by column."""

    line: int
    cells: Mapping[str, Cell]

    def number(self, column: str) -> float | None:
        """Return a quantity in SI, None where the cell is empty."""
        value = self.cells.get(column)
        return value if isinstance(value, float) else None

    def text(self, column: str) -> str:
        """Return a text, empty where the cell is."""
        value = self.cells.get(column)
        return value if isinstance(value, str) else ""

    def curve(self, column: str) -> Curve | None:
        """Return a curve in table units, None where the cell is empty."""
        value = self.cells.get(column)
        return value if isinstance(value, Curve) else None

    @property
    def name(self) -> str:
        """Part and bin, PART-BIN."""
        return "-".join(word for word in (self.text("part"), self.text("bin")) if word)


@dataclass(frozen=True)
class _Record:
    line: int
    cells: tuple[str, ...]


def read_rows(path: Path) -> tuple[Row, ...]:
    """Read every row of the table at `path`; raises InputError with every mistake of the file."""
    mistakes: list[Mistake] = []
    place, source = stream_rows(path, mistakes)
    rows = [row for row in source if row is not None]
    _check_names(place, rows, mistakes)
    if mistakes:
        raise InputError(mistakes)
    return tuple(rows)


def stream_rows(path: Path, mistakes: list[Mistake]) -> tuple[Place, Iterator[Row | None]]:
    """Return how the lines of the table are called, and its rows as they are read, None for one that does not line up.

    Mistakes are added to the list as they are found; the caller looks for names that stand there twice. Raises
    InputError, at once or while reading, where the file cannot be read on.
    """
    place, records = _file(path, mistakes)
    return place, _rows(place, records, mistakes)


def _rows(place: Place, records: Iterator[_Record], mistakes: list[Mistake]) -> Iterator[Row | None]:
    header = next(records, None)
    if header is None:
        raise InputError(mistakes or [Mistake(place.name, "no header line", "a line with the names of the columns")])
    columns = _header(place, header, mistakes)
    empty = True
    for record in records:
        empty = False
        yield _row(place, columns, record, mistakes)
    if empty and not mistakes:
        mistakes.append(Mistake(place.name, "no rows", "one line per part and CTR bin below the header"))


# ---- lines ----------------------------------------------------------------------------------------------------------


def _file(path: Path, mistakes: list[Mistake]) -> tuple[Place, Iterator[_Record]]:
    """Return how the lines of the file are called, and the header and rows in it."""
    if not reads(path):
        return Place(path.name, "line"), _records(path, mistakes)
    place, lines = read_file(path)
    return place, (_Record(number, cells) for number, cells in lines)


def _text_lines(path: Path) -> Iterator[str]:
    """Yield the lines of a file of text, each with one line feed at its end whatever it has in the file."""
    try:
        with path.open(encoding="utf-8-sig", newline=None) as file:
            for line in file:
                if "\0" in line:
                    raise InputError([Mistake(path.name, "binary data", "a CSV file in UTF-8")])
                yield line
    except OSError as error:
        found = "a directory" if path.is_dir() else (error.strerror or "an unreadable file").lower()
        raise InputError([Mistake(str(path), found, "a CSV file that can be read")]) from None
    except UnicodeDecodeError:
        raise InputError([_undecodable(path)]) from None


def _undecodable(path: Path) -> Mistake:
    """Return where a file is no text: the decoder only knows the place in its buffer."""
    first = 0
    with path.open("rb") as file:
        for number, line in enumerate(file, 1):
            if b"\0" in line:
                return Mistake(path.name, "binary data", "a CSV file in UTF-8")
            first = first or (0 if _is_text(line) else number)
    return Mistake(f"{path.name} line {first}", "bytes that are not UTF-8", "a CSV file in UTF-8")


def _is_text(line: bytes) -> bool:
    try:
        line.decode()
    except UnicodeDecodeError:
        return False
    return True


def _records(path: Path, mistakes: list[Mistake]) -> Iterator[_Record]:
    """Yield the header and the rows, without comments and empty lines."""
    # blanked, not dropped: the reader counts lines
    kept = ("\n" if line.lstrip().startswith("#") else line for line in _text_lines(path))
    start = list(_up_to_header(kept))
    reader = csv.reader(chain(start, kept), delimiter=_delimiter(start), strict=True)
    line = 1
    try:
        for cells in reader:
            stripped = tuple(cell.strip() for cell in cells)
            # a spreadsheet quotes a comment that holds the delimiter, and pads empty lines with delimiters
            if any(stripped) and not stripped[0].startswith("#"):
                yield _Record(line, stripped)
            line = reader.line_num + 1
    except csv.Error as error:
        found = f"cells that cannot be told apart ({error})"
        mistakes.append(Mistake(f"{path.name} line {line}", found, "cells with a delimiter between and quotes closed"))


def _up_to_header(lines: Iterator[str]) -> Iterator[str]:
    for line in lines:
        yield line
        if line.strip():
            return


def _delimiter(lines: list[str]) -> str:
    header = next((line for line in lines if line.strip()), "")
    return max(_DELIMITERS, key=header.count)


# ---- header ---------------------------------------------------------------------------------------------------------


def _header(place: Place, header: _Record, mistakes: list[Mistake]) -> tuple[str, ...]:
    """Return the column of each cell, "" where there is none; unknown, repeated and missing columns are mistakes."""
    known = schema().columns
    where = place.at(header.line)
    names = tuple(name.lower() for name in header.cells)
    for name in dict.fromkeys(names):
        if name and name not in known:
            mistakes.append(Mistake(where, f"column {quoted(name)}", _nearest(name)))
        elif name and names.count(name) > 1:
            mistakes.append(Mistake(where, f"column {quoted(name)} {names.count(name)} times", "each column once"))
    for name in ("part", "kind"):
        if name not in names:
            mistakes.append(Mistake(where, f"no column {name}", "the columns part and kind in every table"))
    return names


def _nearest(name: str) -> str:
    near = difflib.get_close_matches(name, schema().columns, n=1)
    return f"a known column, such as {near[0]}" if near else "a known column; the blank template lists them"


# ---- rows -----------------------------------------------------------------------------------------------------------


def _row(place: Place, columns: tuple[str, ...], record: _Record, mistakes: list[Mistake]) -> Row | None:
    """Read one line; None where it does not line up with the header."""
    where = place.at(record.line)
    if len(record.cells) < len(columns) or any(record.cells[len(columns) :]):
        expected = f"{len(columns)} as in the header, with a delimiter for every empty cell"
        mistakes.append(Mistake(where, f"{len(record.cells)} cells", expected))
        return None
    before = len(mistakes)
    cells = dict(_cells(where, columns, record.cells, mistakes))
    row = Row(record.line, cells)
    # relations between cells mean little while one of them is wrong
    if len(mistakes) == before:
        mistakes.extend(_relations(where, row))
    return row


def _cells(
    where: str, columns: tuple[str, ...], texts: tuple[str, ...], mistakes: list[Mistake]
) -> Iterator[tuple[str, Cell]]:
    known = schema().columns
    for name, text in zip(columns, texts, strict=False):
        column = known.get(name)
        if text.lower() in _EMPTY:
            if column is not None and column.gap == "mistake":
                mistakes.append(Mistake(f"{where}, column {name}", "an empty cell", column.meaning.lower()))
            continue
        try:
            if column is not None:
                yield name, _read(column, text)
            elif not name:
                raise QuantityError(quoted(text), "a column name in the header above it")
        except QuantityError as error:
            at = f"{where}, column {name}" if name else where
            mistakes.append(Mistake(at, error.found, error.expected))


@lru_cache(maxsize=8192)
def _read(column: Column, text: str) -> Cell:
    """Read one filled cell; raises QuantityError."""
    match column.type:
        case "quantity":
            return _quantity(column, text)
        case "count":
            return _count(column, text)
        case "curve":
            return _curve(column, text)
        case "text":
            return _plain_text(text)
        case _:
            return _choice(column, text)


def _quantity(column: Column, text: str) -> float:
    unit = column.table_unit
    if _NUMBER.fullmatch(text):
        number = float(text)
        value = unit.to_si(number)
    elif column.unit == "1":
        raise QuantityError(quoted(text), "a plain number")
    else:
        value = _with_unit(column, text)
        number = unit.from_si(value)
    if not _within(column, number):
        raise QuantityError(quoted(text), f"{column.range_text}{_plain_note(column)}")
    return value


def _within(column: Column, number: float) -> bool:
    return column.low - _SLACK * abs(column.low) <= number <= column.high + _SLACK * abs(column.high)


def _with_unit(column: Column, text: str) -> float:
    try:
        return parse_quantity(text, column.table_unit.base)
    except QuantityError as error:
        expected = f"a plain number in {column.table_unit.shown}, or {error.expected}"
        raise QuantityError(error.found, expected) from None


def _plain_note(column: Column) -> str:
    shown = column.table_unit.shown
    return f"; a plain number is in {shown}" if shown else ""


def _count(column: Column, text: str) -> float:
    if not re.fullmatch(r"[0-9]{1,9}", text) or not column.low <= int(text) <= column.high:
        raise QuantityError(quoted(text), f"a whole number, {column.low:g} to {column.high:g}")
    return float(int(text))


def _curve(column: Column, text: str) -> Curve:
    try:
        curve = read_points(text)
    except ValueError as error:
        raise QuantityError(quoted(text), str(error)) from None
    if not (column.low <= curve.x[0] and curve.x[-1] <= column.high):
        raise QuantityError(quoted(text), f"first numbers of {column.range_text}")
    if max(curve.y) > 1e6 * min(curve.y):
        raise QuantityError(quoted(text), "second numbers within a factor of a million")
    return curve


def _plain_text(text: str) -> str:
    if not text.isprintable() or len(text) > 200:
        raise QuantityError(quoted(text), "one line of printable text, up to 200 characters")
    return text


def _choice(column: Column, text: str) -> str | bool:
    choices = column.choices or ("yes", "no")
    if text.lower() not in choices:
        raise QuantityError(quoted(text), f"{', '.join(choices[:-1])} or {choices[-1]}")
    return text.lower() if column.choices else text.lower() == "yes"


# ---- relations ------------------------------------------------------------------------------------------------------


def _relations(where: str, row: Row) -> Iterator[Mistake]:
    """Check what the cells of one row must be to each other."""
    yield from _orders(where, row)
    yield from _strangers(where, row)
    yield from _curve_relations(where, row)


def _orders(where: str, row: Row) -> Iterator[Mistake]:
    for names, strict in schema().orders:
        filled = [(name, value) for name in names if (value := row.number(name)) is not None]
        for (low_name, low), (name, value) in pairwise(filled):
            if value < low * (1 - _SLACK) or (strict and value <= low):
                relation = "more than" if strict else "at least"
                expected = f"{relation} {low_name}, {schema().show(low_name, low)}"
                yield Mistake(f"{where}, column {name}", schema().show(name, value), expected)


def _strangers(where: str, row: Row) -> Iterator[Mistake]:
    """Find filled cells that an output stage of this kind does not have."""
    if not row.text("kind"):
        return
    kind = Kind(row.text("kind"))
    columns = schema().columns
    for name in row.cells:
        if kind not in columns[name].kinds:
            yield Mistake(f"{where}, column {name}", "a filled cell", f"an empty one: kind {kind} has no {name}")
    if kind is Kind.LOGIC and row.cells.get("base_pin") is True:
        yield Mistake(f"{where}, column base_pin", '"yes"', "no: a logic output has no base to load")


def _curve_relations(where: str, row: Row) -> Iterator[Mistake]:
    curve, ctr_at = row.curve("ctr_curve"), row.number("ctr_at")
    at_curve = f"{where}, column ctr_curve"
    if curve is not None and not curve.carries_more:
        yield Mistake(at_curve, "an output current that falls while LED current rises", "current times CTR to rise")
    if curve is not None and ctr_at is not None and not curve.covers(UNITS["mA"].from_si(ctr_at)):
        found = f"points from {curve.x[0]:g} to {curve.x[-1]:g} mA"
        yield Mistake(at_curve, found, f"points on both sides of ctr_at, {schema().show('ctr_at', ctr_at)}")
    warm = row.curve("ctr_temperature")
    if warm is not None and not warm.covers(25.0):
        found = f"points from {warm.x[0]:g} to {warm.x[-1]:g} °C"
        yield Mistake(f"{where}, column ctr_temperature", found, "points on both sides of 25 °C")


def _check_names(place: Place, rows: list[Row], mistakes: list[Mistake]) -> None:
    seen: dict[str, int] = {}
    for row in rows:
        first = seen.setdefault(row.name.casefold(), row.line)
        if row.name and first != row.line:
            expected = f"each part and bin once (first on {place.word} {first})"
            mistakes.append(Mistake(f"{place.at(row.line)}, column part", quoted(row.name), expected))


def quoted(text: str) -> str:
    """Return a cell as messages show it."""
    return json.dumps(text if len(text) <= 60 else text[:57] + "...", ensure_ascii=False)
