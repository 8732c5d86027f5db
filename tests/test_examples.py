"""Every brief in examples/ has a proved design that holds, and says what it is."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from command import ROOT

import optopick
from optopick.brief import Brief, GoalName
from optopick.read_brief import read_brief
from optopick.read_couplers import read_couplers
from optopick.recheck import review
from optopick.result import Result, Status

EXAMPLES = sorted((ROOT / "examples").glob("*.toml"))
PICKED: dict[Path, tuple[Brief, Result]] = {}


@pytest.fixture(params=EXAMPLES, ids=lambda path: path.stem)
def picked(request: pytest.FixtureRequest) -> tuple[Brief, Result]:
    """An example and its answer, found once."""
    if request.param not in PICKED:
        brief = read_brief(request.param)
        PICKED[request.param] = (brief, optopick.pick(brief))
    return PICKED[request.param]


def test_there_is_one_for_each_use():
    goals = {read_brief(path).goal.minimize for path in EXAMPLES}
    assert {GoalName.EDGE_TIME, GoalName.POWER} <= goals
    assert any(read_brief(path).couplers.only for path in EXAMPLES)


def test_the_best_is_proved(picked):
    brief, result = picked
    assert result.status is Status.OPTIMAL
    assert result.objective.name == brief.goal.minimize
    assert result.objective.value <= result.objective.bound * (1 + brief.goal.give) * (1 + 1e-5)
    assert result.second.value == pytest.approx(result.second.bound, rel=1e-5)


def test_it_holds_when_checked_again(picked):
    brief, result = picked
    coupler = next(c for c in read_couplers(brief.couplers.table).couplers if c.part == result.design.coupler)
    again = review(brief, coupler, result.design)
    assert again.passed
    assert again == result.review
    assert len(again.checks) >= 15


def test_it_uses_the_stock(picked):
    brief, result = picked
    for name in ("r_led", "r_load", "r_be", "r_shunt"):
        ohms, stock = getattr(result.design, name), getattr(brief.stock, name)
        if ohms is None:
            assert stock is None or stock.absent or name == "r_be"
        else:
            assert ohms in stock.values


def test_it_keeps_its_cautions(picked):
    _, result = picked
    assert any("not safety" in caution for caution in result.cautions)


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.stem)
def test_it_is_said_to_be_invented_and_is_explained(path):
    text = path.read_text(encoding="utf-8")
    comment = text[: text.index("\ntitle")]
    assert comment.startswith("# ")
    assert re.search(r"\binvented\b", comment)
    assert f"[{path.name}]({path.name})" in (ROOT / "examples" / "README.md").read_text(encoding="utf-8")
