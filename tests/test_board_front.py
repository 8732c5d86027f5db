"""The front of a board, and why no board holds every limit, against every board there is."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from board_yardstick import TOTALS, drawn_board
from cli_links import TINY

from optopick.board import Board, BoardGoal, BoardGoalName, BoardLimits, BoardLink
from optopick.errors import InputError
from optopick.model.board import WHOLE
from optopick.read_brief import read_brief
from optopick.result import Status
from optopick.uses.board import solve_board
from optopick.uses.board_front import board_front

SEEDS = (1, 4, 10, 13, 29, 39, 66, 87, 92, 117, 139)
BOARDS = [(seed, *drawn) for seed in SEEDS if (drawn := drawn_board(seed)) is not None]
SAME = 1e-6


def column(goal: BoardGoalName) -> int:
    return TOTALS.index(goal.value)


def holding(found: np.ndarray, board: Board, dropped: frozenset[BoardGoalName] = frozenset()) -> np.ndarray:
    """Which boards hold the limits but for those dropped."""
    held = np.ones(len(found), dtype=bool)
    for goal in set(BoardGoalName) - dropped:
        limit = board.limits.of(goal)
        if limit is not None:
            held &= found[:, column(goal)] <= limit * (1 + SAME)
    return held


FRONTS = [
    pytest.param(board, made, found, count, id=f"{seed}-{count.value}")
    for seed, board, made, found in BOARDS
    for count in WHOLE
    if board.goal.minimize is not count
]


def limited(board: Board, found: np.ndarray, count: BoardGoalName) -> Board:
    """With a limit besides, and one on what is counted, which does not count."""
    other = BoardGoalName.COUPLERS if count is BoardGoalName.REELS else BoardGoalName.REELS
    limit = int(np.median(found[:, column(other)]))
    return replace(board, limits=BoardLimits(**{other.value: limit, count.value: 1}))


def steps(board: Board, found: np.ndarray, count: BoardGoalName) -> list[tuple[int, float]]:
    """Each number at which the first goal falls, and to what."""
    held = found[holding(found, board, frozenset({count}))]
    points, best = [], np.inf
    for number in range(int(held[:, column(count)].min()), int(held[:, column(count)].max()) + 1):
        least = held[held[:, column(count)] <= number, column(board.goal.minimize)].min()
        # the proof's resolution
        if least < best * (1 - 5 * SAME):
            best = float(least)
            points.append((number, best))
    return points


@pytest.mark.parametrize(("board", "made", "found", "count"), FRONTS)
def test_front(board, made, found, count):
    board = limited(board, found, count)
    points = steps(board, found, count)
    front = board_front(board, count, couplers=made)
    assert front.complete
    assert front.status is Status.OPTIMAL
    assert [point.count for point in front.points] == [number for number, _ in points]
    assert [point.goal.value for point in front.points] == pytest.approx([value for _, value in points], rel=1e-5)
    for point in front.points:
        told = {BoardGoalName.REELS: len(point.result.reels), BoardGoalName.COUPLERS: len(point.result.couplers)}
        assert told.get(count, point.result.placed) <= point.count
        limits = replace(board.limits, **{count.value: None})
        assert all(number <= (limits.of(goal) or np.inf) for goal, number in told.items())


def contradicting(board: Board, found: np.ndarray, seed: int) -> list[BoardLimits]:
    """Limits of which each can be held alone, but not all together: those of two boards that are best in one thing."""
    rng = np.random.default_rng(seed)
    goals = [BoardGoalName.REELS, BoardGoalName.POWER, BoardGoalName.PACKAGES, BoardGoalName.COUPLERS]
    goals += [BoardGoalName.COST] if BoardGoalName.COST in board.goals else []
    names = {BoardGoalName.COST: "price"}
    cases = []
    for _ in range(200):
        chosen = [goals[k] for k in rng.choice(len(goals), int(rng.integers(2, len(goals) + 1)), replace=False)]
        limits = {}
        for goal in chosen:
            values = np.unique(found[:, column(goal)])
            value = float(values[int(rng.integers(max(1, len(values) // 3)))])
            limits[names.get(goal, goal.value)] = int(value) if goal in WHOLE else value * 1.0001
        limited = replace(board, limits=BoardLimits(**limits))
        alone = all(holding(found, limited, frozenset(BoardGoalName) - {goal}).any() for goal in chosen)
        if alone and not holding(found, limited).any():
            cases.append(limited.limits)
    return cases[:4]


CONFLICTS = [
    pytest.param(replace(board, limits=limits), made, found, id=f"{seed}-{k}")
    for seed, board, made, found in BOARDS
    for k, limits in enumerate(contradicting(board, found, seed))
]


@pytest.mark.parametrize(("board", "made", "found"), CONFLICTS)
def test_conflict(board, made, found):
    result = solve_board(board, couplers=made)
    assert result.status is Status.INFEASIBLE
    named = [BoardGoalName(one.name) for one in result.conflict]
    assert len(named) >= 2
    others = frozenset(BoardGoalName) - {*named}
    assert not holding(found, board, others).any()
    for one, goal in zip(result.conflict, named, strict=True):
        assert holding(found, board, others | {goal}).any()
        left = found[holding(found, board, frozenset({goal})), column(goal)]
        assert one.limit == board.limits.of(goal)
        assert one.proved
        if one.least is None:
            assert not len(left)
        else:
            assert one.least == pytest.approx(left.min(), rel=1e-5)


@pytest.mark.parametrize(("seed", "board", "made", "found"), BOARDS[:5])
def test_one_limit_that_nothing_holds(seed, board, made, found):
    least = int(found[:, 0].min())
    result = solve_board(replace(board, limits=BoardLimits(reels=least - 1, power=10.0)), couplers=made)
    assert [(one.name, one.limit, one.least) for one in result.conflict] == [("reels", least - 1, least)]


def test_the_cases_are_worth_their_time():
    assert len(FRONTS) >= 18
    assert len(CONFLICTS) >= 25
    fronts = [
        steps(limited(board, found, count), found, count) for board, _, found, count in (c.values for c in FRONTS)
    ]
    assert sum(len(points) > 1 for points in fronts) >= 6
    # at some numbers in between nothing is gained
    assert any(points[-1][0] - points[0][0] >= len(points) for points in fronts)
    boards = [case.values for case in CONFLICTS]
    # three limits that contradict each other two by two: none helps alone
    helpless = [
        not holding(found, board, frozenset({goal})).any()
        for board, _, found in boards
        for goal in BoardGoalName
        if board.limits.of(goal) is not None
    ]
    assert sum(helpless) >= 3
    assert len(helpless) - sum(helpless) >= 20


def tiny(limits: BoardLimits, minimize: BoardGoalName = BoardGoalName.POWER) -> Board:
    links = (BoardLink("one", read_brief(TINY), 2),)
    then = BoardGoalName.REELS if minimize is BoardGoalName.POWER else BoardGoalName.POWER
    return Board("tiny", limits, BoardGoal(minimize, then, 0.0), links)


def test_a_front_of_the_goal_itself():
    with pytest.raises(
        InputError, match=r"--front: found reels, where .* first goal is reels; expected one of couplers"
    ):
        board_front(tiny(BoardLimits(), BoardGoalName.REELS), BoardGoalName.REELS)


def test_no_front():
    front = board_front(tiny(BoardLimits(power=1e-4)))
    assert (front.status, front.points, front.complete) == (Status.INFEASIBLE, (), True)
    brief = read_brief(TINY)
    hard = replace(brief, limits=replace(brief.limits, power=1e-3))
    board = replace(tiny(BoardLimits()), links=(BoardLink("hard", hard, 1),))
    front = board_front(board)
    assert (front.status, front.hopeless) == (Status.INFEASIBLE, ("hard",))


def test_out_of_time():
    front = board_front(tiny(BoardLimits()), time_limit=0.0)
    assert front.status is Status.UNKNOWN
    assert not front.complete
    result = solve_board(tiny(BoardLimits(reels=1)), time_limit=0.0)
    assert result.conflict == ()
