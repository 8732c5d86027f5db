"""Coupler tables that are not text: .xlsx and .parquet, opened through pandas and turned into lines of text cells.

What the cells hold is judged elsewhere, by the same rules as those of a CSV file. pandas and what it needs for these
files (an extra of the package each) load only once such a file is read.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from decimal import Decimal
from numbers import Real
from pathlib import Path
from typing import Any

from optopick.errors import InputError, Mistake

Lines = list[tuple[int, tuple[str, ...]]]
"""Number of a line in its file and its cells; the first line names the columns."""


@dataclass(frozen=True)
class Place:
    """How the lines of one file are called: its name, with the sheet, and the word for a line."""

    name: str
    word: str

    def at(self, number: int) -> str:
        """Return the name of one line; a file that keeps its names apart from its rows has them in line 0."""
        return f"{self.name} {self.word} {number}" if number else f"{self.name}, names of the columns"


def reads(path: Path) -> bool:
    """Whether the name of the file says that it is one of these."""
    return path.suffix.lower() in _READERS


def read_file(path: Path) -> tuple[Place, Lines]:
    """Return the lines of the table at `path` that are neither empty nor comments.

    Raises InputError where the file cannot be read, the extra it needs is missing, or a formula has no stored value.
    """
    kind = path.suffix.lower()
    try:
        with path.open("rb"):
            pass
    except OSError as error:
        found = "a directory" if path.is_dir() else (error.strerror or "an unreadable file").lower()
        raise InputError([Mistake(str(path), found, f"a table in {kind} that can be read")]) from None
    try:
        place, lines = _READERS[kind](path)
    except InputError:
        raise
    except ImportError:
        extra = f'pip install "optopick[{kind[1:]}]"'
        found = f"a {kind} file, which this installation cannot read"
        raise InputError([Mistake(str(path), found, f"{extra}, or the table as CSV")]) from None
    except Exception:  # a damaged file fails anywhere in the libraries, with an error of any type
        found = f"no valid {kind} file"
        raise InputError([Mistake(str(path), found, f"a table saved as {kind}, or as CSV")]) from None
    return place, [(number, cells) for number, cells in lines if any(cells) and not cells[0].startswith("#")]


# ---- .xlsx ----------------------------------------------------------------------------------------------------------


def _xlsx(path: Path) -> tuple[Place, Lines]:
    """Read the first sheet, row by row with the numbers that the spreadsheet shows."""
    import pandas as pd  # noqa: PLC0415 - a CSV table must not wait for it

    # the cells of the file rather than pandas's frame of it: a frame has lost percent signs, errors and row numbers
    with (
        pd.ExcelFile(path, engine="openpyxl") as values,
        pd.ExcelFile(path, engine="openpyxl", engine_kwargs={"data_only": False}) as formulas,
    ):
        sheet, written = values.book.worksheets[0], formulas.book.worksheets[0]
        place = Place(f'{path.name} sheet "{sheet.title}"', "row")
        rows = list(zip(sheet.iter_rows(), written.iter_rows(), strict=True))
    mistakes = [
        mistake for number, (row, own) in enumerate(rows, 1) for mistake in _uncomputed(place, number, row, own)
    ]
    if mistakes:
        raise InputError(mistakes)
    return place, [(number, tuple(_sheet_text(cell) for cell in row)) for number, (row, _) in enumerate(rows, 1)]


def _uncomputed(place: Place, number: int, row: tuple[Any, ...], own: tuple[Any, ...]) -> Iterator[Mistake]:
    """Yield the formulas whose value the file does not hold: read as empty, a rule would silently fill them."""
    for column, (cell, written) in enumerate(zip(row, own, strict=True), 1):
        if cell.value is None and isinstance(written.value, str) and written.value.startswith("="):
            expected = "its value: open the file in the spreadsheet and save it again"
            yield Mistake(f"{place.at(number)}, cell {column}", "a formula without a stored value", expected)


def _sheet_text(cell: Any) -> str:  # noqa: ANN401 - a cell of a library that is loaded on demand
    """Return a cell as text; a number shown in percent is stored as its hundredth."""
    percent = "%" in (getattr(cell, "number_format", None) or "")
    if percent and isinstance(cell.value, Real) and not isinstance(cell.value, bool):
        return f"{_plain(Decimal(repr(float(cell.value))) * 100)} %"
    return _text(cell.value)


# ---- .parquet -------------------------------------------------------------------------------------------------------


def _parquet(path: Path) -> tuple[Place, Lines]:
    import pandas as pd  # noqa: PLC0415 - a CSV table must not wait for it

    frame = pd.read_parquet(path, engine="pyarrow")
    if any(name is not None for name in frame.index.names):
        frame = frame.reset_index()
    # objects, so that whole numbers beside an empty cell stay as they are
    missing = frame.isna()
    lines: Lines = [(0, tuple(_text(name) for name in frame.columns))]
    for number, (row, gaps) in enumerate(
        zip(frame.astype(object).itertuples(index=False), missing.itertuples(index=False), strict=True), 1
    ):
        lines.append((number, tuple("" if gap else _text(cell) for cell, gap in zip(row, gaps, strict=True))))
    return Place(path.name, "row"), lines


# ---- cells ----------------------------------------------------------------------------------------------------------


def _text(value: object) -> str:
    """Return a cell as a CSV file would have it: yes and no for truth values, whole numbers without a point."""
    if value is None:
        return ""
    if isinstance(value, bool) or type(value).__name__ == "bool_":  # numpy's own, which is no kind of Python's
        return "yes" if value else "no"
    if isinstance(value, Real):
        return _plain(Decimal(repr(float(value))))
    return str(value).strip()


def _plain(number: Decimal) -> str:
    whole = number.is_finite() and number == number.to_integral_value() and abs(number) < 10**15
    return str(int(number)) if whole else str(number.normalize())


_READERS: dict[str, Callable[[Path], tuple[Place, Lines]]] = {".xlsx": _xlsx, ".parquet": _parquet}
