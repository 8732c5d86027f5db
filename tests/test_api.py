"""The names of the package, as the README uses them."""

from __future__ import annotations

import pytest
from command import ROOT

import optopick
from optopick.result import Status


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
