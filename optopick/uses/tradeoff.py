"""The exact front between two goals over the whole table: each point proved, none left out between them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from optopick.answers import Front, Point
from optopick.brief import Brief, Goal, GoalName
from optopick.coupler import Coupler
from optopick.model.rows import Ask
from optopick.model.search import NEVER, STEP
from optopick.model.solver import Clock
from optopick.uses.engine import (
    Best,
    Entry,
    Progress,
    ask_of,
    entries_of,
    goal_of,
    guard_of,
    over_all,
    quiet,
    rechecked,
)


def tradeoff(
    brief: Brief,
    goals: tuple[GoalName, GoalName] = (GoalName.EDGE_TIME, GoalName.POWER),
    *,
    points: int | None = None,
    couplers: Sequence[Coupler] | None = None,
    progress: Progress = quiet,
    time_limit: float = np.inf,
    floors: Mapping[str, float] | None = None,
) -> Front:
    """The front between two goals. points: that many at the most, evenly by the first goal; None: every one.

    Each point is the least second goal at its first goal, and the least first goal at that second: proved both ways.
    Past `time_limit` [s] the points so far are given, complete False. floors: by part, a first goal, guard included,
    below which it is known to have no design.
    """
    brief = replace(brief, goal=Goal(goals[0], goals[1], 0.0))
    known = {part: floor / guard_of(brief, goals[0]) for part, floor in (floors or {}).items()}
    walk = _Walk(brief, entries_of(brief, couplers)[0], Clock(time_limit), known)
    found = walk.all(progress) if points is None else walk.some(points, progress)
    return Front(goals, tuple(found), points is None and not walk.clock.out, _knee(found), walk.clock.out)


class _Walk:
    """Along the front: the first goal least, the second then least, then the second better than that, and again."""

    def __init__(self, brief: Brief, entries: list[Entry], clock: Clock, floors: dict[str, float]) -> None:
        self.brief, self.entries, self.clock = brief, entries, clock
        self.first, self.second = brief.goal.minimize, brief.goal.then
        self.floors = floors
        # a design of which one of the goals never ends has no place on the front
        self.ask = ask_of(brief).limited(self.first, NEVER).limited(self.second, NEVER)

    def point(self, ask: Ask) -> tuple[Best, float, float] | None:
        """The point with the least first goal within `ask`; goals as the model has them."""
        first = over_all(self.entries, self.first, ask, self.clock, floors=self.floors)
        if first.choice is None:
            return None
        held = ask.limited(self.first, first.value * (1 + STEP))
        limit = held.limit(self.first) * (1 + STEP)
        near = [entry for entry in self.entries if self.floors.get(entry.coupler.part, 0.0) <= limit]
        second = over_all(near, self.second, held, self.clock, start=first)
        return None if self.clock.out else (second, first.value, second.value)

    def all(self, progress: Progress) -> list[Point]:
        """Every point."""
        found, ask = [], self.ask
        while (at := self.point(ask)) is not None:
            found.append(self._told(at[0]))
            progress("points of the front", len(found), len(found) + 1)
            ask = ask.limited(self.second, at[2] * (1 - STEP))
        return found

    def some(self, count: int, progress: Progress) -> list[Point]:
        """Both ends, and the points at first goals evenly between them by ratio."""
        start = self.point(self.ask)
        if start is None:
            return []
        least = over_all(self.entries, self.second, self.ask, self.clock)
        found = [start]
        for done, limit in enumerate(np.geomspace(start[2], least.value * (1 + STEP), count)[1:]):
            progress("points of the front", done + 1, count)
            at = self.point(self.ask.limited(self.second, float(limit)))
            if at is not None and at[2] < found[-1][2] * (1 - STEP):
                found.append(at)
        return [self._told(at[0]) for at in found]

    def _told(self, at: Best) -> Point:
        assert at.entry is not None
        assert at.choice is not None
        reviewed = rechecked(self.brief, at.entry, at.choice)
        return Point(goal_of(reviewed, self.first), goal_of(reviewed, self.second), reviewed)


def _knee(points: Sequence[Point]) -> int | None:
    """The point farthest below the line between the ends, each goal by its logarithm scaled to one."""
    if len(points) < 3:
        return None
    x, y = (np.log([getattr(point, name) for point in points]) for name in ("first", "second"))
    x, y = (x - x[0]) / (x[-1] - x[0]), (y - y[-1]) / (y[0] - y[-1])
    return int(np.argmin(x + y))
