"""Prices, packages of several channels and edges over a board, against every board there is."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from board_yardstick import TOTALS, drawn_board, expected
from cli_links import TINY

from optopick.board import Board, BoardGoal, BoardGoalName, BoardLimits, BoardLink
from optopick.brief import Goal, GoalName, Position
from optopick.coupler import Coupler
from optopick.errors import InputError
from optopick.model import board as model
from optopick.model.board_packages import Sharing
from optopick.read_brief import read_brief
from optopick.read_couplers import read_couplers
from optopick.result import Status
from optopick.uses.board import solve_board
from optopick.uses.board_totals import heat_share
from optopick.uses.pick import pick

SEEDS = (1, 4, 13, 14, 18, 29, 39, 66, 87, 91, 113, 122, 133, 139)
BOARDS = [(seed, *drawn) for seed in SEEDS if (drawn := drawn_board(seed)) is not None]


def limited(board: Board, found: np.ndarray, seed: int) -> list[Board]:
    """The board without limits, with limits on packages and price that bind, together with reels, and beyond all."""
    rng = np.random.default_rng(seed)
    least = dict(zip(TOTALS, found.min(axis=0), strict=True))
    few = BoardLimits(packages=int(least["packages"] + rng.integers(2)))
    limits = [BoardLimits(), few, replace(few, reels=int(least["reels"] + rng.integers(2)), couplers=1)]
    if BoardGoalName.COST in board.goals:
        cheap = float(least["cost"] * rng.uniform(1.0, 1.1))
        limits += [BoardLimits(price=cheap), BoardLimits(price=cheap, power=float(least["power"] * 1.1))]
        limits.append(BoardLimits(price=0.99 * float(least["cost"])))
    limits.append(BoardLimits(packages=int(least["packages"]) - 1))
    return [replace(board, limits=one) for one in limits]


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
        return
    assert result.status is Status.OPTIMAL
    first, second = result.goals
    assert second.value == pytest.approx(wanted[1], rel=1e-5)
    assert first.value <= wanted[0] * (1 + board.goal.give) * (1 + 1e-5)
    assert first.bound == pytest.approx(wanted[0], rel=1e-5)
    assert result.power == pytest.approx(wanted[2], rel=1e-5)
    assert_holds(board, result, made)


def assert_holds(board, result, made):
    """Every link in packages enough, none more than full, what is told counted again, every limit kept."""
    parts = {one.part: one for one in made}
    inside: dict[str, int] = {}
    for one in result.packages:
        assert sum(count for _, count in one.links) <= one.count * one.channels
        assert one.grounds is not None or one.count == sum(count for _, count in one.links)
        for name, count in one.links:
            link = next(each for each in result.links if each.link.name == name)
            assert link.review.design.coupler == one.part
            assert one.grounds in (None, link.link.grounds)
            inside[name] = inside.get(name, 0) + count
    assert inside == {link.name: link.count for link in board.links}
    heats = {one.link.name: heat_share(one) for one in result.links}
    shared = [one for one in result.packages if one.grounds is not None]
    assert all(heats[name] * one.channels <= 1 + 1e-6 for one in shared for name, _ in one.links)
    if BoardGoalName.COST in board.goals:
        price = sum(one.count * parts[one.part].price for one in result.packages)
        for one in result.links:
            for name, pieces in (("r_led", one.review.design.pieces), ("r_load", 1), ("r_be", 1), ("r_shunt", 1)):
                ohms, stock = getattr(one.review.design, name), getattr(one.link.brief.stock, name)
                if ohms is not None:
                    price += one.link.count * pieces * stock.price[stock.values.index(ohms)]
        assert result.price == pytest.approx(price)
    for told, limit in ((result.placed, board.limits.packages), (result.price, board.limits.price)):
        assert limit is None or told <= limit * (1 + 1e-6)


def test_the_cases_are_worth_their_time():
    """Limits bind, some leave nothing; links of one brief stand on different grounds; every goal comes first and second."""
    outcomes = [(expected(found, board), board, found) for board, _, found in (case.values for case in CASES)]
    assert sum(outcome is None for outcome, _, _ in outcomes) >= 12
    free = [expected(found, replace(board, limits=BoardLimits())) for _, board, found in outcomes]
    assert sum(outcome[0] != other for outcome, other in zip(outcomes, free, strict=True)) >= 30
    boards = [board for _, board, _, _ in BOARDS]
    assert {goal for board in boards for goal in board.goals} >= {*BoardGoalName} - {BoardGoalName.COUPLERS}
    assert (
        sum(len({link.grounds for link in board.links if link.brief == board.links[2].brief}) > 1 for board in boards)
        >= 4
    )


def test_sometimes_the_values_decide_whether_a_link_shares(monkeypatch):
    """Without the limit of the package's heat the answers are others."""
    seen = []
    real = model.sharing_of
    monkeypatch.setattr(model, "sharing_of", lambda seat, counts: seen.append(real(seat, counts)) or seen[-1])
    for _, board, made, _ in BOARDS[:6]:
        solve_board(board, couplers=made)
    assert set(seen) == set(Sharing)


# ---- links of the tiny brief, priced ----------------------------------------------------------------------------------


def priced(*couplers: float | None, stock: float | None = 0.02) -> tuple[Board, list[Coupler]]:
    """Two links of one brief on the same grounds, three of each, with couplers at these prices."""
    brief = read_brief(TINY)
    positions = {
        name: replace(position, price=(stock,) * len(position.values))
        for name in ("r_led", "r_load", "r_be")
        if (position := getattr(brief.stock, name))
    }
    brief = replace(brief, stock=replace(brief.stock, **positions))
    links = tuple(BoardLink(name, brief, 3, ("field", "logic")) for name in ("one", "two"))
    plain = read_couplers(brief.couplers.table).couplers[0]
    made = [replace(plain, part=f"PART-{k}", channels=2, price=price) for k, price in enumerate(couplers, 1)]
    board = Board("priced", BoardLimits(), BoardGoal(BoardGoalName.COST, BoardGoalName.POWER, 0.0), links)
    return board, made


def test_packages_are_filled_across_links():
    board, made = priced(0.3)
    result = solve_board(board, couplers=made)
    assert [(one.count, one.links, one.grounds) for one in result.packages] == [
        (3, (("one", 3), ("two", 3)), ("field", "logic"))
    ]
    design = result.links[0].review.design
    assert result.price == pytest.approx(3 * 0.3 + 6 * 0.02 * (3 if design.r_be else 2))
    apart = replace(board, links=(board.links[0], replace(board.links[1], grounds=("motor", "logic"))))
    assert solve_board(apart, couplers=made).placed == 4
    other_way = replace(board, links=(board.links[0], replace(board.links[1], grounds=("logic", "field"))))
    assert solve_board(other_way, couplers=made).placed == 4
    alone = replace(board, links=tuple(replace(link, grounds=None) for link in board.links))
    assert solve_board(alone, couplers=made).placed == 6


def test_a_hot_link_has_packages_of_its_own():
    board, made = priced(0.3)
    free = solve_board(board, couplers=made)
    share = heat_share(free.links[0])
    p_total = made[0].p_total

    def placed(factor: float) -> int:
        cold = replace(p_total, value=p_total.value * factor, slope=p_total.slope * factor)
        power = replace(board, goal=replace(board.goal, minimize=BoardGoalName.PACKAGES))
        one_design = replace(
            board.links[0].brief.stock,
            r_led=only(board.links[0].brief.stock.r_led, free.links[0].review.design.r_led),
            r_load=only(board.links[0].brief.stock.r_load, free.links[0].review.design.r_load),
        )
        brief = replace(board.links[0].brief, stock=one_design)
        links = tuple(replace(link, brief=brief) for link in board.links)
        return solve_board(replace(power, links=links), couplers=[replace(made[0], p_total=cold)]).placed

    # two channels: each may take half of what the package may
    assert placed(2 * share * 1.01) == 3
    assert placed(2 * share * 0.97) == 6


def test_each_of_several_resistors_in_series_has_its_price():
    board, made = priced(0.3)
    brief = board.links[0].brief
    count = len(brief.stock.r_led.values)
    # so few watts that one resistor takes too much
    weak = replace(brief.stock.r_led, power=(0.015,) * count, pieces=4)
    links = tuple(replace(link, brief=replace(brief, stock=replace(brief.stock, r_led=weak))) for link in board.links)
    result = solve_board(replace(board, links=links), couplers=made)
    assert result.status is Status.OPTIMAL
    design = result.links[0].review.design
    assert design.pieces > 1
    placed = design.pieces + 1 + (design.r_be is not None)
    assert result.goals[0].value == pytest.approx(3 * 0.3 + 6 * 0.02 * placed)


def only(position: Position, ohms: float) -> Position:
    """A position with one of its values."""
    k = position.values.index(ohms)
    columns = ("values", "tolerance", "power", "voltage", "price")
    return replace(position, **{name: (getattr(position, name)[k],) for name in columns})


def test_what_has_no_price_is_left_out_and_told():
    board, made = priced(None, 0.9)
    result = solve_board(board, couplers=made)
    assert result.couplers == ("PART-2",)
    assert "PART-1" in result.unpriced
    brief = board.links[0].brief
    best = result.links[0].review.design.r_load
    dear = tuple(
        None if ohms == best else price
        for ohms, price in zip(brief.stock.r_load.values, brief.stock.r_load.price, strict=True)
    )
    stock = replace(brief.stock, r_load=replace(brief.stock.r_load, price=dear))
    links = tuple(replace(link, brief=replace(brief, stock=stock)) for link in board.links)
    result = solve_board(replace(board, links=links), couplers=made)
    assert result.links[0].review.design.r_load != best
    assert any(name.startswith("one r_load ") for name in result.unpriced)


def test_prices_play_no_part_where_none_is_asked_for():
    board, made = priced(None, stock=None)
    board = replace(board, goal=BoardGoal(BoardGoalName.POWER, BoardGoalName.REELS, 0.0))
    result = solve_board(board, couplers=made)
    assert result.price is None
    assert result.unpriced == ()
    assert result.status is Status.OPTIMAL


@pytest.mark.parametrize("limits", [BoardLimits(), BoardLimits(price=5.0)])
def test_nothing_that_has_a_price(limits):
    board, made = priced(None, stock=None)
    board = replace(board, limits=limits)
    if limits.price:
        board = replace(board, goal=BoardGoal(BoardGoalName.POWER, BoardGoalName.REELS, 0.0))
    with pytest.raises(InputError) as caught:
        solve_board(board, couplers=made)
    told = [str(mistake) for mistake in caught.value.mistakes]
    assert told[0] == (
        "board: link one: found no price of any coupler that may serve: PART-1; "
        "expected prices in the coupler table where cost is limited or a goal"
    )
    assert told[1:] == [
        f"board: link one: found no price of any resistor in stock.{name} ({count} values listed in the brief); "
        "expected a shelf list with the column price where cost is limited or a goal"
        for name, count in (("r_led", 3), ("r_load", 3), ("r_be", 2))
    ]


# ---- edges ------------------------------------------------------------------------------------------------------------


def test_each_edge_counts_against_its_own_limit():
    """A slow link with a long limit does not hold back a fast one with a short limit."""
    brief = read_brief(TINY)
    limits = [replace(brief.limits, edge_time=limit, delay=None, distortion=None) for limit in (28e-6, 60e-6, None)]
    links = tuple(BoardLink(f"L{k}", replace(brief, limits=one), 1) for k, one in enumerate(limits))
    board = Board("edges", BoardLimits(), BoardGoal(BoardGoalName.EDGE, BoardGoalName.POWER, 0.0), links)
    result = solve_board(board)
    assert result.status is Status.OPTIMAL
    shares = [
        max(one.review.timing.edge_on, one.review.timing.edge_off) / one.link.brief.limits.edge_time
        for one in result.links[:2]
    ]
    assert result.edge == pytest.approx(max(shares)) == pytest.approx(result.goals[0].value)
    least = pick(replace(links[0].brief, goal=Goal(GoalName.EDGE_TIME, GoalName.POWER, 0.0))).objective.value
    assert result.edge == pytest.approx(least / 28e-6)
    # the link without a limit takes what it takes alone
    assert result.links[2].power == pytest.approx(result.links[2].alone)


def test_no_board_has_edges_that_short():
    brief = read_brief(TINY)
    goal = BoardGoal(BoardGoalName.EDGE, BoardGoalName.POWER, 0.0)
    board = Board("edges", BoardLimits(reels=1), goal, (BoardLink("one", brief, 1),))
    result = solve_board(board)
    assert result.status is Status.INFEASIBLE
    assert result.hopeless == ()


def test_out_of_time_over_edges():
    brief = read_brief(TINY)
    goal = BoardGoal(BoardGoalName.EDGE, BoardGoalName.POWER, 0.0)
    board = Board("edges", BoardLimits(), goal, (BoardLink("one", brief, 1),))
    assert solve_board(board, time_limit=0.0).status in (Status.UNKNOWN, Status.FEASIBLE)
