"""The optimiser against full enumeration: same status, same optimum, same second optimum; and check against check.

`enumeration` shares no formula with the program. A quantity on which both agree has been derived twice.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import random_links
from enumeration import Winner, enumerate_best, feasible_grid, survey

import optopick
from optopick.brief import Brief, Drive, DriveCircuit, GoalName, Isolation, OutputCircuit, Position, Span
from optopick.coupler import Coupler
from optopick.recheck import review
from optopick.result import Design, Status

SAME = 3e-6
CHUNKS, EACH = 10, 30
GOALS = list(GoalName)
COLUMNS = ("values", "tolerance", "power", "voltage", "price")


def window(rng: np.random.Generator, position: Position | None, most: int) -> Position | None:
    """At most so many neighbouring values of a stock."""
    if position is None or len(position.values) <= most:
        return position
    start = int(rng.integers(0, len(position.values) - most + 1))
    return replace(position, **{c: getattr(position, c)[start : start + most] for c in COLUMNS})


def mixed(rng: np.random.Generator, position: Position | None) -> Position | None:
    """A stock of 1 % and 5 % parts and of small and large ones: neighbours' spans overlap."""
    if position is None:
        return None
    tolerance = tuple(float(x) for x in rng.choice([0.01, 0.05], len(position.values)))
    power = tuple(float(x) for x in rng.choice([0.125, 1.0], len(position.values)))
    return replace(position, tolerance=tolerance, power=power)


def shortened(rng: np.random.Generator, brief: Brief, most: tuple[int, int, int, int]) -> Brief:
    stock = brief.stock
    cut = {name: window(rng, getattr(stock, name), n) for name, n in zip(POSITIONS, most, strict=True)}
    return replace(brief, stock=replace(stock, **cut))


POSITIONS = ("r_led", "r_load", "r_be", "r_shunt")


def field_drive(rng: np.random.Generator, brief: Brief) -> Brief:
    """The LED lit by a contact of 11 to 30 V that leaks when off."""
    drive = Drive(
        circuit=DriveCircuit.FIELD,
        supply=Span(float(rng.choice([11.0, 15.0])), 30.0),
        drop=Span(0.0, 0.0),
        max_current=None,
        off_leakage=0.0,
        off_voltage=float(rng.choice([1.0, 3.0, 5.0])),
        off_current=float(rng.choice([0.0, 0.3e-3, 1e-3], p=[0.5, 0.4, 0.1])),
        on_current_min=2e-3,
        reverse=float(rng.choice([0.0, 3.0, 6.0], p=[0.5, 0.4, 0.1])),
    )
    series = random_links.position("E12", 1.2e3, 8.2e3)
    shunt = random_links.position("E6", 680, 3.3e3, absent=True)
    stock = replace(brief.stock, r_led=replace(series, power=(1.0,) * len(series.values)), r_shunt=shunt)
    return replace(brief, drive=drive, stock=stock)


def turning(coupler: Coupler) -> Coupler:
    """The same coupler with CTR highest between room temperature and the hottest, and a bend where it falls."""
    return over_temperature(coupler, (-40.0, 25.0, 45.0, 60.0, 100.0), (0.8, 1.0, 1.06, 1.0, 0.65))


def kinked(coupler: Coupler) -> Coupler:
    """The same coupler with a CTR that falls steeply up to 25 degC and hardly beyond, and an LED that hardly dims."""
    bent = over_temperature(coupler, (-40.0, 25.0, 100.0), (1.6, 1.0, 0.97))
    return replace(bent, transfer=replace(bent.transfer, light_tc=-0.001))


def over_temperature(coupler: Coupler, t: tuple[float, ...], h: tuple[float, ...]) -> Coupler:
    return replace(coupler, transfer=replace(coupler.transfer, curve_t=t, curve_h=h))


def barriers(brief: Brief, couplers: list[Coupler]) -> tuple[Brief, list[Coupler]]:
    """A barrier that the first coupler lacks, and a list of names that leaves the third and later ones out."""
    first = replace(couplers[0], barrier=replace(couplers[0].barrier, withstand=None))
    named = tuple(c.part for c in couplers[:2])
    limits = replace(brief.limits, isolation=Isolation(withstand=3750.0, working=300.0, creepage=6e-3))
    brief = replace(brief, limits=limits, couplers=replace(brief.couplers, only=named))
    return brief, [first, *couplers[1:]]


def case(seed: int) -> tuple[Brief, list[Coupler]]:
    """One random link, its goals and variant by the seed so that each comes up."""
    rng = np.random.default_rng(seed)
    brief = random_links.brief(rng, "E24" if seed % 3 == 0 else "E12")
    couplers = [random_links.coupler(rng, f"RND-{k}") for k in range(1 + seed % 4)]
    first = GOALS[(seed // 4) % 4]
    then = GOALS[(GOALS.index(first) + 1 + seed % 3) % 4]
    brief = replace(brief, goal=replace(brief.goal, minimize=first, then=then))
    brief = unusual(rng, seed, brief)
    if seed % 6 == 4:
        couplers = [turning(c) for c in couplers]
    if seed % 6 == 5:
        couplers = [kinked(c) for c in couplers]
    if seed % 8 == 6:
        brief, couplers = barriers(brief, couplers)
    return shortened(rng, brief, (10, 12, 6, 3)), couplers


def unusual(rng: np.random.Generator, seed: int, brief: Brief) -> Brief:
    """Now and then a field contact, one-sided weather, a supply without tolerance, mixed stock, fewer limits."""
    if seed % 11 == 3:
        brief = field_drive(rng, brief)
    if seed % 5 == 2:
        weather = Span(30.0, 70.0) if seed % 2 else Span(-40.0, 20.0)
        brief = replace(brief, environment=replace(brief.environment, temperature=weather))
    if seed % 9 == 1:
        exact = Span(brief.output.supply.low, brief.output.supply.low)
        brief = replace(brief, output=replace(brief.output, supply=exact))
    if seed % 4 == 1:
        stock = {name: mixed(rng, getattr(brief.stock, name)) for name in POSITIONS}
        brief = replace(brief, stock=replace(brief.stock, **stock))
    if seed % 2:
        brief = replace(brief, limits=replace(brief.limits, edge_time=None, distortion=None, power=None))
    return brief


def winner_of(design: Design) -> Winner:
    return Winner(design.coupler, design.r_led, design.r_load, design.r_be, design.r_shunt)


def agree(brief: Brief, couplers: list[Coupler]) -> bool:
    """Hold the optimiser to enumeration; whether a design exists.

    What `bound` shows of the first goal is its optimum; the design itself may give some of it for the second.
    """
    best, result = enumerate_best(brief, couplers), optopick.pick(brief, couplers=couplers)
    if best.status == "infeasible":
        assert result.status is Status.INFEASIBLE
        assert result.design is None
        return False
    assert result.status is Status.OPTIMAL
    assert result.objective.bound == pytest.approx(best.first, rel=SAME)
    assert result.objective.value <= best.first * (1 + brief.goal.give) * (1 + SAME)
    assert result.second.value == pytest.approx(best.second, rel=SAME)
    assert result.second.bound == pytest.approx(best.second, rel=SAME)
    assert winner_of(result.design) in best.winners
    return True


@pytest.mark.parametrize("chunk", range(CHUNKS))
def test_random_links(chunk):
    found = []
    for seed in range(chunk * EACH, (chunk + 1) * EACH):
        brief, couplers = case(seed)
        try:
            exists = agree(brief, couplers)
        except AssertionError as error:
            raise AssertionError(f"seed {seed}: {error}") from error
        if exists:
            found.append((brief.goal.minimize, brief.goal.then, brief.output.circuit))
    assert 0.45 * EACH <= len(found) < EACH
    assert {first for first, _, _ in found} == set(GoalName)
    assert {then for _, then, _ in found} == set(GoalName)
    assert {circuit for _, _, circuit in found} == set(OutputCircuit)


@pytest.mark.parametrize(("seed", "goal"), [(9608, 0), (9713, 1), (9662, 2), (9623, 3)])
def test_fine_series(seed, goal):
    """E96 over shortened spans, base resistor included, for every goal."""
    rng = np.random.default_rng(seed)
    brief = random_links.brief(rng, "E96", list(OutputCircuit)[goal % 2])
    brief = replace(brief, goal=replace(brief.goal, minimize=GOALS[goal], then=GOALS[(goal + 1) % 4]))
    brief = replace(shortened(rng, brief, (40, 40, 14, 2)), limits=replace(brief.limits, power=None, distortion=None))
    assert agree(brief, [random_links.coupler(rng)])


def easy(brief: Brief) -> Brief:
    """The same link with limits that more designs hold."""
    limits = replace(brief.limits, ctr_margin=1.05, edge_time=1e-3, delay=2e-3, distortion=2e-3, power=1.0)
    drive = replace(brief.drive, max_current=None, off_leakage=1e-6)
    return replace(brief, limits=limits, drive=drive, signal=replace(brief.signal, shortest_pulse=3e-3))


@pytest.mark.parametrize("seed", range(22))
def test_every_design_check_by_check(seed):
    """Not just the best: every design of a small grid has the same checks with the same room, and the same goals."""
    rng = np.random.default_rng(3000 + seed)
    brief, coupler = random_links.brief(rng, "E3", list(OutputCircuit)[seed % 2]), random_links.coupler(rng)
    brief = field_drive(rng, brief) if seed % 5 == 4 else brief
    brief = shortened(rng, brief, (3, 3, 2, 1))
    if seed % 4 > 1:
        brief = easy(brief)
    coupler = (lambda c: c, kinked, turning)[seed % 3](coupler)
    grid = feasible_grid(brief, coupler)
    for k in range(len(grid.r_led)):
        reviewed = review(brief, coupler, Design(*grid.winner(k)))
        assert reviewed.passed == grid.feasible[k]
        for check in reviewed.checks:
            room = float(grid.rooms[check.name][k])
            assert check.passed == (room >= -1e-9), check
            assert check.margin == pytest.approx(room, rel=1e-7, abs=1e-7) or not np.isfinite(check.margin), check
        others = set(grid.rooms) - {check.name for check in reviewed.checks}
        assert others <= empty_positions(grid.winner(k))
        timing = reviewed.timing
        assert max(timing.edge_on, timing.edge_off) == pytest.approx(grid.goals["edge time"][k], rel=1e-9)
        assert max(timing.delay_on, timing.delay_off) == pytest.approx(grid.goals["delay"][k], rel=1e-9)
        assert timing.distortion == pytest.approx(grid.goals["distortion"][k], rel=1e-9)
        assert reviewed.power.worst == pytest.approx(grid.goals["power"][k], rel=1e-9)


def empty_positions(winner: Winner) -> set[str]:
    """Checks that do not arise because a position is empty."""
    return {name for name, r in (("r_be_power", winner.r_be), ("r_shunt_power", winner.r_shunt)) if r is None}


@pytest.mark.parametrize("seed", range(10))
def test_extremes_of_light_say_as_much_as_all_of_it(seed):
    """The short way through the vertices, which the large comparisons use, finds what trying all of them finds."""
    rng = np.random.default_rng(5000 + seed)
    brief, coupler = random_links.brief(rng, "E3"), random_links.coupler(rng)
    brief = replace(brief, limits=replace(brief.limits, edge_time=None, delay=None, distortion=None, power=None))
    brief = shortened(rng, brief, (3, 4, 2, 1))
    whole, short = feasible_grid(brief, coupler), survey(brief, coupler)
    held = whole.feasible
    kept = short.feasible
    assert [whole.winner(k) for k in np.flatnonzero(held)] == [short.winner(k) for k in np.flatnonzero(kept)]
    for name, goal in whole.goals.items():
        assert short.goals[name][kept] == pytest.approx(goal[held], rel=1e-12)


@pytest.mark.parametrize("seed", [29, 44, 47, 17, 54])
def test_what_is_given_stays_within_the_first_goals_own_limit(seed):
    """With more given than the brief's own limit on the first goal leaves, the limit decides."""
    brief, couplers = case(seed)
    free = enumerate_best(brief, couplers)
    assert free.status == "feasible"
    name = brief.goal.minimize.name.lower()
    brief = replace(
        brief, limits=replace(brief.limits, **{name: 1.02 * free.first}), goal=replace(brief.goal, give=1.0)
    )
    expected, found = enumerate_best(brief, couplers), optopick.pick(brief, couplers=couplers)
    assert found.status is Status.OPTIMAL
    assert found.second.value == pytest.approx(expected.second, rel=1e-6)
