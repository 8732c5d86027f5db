"""What a coupler table lacks: rows that no brief can use, and what rules fill in for the others."""

from __future__ import annotations

from pathlib import Path

from optopick.answers import CheckedRow, Gap, TableCheck
from optopick.coupler import Assumed, Coupler
from optopick.read_couplers import read_couplers


def check_table(path: Path) -> TableCheck:
    """Look at the coupler table at `path` by itself; raises InputError with every mistake in it."""
    table = read_couplers(path)
    rows = tuple(CheckedRow(coupler.part, coupler.row, coupler.assumed) for coupler in table.couplers)
    return TableCheck(path.name, rows, table.set_aside, _gaps(table.couplers))


def _gaps(couplers: tuple[Coupler, ...]) -> tuple[Gap, ...]:
    """Group what was assumed by parameter and rule, in the order of the table where the counts are equal."""
    groups: dict[tuple[str, str], list[Assumed]] = {}
    for coupler in couplers:
        for assumed in coupler.assumed:
            groups.setdefault((assumed.parameter, assumed.rule), []).append(assumed)
    gaps = [_gap(together) for together in groups.values()]
    return tuple(sorted(gaps, key=lambda gap: -len(gap.parts)))


def _gap(together: list[Assumed]) -> Gap:
    first = together[0]
    parts = tuple(dict.fromkeys(assumed.part for assumed in together))
    values = tuple(dict.fromkeys(assumed.value for assumed in together))
    return Gap(first.parameter, first.rule, parts, values)
