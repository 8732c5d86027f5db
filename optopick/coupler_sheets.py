"""The bins of one part, which share a data sheet: its gain and its switching rows are those of one typical unit."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from optopick import gaps
from optopick.coupler import Kind
from optopick.coupler_cells import Row

GAIN = ("h_fe_min", "h_fe_typ", "h_fe_max")
SWITCHING = (
    *("sw_t_r", "sw_t_f", "sw_v_cc", "sw_i_c", "sw_r_l"),
    *("sat_t_s", "sat_t_off", "sat_v_cc", "sat_i_f", "sat_r_l"),
)

Part = tuple[str, str, float]
"""A part with all its bins: name, output stage, test current of CTR [A]."""

Shared = tuple[float, frozenset[str]]
"""CTR of a part's typical unit [1], and the columns that are alike in all of its rows."""


@dataclass(frozen=True)
class Bin:
    """One bin among those of its part, CTR at the same test current.

    ctr: in the middle of this bin [1]; ctr_part: in the middle of all bins of the part, that of the sheet's typical
    unit [1]; alike: columns of gain and of switching that read the same in every bin.
    """

    ctr: float
    ctr_part: float
    alike: frozenset[str]

    def gain_over(self, *columns: str) -> float:
        """Return the gain of this bin's typical unit over that of the unit which `columns` speak of [1].

        The same light gives CTR in proportion to gain: ctr/ctr_part where every bin has the same figures. Where they
        differ they are each bin's own, and the answer is 1.
        """
        return self.ctr / self.ctr_part if self.alike.issuperset(columns) else 1.0


@dataclass(frozen=True)
class Figures:
    """What one row says about its part: ends of CTR [1], and the columns of gain and of switching in SI."""

    low: float
    high: float
    columns: tuple[float | None, ...]


def bins_of(rows: Sequence[Row]) -> list[Bin | None]:
    """Return the bin of every row; None where the row states no CTR."""
    parts: dict[Part, list[Figures]] = {}
    for row in rows:
        if (key := part_of(row)) is not None:
            parts.setdefault(key, []).append(figures_of(row))
    shared = {key: shared_of(together) for key, together in parts.items()}
    return [None if (key := part_of(row)) is None else bin_of(row, shared[key]) for row in rows]


def bin_of(row: Row, shared: Shared) -> Bin:
    """Return the bin of a row that states CTR, from what its part's rows have in common."""
    return Bin(_ctr(row), *shared)


def part_of(row: Row) -> Part | None:
    """Return what the bins of one part have in common: its name, its output stage, the test current of CTR."""
    ctr_at = row.number("ctr_at")
    if ctr_at is None or row.number("ctr_min") is None or not row.text("kind"):
        return None
    return row.text("part").casefold(), row.text("kind"), ctr_at


def figures_of(row: Row) -> Figures:
    """Return what a row that states CTR says about its part."""
    return Figures(*_ends(row), tuple(row.number(name) for name in (*GAIN, *SWITCHING)))


def shared_of(together: Sequence[Figures]) -> Shared:
    """Return the CTR of the typical unit of the part [1], and the columns that read the same in all of its rows."""
    ctr = math.sqrt(min(one.low for one in together) * max(one.high for one in together))
    alike = (name for k, name in enumerate((*GAIN, *SWITCHING)) if len({one.columns[k] for one in together}) == 1)
    return ctr, frozenset(alike)


def _ctr(row: Row) -> float:
    low, high = _ends(row)
    return math.sqrt(low * high)


def _ends(row: Row) -> tuple[float, float]:
    """Return the ends of CTR [1], the larger one filled in where the row is silent."""
    low, high = row.number("ctr_min"), row.number("ctr_max")
    if low is None:
        raise ValueError(f"{row.name} states no CTR")
    if high is None:
        high = gaps.ctr_max(gaps.Unit(row.name, Kind(row.text("kind"))), low).value
    return low, high
