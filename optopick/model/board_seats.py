"""A coupler on a link of a board: the values still in question, the cuts made, and the designs it can give."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from optopick.board import BoardGoalName, reel_of
from optopick.coupler import Coupler
from optopick.model.box import Box, Choice, narrowed, whole_box
from optopick.model.kinds import LinkModel
from optopick.model.rows import EASE, Ask, Rows, all_but, stack
from optopick.physics.types import Array

SMALL = 6000
"""A seat with no more combinations than this is looked at in each of them before the solver is."""

CUTS_AHEAD = 6
"""Rounds of cuts that such a seat gets in advance."""


@dataclass(frozen=True)
class Prices:
    """Price of each value of each position of a coupler's model over the whole stock, for one link; (n,) each."""

    led: Array
    load: Array
    base: Array

    def of(self, box: Box) -> tuple[Array, Array, Array]:
        """Those of a box's values."""
        i, j, m = box.indices
        return self.led[i], self.load[j], self.base[m]


@dataclass(frozen=True)
class Seat:
    """A coupler on a link: number of the link, the part, what is asked of it, and the values in question.

    prices: of the stock, None where no price counts.
    """

    link: int
    coupler: Coupler
    ask: Ask
    box: Box
    prices: Prices | None = None

    def adds(self, goal: BoardGoalName) -> tuple[Array, Array, Array]:
        """What each value of each position adds to the cost of one link, packages aside; else to its power [W]."""
        if goal is BoardGoalName.COST:
            if self.prices is None:
                raise ValueError("a cost without prices")
            return self.prices.of(self.box)
        p, q = self.box.model.power
        return p, q, np.zeros(self.box.model.sizes[2])

    @property
    def heat(self) -> tuple[Array, Array, Array]:
        """Heat of each LED branch (T, n) and load resistor (T, n), and of an equal share of the package (T, 1) [W]."""
        led, load, room = self.box.model.heat
        return led, load, np.reshape(room, (-1, 1)) / self.coupler.channels


@dataclass(frozen=True)
class Taken:
    """The seat taken for a link, and its combination in the seat's box."""

    seat: Seat
    choice: Choice

    def adds(self, goal: BoardGoalName) -> float:
        """What it adds to a board's cost, for one link, packages aside; for every other goal to its power [W]."""
        return float(sum(part[k] for part, k in zip(self.seat.adds(goal), self.choice, strict=True)))

    @property
    def power(self) -> float:
        """Worst average power [W]."""
        return self.adds(BoardGoalName.POWER)

    @property
    def reels(self) -> set[float]:
        """The reels it takes from."""
        r_led, _, r_shunt, r_load, r_be = self.seat.box.model.values(*self.choice)
        return {reel_of(ohms) for ohms in (r_led, r_shunt, r_load, r_be) if np.isfinite(ohms)}

    @property
    def edge(self) -> float:
        """Worst edge time [s], guard taken out."""
        return float(self.seat.box.model.scores(*self._index).edge[0])

    @property
    def shares(self) -> bool:
        """Whether its heat leaves each other channel of its package as much."""
        led, load, share = self.seat.heat
        i, j, _ = self.choice
        return bool((led[:, [i]] + load[:, [j]] <= share * (1 + EASE)).all())

    @property
    def sound(self) -> bool:
        """Whether the rows hold, and the exact times what is asked: the rows only bound them."""
        box, index = self.seat.box, self._index
        return bool(box.model.scores(*index).within(self.seat.ask)[0]) and bool(box.rows.holds(*index)[0])

    @property
    def _index(self) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        i, j, m = (np.array([k]) for k in self.choice)
        return i, j, m


def seat_of(link: int, coupler: Coupler, model: LinkModel, ask: Ask, prices: Prices | None = None) -> Seat | None:
    """A coupler on a link; None where it has no design within `ask`."""
    box = whole_box(model, ask, stack([], model.sizes))
    box = narrowed(box, ask) if box else None
    return None if box is None else Seat(link, coupler, ask, box, prices)


def prices_of(model: LinkModel, position: Sequence[Mapping[float, float]]) -> Prices:
    """The prices of a model's whole stock from those of each position: LED resistor, shunt, load, base.

    A position left empty costs nothing; equal resistors in series cost one each.
    """
    led, load, base = model.sizes
    in_led = [model.values(i, 0, 0) for i in range(led)]
    return Prices(
        led=np.array([v[1] * position[0][v[0]] + _price(position[1], v[2]) for v in in_led]),
        load=np.array([position[2][model.values(0, j, 0)[3]] for j in range(load)]),
        base=np.array([_price(position[3], model.values(0, 0, m)[4]) for m in range(base)]),
    )


def _price(prices: Mapping[float, float], ohms: float) -> float:
    return prices[ohms] if np.isfinite(ohms) else 0.0


def narrower(seat: Seat, ask: Ask) -> Seat | None:
    """The same seat, asked more; its cuts are kept."""
    box = narrowed(seat.box, ask)
    return None if box is None else replace(seat, ask=ask, box=box)


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


def mentioned(seat: Seat) -> Iterator[tuple[int, int, Array]]:
    """Position of the design (0 to 3), position of the model (0 to 2), and the reel of each of its values."""
    model = seat.box.model
    led, load, base = model.sizes
    branches = [model.values(i, 0, 0) for i in range(led)]
    yield 0, 0, np.array([reel_of(values[0]) for values in branches])
    yield 1, 0, np.array([reel_of(values[2]) for values in branches])
    yield 2, 1, np.array([reel_of(model.values(0, j, 0)[3]) for j in range(load)])
    yield 3, 2, np.array([reel_of(model.values(0, 0, m)[4]) for m in range(base)])


def repaired(seats: Sequence[Seat], taken: Sequence[Taken], goal: BoardGoalName) -> list[Taken] | None:
    """A board with a sound design for every link from no other reels and couplers; None where a link has none.

    Those that add least to the goal.
    """
    reels: set[float] = set().union(*(one.reels for one in taken))
    parts = {one.seat.coupler.part for one in taken}
    found = []
    for link, one in enumerate(taken):
        others = [seat for seat in seats if seat.link == link and seat.coupler.part in parts]
        sound = [one] if one.sound else [each for seat in others if (each := _best_from(seat, reels, goal))]
        if not sound:
            return None
        found.append(min(sound, key=lambda each: each.adds(goal)))
    return found


def _best_from(seat: Seat, reels: set[float], goal: BoardGoalName) -> Taken | None:
    """The sound design of a seat that adds least to a goal, from these reels alone."""
    box = seat.box
    keep = [np.ones(n, dtype=bool) for n in box.model.sizes]
    for _, axis, named in mentioned(seat):
        keep[axis] &= np.array([not np.isfinite(ohms) or float(ohms) in reels for ohms in named])
    i, j, m = (axis.ravel() for axis in np.meshgrid(*(np.flatnonzero(part) for part in keep), indexing="ij"))
    if not len(i):
        return None
    sound = box.model.scores(i, j, m).within(seat.ask) & box.rows.holds(i, j, m)
    led, load, base = seat.adds(goal)
    k = int(np.where(sound, led[i] + load[j] + base[m], np.inf).argmin())
    return Taken(seat, (int(i[k]), int(j[k]), int(m[k]))) if sound[k] else None
