"""The two ways to do without a solver that `pick` is measured against.

Both are given the program's own table of what every stock value contributes at every corner, and its own exact times:
they pay only for combining. Neither proves anything less than `pick` does: both look at every combination.

plain   every combination of the three positions: rows first, then the exact times of what is left
clever  every pair of load and base resistor; the LED resistor by bisection, as more light helps some checks and hurts
        the others, each all the way
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from optopick.brief import Brief, GoalName
from optopick.coupler import Coupler
from optopick.model.rows import EASE, FIELD, Ask
from optopick.model.search import STEP
from optopick.model.transistor import FAMILIES, Family, TransistorModel
from optopick.uses.engine import ask_of

CHUNK = 20_000
"""Combinations at once: arrays of some ten megabytes, about the size of a processor's cache."""

Index = np.ndarray
Designs = tuple[Index, Index, Index]
Test = Callable[[Index, Index, Index], np.ndarray]


@dataclass(frozen=True)
class Least:
    """Least first goal, least second goal within `give` of it (guard taken out); nan where there is no design."""

    first: float
    second: float


NOTHING = Least(np.nan, np.nan)


# --- plain -----------------------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Survey:
    """The goals of every combination that holds every check, and how many combinations were looked at."""

    goals: dict[GoalName, np.ndarray]
    looked_at: int

    def least(self, brief: Brief) -> Least:
        """The optimum of a brief's two goals."""
        first, second = self.goals[brief.goal.minimize], self.goals[brief.goal.then]
        if not len(first):
            return NOTHING
        best = float(first.min())
        return Least(best, float(second[first <= best * (1 + brief.goal.give) * (1 + STEP)].min()))


def plain(brief: Brief, coupler: Coupler, every: int = 1) -> Survey:
    """All combinations of the values that hold the limits on one value alone; of the LED resistors each `every`th."""
    model, ask = TransistorModel.of(brief, coupler), ask_of(brief)
    rows, live = model.rows(Ask()), model.start().indices
    found: dict[GoalName, list[np.ndarray]] = {goal: [] for goal in GoalName}
    looked_at = 0
    for i, j, m in _chunks(live[0][::every], live[1], live[2]):
        looked_at += len(i)
        held = rows.holds(i, j, m)
        scores = model.scores(i[held], j[held], m[held])
        within = scores.within(ask)
        for goal, values in found.items():
            values.append(scores.of(goal)[within])
    return Survey({goal: np.concatenate([*values, np.zeros(0)]) for goal, values in found.items()}, looked_at)


def _chunks(i: Index, j: Index, m: Index) -> Iterator[Designs]:
    shape = (len(i), len(j), len(m))
    total = int(np.prod(shape))
    for start in range(0, total, CHUNK):
        at = np.unravel_index(np.arange(start, min(start + CHUNK, total)), shape)
        yield i[at[0]], j[at[1]], m[at[2]]


# --- clever ----------------------------------------------------------------------------------------------------------


def clever(brief: Brief, coupler: Coupler, every: int = 1) -> Least:
    """Every pair of load and base resistor, the LED resistor by bisection; of the load resistors each `every`th."""
    model, ask = TransistorModel.of(brief, coupler), ask_of(brief)
    pairs = _Pairs(model, every)
    first = pairs.least(brief.goal.minimize, ask)
    if not np.isfinite(first):
        return NOTHING
    near = ask.limited(brief.goal.minimize, first * (1 + brief.goal.give) * (1 + STEP))
    return Least(first, pairs.least(brief.goal.then, near))


class _Pairs:
    """Pairs (j, m), and LED resistors in the order of rising light."""

    def __init__(self, model: TransistorModel, every: int) -> None:
        self.model = model
        i, j, m = model.start().indices
        self.by_light = i[np.argsort(model.candidates.i_low[0, i], kind="stable")]
        for light in (model.candidates.i_low, model.candidates.i_high):
            assert (np.diff(light[:, self.by_light], axis=1) >= 0).all(), "light does not rise with one order"
        grid = np.meshgrid(j[::every], m, indexing="ij")
        self.j, self.m = grid[0].ravel(), grid[1].ravel()

    def least(self, goal: GoalName, ask: Ask) -> float:
        """The least goal within `ask`; infinite where there is no design."""
        low, high, j, m = self._windows(ask)
        if not len(j):
            return np.inf
        if goal is GoalName.POWER:
            ranks = [low]
        elif goal is GoalName.EDGE_TIME:
            ranks = [high]
        else:
            ranks = self._crossing(goal, low, high, j, m)
        return min(self._least_at(goal, rank, j, m) for rank in ranks)

    def _least_at(self, goal: GoalName, rank: Index, j: Index, m: Index) -> float:
        best = np.inf
        for part in _parts(len(j)):
            scores = self.model.scores(self.by_light[rank[part]], j[part], m[part])
            best = min(best, float(scores.of(goal).min()))
        return best

    def _windows(self, ask: Ask) -> tuple[Index, Index, Index, Index]:
        """Least and most light that hold every check, and the pairs that have such a window; cheap checks first."""
        window = (np.zeros(len(self.j), dtype=int), np.full(len(self.j), len(self.by_light) - 1), self.j, self.m)
        for held, helps in self._checks(ask):
            low, high, j, m = window
            if helps:
                low = self._first(held, low, high, j, m)
            else:
                high = self._first(_fails(held), low, high, j, m) - 1
            keep = low <= high
            window = (low[keep], high[keep], j[keep], m[keep])
        return window

    def _checks(self, ask: Ask) -> Iterator[tuple[Test, bool]]:
        """Every check, and whether more light helps it."""
        rows = self.model.rows(Ask(edge=ask.edge, power=ask.power))
        steps = np.diff(rows.a[:, self.by_light], axis=1)
        rising = (steps >= 0).all(axis=1)
        assert (steps[~rising] <= 0).all(), "a row neither rises nor falls with light"
        yield rows.pick(rising).holds, True
        yield rows.pick(~rising).holds, False
        for family in FAMILIES:
            limit = getattr(ask, family.limit)
            if np.isfinite(limit):
                yield self._within(family, limit * (1 + EASE)), not family.more_light_hurts

    def _within(self, family: Family, limit: float) -> Test:
        return lambda i, j, m: self._late(family, i, j, m) <= limit

    def _late(self, family: Family, i: Index, j: Index, m: Index) -> np.ndarray:
        swing = self.model.candidates.load.swing.taken(j)
        return self.model._worst_times(family, i, swing, m).max(axis=(0, 1))

    def _crossing(self, goal: GoalName, low: Index, high: Index, j: Index, m: Index) -> list[Index]:
        """Where the time that light shortens meets the one that light stretches: the least of the longer is there."""
        shrinks, grows = (
            next(f for f in FAMILIES if f.limit == FIELD[goal] and f.more_light_hurts is hurts)
            for hurts in (False, True)
        )

        def crossed(i: Index, j: Index, m: Index) -> np.ndarray:
            return self._late(grows, i, j, m) >= self._late(shrinks, i, j, m)

        rank = self._first(crossed, low, high, j, m)
        return [np.clip(rank, low, high), np.clip(rank - 1, low, high)]

    def _first(self, test: Test, low: Index, high: Index, j: Index, m: Index) -> Index:
        """The least rank of light from `low` to `high` that passes a test which, once passed, stays passed; else
        `high` + 1."""
        found = np.empty_like(low)
        for part in _parts(len(j)):
            found[part] = self._bisected(test, low[part], high[part] + 1, j[part], m[part])
        return found

    def _bisected(self, test: Test, low: Index, high: Index, j: Index, m: Index) -> Index:
        while (low < high).any():
            middle = (low + high) // 2
            passed = test(self.by_light[np.minimum(middle, len(self.by_light) - 1)], j, m)
            open_ = low < high
            low, high = np.where(open_ & ~passed, middle + 1, low), np.where(open_ & passed, middle, high)
        return low


def _fails(test: Test) -> Test:
    return lambda i, j, m: ~test(i, j, m)


def _parts(count: int) -> list[slice]:
    return [slice(start, start + CHUNK) for start in range(0, count, CHUNK)]
