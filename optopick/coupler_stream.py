"""A coupler table row by row, where it is too large to hold: looked through once, then read as often as need be.

What one row needs to know of the others (the bins of its part, names that stand there twice) is kept in a temporary
database on disk.
"""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from hashlib import blake2b
from pathlib import Path

from optopick.coupler import Coupler
from optopick.coupler_cells import Row, quoted, stream_rows
from optopick.coupler_files import Place
from optopick.coupler_sheets import Bin, Figures, Part, Shared, bin_of, figures_of, part_of, shared_of
from optopick.errors import InputError, Mistake
from optopick.read_couplers import SetAside, outcome

MOST = 20
"""Mistakes that are told; the others are counted."""

CACHE = 2048
"""Most of the database that is kept in memory [kB]."""


@dataclass(frozen=True)
class StreamedRow:
    """One row of the table, and its place among the bins of its part."""

    row: Row
    bin_: Bin | None

    @property
    def key(self) -> str:
        """Part and bin, and a checksum of all that its coupler is made from; wherever it stands in the file."""
        told = repr((sorted(self.row.cells.items()), self.bin_ and (self.bin_.ctr, self.bin_.ctr_part)))
        alike = sorted(self.bin_.alike) if self.bin_ else []
        return f"{self.row.name} {blake2b(f'{told} {alike}'.encode(), digest_size=12).hexdigest()}"

    @property
    def resolved(self) -> Coupler | SetAside:
        """Its coupler, gaps filled by rule, or why it is set aside."""
        return outcome(self.row, self.bin_)


class CouplerStream:
    """The table at a path. Raises InputError with its mistakes, the first of very many, before it gives any row."""

    def __init__(self, path: Path) -> None:
        self.path = path
        self.count = 0
        self._index = _Index()
        mistakes, own = _Few(), _Few()
        found: list[Mistake] = []
        place, rows = stream_rows(path, found)
        for row in rows:
            mistakes.take(found)
            if row is not None:
                self.count += 1
                own.take(self._index.named(place, row))
                self._index.add(row)
        mistakes.take(found)
        mistakes.and_then(own)
        mistakes.refuse(place)

    def rows(self) -> Iterator[StreamedRow]:
        """The rows, in the order of the file; raises InputError where it has changed since."""
        mistakes: list[Mistake] = []
        _, rows = stream_rows(self.path, mistakes)
        last: tuple[Part | None, Shared | None] = (None, None)
        for row in rows:
            if mistakes or row is None:
                raise self._changed()
            part = part_of(row)
            if part is None:
                yield StreamedRow(row, None)
                continue
            if last[0] != part:
                last = (part, self._index.shared(part))
            if last[1] is None:
                raise self._changed()
            yield StreamedRow(row, bin_of(row, last[1]))

    def _changed(self) -> InputError:
        return InputError(
            [Mistake(self.path.name, "another table than before", "a file that stays as it is meanwhile")]
        )


class _Index:
    """What rows need to know of each other."""

    def __init__(self) -> None:
        self._database = sqlite3.connect("", isolation_level=None)
        for line in (
            f"pragma cache_size = -{CACHE}",
            "pragma journal_mode = off",
            "begin",
            "create table name (name text primary key, line integer) without rowid",
            "create table figures (part text, low real, high real, columns text)",
            "create index by_part on figures (part)",
        ):
            self._database.execute(line)

    def named(self, place: Place, row: Row) -> list[Mistake]:
        """Note the name of a row; a mistake where it is there already."""
        name = row.name.casefold()
        if self._database.execute("insert or ignore into name values (?, ?)", (name, row.line)).rowcount or not name:
            return []
        (first,) = self._database.execute("select line from name where name = ?", (name,)).fetchone()
        expected = f"each part and bin once (first on {place.word} {first})"
        return [Mistake(f"{place.at(row.line)}, column part", quoted(row.name), expected)]

    def add(self, row: Row) -> None:
        """Note what a row says about its part."""
        part = part_of(row)
        if part is not None:
            says = figures_of(row)
            columns = json.dumps(says.columns)
            line = (json.dumps(part), says.low, says.high, columns)
            self._database.execute("insert into figures values (?, ?, ?, ?)", line)

    def shared(self, part: Part) -> Shared | None:
        """What the rows of a part have in common; None where there are none."""
        asked = "select low, high, columns from figures where part = ?"
        found = self._database.execute(asked, (json.dumps(part),)).fetchall()
        return shared_of([Figures(low, high, tuple(json.loads(text))) for low, high, text in found]) if found else None


class _Few:
    """The first mistakes of any number."""

    def __init__(self) -> None:
        self.first: list[Mistake] = []
        self.count = 0

    def take(self, mistakes: list[Mistake]) -> None:
        """Take the mistakes out of a list."""
        self._keep(mistakes, len(mistakes))
        mistakes.clear()

    def and_then(self, others: _Few) -> None:
        """Take those of others, which come last."""
        self._keep(others.first, others.count)

    def refuse(self, place: Place) -> None:
        """Raise InputError where there are any."""
        if self.count > len(self.first):
            self.first.append(Mistake(place.name, f"{self.count - len(self.first)} mistakes more", "none"))
        if self.count:
            raise InputError(self.first)

    def _keep(self, mistakes: Sequence[Mistake], count: int) -> None:
        self.first.extend(mistakes[: MOST - len(self.first)])
        self.count += count
