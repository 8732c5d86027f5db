"""Random briefs of every drive, three kinds of coupler each: answers hold, and random designs do not beat them."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache

import numpy as np
import pytest
import random_links

from optopick.brief import Brief, DriveCircuit, OutputCircuit, Position
from optopick.coupler import Coupler, Kind
from optopick.errors import DisagreementError
from optopick.recheck import review
from optopick.result import Design, Result, Status
from optopick.uses.engine import goal_of, unusable
from optopick.uses.pick import pick

BRIEFS, CHUNK = 60, 10
TRIES = 10
"""Random designs that are held against each answer."""


@dataclass(frozen=True)
class Case:
    """A random brief, its couplers, and the answer."""

    seed: int
    brief: Brief
    couplers: tuple[Coupler, ...]
    result: Result

    @property
    def winner(self) -> Coupler:
        return next(c for c in self.couplers if c.part == self.result.design.coupler)


def drawn(seed: int) -> tuple[np.random.Generator, Brief, tuple[Coupler, ...]]:
    """What a seed stands for: enough to find a case again."""
    rng = np.random.default_rng(seed)
    return rng, random_links.mixed_brief(rng), tuple(random_links.mixed_couplers(rng))


@cache
def case(seed: int) -> Case:
    _, brief, couplers = drawn(seed)
    try:
        return Case(seed, brief, couplers, pick(brief, couplers=couplers))
    except DisagreementError as error:
        raise AssertionError(f"seed {seed}: {error}") from error


def cases(chunk: int) -> Iterator[Case]:
    return (case(seed) for seed in range(chunk * CHUNK, (chunk + 1) * CHUNK))


@pytest.mark.parametrize("chunk", range(BRIEFS // CHUNK))
def test_every_answer_holds_when_checked_again(chunk):
    for one in cases(chunk):
        result = one.result
        if result.status is Status.INFEASIBLE:
            assert result.design is None
            continue
        assert result.status is Status.OPTIMAL, one.seed
        again = review(one.brief, one.winner, result.design)
        assert again.passed, (one.seed, again.failing)
        assert again == result.review
        assert result.objective.value == goal_of(again, one.brief.goal.minimize)
        assert result.objective.value <= result.objective.bound * (1 + one.brief.goal.give) * (1 + 1e-5)
        assert unusable(one.brief, one.winner) == ""


@pytest.mark.parametrize("chunk", range(BRIEFS // CHUNK))
def test_no_random_design_beats_the_answer_or_refutes_that_there_is_none(chunk):
    for one in cases(chunk):
        rng = np.random.default_rng(10_000 + one.seed)
        bound = one.result.objective.bound if one.result.objective else np.inf
        for coupler, design in tries(rng, one):
            reviewed = review(one.brief, coupler, design)
            if reviewed.passed:
                value = goal_of(reviewed, one.brief.goal.minimize)
                assert value >= bound * (1 - 1e-5), (one.seed, design, value, bound)


def tries(rng: np.random.Generator, one: Case) -> Iterator[tuple[Coupler, Design]]:
    """Random designs from the stock, and neighbours of the answer: of those many pass."""
    usable = [c for c in one.couplers if not unusable(one.brief, c)]
    for _ in range(TRIES if usable else 0):
        coupler = usable[int(rng.integers(len(usable)))]
        near = one.result.design if rng.random() < 0.5 else None
        if near is not None:
            coupler = one.winner
        yield coupler, design_near(rng, one.brief, coupler, near)


def design_near(rng: np.random.Generator, brief: Brief, coupler: Coupler, near: Design | None) -> Design:
    stock = brief.stock
    values = {name: drawn_value(rng, getattr(stock, name), near and getattr(near, name)) for name in POSITIONS}
    if not coupler.base_pin:
        values["r_be"] = None
    if near is not None and near.pieces > 1:
        # more ohms may need fewer pieces, and then the brief does not allow as many
        values["r_led"] = near.r_led
    diode = brief.drive.reverse_diode and brief.drive.reverse > coupler.led.v_r_max
    return Design(coupler.part, **values, pieces=near.pieces if near else 1, reverse_diode=diode)


POSITIONS = ("r_led", "r_load", "r_be", "r_shunt")


def drawn_value(rng: np.random.Generator, stock: Position | None, near: float | None) -> float | None:
    """A value of the stock, at most two steps from `near` where there is one."""
    if stock is None or (stock.absent and near is None and rng.random() < 0.5):
        return None
    if near is None:
        return float(rng.choice(stock.values))
    at = stock.values.index(near) + int(rng.integers(-2, 3))
    return stock.values[min(max(at, 0), len(stock.values) - 1)]


def test_about_half_have_a_design_and_every_kind_and_drive_comes_up():
    found = [case(seed) for seed in range(BRIEFS) if case(seed).result.design]
    assert 0.4 * BRIEFS <= len(found) <= 0.65 * BRIEFS
    kinds = Counter(one.winner.kind for one in found)
    drives = Counter(one.brief.drive.circuit for one in found)
    circuits = Counter(one.brief.output.circuit for one in found)
    assert set(kinds) == set(Kind)
    assert all(drives[circuit] >= 5 for circuit in DriveCircuit)
    assert all(circuits[circuit] >= 8 for circuit in OutputCircuit)


def test_the_field_inputs_differ_in_all_that_may_differ():
    """Shunt required, optional, not in stock; pieces; reverse with and without a diode; leaking and tight contacts."""
    briefs = [brief for seed in range(BRIEFS) for _, brief, _ in [drawn(seed)]]
    field = [brief for brief in briefs if brief.drive.circuit is DriveCircuit.FIELD]
    shunts = Counter(None if b.stock.r_shunt is None else b.stock.r_shunt.absent for b in field)
    assert set(shunts) == {None, True, False}
    assert {b.stock.r_led.pieces for b in field} == {1, 2, 3}
    assert {(b.drive.reverse > 0, b.drive.reverse_diode) for b in field} >= {(True, True), (True, False), (False, True)}
    assert {b.drive.off_current > 0 for b in field} == {True, False}
    assert {b.drive.on_current_min > 0 for b in field} == {True, False}


def test_some_answers_are_split_shunted_or_guarded_by_a_diode():
    designs = [case(seed).result.design for seed in range(BRIEFS) if case(seed).result.design]
    assert any(design.pieces > 1 for design in designs)
    assert any(design.r_shunt is not None for design in designs)
    assert any(design.reverse_diode for design in designs)
