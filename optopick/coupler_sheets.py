"""The bins of one part, which share a data sheet: its gain and its switching rows are those of one typical unit."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from optopick import gaps
from optopick.coupler import Kind
from optopick.coupler_cells import Row

GAIN = ("h_fe_min", "h_fe_typ", "h_fe_max")
SWITCHING = (
    *("sw_t_r", "sw_t_f", "sw_v_cc", "sw_i_c", "sw_r_l"),
    *("sat_t_s", "sat_t_off", "sat_v_cc", "sat_i_f", "sat_r_l"),
)


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


def bins_of(rows: Sequence[Row]) -> list[Bin | None]:
    """Return the bin of every row; None where the row states no CTR."""
    parts: dict[tuple[str, str, float], list[Row]] = {}
    for row in rows:
        if (key := _part_of(row)) is not None:
            parts.setdefault(key, []).append(row)
    shared = {key: _shared(together) for key, together in parts.items()}
    return [None if (key := _part_of(row)) is None else Bin(_ctr(row), *shared[key]) for row in rows]


def _part_of(row: Row) -> tuple[str, str, float] | None:
    """Return what the bins of one part have in common: its name, its output stage, the test current of CTR."""
    ctr_at = row.number("ctr_at")
    if ctr_at is None or row.number("ctr_min") is None or not row.text("kind"):
        return None
    return row.text("part").casefold(), row.text("kind"), ctr_at


def _shared(together: Sequence[Row]) -> tuple[float, frozenset[str]]:
    """Return the CTR of the typical unit of the part [1], and the columns that read the same in all of its rows."""
    ends = [_ends(row) for row in together]
    ctr = math.sqrt(min(low for low, _ in ends) * max(high for _, high in ends))
    return ctr, frozenset(_alike(together))


def _alike(together: Sequence[Row]) -> Iterator[str]:
    return (name for name in (*GAIN, *SWITCHING) if len({row.number(name) for row in together}) == 1)


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
