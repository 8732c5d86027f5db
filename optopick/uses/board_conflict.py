"""Why no board holds every limit: which limits over the board contradict each other, and what each would have to be."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from optopick.board import Board, BoardGoalName
from optopick.board_answers import Needed
from optopick.uses.board_work import BoardWork, Stages, caps_of
from optopick.uses.conflict import minimal_conflict


def conflict(work: BoardWork) -> tuple[Needed, ...]:
    """A minimal set of contradicting limits, each with the least that it would have to be, all others as they are.

    Empty where time ran out before one was found.
    """
    caps = caps_of(work.board)

    def contradicts(dropped: frozenset[str]) -> bool:
        return bool(np.isposinf(work.search.any(caps.without(dropped)).bound))

    names = [goal.value for goal in caps.stated]
    found = minimal_conflict(names, frozenset(), contradicts) or ()
    return () if work.clock.out else tuple(_needed(work, BoardGoalName(name)) for name in found)


def _needed(work: BoardWork, goal: BoardGoalName) -> Needed:
    """The least that a limit would have to be with all others as they are; the board that shows it is checked again."""
    limit = work.board.limits.of(goal) or 0.0
    found = work.search.least(goal, caps_of(work.board).without(frozenset({goal.value})))
    if found.taken is None:
        # the others contradict each other too, or time ran out
        return Needed(goal.value, limit, None, bool(np.isposinf(found.bound)))
    work.result(without(work.board, goal), Stages((goal,), (found,)))
    return Needed(goal.value, limit, found.value, found.proved)


def without(board: Board, goal: BoardGoalName) -> Board:
    """The board without its limit on what a goal makes least."""
    name = "price" if goal is BoardGoalName.COST else goal.value
    return replace(board, limits=replace(board.limits, **{name: None}))
