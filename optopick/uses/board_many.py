"""Several boards side by side, each as it would be alone; answers in the order in which they were given."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from optopick.board import Board
from optopick.board_answers import BoardResult
from optopick.uses.board import solve_board
from optopick.uses.engine import Progress, quiet
from optopick.uses.workers import Processes, Workers


@dataclass(frozen=True)
class BoardTask:
    """One board to solve."""

    board: Board
    time_limit: float

    def __str__(self) -> str:
        return str(self.board.path or self.board.title)


def solve_boards(
    boards: Sequence[Board],
    *,
    workers: Workers | None = None,
    time_limit: float = np.inf,
    progress: Progress = quiet,
) -> tuple[BoardResult, ...]:
    """The answer for each board, in order, whoever does the work; time_limit [s] holds for each board.

    Raises what `solve_board` raises, and WorkLostError where a board was lost again and again.
    """
    tasks = [BoardTask(board, time_limit) for board in boards]
    return tuple(_told((workers or Processes()).map(solve_task, tasks), len(tasks), progress))


def solve_task(task: BoardTask) -> BoardResult:
    """The answer for one board."""
    return solve_board(task.board, time_limit=task.time_limit)


def _told(answers: Iterator[BoardResult], count: int, progress: Progress) -> Iterator[BoardResult]:
    for done, answer in enumerate(answers, 1):
        progress("boards", done, count)
        yield answer
