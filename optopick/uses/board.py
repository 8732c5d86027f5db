"""Every link of a product at once, from few reels and few couplers: found, proved, each link checked again alone."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np

from optopick.board import Board
from optopick.board_answers import BoardResult
from optopick.coupler import Coupler
from optopick.model.solver import Clock
from optopick.read_board import read_board
from optopick.result import Status
from optopick.uses.board_conflict import conflict
from optopick.uses.board_work import BoardWork
from optopick.uses.engine import Progress, quiet


def solve_board(
    board: Board | Path | str,
    *,
    time_limit: float = np.inf,
    progress: Progress = quiet,
    couplers: Sequence[Coupler] | None = None,
) -> BoardResult:
    """The best designs of all links of a board (or of the path of one) together, with the proof.

    time_limit [s]: past it the best board so far is given with the bound shown, status "feasible", or "unknown" where
    there is none. couplers: instead of the briefs' tables. Raises InputError for wrong input and DisagreementError
    where the re-check contradicts the model.
    """
    if not isinstance(board, Board):
        board = read_board(Path(board))
    work = BoardWork(board, couplers, Clock(time_limit), progress)
    stages = work.stages()
    result = work.result(board, stages)
    if result.status is not Status.INFEASIBLE or not work.known:
        return result
    return work.result(board, stages, conflict(work))
