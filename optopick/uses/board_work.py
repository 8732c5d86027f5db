"""What every use of a board is made of: its links made ready, one goal after the other, the answer checked again."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np

from optopick.board import Board, BoardGoalName, reel_of
from optopick.board_answers import BoardProof, BoardResult, LinkChoice, Needed
from optopick.brief import GoalName
from optopick.cautions import cautions
from optopick.coupler import Coupler
from optopick.errors import DisagreementError
from optopick.model.board import WHOLE, Caps
from optopick.model.board_search import BoardFound, BoardSearch, Place
from optopick.model.board_seats import Taken
from optopick.model.search import STEP
from optopick.model.solver import Clock, highs_name
from optopick.report.board_words import goal_words
from optopick.report.words import margin_words
from optopick.result import Objective, Status
from optopick.uses.board_groups import Group, groups_of
from optopick.uses.board_totals import packages_placed, price_of, resistances, totals_of, worst_edge
from optopick.uses.engine import Best, Progress, ask_of, over_all, rechecked

UNITS = {BoardGoalName.POWER: "W"}
"""All others are plain numbers."""


@dataclass(frozen=True)
class Stages:
    """The goals in turn, each with what was found for it: those asked for, then power where it decides between equals.

    The last one ends where there is no board, or none is known.
    """

    goals: tuple[BoardGoalName, ...]
    found: tuple[BoardFound, ...]

    @property
    def last(self) -> BoardFound:
        """What was found last: the board to give."""
        return self.found[-1]

    @property
    def proved(self) -> bool:
        """Whether every goal is proved least."""
        return len(self.found) == len(self.goals) and all(one.proved for one in self.found)


class BoardWork:
    """A board made ready: its links by brief, what each takes alone, and the search over all of them."""

    def __init__(self, board: Board, couplers: Sequence[Coupler] | None, clock: Clock, progress: Progress) -> None:
        self.board, self.clock = board, clock
        self.groups = groups_of(board, couplers)
        self.alone = _alone(self.groups, clock, progress)
        seen = partial(_tell, progress)
        self.search = BoardSearch(_places(board, self.groups, self.alone, clock), clock, progress, seen)
        self.parts = {coupler.part: coupler for group in self.groups for coupler in group.couplers}

    @property
    def hopeless(self) -> tuple[str, ...]:
        """The links that have no design even alone."""
        return tuple(
            link.name
            for group, best in zip(self.groups, self.alone, strict=True)
            if best.choice is None and np.isinf(best.bound)
            for link in group.links
        )

    @property
    def known(self) -> bool:
        """Whether a design of every link is known."""
        return all(best.choice is not None for best in self.alone)

    def stages(self) -> Stages:
        """The board's goals one after the other."""
        if not self.known:
            bound = np.inf if self.hopeless else 0.0
            return Stages((self.board.goal.minimize,), (BoardFound(None, np.inf, bound),))
        return _staged(self.board, self.search)

    def result(self, board: Board, stages: Stages, conflict: Sequence[Needed] = ()) -> BoardResult:
        """The answer for the board, its limits perhaps changed; designs checked again alone, totals counted again."""
        taken = stages.last.taken
        links = _choices(board, self.groups, self.alone, taken) if taken else ()
        designs = [one.review.design for one in links]
        packages = packages_placed(links, self.parts)
        result = BoardResult(
            status=_status(stages),
            goals=self._objectives(stages) if taken else (),
            links=links,
            reels=tuple(sorted({reel_of(ohms) for design in designs for ohms in resistances(design)})),
            couplers=tuple(sorted({design.coupler for design in designs})),
            packages=packages,
            price=price_of(links, packages, self.parts),
            edge=worst_edge(links),
            unpriced=tuple(dict.fromkeys(name for group in self.groups for name in group.unpriced)),
            hopeless=self.hopeless,
            conflict=tuple(conflict),
            proof=self._proof(),
            cautions=tuple(dict.fromkeys(text for group in self.groups for text in cautions(group.brief))),
        )
        _recount(board, result)
        return result

    def _objectives(self, stages: Stages) -> tuple[Objective, ...]:
        """Both goals at the board given, with their bounds."""
        taken = stages.last.taken or ()
        return tuple(
            Objective(goal.value, self.search.value(taken, goal), one.bound, UNITS.get(goal, "1"))
            for goal, one in list(zip(stages.goals, stages.found, strict=False))[:2]
        )

    def _proof(self) -> BoardProof:
        size, clock = self.search.size, self.clock
        return BoardProof(size.columns, size.rows, size.cuts, clock.solves, clock.spent, highs_name())


def _tell(progress: Progress, goal: BoardGoalName, value: float, bound: float) -> None:
    """How far a goal has come, in words."""
    bounded = f"at least {goal_words(goal.value, bound)}"
    if np.isinf(value):
        progress(f"{goal.value}: no board yet, {bounded}", 0, 0)
        return
    gap = margin_words(max(value - bound, 0.0) / value) if value else "0 %"
    progress(f"{goal.value} {goal_words(goal.value, value)}, {bounded} ({gap})", 0, 0)


def _alone(groups: Sequence[Group], clock: Clock, progress: Progress) -> list[Best]:
    """The least power of each link by itself."""
    found = []
    for done, group in enumerate(groups):
        progress("links alone", done, len(groups))
        found.append(over_all(group.entries, GoalName.POWER, ask_of(group.brief), clock))
    return found


def _places(board: Board, groups: Sequence[Group], alone: Sequence[Best], clock: Clock) -> list[Place]:
    return [
        Place(
            couplers=tuple(zip(group.couplers, group.models, strict=True)),
            ask=ask_of(group.brief),
            counts=group.counts,
            least=best.bound if np.isfinite(best.bound) else 0.0,
            quickest=_quickest(group, clock) if BoardGoalName.EDGE in board.goals else 0.0,
            prices=group.prices,
        )
        for group, best in zip(groups, alone, strict=True)
    ]


def _quickest(group: Group, clock: Clock) -> float:
    """A bound on the shortest edge of a link that has a limit on it [s], guard taken out."""
    ask = ask_of(group.brief)
    if np.isinf(ask.edge):
        return 0.0
    best = over_all(group.entries, GoalName.EDGE_TIME, ask, clock)
    return best.bound if np.isfinite(best.bound) else 0.0


def caps_of(board: Board) -> Caps:
    """The board's limits."""
    caps = Caps()
    for goal in BoardGoalName:
        limit = board.limits.of(goal)
        caps = caps if limit is None else caps.limited(goal, float(limit))
    return caps


def _staged(board: Board, search: BoardSearch) -> Stages:
    goals = [*board.goals]
    if board.goal.then is not BoardGoalName.POWER:
        # of boards that are equal in both goals the one that takes least power
        goals.append(BoardGoalName.POWER)
    caps = caps_of(board)
    found: list[BoardFound] = []
    for one, give in zip(goals, (board.goal.give, 0.0, 0.0), strict=False):
        found.append(search.least(one, caps, start=found[-1].taken if found else None))
        if found[-1].taken is None:
            break
        relaxed = found[-1].value * (1 + give) * (1 + STEP)
        caps = caps.limited(one, float(np.floor(relaxed)) if one in WHOLE else relaxed)
    return Stages(tuple(goals), tuple(found))


def _status(stages: Stages) -> Status:
    if stages.found[0].taken is None:
        return Status.INFEASIBLE if np.isinf(stages.found[0].bound) else Status.UNKNOWN
    return Status.OPTIMAL if stages.proved else Status.FEASIBLE


def _choices(
    board: Board, groups: Sequence[Group], alone: Sequence[Best], taken: Sequence[Taken]
) -> tuple[LinkChoice, ...]:
    """The links in the board's order, each with its design checked again alone."""
    found = {}
    for group, best, one in zip(groups, alone, taken, strict=True):
        entry = group.entry([coupler is one.seat.coupler for coupler in group.couplers].index(True))
        try:
            reviewed = rechecked(group.brief, entry, one.seat.box.whole(one.choice))
        except DisagreementError as error:
            raise DisagreementError(f"link {group.links[0].name}: {error}") from error
        found.update({link.name: LinkChoice(link, reviewed, best.value) for link in group.links})
    return tuple(found[link.name] for link in board.links)


def _recount(board: Board, result: BoardResult) -> None:
    """Hold the board's limits and goals against what the designs themselves say."""
    if not result.links:
        return
    counted = totals_of(result)
    for goal in BoardGoalName:
        limit, value = board.limits.of(goal), counted[goal]
        if limit is not None and (value is None or value > limit * (1 + STEP)):
            raise DisagreementError(f"board: {value} {goal.value} in the designs, limit {limit:g}")
    for told in result.goals:
        value = counted[BoardGoalName(told.name)]
        if value is None or not np.isclose(told.value, value, rtol=STEP, atol=1e-12):
            raise DisagreementError(f"board: {told.name} is {told.value:g} in the model, {value} again")
