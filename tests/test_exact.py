"""Front, next-best designs, conflict sets, least changes, nearest design and margin budget against full enumeration.

Small random briefs, so that `enumeration_kinds` can say what every combination of every coupler holds and fails.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from itertools import combinations

import numpy as np
import pytest
import random_links
from enumeration import FIRST_SLACK, Grid
from enumeration_kinds import grid_of, grids_of
from test_enumeration import shortened
from test_enumeration_kinds import winner_of

from optopick.answers import CAUSES, Change, Front
from optopick.brief import Brief, Goal, GoalName, OutputCircuit, Span
from optopick.coupler import Coupler
from optopick.eseries import series_values
from optopick.recheck.vertices import ORDER
from optopick.result import Design, Status
from optopick.uses.budget import budget
from optopick.uses.nearest import nearest
from optopick.uses.pick import alternatives
from optopick.uses.tradeoff import tradeoff
from optopick.uses.why import why

SAME = 3e-6
GOALS = list(GoalName)
MAKERS = (random_links.coupler, random_links.darlington, random_links.logic)
PAIRS = [(a, b) for a in GOALS for b in GOALS if a is not b]
LOOSE = {"edge_time": None, "delay": None, "distortion": None, "power": None}


def small(seed: int, most=(5, 6, 2, 2), loose: bool = True) -> tuple[Brief, list[Coupler]]:
    """A small random link of either circuit and its one to three couplers."""
    rng = np.random.default_rng(80_000 + seed)
    circuit = list(OutputCircuit)[seed % 2]
    draw = (random_links.brief, random_links.brief, random_links.sink_brief, random_links.field_brief)[seed % 4]
    brief = shortened(rng, draw(rng, ("E6", "E12")[seed % 2], circuit), most)
    brief = replace(brief, goal=replace(brief.goal, then=GOALS[(GOALS.index(brief.goal.minimize) + 1 + seed % 3) % 4]))
    if loose:
        slow = replace(brief.signal, shortest_pulse=10 * brief.signal.shortest_pulse)
        brief = replace(brief, signal=slow, limits=replace(brief.limits, **LOOSE))
    makers = MAKERS if circuit is OutputCircuit.PULL_UP else MAKERS[:2]
    couplers = [makers[(seed + k) % len(makers)](rng, f"RND-{k}") for k in range(1 + (seed // 2) % 3)]
    return brief, couplers


def feasible_small(count: int, start: int = 0, least: int = 4) -> list[int]:
    """Seeds of links with at least so many designs."""
    found, seed = [], start
    while len(found) < count:
        if sum(int(grid.feasible.sum()) for grid in grids_of(*small(seed))) >= least:
            found.append(seed)
        seed += 1
    return found


class Designs:
    """Every design that holds, over all couplers: who it is and its goals, (n,) each."""

    def __init__(self, grids: Sequence[Grid]) -> None:
        held = [(grid, np.flatnonzero(grid.feasible)) for grid in grids]
        self.who = [grid.winner(int(k)) for grid, at in held for k in at]
        self.goals = {
            goal: np.concatenate([np.asarray(grid.goals[goal.value])[at] for grid, at in held] or [np.zeros(0)])
            for goal in GoalName
        }

    def best(self, goal: Goal, out: np.ndarray) -> tuple[float, float, list[int]] | None:
        """Least first goal, least second within `give`, and who reaches both, without those `out`."""
        first, second = (np.where(out, np.inf, self.goals[name]) for name in (goal.minimize, goal.then))
        if not np.isfinite(first).any():
            return None
        near = first <= first.min() * (1 + goal.give) * (1 + FIRST_SLACK)
        least = second[near].min()
        return float(first.min()), float(least), list(np.flatnonzero(near & (second <= least * (1 + FIRST_SLACK))))

    def front(self, goals: tuple[GoalName, GoalName]) -> list[tuple[float, float]]:
        """The values that no design beats in both goals, in the order of the first."""
        order = sorted(zip(*(self.goals[name].tolist() for name in goals), strict=True))
        kept: list[tuple[float, float]] = []
        for first, second in order:
            if not (np.isfinite(first) and np.isfinite(second)) or (kept and second >= kept[-1][1] * (1 - FIRST_SLACK)):
                continue
            if kept and first <= kept[-1][0] * (1 + FIRST_SLACK):
                kept.pop()
            kept.append((first, second))
        return kept


# --- fronts ----------------------------------------------------------------------------------------------------------


def same_points(front: Front, expected: list[tuple[float, float]]) -> None:
    told = [(point.first, point.second) for point in front.points]
    assert len(told) == len(expected), (told, expected)
    assert np.allclose(told, expected, rtol=1e-5, atol=0.0), (told, expected)


FRONTS = 28


@pytest.mark.parametrize("chunk", range(4))
def test_front(chunk):
    sizes = []
    for n, seed in enumerate(feasible_small(FRONTS // 4, 1000 * chunk + 40)):
        brief, couplers = small(seed)
        designs, pair = Designs(grids_of(brief, couplers)), PAIRS[(5 * chunk + n) % len(PAIRS)]
        expected = designs.front(pair)
        front = tradeoff(brief, pair, couplers=couplers)
        try:
            assert front.complete
            same_points(front, expected)
            some = tradeoff(brief, pair, points=4, couplers=couplers)
            told = np.array([(p.first, p.second) for p in some.points])
            assert 1 <= len(told) <= 4
            apart = np.abs(told[:, None, :] / np.array(expected)[None, :, :] - 1).max(axis=2).min(axis=1)
            assert (apart < 1e-5).all(), (told, expected)
            assert np.allclose(told[0], expected[0], rtol=1e-5)
            assert np.allclose(told[-1], expected[-1], rtol=1e-5)
        except AssertionError as error:
            raise AssertionError(f"seed {seed}, {pair}: {error}") from error
        sizes.append(len(expected))
    assert max(sizes) >= 3


# --- alternatives ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("differ", ["value", "coupler"])
@pytest.mark.parametrize("chunk", range(2))
def test_alternatives(differ, chunk):
    several = 0
    for seed in feasible_small(14, 1000 * chunk + 300):
        brief, couplers = small(seed)
        results = alternatives(brief, 4, differ=differ, couplers=couplers)
        try:
            several += followed(brief, Designs(grids_of(brief, couplers)), results, differ) > 1
        except AssertionError as error:
            raise AssertionError(f"seed {seed}: {error}") from error
    assert several >= 3


def followed(brief: Brief, designs: Designs, results, differ: str) -> int:
    """Hold each answer to the best of what the answers before it leave; how many there were."""
    out = np.zeros(len(designs.who), dtype=bool)
    for result in results:
        best = designs.best(brief.goal, out)
        assert best is not None, f"no design is left, told {result.design}"
        first, second, winners = best
        assert result.status is Status.OPTIMAL
        assert result.objective.bound == pytest.approx(first, rel=SAME)
        assert result.second.value == pytest.approx(second, rel=SAME)
        told = winner_of(result.design)
        assert told in [designs.who[k] for k in winners]
        out |= [who.coupler == told.coupler if differ == "coupler" else who == told for who in designs.who]
    assert len(results) == 4 or designs.best(brief.goal, out) is None
    return len(results)


# --- why -------------------------------------------------------------------------------------------------------------


def holds_all(grids: Sequence[Grid], names: Sequence[str]) -> bool:
    """Whether some combination of some coupler holds all checks of these names, whatever else it fails."""
    return any(_holding(grid, names).any() for grid in grids)


def _holding(grid: Grid, names: Sequence[str]) -> np.ndarray:
    held = np.ones(len(grid.r_led), dtype=bool)
    for name in (*names, "fewest_pieces"):
        if name in grid.rooms:
            held &= grid.rooms[name] >= -1e-9
    return held


def hopeless(count: int, start: int) -> list[int]:
    """Seeds of links without a design."""
    found, seed = [], start
    while len(found) < count:
        if not any(grid.feasible.any() for grid in grids_of(*tight(seed))):
            found.append(seed)
        seed += 1
    return found


def tight(seed: int) -> tuple[Brief, list[Coupler]]:
    return small(seed, (4, 5, 2, 2), loose=seed % 3 == 0)


@pytest.mark.parametrize("chunk", range(4))
def test_conflict_sets(chunk):
    sizes = set()
    for seed in hopeless(7, 1000 * chunk + 600):
        brief, couplers = tight(seed)
        grids, told = grids_of(brief, couplers, failing=True), why(brief, couplers=couplers)
        assert told.status is Status.INFEASIBLE
        assert told.conflicts, seed
        for conflict in told.conflicts:
            assert not holds_all(grids, conflict), f"seed {seed}: {conflict} does not contradict itself"
            for part in combinations(conflict, len(conflict) - 1):
                assert holds_all(grids, part), f"seed {seed}: {part} of {conflict} contradicts itself"
            sizes.add(len(conflict))
    assert len(sizes) > 1


def changed(brief: Brief, change: Change, value: float | str) -> Brief:
    """The brief with another value of what a change names."""
    head, _, key = change.key.partition(".")
    if head == "stock":
        position = getattr(brief.stock, key)
        values = series_values(str(value), position.values[0], position.values[-1])
        columns = {c: getattr(position, c)[:1] * len(values) for c in ("tolerance", "power", "voltage", "price")}
        return replace(brief, stock=replace(brief.stock, **{key: replace(position, values=values, **columns)}))
    if key.startswith("temperature"):
        span = brief.environment.temperature
        new = Span(min(span.low, value), value) if key.endswith("[1]") else Span(value, max(span.high, value))
        return replace(brief, environment=replace(brief.environment, temperature=new))
    return replace(brief, **{head: replace(getattr(brief, head), **{key: value})})


def exists(brief: Brief, couplers: Sequence[Coupler]) -> bool:
    return any(grid.feasible.any() for grid in grids_of(brief, couplers))


ALONE = {
    "edge_time": "limits.edge_time",
    "delay": "limits.delay",
    "distortion": "limits.distortion",
    "power": "limits.power",
    "driver_current": "drive.max_current",
}
"""Limits that may be moved as far as leaving them out, and what their change is called."""


def none_missing(seed: int, grids: Sequence[Grid], changes: Sequence[Change]) -> None:
    """A limit that alone stands in the way must be among the changes."""
    every, told = {name for grid in grids for name in grid.rooms}, {change.key for change in changes}
    for name, key in ALONE.items():
        assert (name in every and holds_all(grids, sorted(every - {name}))) == (key in told), f"seed {seed}: {key}"


@pytest.mark.parametrize("chunk", range(4))
def test_least_changes(chunk):
    keys = set()
    for seed in hopeless(7, 1000 * chunk + 600):
        brief, couplers = tight(seed)
        changes = why(brief, couplers=couplers).changes
        none_missing(seed, grids_of(brief, couplers, failing=True), changes)
        for change in changes:
            where = f"seed {seed}: {change}"
            assert exists(changed(brief, change, change.needed), couplers), where
            keys.add(change.key)
            if isinstance(change.needed, str):
                continue
            less = change.needed - 0.01 * (change.needed - change.now)
            assert not exists(changed(brief, change, less), couplers), f"{where}; {less} would do"
    assert len(keys) > 1


# --- nearest ---------------------------------------------------------------------------------------------------------


def failing_design(seed: int) -> tuple[Brief, list[Coupler], Design] | None:
    """A small link, and one of its stock's designs that fails, if any does.

    None with more pieces than it needs: `nearest` leaves those pieces as they are, the enumeration counts them as wrong.
    """
    brief, couplers = small(seed)
    rng = np.random.default_rng(seed)
    grids = grids_of(brief, couplers, failing=True)
    grid = grids[int(rng.integers(len(grids)))]
    spared = grid.rooms.get("fewest_pieces", np.ones(len(grid.r_led))) >= 0
    at = np.flatnonzero(~grid.feasible & spared)
    brief = replace(brief, goal=replace(brief.goal, give=0.0))
    return (brief, couplers, Design(*grid.winner(int(rng.choice(at))))) if len(at) else None


NEAREST = (902, 904, 905, 906, 2901, 2902, 2904, 2906, 2907, 4904, 4907, 4908, 4909, 4910)
"""Links with four designs or more and a failing one: nearest designs one to four places away."""


@pytest.mark.parametrize("seed", NEAREST)
def test_nearest(seed):
    """The fewest places changed by enumeration, every one of them said, and of those designs the best."""
    brief, couplers, design = failing_design(seed)
    told, designs = nearest(brief, design, couplers), Designs(grids_of(brief, couplers))
    moved = np.array([distance(design, Design(*who)) for who in designs.who])
    goal = designs.goals[brief.goal.minimize][moved == moved.min()].min()
    assert winner_of(told.result.design) in designs.who
    assert set(told.changed) == places(design, told.result.design)
    assert len(told.changed) == moved.min()
    assert told.result.objective.value == pytest.approx(goal, rel=SAME)


def test_nearest_designs_are_one_to_several_places_away():
    away = set()
    for seed in NEAREST:
        brief, couplers, design = failing_design(seed)
        away.add(min(distance(design, Design(*who)) for who in Designs(grids_of(brief, couplers)).who))
    assert len(away) >= 3


def places(a: Design, b: Design) -> set[str]:
    """Where two designs differ; the pieces of the LED resistor belong to its place."""
    found = {name for name in ("coupler", "r_led", "r_load", "r_be", "r_shunt") if getattr(a, name) != getattr(b, name)}
    return found | ({"r_led"} if a.pieces != b.pieces else set())


def distance(a: Design, b: Design) -> int:
    return len(places(a, b))


# --- budget ----------------------------------------------------------------------------------------------------------


def exact_supply(brief: Brief) -> Brief:
    o = brief.output
    middle = {name: Span(getattr(o, name).middle, getattr(o, name).middle) for name in ("supply", "v_il", "v_ih")}
    return replace(brief, output=replace(o, **middle))


def exact_resistors(brief: Brief) -> Brief:
    stock = brief.stock
    exact = {
        name: replace(getattr(stock, name), tolerance=(0.0,) * len(getattr(stock, name).values))
        for name in ("r_led", "r_load", "r_be", "r_shunt")
        if getattr(stock, name) is not None
    }
    return replace(brief, stock=replace(stock, drift=0.0, **exact))


def only(brief: Brief, design: Design) -> Brief:
    """The brief with no other values in stock than a design's."""
    stock = {}
    for name in ("r_led", "r_load", "r_be", "r_shunt"):
        position, value = getattr(brief.stock, name), getattr(design, name)
        if position is None or value is None:
            stock[name] = None
            continue
        k = position.values.index(value)
        columns = {c: getattr(position, c)[k : k + 1] for c in ("values", "tolerance", "power", "voltage", "price")}
        stock[name] = replace(position, absent=False, **columns)
    return replace(brief, stock=replace(brief.stock, **stock))


@pytest.mark.parametrize("n", range(6))
def test_budget(n):
    """What a cause costs is what the brief without that cause gives back, by enumeration of every vertex."""
    brief, couplers = small(feasible_small(n + 1, 1200)[n])
    who = Designs(grids_of(brief, couplers)).who[-1 - n % 3]
    coupler, design = next(c for c in couplers if c.part == who.coupler), Design(*who)
    brief = only(brief, design)
    grid = grid_of(brief, coupler, every_vertex=True)
    k = [grid.winner(k) for k in range(len(grid.r_led))].index(who)
    shares = budget(brief, coupler, design)
    for cause, eased in (("V_CC", exact_supply(brief)), ("R", exact_resistors(brief))):
        rooms = grid_of(eased, coupler, every_vertex=True).rooms
        gains = {share.check: rooms[share.check][k] - grid.rooms[share.check][k] for share in shares}
        assert max(gains.values()) > 1e-4
        assert {share.check: share.cost[cause] for share in shares} == pytest.approx(gains, rel=1e-6, abs=1e-6), cause
    for cause, alike in (("V_BE", {"v_be_spread": 0.0}), ("storage", {"tau_s_spread": 1.0})):
        unit = replace(coupler, transistor=replace(coupler.transistor, **alike))
        rooms = grid_of(brief, unit, every_vertex=True).rooms
        gains = {share.check: rooms[share.check][k] - grid.rooms[share.check][k] for share in shares}
        assert {share.check: share.cost[cause] for share in shares} == pytest.approx(gains, rel=1e-6, abs=1e-6), cause


def test_the_budget_knows_every_cause():
    """What is uncertain about a design stands under one cause, so that nothing of it is left with all nominal."""
    assert sorted(axis for axes in CAUSES.values() for axis in axes) == sorted(ORDER)
