"""How a board's first goal falls with the reels (or parts, or packages) that it may have: exact at each number."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from optopick.board import Board, BoardGoalName
from optopick.board_answers import BoardFront, FrontPoint
from optopick.coupler import Coupler
from optopick.errors import InputError, Mistake
from optopick.model.board import WHOLE
from optopick.model.board_search import BoardFound
from optopick.model.search import STEP
from optopick.model.solver import Clock
from optopick.read_board import read_board
from optopick.result import Status
from optopick.uses.board_work import BoardWork, Stages, caps_of
from optopick.uses.engine import Progress, quiet


def board_front(
    board: Board | Path | str,
    count: BoardGoalName = BoardGoalName.REELS,
    *,
    time_limit: float = np.inf,
    progress: Progress = quiet,
    couplers: Sequence[Coupler] | None = None,
) -> BoardFront:
    """The least first goal of a board for each number of what is counted, from the fewest to where no more is gained.

    The board's own limit on that number does not count; all its other limits do. Past `time_limit` [s] the points so
    far are given, complete False. Raises InputError for wrong input, and where the first goal is the number itself.
    """
    if not isinstance(board, Board):
        board = read_board(Path(board))
    if count not in WHOLE or count is board.goal.minimize:
        others = [goal.value for goal in WHOLE if goal is not board.goal.minimize]
        found = f"{count.value}, where the board's first goal is {board.goal.minimize.value}"
        raise InputError([Mistake("--front", found, f"one of {', '.join(others)}")])
    board = replace(board, limits=replace(board.limits, **{count.value: None}))
    return _Walk(BoardWork(board, couplers, Clock(time_limit), progress), count).front(progress)


class _Walk:
    """From the fewest to the number at which the first goal is as low as it gets."""

    def __init__(self, work: BoardWork, count: BoardGoalName) -> None:
        self.work, self.count, self.goal = work, count, work.board.goal.minimize
        self.caps = caps_of(work.board)

    def front(self, progress: Progress) -> BoardFront:
        """Every point."""
        work = self.work
        if not work.known:
            return self._told(Status.INFEASIBLE if work.hopeless else Status.UNKNOWN, [], complete=bool(work.hopeless))
        fewest = work.search.least(self.count, self.caps)
        if fewest.taken is None:
            none = bool(np.isposinf(fewest.bound))
            return self._told(Status.INFEASIBLE if none else Status.UNKNOWN, [], complete=none)
        free = work.search.least(self.goal, self.caps, start=fewest.taken)
        points, proved = self._points(fewest, free, progress)
        return self._told(Status.OPTIMAL if proved else Status.FEASIBLE, points, complete=proved)

    def _points(self, fewest: BoardFound, free: BoardFound, progress: Progress) -> tuple[list[FrontPoint], bool]:
        points: list[FrontPoint] = []
        proved, best, start = fewest.proved and free.proved, np.inf, fewest.taken
        most = int(self.work.search.value(free.taken or (), self.count))
        for number in range(int(fewest.value), most + 1):
            progress(f"{self.count.value} of the front", number, most)
            start = free.taken if number == most else start
            found = self.work.search.least(self.goal, self.caps.limited(self.count, number), start=start)
            proved, start = proved and found.proved, found.taken
            if found.value < best * (1 - 4 * STEP):
                best = found.value
                points.append(self._point(number, found))
            if self.work.clock.out or best <= free.value * (1 + STEP):
                break
        return points, proved and not self.work.clock.out

    def _point(self, number: int, found: BoardFound) -> FrontPoint:
        work = self.work
        board = replace(work.board, limits=replace(work.board.limits, **{self.count.value: number}))
        return FrontPoint(number, work.result(board, Stages((self.goal,), (found,))))

    def _told(self, status: Status, points: list[FrontPoint], *, complete: bool) -> BoardFront:
        return BoardFront(self.count.value, self.goal.value, status, tuple(points), complete, self.work.hopeless)
