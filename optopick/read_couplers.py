"""Read a coupler table: a CSV file, one line per part and CTR bin, as data sheets give the figures.

The columns, their units and the rules that fill gaps are those of `optopick.coupler_columns`.
"""

from __future__ import annotations

from contextlib import suppress
from dataclasses import dataclass
from pathlib import Path

from optopick.coupler import Coupler
from optopick.coupler_cells import Row, read_rows
from optopick.coupler_columns import blank_template, columns_markdown
from optopick.coupler_rows import Sheet, resolve, resolve_with_sheet
from optopick.coupler_sheets import Bin, bins_of
from optopick.gaps import UnusableError

__all__ = ["CouplerTable", "SetAside", "blank_template", "columns_markdown", "read_couplers", "sheets_of"]


@dataclass(frozen=True)
class SetAside:
    """A row that no brief can use: its part and bin, its line in the file, and why."""

    part: str
    row: int
    reason: str


@dataclass(frozen=True)
class CouplerTable:
    """The couplers of a table in the file's order, the rows set aside, and the file."""

    couplers: tuple[Coupler, ...]
    set_aside: tuple[SetAside, ...]
    path: Path


def read_couplers(path: Path | str) -> CouplerTable:
    """Read the coupler table at `path`, fill its gaps by rule and set aside the rows that keep one.

    Raises InputError with every mistake of the file: unreadable, an unknown or repeated column, a cell that is not
    what its column asks for or lies outside its range, figures of one row in the wrong order, a part and bin twice.
    """
    path = Path(path)
    rows = read_rows(path)
    outcomes = [outcome(row, bin_) for row, bin_ in zip(rows, bins_of(rows), strict=True)]
    return CouplerTable(
        couplers=tuple(found for found in outcomes if isinstance(found, Coupler)),
        set_aside=tuple(found for found in outcomes if isinstance(found, SetAside)),
        path=path,
    )


def sheets_of(path: Path) -> tuple[tuple[Coupler, Sheet | None], ...]:
    """Return the couplers of a table, each with the switching rows behind its constants; raises InputError as above."""
    rows = read_rows(path)
    found = []
    for row, bin_ in zip(rows, bins_of(rows), strict=True):
        with suppress(UnusableError):
            found.append(resolve_with_sheet(row, bin_))
    return tuple(found)


def outcome(row: Row, bin_: Bin | None) -> Coupler | SetAside:
    """Return the coupler of one row, or why it is set aside."""
    try:
        return resolve(row, bin_)
    except UnusableError as error:
        return SetAside(row.name, row.line, str(error))
