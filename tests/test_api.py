"""The names of the package, as the README uses them."""

from __future__ import annotations

from dataclasses import replace

import pytest
from brief_samples import FIELD
from command import ROOT

import optopick
from optopick.coupler import Kind
from optopick.read_brief import brief_from_text
from optopick.result import NOT_CHOSEN, Status
from optopick.uses.check import check_design, design_from_text


@pytest.mark.parametrize("name", optopick.__all__)
def test_every_name_is_there(name):
    assert callable(getattr(optopick, name))


@pytest.mark.parametrize("kind", [str, lambda path: path])
def test_paths_may_be_strings(kind):
    brief = optopick.load_brief(kind(ROOT / "tests/golden/tiny.toml"))
    couplers = optopick.load_couplers(kind(brief.couplers.table)).couplers
    found = optopick.pick(brief, couplers=couplers)
    assert found.status is Status.OPTIMAL
    assert optopick.review(brief, next(c for c in couplers if c.part == found.design.coupler), found.design).passed


@pytest.mark.parametrize("kind", list(Kind))
def test_only_the_kinds_asked_for(kind):
    brief = optopick.load_brief(ROOT / "examples/mixed_relay.toml")
    kinds = {coupler.part: coupler.kind for coupler in optopick.load_couplers(brief.couplers.table).couplers}
    found = optopick.pick(replace(brief, couplers=replace(brief.couplers, kinds=(kind.value,))))
    assert found.status is Status.OPTIMAL
    assert kinds[found.design.coupler] is kind
    others = {one.part for one in found.rejected if one.reason == NOT_CHOSEN}
    assert others == {part for part, other in kinds.items() if other is not kind}


def test_a_brief_names_the_kinds(tmp_path):
    (tmp_path / "parts.csv").touch()
    brief = brief_from_text(FIELD, tmp_path / "link.toml")
    assert brief.couplers.kinds == ("phototransistor", "darlington")


def test_a_check_says_that_the_brief_would_not_take_the_coupler():
    brief = optopick.load_brief(ROOT / "examples/fastest.toml")
    told = check_design(brief, design_from_text("QUIL31", {"r_led": "680", "r_load": "390"}))
    assert told.notes == ("the brief would not take QUIL31: not among the brief's couplers",)
    none = check_design(brief, design_from_text("PYRA60-H", {"r_led": "270", "r_load": "13k", "r_be": "47k"}))
    assert none.notes == ()
