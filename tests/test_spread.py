"""Units that differ in base-emitter voltage and storage: each end of a spread counts where it hurts."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import random_links

from optopick.brief import Brief, OutputCircuit
from optopick.coupler import Coupler
from optopick.model.kinds import model_of
from optopick.model.transistor import FAMILIES
from optopick.recheck import review
from optopick.result import Design
from optopick.uses.samples import sample

TIMES = ("edge_on", "edge_off", "storage", "delay_on", "delay_off", "distortion")


def link(seed: int, v_be_spread: float, tau_s_spread: float) -> tuple[Brief, Coupler]:
    """A random link with a base resistor and these spreads."""
    rng = np.random.default_rng(seed)
    brief = random_links.brief(rng, "E3", OutputCircuit.PULL_UP)
    stock = replace(brief.stock, r_be=random_links.position("E3", 47e3, 1e6))
    unit = random_links.coupler(rng)
    transistor = replace(unit.transistor, v_be_spread=v_be_spread, tau_s_spread=tau_s_spread)
    return replace(brief, stock=stock), replace(unit, base_pin=True, transistor=transistor)


def reviewed(seed: int, v_be_spread: float = 0.0, tau_s_spread: float = 1.0, r_be: float = 330e3):
    brief, unit = link(seed, v_be_spread, tau_s_spread)
    return review(brief, unit, Design(unit.part, 330.0, 22e3, r_be, None))


@pytest.mark.parametrize("seed", [8, 11, 12, 18, 19])
def test_a_spread_of_storage_makes_off_times_longer_and_no_other(seed):
    plain, wide = reviewed(seed).timing, reviewed(seed, tau_s_spread=1.5).timing
    assert wide.storage > plain.storage
    assert wide.delay_off > plain.delay_off
    assert (wide.edge_on, wide.edge_off, wide.delay_on) == (plain.edge_on, plain.edge_off, plain.delay_on)


@pytest.mark.parametrize("seed", [8, 11, 12, 18, 19])
def test_a_spread_of_base_voltage_helps_no_check_and_no_time(seed):
    plain, wide = reviewed(seed), reviewed(seed, v_be_spread=0.05)
    for name in TIMES:
        assert getattr(wide.timing, name) >= getattr(plain.timing, name) * (1 - 1e-12)
    for before, after in zip(plain.checks, wide.checks, strict=True):
        assert after.margin <= before.margin + 1e-12, before
    heat = {check.name: check.value for check in wide.checks}["r_be_power"]
    base = {check.name: check.value for check in plain.checks}["r_be_power"]
    assert heat > base


def test_without_a_base_resistor_the_base_voltage_changes_nothing():
    for seed in range(4):
        designs = [link(seed, spread, 1.0) for spread in (0.0, 0.05)]
        one, other = (review(b, u, Design(u.part, 680.0, 4700.0, None, None)).timing for b, u in designs)
        assert one == other


@pytest.mark.parametrize(("v_be_spread", "tau_s_spread"), [(0.05, 1.0), (0.0, 1.5)])
def test_samples_are_drawn_over_each_spread(v_be_spread, tau_s_spread):
    """The slowest of many samples is slower than without the spread, and no slower than the checks' own corner."""
    least = []
    for spreads in ((0.0, 1.0), (v_be_spread, tau_s_spread)):
        brief, unit = link(11, *spreads)
        design = Design(unit.part, 330.0, 22e3, 150e3, None)
        passing = {one.check: one.least for one in sample(brief, unit, design, count=20_000).checks}
        checked = {check.name: check.margin for check in review(brief, unit, design).checks}
        assert passing["shortest_pulse"] >= checked["shortest_pulse"]
        least.append(passing["shortest_pulse"])
    assert least[1] < least[0] - 0.01


def test_the_model_counts_the_same_ends_as_the_re_check():
    """Both directions of distortion among them: late when dark with long storage, late when lit with short."""
    lit_later = 0
    for seed in range(12):
        brief, unit = link(seed, 0.05, 1.5)
        model, short = model_of(brief, unit), model_of(*link(seed, 0.05, 1.0))
        i, j, m = (axis.ravel() for axis in np.meshgrid(*(np.arange(n) for n in model.sizes), indexing="ij"))
        found = model.scores(i, j, m).distortion
        on, off = (model._worst_times(f, i, model.candidates.load.swing.taken(j), m) for f in late_families())
        later = on.max(axis=(0, 1)) > off.max(axis=(0, 1))
        usable = np.flatnonzero(np.isfinite(found) & later)
        for k in usable[:: max(1, len(usable) // 3)]:
            r_led, pieces, shunt, r_load, r_be = model.values(int(i[k]), int(j[k]), int(m[k]))
            design = Design(
                unit.part,
                r_led,
                r_load,
                r_be if np.isfinite(r_be) else None,
                shunt if np.isfinite(shunt) else None,
                pieces,
            )
            checked = review(brief, unit, design).timing.distortion / brief.limits.timing_guard
            assert found[k] == pytest.approx(checked, rel=1e-9)
            lit_later += found[k] > short.scores(i[k : k + 1], j[k : k + 1], m[k : k + 1]).distortion[0] * (1 + 1e-6)
    assert lit_later > 3


def late_families():
    by_name = {family.name: family for family in FAMILIES}
    return by_name["late_on"], by_name["late_off"]
