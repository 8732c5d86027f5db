"""A coupler table for people at a terminal, and as JSON: what it lacks, and how well its switching rows are met."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import asdict

from rich.console import Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from optopick.answers import Fitted, FittedTime, Gap, TableCheck
from optopick.report.words import amount

SHOWN_VALUES = 3
"""Different values of one gap that the terminal lists; JSON has them row by row."""


def table_text(check: TableCheck) -> RenderableType:
    """The whole answer to `table check`."""
    count = len(check.rows) + len(check.set_aside)
    verdict = f"{count} rows: {len(check.rows)} usable, {len(check.set_aside)} set aside."
    parts: list[RenderableType] = [Text(check.file, style="bold"), Text(verdict)]
    if check.set_aside:
        parts.append(Padding(_set_aside(check), (1, 0, 0, 0)))
    if check.gaps:
        parts += [Padding(_gaps(check), (1, 0, 0, 0)), Padding(_by_row(check), (1, 0, 0, 0))]
    elif check.rows:
        parts.append(Text("Nothing had to be assumed."))
    return Group(*parts)


def _table(*headings: str) -> Table:
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold")
    for heading in headings:
        table.add_column(heading, justify="right" if heading in ("Row", "Rows") else "left")
    return table


def _set_aside(check: TableCheck) -> RenderableType:
    table = _table("Set aside", "Row", "Because")
    for aside in check.set_aside:
        table.add_row(aside.part, str(aside.row), aside.reason)
    return table


def _gaps(check: TableCheck) -> RenderableType:
    """What the table leaves out, how often, and what is taken instead: that is what the gap costs."""
    table = _table("Missing", "Rows", "Taken", "By this rule")
    for gap in check.gaps:
        table.add_row(gap.parameter, str(len(gap.parts)), _values(gap), gap.rule)
    return table


def _values(gap: Gap) -> str:
    more = len(gap.values) - SHOWN_VALUES
    return ", ".join(gap.values[:SHOWN_VALUES]) + (f" and {more} more" if more > 0 else "")


def _by_row(check: TableCheck) -> RenderableType:
    table = _table("Part", "Row", "Filled in by rule")
    for row in check.rows:
        names = dict.fromkeys(assumed.parameter for assumed in row.assumed)
        table.add_row(row.part, str(row.row), ", ".join(names) or "nothing")
    return table


def table_object(check: TableCheck) -> dict[str, object]:
    """The object that `table check --json` prints."""
    return {
        "file": check.file,
        "usable": len(check.rows),
        "rows": [asdict(row) for row in check.rows],
        "set_aside": [asdict(aside) for aside in check.set_aside],
        "gaps": [asdict(gap) | {"count": len(gap.parts)} for gap in check.gaps],
    }


def fit_text(fitted: Sequence[Fitted], file: str) -> RenderableType:
    """The whole answer to `table fit`."""
    if not fitted:
        return Group(Text(file, style="bold"), Text("No usable row has a transistor output with switching constants."))
    table = _table("Part", "Column", "Given", "Reproduced", "Off by")
    for one in fitted:
        for cells in _fit_rows(one):
            table.add_row(*cells)
    notes = [Text(f"{one.part}: {one.note}") for one in fitted if one.note]
    told = Text(
        "A time in brackets is not fitted: it is what the constants that meet the others give. A part without times "
        "has no switching row that could be used."
    )
    heading = [Text(), Text("Not used, and why", style="bold")] if notes else []
    return Group(Text(file, style="bold"), table, *heading, *notes, Text(), told)


def _fit_rows(one: Fitted) -> Iterator[tuple[str, ...]]:
    if not one.times:
        yield one.part, "–", "–", "–", "–"
    for k, time in enumerate(one.times):
        yield "" if k else one.part, *_time(time)


def _time(time: FittedTime) -> tuple[str, str, str, str]:
    off = f"{time.residual:+.1f} %" if abs(time.residual) >= 0.05 else "0.0 %"
    reproduced = amount(time.reproduced, "s")
    if not time.fitted:
        reproduced, off = f"({reproduced})", f"({off})"
    return time.column, amount(time.given, "s"), reproduced, off


def fit_object(fitted: Sequence[Fitted], file: str) -> dict[str, object]:
    """The object that `table fit --json` prints; times in seconds, residuals in per cent."""
    parts = [
        asdict(one) | {"times": [asdict(time) | {"residual": time.residual} for time in one.times]} for one in fitted
    ]
    return {"file": file, "parts": parts}
