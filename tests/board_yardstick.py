"""Random boards with prices, grounds and packages of several channels, and every board there is: the yardstick."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import product

import numpy as np
from enumeration_kinds import grids_of
from random_links import brief, coupler, logic, mixed_brief, position

from optopick.board import Board, BoardGoal, BoardGoalName, BoardLimits, BoardLink
from optopick.brief import Brief, Position
from optopick.coupler import Coupler, Rating

ROUNDING = 1e-6
COLUMNS = ("values", "tolerance", "power", "voltage", "price")
TOTALS = ("reels", "couplers", "packages", "power", "cost", "edge")
"""Columns of what `boards` counts."""


def some_of(rng: np.random.Generator, stock: Position | None, count: int, unpriced: bool) -> Position | None:
    """A few values of a position with a price each, or one of them without."""
    if stock is None:
        return None
    keep = sorted(rng.choice(len(stock.values), min(count, len(stock.values)), replace=False).tolist())
    few = replace(stock, **{name: tuple(getattr(stock, name)[k] for k in keep) for name in COLUMNS})
    prices: list[float | None] = [float(np.round(rng.uniform(0.01, 0.3), 2)) for _ in few.values]
    if unpriced and len(prices) > 1:
        prices[int(rng.integers(len(prices)))] = None
    return replace(few, price=tuple(prices))


def small_brief(rng: np.random.Generator, title: str) -> Brief:
    """A random brief with few values, of positions that overlap, so that reels can be shared; some without price."""
    drawn = (brief if rng.random() < 0.7 else mixed_brief)(rng, "E6")
    stock, unpriced = replace(drawn.stock, r_load=position("E6", 470, 10e3)), rng.random() < 0.3
    few = replace(
        stock,
        r_led=some_of(rng, stock.r_led, 5, unpriced),
        r_load=some_of(rng, stock.r_load, 4, False),
        r_be=some_of(rng, stock.r_be, 2, False),
        r_shunt=some_of(rng, stock.r_shunt, 2, False),
    )
    return replace(drawn, title=title, stock=few, limits=replace(drawn.limits, power=None, edge_time=None))


@dataclass(frozen=True)
class Design:
    """A valid design of a link: what it takes for one of it. heat: share of the package's limit, at its worst [1]."""

    reels: frozenset[float]
    part: str
    heat: float
    power: float
    price: float
    edge: float


def designs_of(brief: Brief, couplers: list[Coupler], priced: bool) -> list[Design]:
    """Every valid design that no other of the same parts beats; with `priced` those alone whose prices are known."""
    found: dict[tuple[frozenset[float], str, bool], list[Design]] = {}
    channels = {one.part: one.channels for one in couplers}
    for design in _valid(brief, couplers):
        if np.isnan(design.price) and priced:
            continue
        rivals = found.setdefault((design.reels, design.part, design.heat <= 1 / channels[design.part]), [])
        mine = _figures(design)
        if not any((_figures(rival) <= mine).all() for rival in rivals):
            rivals[:] = [rival for rival in rivals if not (mine <= _figures(rival)).all()] + [design]
    return [design for rivals in found.values() for design in rivals]


def _figures(design: Design) -> np.ndarray:
    return np.nan_to_num(np.array([design.power, design.price, design.edge]))


def _valid(brief: Brief, couplers: list[Coupler]) -> Iterator[Design]:
    limit, price = brief.limits.edge_time, {one.part: one.price for one in couplers}
    for grid in grids_of(brief, couplers):
        for k in np.flatnonzero(grid.feasible):
            winner = grid.winner(k)
            ohms = {"r_led": winner.r_led, "r_load": winner.r_load, "r_be": winner.r_be, "r_shunt": winner.r_shunt}
            costs = [price[winner.coupler]] if price[winner.coupler] is None else []
            for name, value in ohms.items():
                if value is not None:
                    stock: Position = getattr(brief.stock, name)
                    each = stock.price[stock.values.index(value)]
                    costs += [each] * (winner.pieces if name == "r_led" else 1)
            yield Design(
                reels=frozenset(value for value in ohms.values() if value is not None),
                part=winner.coupler,
                heat=1.0 - float(grid.rooms["total_power"][k]),
                power=float(grid.goals["power"][k]),
                price=float("nan") if None in costs else float(sum(cost for cost in costs if cost is not None)),
                edge=0.0 if limit is None else float(grid.goals["edge time"][k]) / limit,
            )


def boards(board: Board, couplers: list[Coupler], designs: list[list[Design]]) -> np.ndarray:
    """The totals of every board there is, (n, 6): one design for each brief, in the order of their first links."""
    briefs = list(dict.fromkeys(link.brief for link in board.links))
    number = [briefs.index(link.brief) for link in board.links]
    rows = []
    for chosen in product(*designs):
        placed = [(link, chosen[k]) for link, k in zip(board.links, number, strict=True)]
        packages, packed = packages_in(placed, {one.part: one.channels for one in couplers})
        price = {one.part: one.price or 0.0 for one in couplers}
        rows.append(
            (
                len(frozenset().union(*(one.reels for one in chosen))),
                len({one.part for one in chosen}),
                packages,
                sum(link.count * one.power for link, one in placed),
                sum(link.count * one.price for link, one in placed) + sum(price[p] * n for p, n in packed.items()),
                max(one.edge for one in chosen),
            )
        )
    return np.array(rows, dtype=float).reshape(-1, len(TOTALS))


def packages_in(placed: list[tuple[BoardLink, Design]], channels: dict[str, int]) -> tuple[int, dict[str, int]]:
    """All packages, and those of each part: filled one channel after the other, a link too hot to share alone."""
    packed: dict[str, int] = {}
    free: dict[tuple[object, ...], int] = {}
    for link, design in placed:
        for _ in range(link.count):
            place = (design.part, link.grounds)
            shares = link.grounds is not None and design.heat <= (1 + 1e-9) / channels[design.part]
            if shares and free.get(place, 0):
                free[place] -= 1
                continue
            packed[design.part] = packed.get(design.part, 0) + 1
            if shares:
                free[place] = channels[design.part] - 1
    return sum(packed.values()), packed


def expected(found: np.ndarray, board: Board) -> tuple[float, float, float] | None:
    """The least first goal, the least second within what is given, and the least power then; None without a board."""
    held = np.ones(len(found), dtype=bool)
    for goal in BoardGoalName:
        limit = board.limits.of(goal)
        if limit is not None:
            held &= found[:, TOTALS.index(goal.value)] <= limit * (1 + ROUNDING)
    if not held.any():
        return None
    first, second, power = (found[held, TOTALS.index(name)] for name in (*board.goals, "power"))
    near = first <= first.min() * (1 + board.goal.give) * (1 + ROUNDING)
    then = float(second[near].min())
    return float(first.min()), then, float(power[near & (second <= then * (1 + ROUNDING))].min())


GROUNDS = (None, ("field", "logic"), ("field", "logic"), ("motor", "logic"))
GOALS = (
    (BoardGoalName.COST, BoardGoalName.POWER),
    (BoardGoalName.COST, BoardGoalName.REELS),
    (BoardGoalName.POWER, BoardGoalName.COST),
    (BoardGoalName.PACKAGES, BoardGoalName.POWER),
    (BoardGoalName.EDGE, BoardGoalName.POWER),
    (BoardGoalName.EDGE, BoardGoalName.COST),
    (BoardGoalName.REELS, BoardGoalName.EDGE),
    (BoardGoalName.POWER, BoardGoalName.EDGE),
)


def drawn_couplers(rng: np.random.Generator) -> list[Coupler]:
    """Three parts of one to four channels; packages that one link may fill to more than its share; one without price."""
    made = [coupler(rng, "RND-1"), coupler(rng, "RND-2"), logic(rng) if rng.random() < 0.5 else coupler(rng, "RND-3")]
    found = []
    for one in made:
        heat = Rating(float(rng.choice([0.04, 0.08, 0.2])), 25, float(rng.choice([0.0, 2e-4])))
        price = None if rng.random() < 0.15 else float(np.round(rng.uniform(0.1, 0.6), 2))
        found.append(replace(one, channels=int(rng.choice([1, 2, 2, 4])), p_total=heat, price=price))
    return found


def drawn_board(seed: int) -> tuple[Board, list[Coupler], np.ndarray] | None:
    """A random board with its couplers and all boards that there are; None where a link has no design, or too many."""
    rng = np.random.default_rng(seed)
    made, goals = drawn_couplers(rng), GOALS[seed % len(GOALS)]
    priced = BoardGoalName.COST in goals
    briefs, designs = [], []
    for k in range(2):
        one = small_brief(rng, f"link {k}")
        edges = [g.goals["edge time"][g.feasible] for g in grids_of(one, made)]
        every = np.concatenate([part[np.isfinite(part)] for part in edges]) if edges else np.zeros(0)
        if not every.size:
            return None
        if k == 0 or rng.random() < 0.6:
            # a limit that some designs fail
            one = replace(one, limits=replace(one.limits, edge_time=1.0001 * float(np.quantile(every, 0.7))))
        briefs.append(one)
        designs.append(designs_of(one, made, priced))
    links = [BoardLink(f"L{k}", one, int(rng.integers(1, 6)), _grounds(rng)) for k, one in enumerate(briefs)]
    links.append(BoardLink("again", briefs[int(rng.integers(2))], int(rng.integers(1, 4)), _grounds(rng)))
    if not 0 < np.prod([len(one) for one in designs]) <= 20_000:
        return None
    board = Board("random", BoardLimits(), BoardGoal(*goals, float(rng.choice([0.0, 0.1]))), tuple(links))
    return board, made, boards(board, made, designs)


def _grounds(rng: np.random.Generator) -> tuple[str, str] | None:
    return GROUNDS[int(rng.integers(len(GROUNDS)))]
