"""The optimiser against full enumeration for every kind of coupler and every drive, and check against check.

Mixed tables under briefs of every drive: field contacts with shunt, leakage, least current, reverse voltage, and the LED
resistor in up to three pieces. `enumeration_kinds` shares no formula with the program.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import replace

import numpy as np
import pytest
import random_links
from enumeration import Winner
from enumeration_kinds import admitted, best_of_all, grid_of
from test_enumeration import shortened

import optopick
from optopick.brief import Brief, DriveCircuit, GoalName, Isolation
from optopick.coupler import Coupler, Kind
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
        brief = replace(brief, limits=replace(brief.limits, edge_time=None, delay=None, distortion=None, power=None))
    first = GOALS[(seed // 4) % 4]
    then = GOALS[(GOALS.index(first) + 1 + seed % 3) % 4]
    brief = replace(brief, goal=replace(brief.goal, minimize=first, then=then))
    if seed % 9 == 5:
        brief = replace(brief, limits=replace(brief.limits, isolation=Isolation(5000.0, 600.0, 7e-3)))
    couplers = random_links.mixed_couplers(rng)
    if seed % 5 == 2:
        couplers = [MAKERS[seed % 3](rng, "RND-A"), MAKERS[(seed // 3) % 3](rng, "RND-B")]
    return shortened(rng, brief, (9, 10, 3, 3)), couplers


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


TALLY: dict[int, Counter] = {}


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
