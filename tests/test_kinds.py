"""Couplers of every kind in one table: each wins where it is the best, and is asked only what applies to it."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import pytest
import random_links
from command import ROOT

from optopick.answers import Ranking
from optopick.brief import Brief, OutputCircuit
from optopick.coupler import Coupler, Kind
from optopick.errors import InputError
from optopick.model.kinds import MODELS, model_of
from optopick.read_brief import read_brief
from optopick.read_couplers import read_couplers
from optopick.recheck import review
from optopick.recheck.review import STAGES
from optopick.report.labels import CHECKS, check_label
from optopick.result import Design, Status
from optopick.uses.check import check_design
from optopick.uses.engine import ask_of
from optopick.uses.pick import pick
from optopick.uses.rank import rank
from optopick.uses.workers import Here

WINNERS = {
    "mixed_fast": Kind.LOGIC,
    "mixed_relay": Kind.DARLINGTON,
    "mixed_saver": Kind.PHOTOTRANSISTOR,
}

MIXED = (
    *("BRIM40-A", "BRIM48-T", "QUIL12-F", "PYRA60-H"),
    *("BRIM70-N", "TALLO7D-E", "PYRA75", "QUIL17-P"),
    *("QUIL31", "QUIL35", "TALLO61", "PYRA41"),
)
"""Four of each kind from the demo table, the winners among them."""

TRANSISTOR = {
    "led_current_low",
    "led_current_high",
    "deliverable_current",
    "ctr_margin",
    "collector_voltage",
    "collector_current",
}
LOGIC = {"switching_current", "sink_current", "supply_low", "supply_high"}
EITHER = {"led_dark", "output_low", "output_high", "output_power", "total_power", "r_load_power", "led_current"}
"""Checks of one kind of output alone, and some that every kind has."""


def example(name: str) -> Brief:
    return read_brief(ROOT / "examples" / f"{name}.toml")


@cache
def ranking(name: str) -> Ranking:
    """The mixed dozen ranked for an example."""
    brief = example(name)
    return rank(replace(brief, couplers=replace(brief.couplers, only=MIXED)), workers=Here())


@cache
def demo() -> dict[str, Coupler]:
    return {coupler.part: coupler for coupler in read_couplers(ROOT / "catalogs" / "demo.csv").couplers}


# ---- each kind has its brief ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(("name", "kind"), WINNERS.items())
def test_each_kind_wins_the_whole_table_in_one_of_three_briefs(name, kind):
    result = pick(example(name))
    assert result.status is Status.OPTIMAL
    assert demo()[result.design.coupler].kind is kind


@pytest.mark.parametrize(("name", "kind"), WINNERS.items())
def test_each_kind_leads_a_mixed_ranking(name, kind):
    found = ranking(name)
    assert found.complete
    assert found.ranked[0].coupler.kind is kind
    assert all(one.status is Status.OPTIMAL and one.review.passed for one in found.ranked)
    assert len({one.coupler.kind for one in found.ranked}) >= 2
    values = [one.objective.value for one in found.ranked]
    assert values == sorted(values)
    parts = {one.coupler.part for one in found.ranked} | {one.part for one in found.rejected}
    assert parts >= set(MIXED)


def test_every_kind_has_a_design_where_the_phototransistor_wins():
    assert {one.coupler.kind for one in ranking("mixed_saver").ranked} == set(Kind)


def test_a_brief_of_one_kind_has_the_winner_of_that_kind():
    """Taking the winning kind away leaves the best of the others in its place."""
    brief, first = example("mixed_saver"), ranking("mixed_saver").ranked
    others = [one for one in first if one.coupler.kind is not Kind.PHOTOTRANSISTOR]
    left = pick(brief, couplers=[demo()[p] for p in MIXED if demo()[p].kind is not Kind.PHOTOTRANSISTOR])
    assert left.design == others[0].review.design


# ---- a check that does not apply is absent, not passed --------------------------------------------------------------


def names_of(kind: Kind) -> set[str]:
    """Every check of any design of a kind in the mixed rankings."""
    designs = [one for name in WINNERS for one in ranking(name).ranked if one.coupler.kind is kind]
    assert designs
    return {check.name for one in designs for check in one.review.checks}


def test_transistor_checks_are_absent_from_logic_outputs():
    assert example("mixed_fast").limits.ctr_margin is not None
    assert not names_of(Kind.LOGIC) & (TRANSISTOR | {"r_be_power"})
    assert names_of(Kind.LOGIC) >= LOGIC | EITHER


@pytest.mark.parametrize("kind", [Kind.PHOTOTRANSISTOR, Kind.DARLINGTON])
def test_logic_checks_are_absent_from_transistors(kind):
    assert not names_of(kind) & LOGIC
    assert names_of(kind) >= TRANSISTOR | EITHER


def test_every_kind_specific_check_has_words():
    assert set(CHECKS) >= TRANSISTOR | LOGIC | EITHER


@pytest.mark.parametrize("seed", range(12))
def test_no_kind_answers_for_another_whatever_the_design(seed):
    """Random designs, most of them failing: still only the checks that apply, each once, and those of every limit."""
    rng = np.random.default_rng(seed)
    brief = random_links.brief(rng, circuit=OutputCircuit.PULL_UP)
    brief = replace(brief, limits=replace(brief.limits, ctr_margin=1.2, edge_time=1e-4, delay=1e-4))
    for coupler in random_links.mixed_couplers(rng):
        r_be = float(rng.choice([100e3, 470e3])) if coupler.base_pin else None
        design = Design(coupler.part, float(rng.choice([220, 680, 2.2e3])), float(rng.choice([1e3, 10e3])), r_be, None)
        found = [check.name for check in review(brief, coupler, design).checks]
        own, foreign = (LOGIC, TRANSISTOR) if coupler.kind is Kind.LOGIC else (TRANSISTOR, LOGIC)
        assert len(found) == len(set(found))
        assert set(found) >= own | EITHER | {"edge_time", "delay", "shortest_pulse"}
        assert not set(found) & foreign
        assert ("r_be_power" in found) == (r_be is not None)


def test_a_limit_that_is_not_stated_is_no_check():
    brief = example("mixed_saver")
    brief = replace(brief, limits=replace(brief.limits, ctr_margin=None, delay=None))
    design = next(one.review.design for one in ranking("mixed_saver").ranked)
    found = {check.name for check in review(brief, demo()[design.coupler], design).checks}
    assert not found & {"ctr_margin", "delay", "edge_time", "distortion", "power", "withstand", "input_current"}


@pytest.mark.parametrize("part", ["PYRA60-H", "QUIL17-P", "QUIL31"])
def test_the_model_has_no_row_of_another_kind(part):
    coupler, brief = demo()[part], example("mixed_fast")
    rows = set(model_of(brief, coupler).rows(ask_of(brief)).names)
    assert ("ctr_margin" in rows) == (coupler.kind is not Kind.LOGIC)
    assert not rows & LOGIC  # each of them concerns one position alone


def test_nobody_is_rejected_for_what_does_not_apply():
    foreign = {Kind.LOGIC: TRANSISTOR | {"r_be_power"}, Kind.DARLINGTON: LOGIC, Kind.PHOTOTRANSISTOR: LOGIC}
    told = [
        (demo()[one.part].kind, one.reason) for name in WINNERS for one in ranking(name).rejected if one.part in MIXED
    ]
    assert {kind for kind, _ in told} == set(Kind)
    for kind, reason in told:
        assert not [name for name in foreign[kind] if check_label(name) in reason], reason


# ---- what a kind cannot do ------------------------------------------------------------------------------------------


def test_a_logic_output_takes_no_emitter_load():
    brief = example("shortlist")
    brief = replace(brief, couplers=replace(brief.couplers, only=("QUIL31", "BRIM40-B")))
    result = pick(brief)
    assert result.design.coupler == "BRIM40-B"
    assert {one.part: one.reason for one in result.rejected}["QUIL31"] == (
        "a logic output pulls low only: it needs a pull-up"
    )


def test_a_logic_output_takes_no_base_resistor():
    for one in ranking("mixed_fast").ranked:
        assert one.review.design.r_be is None or demo()[one.coupler.part].base_pin
    with pytest.raises(InputError, match="base is not brought out"):
        check_design(example("mixed_fast"), Design("QUIL31", 680.0, 1e3, 100e3, None))


@pytest.mark.parametrize("kind", Kind)
def test_every_kind_has_its_one_place_in_model_and_recheck(kind):
    assert kind in MODELS
    assert kind in STAGES


# ---- a kind's own figures decide ------------------------------------------------------------------------------------


def passes(part: str, name: str, **changed: float) -> bool:
    """Whether a check holds for the part's best design once some of its logic figures are others."""
    brief = example("mixed_fast")
    design = next(one.review.design for one in ranking("mixed_fast").ranked if one.coupler.part == part)
    coupler = demo()[part]
    other = replace(coupler, logic=replace(coupler.logic, **changed))
    return next(check.passed for check in review(brief, other, design).checks if check.name == name)


@pytest.mark.parametrize(
    ("name", "column", "factor"),
    [
        ("switching_current", "i_f_on", 3.0),
        ("led_dark", "i_f_off", 0.001),
        ("sink_current", "i_ol", 0.3),
        ("output_low", "v_ol", 4.0),
        ("output_high", "i_oh", 400.0),
        ("supply_low", "v_cc_min", 1.7),
        ("supply_high", "v_cc_max", 0.9),
        ("output_power", "i_cc", 30.0),
    ],
)
def test_each_figure_of_a_logic_output_can_fail_its_check(name, column, factor):
    figure = getattr(demo()["QUIL31"].logic, column)
    assert passes("QUIL31", name)
    assert not passes("QUIL31", name, **{column: factor * figure})
