"""Many links in one mixed-integer model, tied together by the reels and the coupler parts that they share.

A seat is one coupler on one link, with the values still in question for it. For each value of each position of a seat
there is a column; a position's columns add up to the seat's own, and the seats of a link to one. A seat's rows
a[i] + b[j] + c[m] >= 0 go in as they are: of a seat that is not taken every column is 0, and 0 >= 0 holds.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from optopick.board import BoardGoalName, reel_of
from optopick.coupler import Coupler
from optopick.model.box import Box, Choice, narrowed, whole_box
from optopick.model.kinds import LinkModel
from optopick.model.ranges import undominated
from optopick.model.rows import EASE, Ask, Rows, all_but, stack
from optopick.model.solver import Program
from optopick.physics.types import Array

ROUNDING = 1e-9
"""Share by which totals may miss their limit: rounding."""


SMALL = 6000
"""A seat with no more combinations than this is looked at in each of them before the solver is."""

CUTS_AHEAD = 6
"""Rounds of cuts that such a seat gets in advance."""


@dataclass(frozen=True)
class Seat:
    """A coupler on a link: number of the link, the part, what is asked of it, and the values in question."""

    link: int
    coupler: Coupler
    ask: Ask
    box: Box


@dataclass(frozen=True)
class Caps:
    """Upper limits over the board, infinite where none is stated; power [W]."""

    reels: float = np.inf
    couplers: float = np.inf
    power: float = np.inf


@dataclass(frozen=True)
class Taken:
    """The seat taken for a link, and its combination in the seat's box."""

    seat: Seat
    choice: Choice

    @property
    def power(self) -> float:
        """Worst average power [W]."""
        p, q = self.seat.box.model.power
        return float(p[self.choice[0]] + q[self.choice[1]])

    @property
    def reels(self) -> set[float]:
        """The reels it takes from."""
        r_led, _, r_shunt, r_load, r_be = self.seat.box.model.values(*self.choice)
        return {reel_of(ohms) for ohms in (r_led, r_shunt, r_load, r_be) if np.isfinite(ohms)}

    @property
    def sound(self) -> bool:
        """Whether the rows hold, and the exact times what is asked: the rows only bound them."""
        box, index = self.seat.box, tuple(np.array([k]) for k in self.choice)
        return bool(box.model.scores(*index).within(self.seat.ask)[0]) and bool(box.rows.holds(*index)[0])


def seat_of(link: int, coupler: Coupler, model: LinkModel, ask: Ask) -> Seat | None:
    """A coupler on a link; None where it has no design within `ask`."""
    box = whole_box(model, ask, stack([], model.sizes))
    box = narrowed(box, ask) if box else None
    return None if box is None else Seat(link, coupler, ask, box)


def narrower(seat: Seat, ask: Ask) -> Seat | None:
    """The same seat, asked more; its cuts are kept."""
    box = narrowed(seat.box, ask)
    return None if box is None else Seat(seat.link, seat.coupler, ask, box)


def with_cuts(seat: Seat, choice: Choice) -> Seat:
    """The seat with rows that forbid a combination which the exact times refuse, and as many like it as can be."""
    box = seat.box
    cuts = box.model.cuts(seat.ask, *choice)
    index = tuple(np.array([k]) for k in choice)
    if not len(cuts) or bool(cuts.holds(*index)[0]):
        cuts = stack([cuts, all_but(choice, box.model.sizes)], box.model.sizes)
    return replace(seat, box=box.with_cuts(_that_may_fail(cuts)))


def sharpened(seat: Seat) -> Seat | None:
    """A small seat without values that no sound combination has, cuts made in advance; None where none is sound."""
    box = seat.box
    if box.combinations > SMALL:
        return seat
    i, j, m = _held(box)
    sound = box.model.scores(i, j, m).within(seat.ask)
    if not sound.any():
        return None
    seat = replace(seat, box=box.take(*(np.unique(axis[sound]) for axis in (i, j, m))))
    for _ in range(CUTS_AHEAD):
        box = seat.box
        i, j, m = _held(box)
        refused = ~box.model.scores(i, j, m).within(seat.ask)
        if not refused.any():
            break
        p, q = box.model.power
        k = int(np.where(refused, p[i] + q[j], np.inf).argmin())
        seat = with_cuts(seat, (int(i[k]), int(j[k]), int(m[k])))
    return seat


def _held(box: Box) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The combinations of a box that hold its rows."""
    i, j, m = (axis.ravel() for axis in np.meshgrid(*(np.arange(n) for n in box.model.sizes), indexing="ij"))
    keep = box.rows.holds(i, j, m)
    return i[keep], j[keep], m[keep]


def _that_may_fail(rows: Rows) -> Rows:
    """Rows that some combination fails: of all values, since the seat keeps those that a row alone rules out."""
    return rows.pick(sum(part.min(axis=1) for part in (rows.a, rows.b, rows.c)) < -EASE)


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


def mentioned(seat: Seat) -> Iterator[tuple[int, int, Array]]:
    """Position of the design (0 to 3), position of the model (0 to 2), and the reel of each of its values."""
    model = seat.box.model
    led, load, base = model.sizes
    branches = [model.values(i, 0, 0) for i in range(led)]
    yield 0, 0, np.array([reel_of(values[0]) for values in branches])
    yield 1, 0, np.array([reel_of(values[2]) for values in branches])
    yield 2, 1, np.array([reel_of(model.values(0, j, 0)[3]) for j in range(load)])
    yield 3, 2, np.array([reel_of(model.values(0, 0, m)[4]) for m in range(base)])


def repaired(seats: Sequence[Seat], taken: Sequence[Taken]) -> list[Taken] | None:
    """A board with a sound design for every link from no other reels and couplers; None where a link has none."""
    reels: set[float] = set().union(*(one.reels for one in taken))
    parts = {one.seat.coupler.part for one in taken}
    found = []
    for link, one in enumerate(taken):
        others = [seat for seat in seats if seat.link == link and seat.coupler.part in parts]
        sound = [one] if one.sound else [each for seat in others if (each := _best_from(seat, reels)) is not None]
        if not sound:
            return None
        found.append(min(sound, key=lambda each: each.power))
    return found


def _best_from(seat: Seat, reels: set[float]) -> Taken | None:
    """The sound design of a seat that takes least power, from these reels alone."""
    box = seat.box
    keep = [np.ones(n, dtype=bool) for n in box.model.sizes]
    for _, axis, named in mentioned(seat):
        keep[axis] &= np.array([not np.isfinite(ohms) or float(ohms) in reels for ohms in named])
    i, j, m = (axis.ravel() for axis in np.meshgrid(*(np.flatnonzero(part) for part in keep), indexing="ij"))
    if not len(i):
        return None
    sound = box.model.scores(i, j, m).within(seat.ask) & box.rows.holds(i, j, m)
    p, q = box.model.power
    k = int(np.where(sound, p[i] + q[j], np.inf).argmin())
    return Taken(seat, (int(i[k]), int(j[k]), int(m[k]))) if sound[k] else None


class BoardProgram:
    """The program over all seats; `counts` of each link, `scale` [W] by which powers are divided."""

    def __init__(
        self, seats: Sequence[Seat], counts: Sequence[int], caps: Caps, goal: BoardGoalName, scale: float
    ) -> None:
        self.seats, self.counts, self.caps, self.goal, self.scale = seats, counts, caps, goal, scale
        self._rows: list[tuple[np.ndarray, Array, float, float]] = []
        ends = np.cumsum([0, *(sum(seat.box.model.sizes) for seat in seats)])
        self.starts, seat_columns = ends[:-1], int(ends[-1])
        self.uses = [list(mentioned(seat)) for seat in seats]
        found = {float(ohms) for uses in self.uses for _, _, reels in uses for ohms in reels if np.isfinite(ohms)}
        self.reels = {ohms: k for k, ohms in enumerate(sorted(found), seat_columns + len(seats))}
        parts = sorted({seat.coupler.part for seat in seats})
        self.parts = {part: k for k, part in enumerate(parts, seat_columns + len(seats) + len(self.reels))}
        self.seat_columns = seat_columns
        self.size = seat_columns + len(seats) + len(self.reels) + len(self.parts)
        self._add_all()

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
        shared = ((self.reels, self.caps.reels), (self.parts, self.caps.couplers))
        for columns_of, cap in shared:
            if np.isfinite(cap):
                self._add(list(columns_of.values()), np.ones(len(columns_of)), 0.0, cap)
        if np.isfinite(self.caps.power):
            powers = self.powers() / self.caps.power
            used = np.flatnonzero(powers)
            self._add(used, powers[used], 0.0, 1.0 + ROUNDING)

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

    def powers(self) -> Array:
        """The power that each column adds over the board [W]."""
        found = np.zeros(self.size)
        for k, seat in enumerate(self.seats):
            p, q = seat.box.model.power
            led, load, _ = self.columns(k)
            found[led], found[load] = self.counts[seat.link] * p, self.counts[seat.link] * q
        return found

    def program(self) -> Program:
        """All of it, for the solver."""
        costs = np.zeros(self.size)
        if self.goal is BoardGoalName.POWER:
            costs = self.powers() / self.scale
        else:
            costs[list((self.reels if self.goal is BoardGoalName.REELS else self.parts).values())] = 1.0
        lengths = [len(columns) for columns, _, _, _ in self._rows]
        return Program(
            costs=costs,
            row_of=np.repeat(np.arange(len(self._rows)), lengths),
            column_of=np.concatenate([row[0] for row in self._rows]),
            entries=np.concatenate([row[1] for row in self._rows]),
            low=np.array([row[2] for row in self._rows]),
            high=np.array([row[3] for row in self._rows]),
        )

    def taken(self, chosen: np.ndarray) -> list[Taken]:
        """What a choice of columns takes for each link, in their order."""
        found = {}
        for k, seat in enumerate(self.seats):
            if chosen[self.own(k)]:
                i, j, m = (int(np.flatnonzero(chosen[columns])[0]) for columns in self.columns(k))
                found[seat.link] = Taken(seat, (i, j, m))
        return [found[link] for link in range(len(self.counts))]
