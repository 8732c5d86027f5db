"""Many links in one mixed-integer model, tied together by the reels, the coupler parts and the packages they share.

A seat is one coupler on one link, with the values still in question for it. For each value of each position of a seat
there is a column; a position's columns add up to the seat's own, and the seats of a link to one. A seat's rows
a[i] + b[j] + c[m] >= 0 go in as they are: of a seat that is not taken every column is 0, and 0 >= 0 holds.

For packages of several channels that links share there is a whole-number column for each part and pair of grounds;
where the values chosen decide whether a link may share, one more for its seat.
"""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from dataclasses import dataclass, fields, replace
from typing import TypeVar

import numpy as np

from optopick.board import BoardGoalName, Grounds
from optopick.model.board_packages import Counts, Sharing, on_grounds, sharing_of
from optopick.model.board_seats import Seat, Taken, mentioned
from optopick.model.ranges import undominated
from optopick.model.rows import EASE, Rows
from optopick.model.solver import Program
from optopick.physics.types import Array

Name = TypeVar("Name", bound=Hashable)

ROUNDING = 1e-9
"""Share by which totals may miss their limit: rounding."""


@dataclass(frozen=True)
class Caps:
    """Upper limits over the board, infinite where none is stated; power [W]; edge: of each link's own limit [1]."""

    reels: float = np.inf
    couplers: float = np.inf
    packages: float = np.inf
    power: float = np.inf
    cost: float = np.inf
    edge: float = np.inf

    def of(self, goal: BoardGoalName) -> float:
        """The limit on what a goal makes least."""
        return float(getattr(self, goal.value))

    def limited(self, goal: BoardGoalName, limit: float) -> Caps:
        """The same with what a goal makes least held to `limit` as well."""
        return replace(self, **{goal.value: min(limit, self.of(goal))})

    def without(self, names: frozenset[str]) -> Caps:
        """The same without some of the limits."""
        return replace(self, **dict.fromkeys(names, np.inf))

    @property
    def stated(self) -> tuple[BoardGoalName, ...]:
        """The goals that are held to a limit."""
        return tuple(BoardGoalName(field.name) for field in fields(self) if np.isfinite(getattr(self, field.name)))


LINEAR = tuple(goal for goal in BoardGoalName if goal is not BoardGoalName.EDGE)
"""Goals that are sums over columns; an edge is a limit on each seat instead."""

WHOLE = (BoardGoalName.REELS, BoardGoalName.COUPLERS, BoardGoalName.PACKAGES)
"""Goals that count things."""


def clipped(rows: Rows) -> Rows:
    """Rows that hold for the same combinations, each entry no larger than it needs to be: closer once relaxed.

    What a value gives beyond the worst that the others can take is of no use.
    """
    parts = [rows.a + EASE, rows.b.copy(), rows.c.copy()]
    for k in range(3):
        worst = sum(parts[n].min(axis=1) for n in range(3) if n != k)
        parts[k] = np.minimum(parts[k], -np.reshape(worst, (-1, 1)))
    largest = np.max([np.abs(part).max(axis=1) for part in parts], axis=0)
    scale = np.where(largest > 0, largest, 1.0).reshape(-1, 1)
    return Rows(rows.names, *(part / scale for part in parts))


class BoardProgram:
    """The program over all seats; `counts` of each link, `scale` by which costs are divided; goal None: any board."""

    def __init__(
        self, seats: Sequence[Seat], counts: Sequence[Counts], caps: Caps, goal: BoardGoalName | None, scale: float
    ) -> None:
        self.seats, self.counts, self.caps, self.goal, self.scale = seats, counts, caps, goal, scale
        self._rows: list[tuple[np.ndarray, Array, float, float]] = []
        ends = np.cumsum([0, *(sum(seat.box.model.sizes) for seat in seats)])
        self.starts, self.seat_columns = ends[:-1], int(ends[-1])
        self.size = self.seat_columns + len(seats)
        self.uses = [list(mentioned(seat)) for seat in seats]
        found = {float(ohms) for uses in self.uses for _, _, reels in uses for ohms in reels if np.isfinite(ohms)}
        self.reels = self._new(sorted(found))
        self.parts = self._new(sorted({seat.coupler.part for seat in seats}))
        self._find_packings()
        self.upper = np.ones(self.size)
        self._add_all()

    def _new(self, names: Sequence[Name]) -> dict[Name, int]:
        """A new column for each name."""
        first, self.size = self.size, self.size + len(names)
        return {name: first + k for k, name in enumerate(names)}

    def columns(self, k: int) -> list[np.ndarray]:
        """The columns of each position of seat k."""
        ends = self.starts[k] + np.cumsum([0, *self.seats[k].box.model.sizes])
        return [np.arange(ends[n], ends[n + 1]) for n in range(3)]

    def own(self, k: int) -> int:
        """The column that says whether seat k is taken."""
        return self.seat_columns + k

    def _add(self, columns: Sequence[int] | np.ndarray, entries: Array, low: float, high: float) -> None:
        self._rows.append((np.asarray(columns), np.asarray(entries, dtype=float), low, high))

    def _add_all(self) -> None:
        for link in range(len(self.counts)):
            mine = [self.own(k) for k, seat in enumerate(self.seats) if seat.link == link]
            self._add(mine, np.ones(len(mine)), 1.0, 1.0)
        for k, seat in enumerate(self.seats):
            for columns in self.columns(k):
                self._add([*columns, self.own(k)], np.array([1.0] * len(columns) + [-1.0]), 0.0, 0.0)
            self._add([self.own(k), self.parts[seat.coupler.part]], np.array([-1.0, 1.0]), 0.0, np.inf)
            rows, together = clipped(undominated(seat.box.rows)), np.concatenate(self.columns(k))
            for entries in np.concatenate([rows.a, rows.b, rows.c], axis=1):
                self._add(together, entries, 0.0, np.inf)
        for ohms, mentions in self._mentions().items():
            for mine in mentions:
                self._add([*mine, self.reels[ohms]], np.array([-1.0] * len(mine) + [1.0]), 0.0, np.inf)
        self._add_packings()
        for goal in self.caps.stated:
            if goal in LINEAR:
                self._add_cap(self.weights(goal), self.caps.of(goal), whole=goal in WHOLE)

    def _add_cap(self, weights: Array, cap: float, whole: bool) -> None:
        used = np.flatnonzero(weights)
        scale = 1.0 if whole else (cap or float(np.abs(weights).max(initial=1.0)))
        self._add(used, weights[used] / scale, 0.0, cap / scale + (0.0 if whole else ROUNDING))

    def _mentions(self) -> dict[float, list[list[int]]]:
        """For each reel, the columns that take from it: for each link and position those of all its seats."""
        found: dict[tuple[float, int, int], list[int]] = {}
        for k, (seat, uses) in enumerate(zip(self.seats, self.uses, strict=True)):
            columns = self.columns(k)
            for position, axis, reels in uses:
                for column, ohms in zip(columns[axis], reels, strict=True):
                    if np.isfinite(ohms):
                        found.setdefault((float(ohms), seat.link, position), []).append(int(column))
        by_reel: dict[float, list[list[int]]] = {}
        for (ohms, _, _), columns_ in found.items():
            by_reel.setdefault(ohms, []).append(columns_)
        return by_reel

    # ---- packages -------------------------------------------------------------------------------------------------

    def _find_packings(self) -> None:
        """The columns for packages, where they count: which seats share, and how many there are of each part."""
        self.shares: dict[int, int] = {}
        self.packages: dict[tuple[str, Grounds], int] = {}
        if not {BoardGoalName.PACKAGES, BoardGoalName.COST} & {self.goal, *self.caps.stated}:
            return
        kinds = [sharing_of(seat, self.counts[seat.link]) for seat in self.seats]
        self.by_values = self._new([k for k, kind in enumerate(kinds) if kind is Sharing.BY_VALUES])
        self.shares = {k: self.own(k) for k, kind in enumerate(kinds) if kind is Sharing.ALWAYS} | self.by_values
        self.packages = self._new(sorted({place for k in self.shares for place, _ in self._packed(k)}))

    def _packed(self, k: int) -> list[tuple[tuple[str, Grounds], int]]:
        """Where the links of seat k are packed if they share, and how many of them there."""
        seat = self.seats[k]
        of_link = self.counts[seat.link].items()
        return [((seat.coupler.part, grounds), count) for grounds, count in of_link if grounds is not None]

    def _add_packings(self) -> None:
        filled: dict[tuple[str, Grounds], list[tuple[int, float]]] = {}
        for k, column in self.shares.items():
            for place, count in self._packed(k):
                filled.setdefault(place, []).append((column, count / self.seats[k].coupler.channels))
        for place, column in self.packages.items():
            columns, shares = zip(*filled[place], strict=True)
            self.upper[column] = float(np.ceil(sum(shares) - ROUNDING))
            self._add([column, *columns], np.array([1.0, *(-share for share in shares)]), 0.0, np.inf)
        for k, column in self.shares.items():
            if column != self.own(k):
                self._add_heat(k, column)

    def _add_heat(self, k: int, shares: int) -> None:
        """Seat k shares only where it is taken, and its heat is an equal share of the package's at most."""
        self._add([self.own(k), shares], np.array([1.0, -1.0]), 0.0, np.inf)
        (led, load, share), channels = self.seats[k].heat, self.seats[k].coupler.channels
        columns = [*np.concatenate(self.columns(k)[:2]), self.own(k), shares]
        room = share * channels
        for entries in np.concatenate([-led / room, -load / room, 0 * room + 1, share / room - 1], axis=1):
            self._add(columns, entries, -ROUNDING, np.inf)

    def _in_packages(self, priced: bool) -> Array:
        """How many packages each column adds to the board, or what they cost."""
        found = np.zeros(self.size)
        price = {seat.coupler.part: (seat.coupler.price or 0.0) if priced else 1.0 for seat in self.seats}
        for k, seat in enumerate(self.seats):
            each, of_link = price[seat.coupler.part], self.counts[seat.link]
            found[self.own(k)] += each * sum(of_link.values())
            if k in self.shares:
                found[self.shares[k]] -= each * on_grounds(of_link)
        for (part, _), column in self.packages.items():
            found[column] = price[part]
        return found

    # ---- what is summed up ----------------------------------------------------------------------------------------

    def weights(self, goal: BoardGoalName) -> Array:
        """What each column adds to a goal over the board."""
        found = np.zeros(self.size)
        if goal in (BoardGoalName.REELS, BoardGoalName.COUPLERS):
            found[list((self.reels if goal is BoardGoalName.REELS else self.parts).values())] = 1.0
            return found
        if goal is BoardGoalName.PACKAGES:
            return self._in_packages(priced=False)
        for k, seat in enumerate(self.seats):
            for columns, part in zip(self.columns(k), seat.adds(goal), strict=True):
                found[columns] = sum(self.counts[seat.link].values()) * part
        return found + self._in_packages(priced=True) if goal is BoardGoalName.COST else found

    def program(self) -> Program:
        """All of it, for the solver."""
        lengths = [len(columns) for columns, _, _, _ in self._rows]
        return Program(
            costs=np.zeros(self.size) if self.goal is None else self.weights(self.goal) / self.scale,
            row_of=np.repeat(np.arange(len(self._rows)), lengths),
            column_of=np.concatenate([row[0] for row in self._rows]),
            entries=np.concatenate([row[1] for row in self._rows]),
            low=np.array([row[2] for row in self._rows]),
            high=np.array([row[3] for row in self._rows]),
            upper=self.upper,
        )

    def taken(self, chosen: np.ndarray) -> list[Taken]:
        """What a choice of columns takes for each link, in their order."""
        found = {}
        for k, seat in enumerate(self.seats):
            if chosen[self.own(k)]:
                i, j, m = (int(np.flatnonzero(chosen[columns])[0]) for columns in self.columns(k))
                found[seat.link] = Taken(seat, (i, j, m))
        return [found[link] for link in range(len(self.counts))]
