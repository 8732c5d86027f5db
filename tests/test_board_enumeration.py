"""Small boards against full enumeration: the product of all valid designs of every link, counted one by one."""

from __future__ import annotations

from dataclasses import replace
from itertools import product

import numpy as np
import pytest
from enumeration_kinds import grids_of
from random_links import brief, coupler, logic, mixed_brief, position

from optopick.board import Board, BoardGoal, BoardGoalName, BoardLimits, BoardLink
from optopick.brief import Brief, Position
from optopick.coupler import Coupler
from optopick.model import board_seats as model
from optopick.model.kinds import model_of
from optopick.recheck import review
from optopick.result import Status
from optopick.uses.board import solve_board
from optopick.uses.board_totals import resistances
from optopick.uses.engine import ask_of

SUMS = (BoardGoalName.POWER, BoardGoalName.REELS, BoardGoalName.COUPLERS)
GIVES = (0.0, 0.05, 0.3)
ROUNDING = 1e-6


def sparse(rng: np.random.Generator, stock: Position | None, count: int) -> Position | None:
    """A few values of a position."""
    if stock is None:
        return None
    keep = sorted(rng.choice(len(stock.values), min(count, len(stock.values)), replace=False).tolist())
    columns = {name: tuple(getattr(stock, name)[k] for k in keep) for name in COLUMNS}
    return replace(stock, **columns)


COLUMNS = ("values", "tolerance", "power", "voltage", "price")


def small_brief(rng: np.random.Generator, title: str) -> Brief:
    """A random brief with few values, of positions that overlap, so that reels can be shared."""
    drawn = (brief if rng.random() < 0.6 else mixed_brief)(rng, "E6")
    if rng.random() < 0.5:
        # values that serve as LED resistor and as load resistor
        drawn = replace(drawn, stock=replace(drawn.stock, r_load=position("E6", 470, 10e3)))
    stock = drawn.stock
    few = replace(
        stock,
        r_led=sparse(rng, stock.r_led, 5),
        r_load=sparse(rng, stock.r_load, 5),
        r_be=sparse(rng, stock.r_be, 2),
        r_shunt=sparse(rng, stock.r_shunt, 2),
    )
    limits = replace(drawn.limits, power=None)
    return replace(drawn, title=title, stock=few, limits=limits)


class Designs:
    """Every valid design of a link that no other of it beats: reels, part, power."""

    def __init__(self, link: BoardLink, couplers: list[Coupler]) -> None:
        found: dict[tuple[frozenset[float], str], float] = {}
        for grid in grids_of(link.brief, couplers):
            for k in np.flatnonzero(grid.feasible):
                values = (grid.r_led[k], grid.r_shunt[k], grid.r_load[k], grid.r_be[k])
                key = (frozenset(float(ohms) for ohms in values if np.isfinite(ohms)), grid.coupler)
                found[key] = min(found.get(key, np.inf), float(grid.goals["power"][k]))
        self.of = [(*key, power) for key, power in found.items()]


def totals(links: tuple[BoardLink, ...], designs: list[Designs]) -> np.ndarray:
    """Reels, couplers and power of every board there is, (n, 3)."""
    rows = []
    for board in product(*(one.of for one in designs)):
        reels = frozenset().union(*(one[0] for one in board))
        power = sum(link.count * one[2] for link, one in zip(links, board, strict=True))
        rows.append((len(reels), len({one[1] for one in board}), power))
    return np.array(rows, dtype=float).reshape(-1, 3)


def column(goal: BoardGoalName) -> int:
    return {"reels": 0, "couplers": 1, "power": 2}[goal.value]


def expected(found: np.ndarray, board: Board) -> tuple[float, float, float] | None:
    """The least first goal, the least second within what is given, and the least power then; None without a board."""
    limits = board.limits
    held = np.ones(len(found), dtype=bool)
    for limit, k in ((limits.reels, 0), (limits.couplers, 1), (limits.power, 2)):
        held &= True if limit is None else found[:, k] <= limit * (1 + ROUNDING)
    if not held.any():
        return None
    first, second = found[held, column(board.goal.minimize)], found[held, column(board.goal.then)]
    near = first <= first.min() * (1 + board.goal.give) * (1 + ROUNDING)
    then = float(second[near].min())
    return float(first.min()), then, float(found[held, 2][near & (second <= then * (1 + ROUNDING))].min())


def drawn_board(seed: int) -> tuple[Board, list[Coupler], np.ndarray] | None:
    """A random board with its couplers and the totals of all boards; None where a link has no design or too many."""
    rng = np.random.default_rng(seed)
    made = [coupler(rng, "RND-1"), coupler(rng, "RND-2") if rng.random() < 0.7 else logic(rng)]
    briefs = [small_brief(rng, f"link {k}") for k in range(2 + int(rng.random() < 0.5))]
    if rng.random() < 0.3:
        briefs[-1] = briefs[0]
    links = tuple(BoardLink(f"L{k}", one, int(rng.integers(1, 4))) for k, one in enumerate(briefs))
    designs = [Designs(link, made) for link in links]
    if not 0 < np.prod([len(one.of) for one in designs]) <= 60_000:
        return None
    first, second = (SUMS[k] for k in rng.choice(3, 2, replace=False))
    goal = BoardGoal(first, second, float(rng.choice(GIVES)))
    return Board("random", BoardLimits(), goal, links), made, totals(links, designs)


SEEDS = (2, 5, 7, 9, 10, 20, 22, 25, 26, 27, 28, 34, 40, 41, 43, 50)
"""Those below 51 whose links all have designs, and not too many; drawing the others anew each time takes its time."""

BOARDS = [(seed, *drawn) for seed in SEEDS if (drawn := drawn_board(seed)) is not None]


def limited(board: Board, found: np.ndarray, seed: int) -> list[Board]:
    """The board without limits, with limits that bind, and with one that nothing holds."""
    rng = np.random.default_rng(seed)
    free = found[found[:, 2].argmin()]
    least = found.min(axis=0)
    reels = int(rng.integers(least[0], max(least[0], free[0] - 1) + 1))
    return [
        board,
        replace(board, limits=BoardLimits(reels=reels)),
        replace(board, limits=BoardLimits(reels=reels, couplers=1)),
        replace(board, limits=BoardLimits(power=float(least[2] * rng.uniform(1.0, 1.3)))),
        replace(board, limits=BoardLimits(reels=int(least[0]) - 1)) if least[0] > 1 else board,
    ]


CASES = [
    pytest.param(case, made, found, id=f"{seed}-{k}")
    for seed, board, made, found in BOARDS
    for k, case in enumerate(limited(board, found, seed))
]


@pytest.mark.parametrize(("board", "made", "found"), CASES)
def test_as_enumeration_says(board, made, found):
    result = solve_board(board, couplers=made)
    wanted = expected(found, board)
    if wanted is None:
        assert result.status is Status.INFEASIBLE
        assert result.links == ()
        assert result.hopeless == ()
        return
    assert result.status is Status.OPTIMAL
    first, second = result.goals
    assert second.value == pytest.approx(wanted[1], rel=5e-6)
    assert first.value <= wanted[0] * (1 + board.goal.give) * (1 + 5e-6)
    assert first.bound == pytest.approx(wanted[0], rel=1e-5)
    assert result.power == pytest.approx(wanted[2], rel=1e-5)
    assert_holds(board, result, made)


# ---- limits on times that bind, so that the solver picks what the exact times refuse ----------------------------------


def tight_brief(rng: np.random.Generator, title: str, part: Coupler) -> Brief | None:
    """A brief whose limits on delay and distortion leave a small part of its valid designs; None without any."""
    drawn = brief(rng, "E12")
    stock = replace(
        drawn.stock,
        r_led=sparse(rng, drawn.stock.r_led, 14),
        r_load=sparse(rng, drawn.stock.r_load, 12),
        r_be=sparse(rng, drawn.stock.r_be, 5),
        r_shunt=None,
    )
    free = replace(drawn.limits, power=None, edge_time=None, delay=None, distortion=None)
    drawn = replace(drawn, title=title, stock=stock, limits=free)
    grid = grids_of(drawn, [part])[0]
    if not grid.feasible.any():
        return None
    shares = (("delay", 0.3), ("distortion", 0.15))
    limits = {name: 1.0001 * float(np.quantile(grid.goals[name][grid.feasible], share)) for name, share in shares}
    return replace(drawn, limits=replace(free, **limits))


def tight_board(seed: int) -> tuple[int, Board, list[Coupler], np.ndarray] | None:
    rng = np.random.default_rng(seed)
    made = [coupler(rng, "RND-1")]
    links = []
    for k in range(2):
        one = tight_brief(rng, f"link {k}", made[0])
        if one is None:
            return None
        links.append(BoardLink(f"L{k}", one, 1 + k))
    designs = [Designs(link, made) for link in links]
    if not 0 < np.prod([len(one.of) for one in designs]) <= 60_000:
        return None
    goal = BoardGoal(*((BoardGoalName.POWER, BoardGoalName.REELS)[:: 1 - 2 * (seed % 2)]), 0.0)
    board = Board("tight", BoardLimits(), goal, tuple(links))
    return seed, board, made, totals(board.links, designs)


TIGHT = [drawn for drawn in map(tight_board, (0, 3, 5, 7, 9, 10, 13, 17, 18)) if drawn is not None]


@pytest.mark.parametrize("ahead", [True, False], ids=["ahead", "none-ahead"])
@pytest.mark.parametrize("case", TIGHT, ids=lambda case: str(case[0]))
def test_with_cuts(monkeypatch, case, ahead):
    """`ahead` False: no seat is looked at in advance, so that the solver meets what the times refuse."""
    _, board, made, found = case
    if not ahead:
        monkeypatch.setattr(model, "SMALL", 0)
    few = int(found[:, 0].min())
    for limits in (BoardLimits(), BoardLimits(reels=few)):
        limited_ = replace(board, limits=limits)
        result = solve_board(limited_, couplers=made)
        wanted = expected(found, limited_)
        assert result.status is Status.OPTIMAL
        assert [goal.value for goal in result.goals] == pytest.approx(wanted[:2], rel=5e-6)
        assert_holds(limited_, result, made)


def test_there_is_something_to_cut(monkeypatch):
    monkeypatch.setattr(model, "SMALL", 0)
    assert all(solve_board(board, couplers=made).proof.cuts for _, board, made, _ in TIGHT[:2])


def test_what_is_cut_stays_out():
    """Each cut forbids its combination and no sound one, to the last combination there is."""
    _, board, made, _ = TIGHT[0]
    link = board.links[0]
    seat = model.seat_of(0, made[0], model_of(link.brief, made[0]), ask_of(link.brief))
    i, j, m = (axis.ravel() for axis in np.meshgrid(*(np.arange(n) for n in seat.box.model.sizes), indexing="ij"))
    sound = seat.box.model.scores(i, j, m).within(seat.ask) & seat.box.rows.holds(i, j, m)
    assert sound.any()
    for k in np.flatnonzero(~sound):
        cut = model.with_cuts(seat, (int(i[k]), int(j[k]), int(m[k])))
        left = cut.box.rows.holds(i, j, m)
        assert not left[k]
        assert left[sound].all()


def assert_holds(board, result, made):
    """Every link valid alone, never more reels or couplers or power than allowed."""
    parts = {one.part: one for one in made}
    reels, power = set(), 0.0
    for link, one in zip(board.links, result.links, strict=True):
        design = one.review.design
        again = review(link.brief, parts[design.coupler], design)
        assert again.passed
        assert one.link is link
        assert one.power >= one.alone * (1 - 1e-6)
        reels |= set(resistances(design))
        power += link.count * again.power.worst
    assert result.reels == tuple(sorted(reels))
    assert result.power == pytest.approx(power)
    limits = board.limits
    assert limits.reels is None or len(reels) <= limits.reels
    assert limits.couplers is None or len(set(result.couplers)) <= limits.couplers
    assert limits.power is None or power <= limits.power * (1 + 1e-6)


def test_the_cases_are_worth_their_time():
    """Some limits bind, some leave nothing, some boards have links of one brief, every pair of goals is there."""
    assert len(BOARDS) >= 12
    assert len(TIGHT) >= 6
    outcomes = [expected(found, board) for board, _, found in (case.values for case in CASES)]
    assert sum(outcome is None for outcome in outcomes) >= 10
    bound = [
        expected(found, board) != expected(found, replace(board, limits=BoardLimits()))
        for board, _, found in (case.values for case in CASES)
    ]
    assert sum(bound) >= 25
    assert any(len({link.brief for link in board.links}) < len(board.links) for _, board, _, _ in BOARDS)
    assert len({(board.goal.minimize, board.goal.then) for _, board, _, _ in BOARDS}) >= 4
