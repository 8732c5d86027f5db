"""The best design of one coupler under limits, with its proof: tighten, solve, evaluate exactly, ask for better."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from optopick.brief import GoalName
from optopick.model.box import Box, Choice, halves, narrowed, tightened, whole_box
from optopick.model.kinds import LinkModel
from optopick.model.ranges import undominated
from optopick.model.rows import Ask, Rows, all_but, stack
from optopick.model.solver import Answer, Clock, Outcome, Problem, solve

STEP = 1e-6
"""A design counts as better only if it is so by this share; the proof's resolution."""

HALVINGS = 20
"""Of the bisection for the bound that a search out of time shows."""

NEVER = 1e6
"""Seconds that no time that is a goal may reach: an output that never gets there is no answer."""

LEAF = 4000
"""A box with more combinations is split before the solver sees it, where rows only bound the delays."""

GRID = (24, 10, 8)
"""How many values per position the first look tries."""


@dataclass(frozen=True)
class Found:
    """The best combination, its goal's value, and the bound below which the coupler has none.

    Where no combination is better than the value to beat, `choice` is None and `value` is that value; an infinite
    bound says that the coupler has no design at all.
    """

    choice: Choice | None
    value: float
    bound: float


def best(
    model: LinkModel,
    goal: GoalName,
    ask: Ask,
    clock: Clock,
    below: float = np.inf,
    without: Sequence[Choice] = (),
) -> Found:
    """The least `goal` of one coupler within `ask`, if it is better than `below`; combinations `without` left out.

    Each round asks for a design better than the best so far. A round ends the search when ranges or the solver show
    that there is none: that is the proof. Where time runs out, `bound` is what ranges show.
    """
    search = Search(model, goal, ask, clock, without)
    found = search.run(below)
    return replace(found, bound=shown([search], found.value, clock)) if search.unfinished else found


def shown(unfinished: Sequence[Search], value: float, clock: Clock) -> float:
    """The goal below which ranges alone exclude every design of searches that ran out of time, by bisection.

    It takes no longer than the clock's grace; 0 where that is too short, or where there is no `value` to begin at.
    """
    low, high = 0.0, value if np.isfinite(value) else 0.0
    for _ in range(HALVINGS if high else 0):
        middle = (low + high) / 2
        gone = all(not clock.grace_over and search.gone(middle) for search in unfinished)
        if clock.grace_over:
            break
        low, high = (middle, high) if gone else (low, middle)
    return low


def first_look(
    model: LinkModel, goal: GoalName, ask: Ask, below: float = np.inf, without: Sequence[Choice] = ()
) -> Found:
    """A good design of one coupler that beats `below`, found without the solver: see `Search.look`."""
    return Search(model, goal, ask, Clock(), without).look(below)


def exists(model: LinkModel, ask: Ask, clock: Clock) -> bool | None:
    """Whether the coupler has any design within `ask`; None where time ran out first."""
    search = Search(model, None, ask, clock)
    box = narrowed(search.box, ask) if search.box else None
    if box is None:
        clock.by_ranges += 1
        return False
    if _look(box, GoalName.POWER, ask):
        return True
    outcome, found = search.solve(box, ask)
    return True if found else (None if outcome.answer is Answer.OUT_OF_TIME else False)


def refuted(model: LinkModel, ask: Ask) -> bool:
    """Whether ranges alone show that the coupler has no design within `ask`: quick, and silent where they do not."""
    box = whole_box(model, ask, stack([], model.sizes))
    return box is None or tightened(box, ask) is None


class Search:
    """The search of `best`, which may begin with a look: what that has ruled out the rest need not look at again.

    `goal` None asks for any design.
    """

    def __init__(
        self, model: LinkModel, goal: GoalName | None, ask: Ask, clock: Clock, without: Sequence[Choice] = ()
    ) -> None:
        self.goal, self.clock = goal or GoalName.POWER, clock
        self.any = goal is None
        self.ask = ask if self.goal is GoalName.POWER else ask.limited(self.goal, NEVER)
        self.boxes: list[Box] = []
        self.unfinished = False
        self.box = whole_box(model, self.ask, stack([all_but(choice, model.sizes) for choice in without], model.sizes))
        self.scale = float(sum(np.median(part) for part in model.power))

    def look(self, below: float) -> Found:
        """A good design that beats `below`, found without the solver; no proof that it is the best.

        Where ranges show that there is none, the bound says so as in `best`; else the bound is 0. Whoever calls `run`
        afterwards may ask for no more than `below`.
        """
        wanted = self.better_than(below)
        self.box = tightened(self.box, wanted) if self.box else None
        if self.box is None:
            return _proved(None, below)
        found = _look(self.box, self.goal, wanted)
        return Found(self.box.whole(found[0]), found[1], 0.0) if found else Found(None, below, 0.0)

    def run(self, below: float) -> Found:
        """Work through boxes: narrow, look, split what is large, solve what is small, until none is left.

        Where time runs out the search is `unfinished`, and shows no bound by itself.
        """
        choice: Choice | None = None
        value = below
        self.boxes = [self.box] if self.box else []
        solved = False
        while self.boxes:
            if self.clock.out:
                self.unfinished = True
                return Found(choice, value, 0.0)
            box = narrowed(self.boxes.pop(), self.better_than(value))
            if box is None:
                continue
            better, outcome = _look(box, self.goal, self.better_than(value)), None
            if better is None and box.combinations > LEAF and self.ask.has_delays:
                self.boxes.extend(halves(box))
                continue
            if better is None:
                outcome, better = self.solve(box, self.better_than(value))
                box, solved = self.box or box, True
                if outcome.answer is Answer.OUT_OF_TIME:
                    self.boxes.append(box)
                    self.unfinished = True
                    return Found(choice, value, 0.0)
            if better is not None:
                choice, value = box.whole(better[0]), better[1]
                least = outcome is not None and outcome.bound * self.scale >= value * (1 - STEP)
                self.boxes.extend([] if least and self.goal is GoalName.POWER else [box])
        self.clock.by_ranges += not solved
        return _proved(choice, value)

    def better_than(self, value: float) -> Ask:
        """What a better design must do."""
        if not np.isfinite(value):
            return self.ask
        return self.ask.limited(self.goal, value * (1 - STEP))

    def solve(self, box: Box, wanted: Ask) -> tuple[Outcome, tuple[Choice, float] | None]:
        """Solver calls, with cuts for what the exact times refuse, until one answer stands."""
        cut: Box | None = box
        while cut is not None and not self.clock.out:
            outcome = solve(Problem(undominated(cut.rows), cut.model.sizes, self._linear_goal(cut)), self.clock.left)
            self.clock.solves += 1
            self.box = cut
            if outcome.choice is None:
                return outcome, None
            index = tuple(np.array([k]) for k in outcome.choice)
            scores = cut.model.scores(*index)
            if bool(scores.within(wanted)[0]) and bool(cut.rows.holds(*index)[0]):
                return outcome, (outcome.choice, float(scores.of(self.goal)[0]))
            cut = tightened(cut.with_cuts(_cuts(cut, wanted, outcome.choice)), wanted)
        return (Outcome(Answer.OUT_OF_TIME, None, 0.0) if cut else Outcome(Answer.NONE, None, np.inf)), None

    def _linear_goal(self, box: Box) -> tuple[np.ndarray, np.ndarray] | None:
        if self.any or self.goal is not GoalName.POWER:
            return None
        p, q = box.model.power
        return p / self.scale, q / self.scale

    def gone(self, limit: float) -> bool:
        """Whether ranges alone exclude every design with the goal within `limit` in what is left."""
        return all(tightened(box, self.ask.limited(self.goal, limit)) is None for box in self.boxes)


def _proved(choice: Choice | None, value: float) -> Found:
    """Nothing better than `value` exists; nothing at all where no value was to be beaten."""
    return Found(choice, value, value * (1 - STEP) if np.isfinite(value) else np.inf)


def _cuts(box: Box, wanted: Ask, choice: Choice) -> Rows:
    """Rows that forbid a combination the exact times refuse, and as many like it as can be."""
    cuts = box.model.cuts(wanted, *choice)
    index = tuple(np.array([k]) for k in choice)
    return all_but(choice, box.model.sizes) if not len(cuts) or bool(cuts.holds(*index)[0]) else cuts


def _look(box: Box, goal: GoalName, wanted: Ask) -> tuple[Choice, float] | None:
    """A coarse grid over the box, then all neighbours of the best: cheap, and often enough."""
    found = _best_of(box, [_spread(n, count) for n, count in zip(box.model.sizes, GRID, strict=True)], goal, wanted)
    while found is not None:
        near = [np.arange(max(k - 4, 0), min(k + 5, n)) for k, n in zip(found[0], box.model.sizes, strict=True)]
        nearer = _best_of(box, near, goal, wanted)
        if nearer is None or nearer[1] >= found[1]:
            return found
        found = nearer
    return None


def _best_of(box: Box, values: list[np.ndarray], goal: GoalName, wanted: Ask) -> tuple[Choice, float] | None:
    i, j, m = (axis.ravel() for axis in np.meshgrid(*values, indexing="ij"))
    keep = box.rows.holds(i, j, m)
    if not keep.any():
        return None
    i, j, m = i[keep], j[keep], m[keep]
    scores = box.model.scores(i, j, m)
    values_ = np.where(scores.within(wanted), scores.of(goal), np.inf)
    k = int(values_.argmin())
    return ((int(i[k]), int(j[k]), int(m[k])), float(values_[k])) if np.isfinite(values_[k]) else None


def _spread(size: int, count: int) -> np.ndarray:
    return np.unique(np.linspace(0, size - 1, min(size, count)).astype(int))
