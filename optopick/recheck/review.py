"""One design, every check: what `check` prints and what every answer of the model must survive."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

import numpy as np

from optopick.brief import Brief, Isolation
from optopick.coupler import Barrier, Coupler, Kind
from optopick.physics.led import branch_current, forward_voltage, led_current
from optopick.physics.saturation import load_current
from optopick.physics.types import Array
from optopick.recheck import logic, transistor
from optopick.recheck.led_side import led_branch, led_checks
from optopick.recheck.measured import Measured
from optopick.recheck.stage import Times, timing_checks, worst_times
from optopick.recheck.vertices import Vertices, vertices, worst
from optopick.result import Design, Power, Review

STAGES = {
    Kind.PHOTOTRANSISTOR: transistor.review_stage,
    Kind.DARLINGTON: transistor.review_stage,
    Kind.LOGIC: logic.review_stage,
}
"""How each kind of output is checked: the place to add a kind."""


@dataclass(frozen=True)
class Evaluation:
    """A design wherever its box was filled: checks but for power, times [s], average power of both paths [W]."""

    checks: tuple[Measured, ...]
    times: Times
    led_power: Array
    output_power: Array


def evaluate(brief: Brief, coupler: Coupler, design: Design, box: Vertices, checks_only: bool = False) -> Evaluation:
    """Every check of a design at every point of a box: the vertices, or samples.

    checks_only: times that no check asks for need not be computed.
    """
    branch = led_branch(brief, coupler, box)
    stage = STAGES[coupler.kind](brief, coupler, design, box, branch, checks_only)
    checks = (
        *stage.checks,
        *timing_checks(brief, stage.times),
        *led_checks(brief, coupler, design, box, branch),
        *_barrier_checks(coupler.barrier, brief.limits.isolation),
    )
    return Evaluation(checks, stage.times, brief.signal.lit * (box.drive * branch.i_branch), stage.power)


def review(brief: Brief, coupler: Coupler, design: Design, nominal: Collection[str] = ()) -> Review:
    """Every check of `design` at its worst corner, its timing and its power; `nominal` as in `vertices`.

    Average power is the sum of both paths, each at its own worst temperature: within a resistor's drift of the common
    one, and a sum of two parts.
    """
    box = vertices(brief, coupler, design, nominal)
    found = evaluate(brief, coupler, design, box)
    power = found.led_power.max(axis=0, keepdims=True) + found.output_power.max(axis=0, keepdims=True)
    limited = [] if brief.limits.power is None else [Measured("power", power, brief.limits.power, "<=", "W")]
    checks = tuple(worst(box, measured) for measured in (*found.checks, *limited))
    told = Power(_nominal_power(brief, coupler, design), float(np.max(power)))
    return Review(design, checks, worst_times(brief, found.times), told)


def _nominal_power(brief: Brief, coupler: Coupler, design: Design) -> float:
    """Average power [W] of typical parts at 25 degC and mid supplies."""
    led, r_shunt = coupler.led, design.r_shunt or np.inf
    v = brief.drive.supply.middle
    r_total = design.r_led * design.pieces
    i_f = led_current(led, led.v_f_typ, v - brief.drive.drop.middle, r_total, 25.0, r_shunt)
    i_branch = branch_current(i_f, forward_voltage(led, led.v_f_typ, i_f, 25.0), r_shunt)
    v_cc = brief.output.supply.middle
    v_on = coupler.transistor.v_ce_sat if coupler.transistor else coupler.logic.v_ol if coupler.logic else 0.0
    i_cc = coupler.logic.i_cc if coupler.logic else 0.0
    i_load = load_current(v_cc, v_on, design.r_load)
    return float(brief.signal.lit * (v * i_branch + v_cc * i_load) + v_cc * i_cc)


def _barrier_checks(barrier: Barrier, needed: Isolation) -> list[Measured]:
    pairs = (
        ("withstand", barrier.withstand, needed.withstand, "V"),
        ("working_voltage", barrier.working, needed.working, "V"),
        ("creepage", barrier.creepage, needed.creepage, "m"),
    )
    return [
        Measured(name, np.nan if has is None else has, limit, ">=", unit)
        for name, has, limit, unit in pairs
        if limit is not None
    ]
