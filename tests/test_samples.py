"""Random units: none inside the stated extremes fails what holds at the worst corner; the count is repeatable."""

from __future__ import annotations

import numpy as np
import pytest
import random_links

from optopick.recheck import review
from optopick.result import Design
from optopick.uses.samples import CHUNK, sample
from optopick.uses.workers import Here, Processes


def random_design(seed: int):
    """A brief, one of its couplers and a design from its stock, whether it passes or not."""
    rng = np.random.default_rng(seed)
    kinds = (random_links.coupler, random_links.coupler, random_links.darlington, random_links.logic)
    coupler = kinds[seed % 4](rng)
    drives = (random_links.brief, random_links.sink_brief, random_links.field_brief)
    circuit = "pull-up" if coupler.logic else None
    brief = drives[seed % 3](rng, "E12", circuit and random_links.OutputCircuit(circuit))
    stock = brief.stock
    some = {name: float(rng.choice(getattr(stock, name).values)) for name in ("r_led", "r_load")}
    r_be = float(rng.choice(stock.r_be.values)) if stock.r_be and coupler.base_pin else None
    r_shunt = float(rng.choice(stock.r_shunt.values)) if stock.r_shunt else None
    return brief, coupler, Design(coupler.part, **some, r_be=r_be, r_shunt=r_shunt)


@pytest.mark.parametrize("seed", range(52))
def test_no_sample_fails_what_holds_at_the_worst_corner(seed):
    brief, coupler, design = random_design(seed)
    reviewed = {check.name: check for check in review(brief, coupler, design).checks}
    drawn = sample(brief, coupler, design, count=20_000, normal=seed % 2 == 1, seed=seed)
    assert {passing.check for passing in drawn.checks} == set(reviewed)
    for passing in drawn.checks:
        check = reviewed[passing.check]
        if check.passed:
            assert passing.passed == drawn.count, (
                f"{passing.check}: worst corner {check.margin}, sample {passing.least}"
            )
        if np.isfinite(check.margin):
            assert passing.least >= check.margin - 1e-6 * max(1.0, abs(check.margin)), passing.check


def test_failing_checks_fail_in_some_samples():
    """The samples see what the worst corner sees: of the checks that fail there some fail in samples too."""
    seen = 0
    for seed in range(12):
        brief, coupler, design = random_design(seed)
        failing = {check.name for check in review(brief, coupler, design).failing}
        drawn = sample(brief, coupler, design, count=5_000, seed=seed)
        seen += sum(passing.passed < drawn.count for passing in drawn.checks if passing.check in failing)
        assert drawn.good <= min(passing.passed for passing in drawn.checks)
    assert seen > 5


def test_workers_and_chunks_do_not_change_the_answer():
    brief, coupler, design = random_design(0)
    count = 9 * CHUNK + 17
    once = sample(brief, coupler, design, count=count, workers=Here())
    assert once == sample(brief, coupler, design, count=count, workers=Processes(3))
    assert once.count == count
    assert all(sum(passing.histogram) == count for passing in once.checks)
