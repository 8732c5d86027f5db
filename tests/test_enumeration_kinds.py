"""The optimiser against full enumeration for every kind of coupler and every drive, and check against check.

Mixed tables under briefs of every drive: field contacts with shunt, leakage, least current, reverse voltage, and the
LED resistor in up to three pieces. `enumeration_kinds` shares no formula with the program.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import replace

import numpy as np
import pytest
import random_links
from enumeration import Winner
from enumeration_kinds import best_of_all, grid_of
from test_enumeration import shortened

import optopick
from optopick.brief import Brief, GoalName, Isolation, OutputCircuit
from optopick.coupler import Coupler, Kind
from optopick.model.kinds import model_of
from optopick.recheck import review
from optopick.result import Design, Status

SAME = 3e-6
CHUNKS, EACH = 10, 31
GOALS = list(GoalName)
MAKERS = (random_links.coupler, random_links.darlington, random_links.logic)


def case(seed: int) -> tuple[Brief, list[Coupler]]:
    """One random link and its table; drive, goals and size of the table by the seed so that each comes up."""
    rng = np.random.default_rng(70_000 + seed)
    draw = (random_links.mixed_brief, random_links.field_brief, random_links.mixed_brief, random_links.sink_brief)
    brief = draw[seed % 4](rng, "E12")
    if seed % 3:
        slow = replace(brief.signal, shortest_pulse=4 * brief.signal.shortest_pulse)
        limits = replace(brief.limits, edge_time=None, delay=None, distortion=None, power=None)
        brief = replace(brief, signal=slow, limits=limits)
    if seed % 12 == 1:
        brief = split_in_three(rng, brief)
    first = GOALS[(seed // 4) % 4]
    then = GOALS[(GOALS.index(first) + 1 + seed % 3) % 4]
    brief = replace(brief, goal=replace(brief.goal, minimize=first, then=then))
    if seed % 9 == 5:
        brief = replace(brief, limits=replace(brief.limits, isolation=Isolation(5000.0, 600.0, 7e-3)))
    couplers = random_links.mixed_couplers(rng)
    if seed % 5 == 2:
        couplers = [MAKERS[seed % 3](rng, "RND-A"), MAKERS[(seed // 3) % 3](rng, "RND-B")]
    return shortened(rng, brief, (9, 10, 3, 3)), couplers


def split_in_three(rng: np.random.Generator, brief: Brief) -> Brief:
    """Resistors of so few volts that some fields take three of them, some two, and the pulse of a slow contact."""
    r_led = random_links.rated(brief.stock.r_led, 0.4, float(rng.choice([13.0, 18.0])))
    drive = replace(brief.drive, off_current=0.0, off_voltage=0.5, on_current_min=0.0, reverse_diode=True)
    slow = replace(brief.signal, shortest_pulse=20e-3)
    return replace(brief, signal=slow, drive=drive, stock=replace(brief.stock, r_led=replace(r_led, pieces=3)))


def winner_of(design: Design) -> Winner:
    return Winner(design.coupler, design.r_led, design.r_load, design.r_be, design.r_shunt, design.pieces)


def agree(brief: Brief, couplers: list[Coupler]) -> Design | None:
    """Hold `pick` to enumeration; the design where one exists."""
    best, result = best_of_all(brief, couplers), optopick.pick(brief, couplers=couplers)
    if best.status == "infeasible":
        assert result.status is Status.INFEASIBLE, f"enumeration has no design, pick has {result.design}"
        assert result.design is None
        return None
    assert result.status is Status.OPTIMAL, f"{result.status}; enumeration has {best}"
    assert result.objective.bound == pytest.approx(best.first, rel=SAME)
    assert result.objective.value <= best.first * (1 + brief.goal.give) * (1 + SAME)
    assert result.second.value == pytest.approx(best.second, rel=SAME)
    assert result.second.bound == pytest.approx(best.second, rel=SAME)
    assert winner_of(result.design) in best.winners
    coupler = next(c for c in couplers if c.part == result.design.coupler)
    assert result.design.reverse_diode == (brief.drive.reverse > coupler.led.v_r_max)
    return result.design


@pytest.mark.parametrize("chunk", range(CHUNKS))
def test_random_links_of_every_kind(chunk):
    found = run_chunk(chunk)
    assert found["feasible"] >= 0.4 * EACH
    assert found["feasible"] < EACH
    for kind in Kind:
        assert found[kind] > 0, f"no {kind.value} wins"


def run_chunk(chunk: int) -> Counter:
    """Run a chunk of cases; what came up, counted."""
    found = Counter()
    for seed in range(chunk * EACH, (chunk + 1) * EACH):
        brief, couplers = case(seed)
        try:
            design = agree(brief, couplers)
        except AssertionError as error:
            raise AssertionError(f"seed {seed}: {error}") from error
        if design is None:
            continue
        kind = next(c.kind for c in couplers if c.part == design.coupler)
        found.update(["feasible", kind, brief.drive.circuit, (brief.drive.circuit, kind), f"{design.pieces} pieces"])
        found.update(["shunt"] * (design.r_shunt is not None) + ["diode"] * design.reverse_diode)
    return found


@pytest.mark.parametrize("seed", range(24))
def test_every_design_check_by_check(seed):
    """Not just the best: every design of a small grid has the same checks with the same room, and the same goals."""
    rng = np.random.default_rng(90_000 + seed)
    draw = (random_links.brief, random_links.sink_brief, random_links.field_brief)[seed % 3]
    brief = shortened(rng, draw(rng, "E3"), (3, 3, 2, 1))
    coupler = MAKERS[(seed // 3) % 3](rng, "RND-1")
    if coupler.kind is Kind.LOGIC:
        brief = replace(brief, output=replace(brief.output, circuit=OutputCircuit.PULL_UP))
    grid = grid_of(brief, coupler, every_vertex=True)
    diode = brief.drive.reverse_diode and brief.drive.reverse > coupler.led.v_r_max
    for k in range(len(grid.r_led)):
        design = Design(*grid.winner(k), reverse_diode=diode)
        reviewed = review(brief, coupler, design)
        fewest = grid.rooms.get("fewest_pieces", np.ones(len(grid.r_led)))[k] > 0
        assert (reviewed.passed and fewest) == grid.feasible[k]
        for check in reviewed.checks:
            room = float(grid.rooms[check.name][k])
            assert check.passed == (room >= -1e-9), check
            assert check.margin == pytest.approx(room, rel=1e-7, abs=1e-7) or not np.isfinite(check.margin), check
        others = set(grid.rooms) - {check.name for check in reviewed.checks} - {"fewest_pieces"}
        assert others <= {name for name in ("r_be_power", "r_shunt_power") if getattr(design, name[:-6]) is None}
        timing, goals = reviewed.timing, {name: goal[k] for name, goal in grid.goals.items()}
        told = {
            "edge time": max(timing.edge_on, timing.edge_off),
            "delay": max(timing.delay_on, timing.delay_off),
            "distortion": timing.distortion,
            "power": reviewed.power.worst,
        }
        # the logarithm towards what is left in the dark doubles and more a rounding in that
        assert told == pytest.approx(goals, rel=1e-7)


@pytest.mark.parametrize("margin", [None, 1.05])
@pytest.mark.parametrize("make", MAKERS[:2])
def test_no_design_drives_the_led_beyond_the_curve_of_its_ctr(make, margin):
    """The curve is not extrapolated upward: where every resistor in stock leads beyond its end there is no design."""
    rng = np.random.default_rng(2)
    brief = random_links.brief(rng, "E6", OutputCircuit.PULL_UP)
    coupler = replace(make(rng), base_pin=False)
    end, v = coupler.transfer.curve_i[-1], brief.drive.supply.high - brief.drive.drop.low - coupler.led.v_f_min
    r_led = random_links.rated(random_links.position("E24", 0.6 * v / end, 0.85 * v / end), 3.0, 200.0)
    limits = replace(brief.limits, ctr_margin=margin, edge_time=None, delay=None, distortion=None, power=None)
    brief = replace(
        brief,
        signal=replace(brief.signal, shortest_pulse=1.0),
        drive=replace(brief.drive, max_current=None, off_leakage=0.0),
        environment=replace(brief.environment, temperature=replace(brief.environment.temperature, high=50.0)),
        limits=limits,
        stock=replace(brief.stock, r_led=r_led, r_shunt=None),
    )
    assert agree(brief, [coupler]) is None


def test_pieces_are_spared_where_fewer_would_do():
    """One resistor where it bears the field, two where one does not, three where two do not: no more, no fewer."""
    rng = np.random.default_rng(4)
    brief, coupler = random_links.field_brief(rng), random_links.logic(rng, "RND-1")
    drive = replace(brief.drive, supply=replace(brief.drive.supply, low=23.0, high=25.0))
    for volts, pieces in ((30.0, {1}), (16.0, {2}), (9.0, {3}), (5.0, set())):
        series = replace(random_links.rated(random_links.position("E6", 1e3, 10e3), 5.0, volts), pieces=3)
        fine = replace(brief, drive=drive, stock=replace(brief.stock, r_led=series, r_shunt=None))
        grid = grid_of(fine, coupler)
        fits = np.all([grid.rooms[name] >= 0 for name in ("r_led_voltage", "fewest_pieces")], axis=0)
        assert set(grid.pieces[fits].tolist()) == pieces
        model = model_of(fine, coupler)
        keep = model.led.keep["r_led_voltage"] & model.led.keep["fewest_pieces"]
        assert set(model.led.pieces[keep].tolist()) == pieces
