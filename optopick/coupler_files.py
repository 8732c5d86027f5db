"""Coupler tables that are not text: .xlsx and .parquet, read piece by piece and turned into lines of text cells.

What the cells hold is judged elsewhere, by the same rules as those of a CSV file. pandas and what it needs for these
files (an extra of the package each) load only once such a file is read.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from decimal import Decimal
from numbers import Real
from pathlib import Path
from typing import TYPE_CHECKING, Any

from optopick.errors import InputError, Mistake

if TYPE_CHECKING:
    import pandas as pd

AT_ONCE = 1024
"""Rows of a .parquet file that are held at once."""

Lines = Iterator[tuple[int, tuple[str, ...]]]
"""Number of a line in its file and its cells, as they are read; the first line names the columns."""


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

    Raises InputError, at once or while reading, where the file cannot be read, the extra it needs is missing, or a
    formula has no stored value.
    """
    kind = path.suffix.lower()
    try:
        with path.open("rb"):
            pass
    except OSError as error:
        found = "a directory" if path.is_dir() else (error.strerror or "an unreadable file").lower()
        raise InputError([Mistake(str(path), found, f"a table in {kind} that can be read")]) from None
    with _refusing(path):
        place, lines = _READERS[kind](path)
    return place, _filled(path, lines)


def _filled(path: Path, lines: Lines) -> Lines:
    with _refusing(path):
        for number, cells in lines:
            if any(cells) and not cells[0].startswith("#"):
                yield number, cells


@contextmanager
def _refusing(path: Path) -> Iterator[None]:
    """Turn what the libraries raise into InputError."""
    kind = path.suffix.lower()
    try:
        yield
    except InputError:
        raise
    except ImportError:
        extra = f'pip install "optopick[{kind[1:]}]"'
        found = f"a {kind} file, which this installation cannot read"
        raise InputError([Mistake(str(path), found, f"{extra}, or the table as CSV")]) from None
    except Exception:  # a damaged file fails anywhere in the libraries, with an error of any type
        found = f"no valid {kind} file"
        raise InputError([Mistake(str(path), found, f"a table saved as {kind}, or as CSV")]) from None


# ---- .xlsx ----------------------------------------------------------------------------------------------------------


def _xlsx(path: Path) -> tuple[Place, Lines]:
    """Read the first sheet, row by row with the numbers that the spreadsheet shows."""
    import pandas as pd  # noqa: PLC0415 - a CSV table must not wait for it

    # the cells of the file rather than pandas's frame of it: a frame has lost percent signs, errors and row numbers
    values = pd.ExcelFile(path, engine="openpyxl")
    formulas = pd.ExcelFile(path, engine="openpyxl", engine_kwargs={"data_only": False})
    place = Place(f'{path.name} sheet "{values.book.worksheets[0].title}"', "row")
    return place, _sheet_lines(place, values, formulas)


def _sheet_lines(place: Place, values: pd.ExcelFile, formulas: pd.ExcelFile) -> Lines:
    mistakes: list[Mistake] = []
    with values, formulas:
        sheets = (file.book.worksheets[0].iter_rows() for file in (values, formulas))
        for number, (row, written) in enumerate(zip(*sheets, strict=True), 1):
            mistakes.extend(_uncomputed(place, number, row, written))
            yield number, tuple(_sheet_text(cell) for cell in row)
    if mistakes:
        raise InputError(mistakes)


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
    """Read a group of rows after the other."""
    import pyarrow.parquet as pq  # noqa: PLC0415 - an extra, and a CSV table must not wait for it

    file = pq.ParquetFile(path)
    return Place(path.name, "row"), _frame_lines(file)


def _frame_lines(file: Any) -> Lines:  # noqa: ANN401 - a file of a library that is loaded on demand
    yield 0, tuple(_text(name) for name in _flat(file.schema_arrow.empty_table().to_pandas()).columns)
    number = 0
    with file:
        for batch in file.iter_batches(AT_ONCE):
            frame = _flat(batch.to_pandas())
            missing = frame.isna()
            # objects, so that whole numbers beside an empty cell stay as they are
            cells = frame.astype(object).itertuples(index=False)
            for row, gaps in zip(cells, missing.itertuples(index=False), strict=True):
                number += 1
                yield number, tuple("" if gap else _text(cell) for cell, gap in zip(row, gaps, strict=True))


def _flat(frame: pd.DataFrame) -> pd.DataFrame:
    """Return a frame with the names of its rows, where they have one, as columns."""
    return frame.reset_index() if any(name is not None for name in frame.index.names) else frame


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
