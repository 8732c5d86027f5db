"""The exact front between two goals over the whole table: each point proved, none left out between them."""

from __future__ import annotations

import time
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache
from itertools import pairwise

import numpy as np

from optopick.answers import Front, Point
from optopick.brief import Brief, Goal, GoalName
from optopick.coupler import Coupler
from optopick.model.kinds import model_of
from optopick.model.rows import Ask
from optopick.model.search import NEVER, STEP
from optopick.model.solver import Clock
from optopick.result import goal_of
from optopick.uses.engine import (
    Best,
    Entry,
    Progress,
    ask_of,
    couplers_of,
    guard_of,
    over_all,
    quiet,
    rechecked,
)
from optopick.uses.workers import Here, Workers

STRETCHES = 8
"""Parts in which the whole front is walked, the same whoever walks them."""


def tradeoff(
    brief: Brief,
    goals: tuple[GoalName, GoalName] = (GoalName.EDGE_TIME, GoalName.POWER),
    *,
    points: int | None = None,
    couplers: Sequence[Coupler] | None = None,
    workers: Workers | None = None,
    progress: Progress = quiet,
    time_limit: float = np.inf,
    floors: Mapping[str, float] | None = None,
) -> Front:
    """The front between two goals. points: that many at the most, evenly by the first goal; None: every one.

    Each point is the least second goal at its first goal, and the least first goal at that second: proved both ways.
    Past `time_limit` [s] the points so far are given, complete False. floors: by part, a first goal, guard included,
    below which it is known to have no design. workers: who walks the parts of the front; this process where None.
    """
    brief = replace(brief, goal=Goal(goals[0], goals[1], 0.0))
    known = {part: floor / guard_of(brief, goals[0]) for part, floor in (floors or {}).items()}
    until = time.time() + time_limit
    walk = _Walk(_Link(brief, tuple(couplers_of(brief, couplers)[0]), tuple(known.items())), until)
    found, parts = walk.start(points)
    out = walk.clock.out
    for done, (some, late) in enumerate((workers or Here()).map(_walked, parts)):
        progress("parts of the front", done + 1, len(parts))
        found.extend(at for at in some if at.second < found[-1].second * (1 - STEP))
        out = out or late
    told = tuple(at.point for at in found)
    return Front(goals, told, points is None and not out, _knee(told), out)


@dataclass(frozen=True)
class _Link:
    """Whose front: the brief with the two goals, the couplers that may serve, and floors of the first goal by part."""

    brief: Brief
    couplers: tuple[Coupler, ...]
    floors: tuple[tuple[str, float], ...]


@dataclass(frozen=True)
class _Stretch:
    """The points whose second goal is at most `start` and more than `end`; the first of them only where that is None.

    until: the time of day [s] when all work ends.
    """

    link: _Link
    start: float
    end: float | None
    until: float

    def __str__(self) -> str:
        return f"the part of the front from {self.link.brief.goal.then.value} {self.start:g}"


@dataclass(frozen=True)
class _At:
    """A point, and its second goal as the model has it."""

    point: Point
    second: float


def _walked(stretch: _Stretch) -> tuple[list[_At], bool]:
    """The points of a part of the front, and whether time ran out."""
    walk = _Walk(stretch.link, stretch.until)
    return walk.stretch(stretch), walk.clock.out


@lru_cache(maxsize=1)
def _entries(brief: Brief, couplers: tuple[Coupler, ...]) -> list[Entry]:
    """The models of the couplers, kept for the next part of the front."""
    return [Entry(coupler, model_of(brief, coupler)) for coupler in couplers]


class _Walk:
    """Along the front: the first goal least, the second then least, then the second better than that, and again."""

    def __init__(self, link: _Link, until: float) -> None:
        self.link, self.brief, self.until = link, link.brief, until
        self.entries = _entries(link.brief, link.couplers)
        self.clock = Clock(until - time.time())
        self.first, self.second = self.brief.goal.minimize, self.brief.goal.then
        # its own: what one part of the front learns must not depend on who walked which before
        self.floors = dict(link.floors)
        # a design of which one of the goals never ends has no place on the front
        self.ask = ask_of(self.brief).limited(self.first, NEVER).limited(self.second, NEVER)

    def start(self, points: int | None) -> tuple[list[_At], list[_Stretch]]:
        """The point with the least first goal, and the parts of the front that are left to walk."""
        first = self.point(self.ask)
        if first is None:
            return [], []
        least = over_all(self.entries, self.second, self.ask, self.clock).value
        if self.clock.out:
            return [first], []
        link = replace(self.link, floors=tuple(self.floors.items()))
        if points is not None:
            limits = np.geomspace(first.second, least * (1 + STEP), points)[1:]
            return [first], [_Stretch(link, float(limit), None, self.until) for limit in limits]
        starts = [first.second * (1 - STEP), *np.geomspace(first.second, least, STRETCHES + 1)[1:-1], 0.0]
        return [first], [_Stretch(link, float(a), float(b), self.until) for a, b in pairwise(starts)]

    def stretch(self, stretch: _Stretch) -> list[_At]:
        """Its points."""
        found, limit = [], stretch.start
        while (at := self.point(self.ask.limited(self.second, limit))) is not None:
            if stretch.end is not None and at.second <= stretch.end:
                break
            found.append(at)
            if stretch.end is None:
                break
            limit = at.second * (1 - STEP)
        return found

    def point(self, ask: Ask) -> _At | None:
        """The point with the least first goal within `ask`."""
        first = over_all(self.entries, self.first, ask, self.clock, floors=self.floors)
        if first.choice is None:
            return None
        held = ask.limited(self.first, first.value * (1 + STEP))
        limit = held.limit(self.first) * (1 + STEP)
        near = [entry for entry in self.entries if self.floors.get(entry.coupler.part, 0.0) <= limit]
        second = over_all(near, self.second, held, self.clock, start=first)
        return None if self.clock.out else self._told(second)

    def _told(self, best: Best) -> _At:
        assert best.entry is not None
        assert best.choice is not None
        reviewed = rechecked(self.brief, best.entry, best.choice)
        return _At(Point(goal_of(reviewed, self.first), goal_of(reviewed, self.second), reviewed), best.value)


def _knee(points: Sequence[Point]) -> int | None:
    """The point farthest below the line between the ends, each goal by its logarithm scaled to one."""
    if len(points) < 3:
        return None
    x, y = (np.log([getattr(point, name) for point in points]) for name in ("first", "second"))
    x, y = (x - x[0]) / (x[-1] - x[0]), (y - y[-1]) / (y[0] - y[-1])
    return int(np.argmin(x + y))
