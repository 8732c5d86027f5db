"""One design, every check: what `check` prints and what every answer of the model must survive."""

from __future__ import annotations

from collections.abc import Collection

import numpy as np

from optopick.brief import Brief, Isolation
from optopick.coupler import Barrier, Coupler, Kind
from optopick.physics.led import branch_current, forward_voltage, led_current
from optopick.physics.saturation import load_current
from optopick.recheck import logic, transistor
from optopick.recheck.led_side import LedBranch, led_branch, led_checks
from optopick.recheck.stage import timing_checks
from optopick.recheck.vertices import Vertices, vertices, worst
from optopick.result import Check, Design, Power, Review

STAGES = {
    Kind.PHOTOTRANSISTOR: transistor.review_stage,
    Kind.DARLINGTON: transistor.review_stage,
    Kind.LOGIC: logic.review_stage,
}
"""How each kind of output is checked: the place to add a kind."""


def review(brief: Brief, coupler: Coupler, design: Design, nominal: Collection[str] = ()) -> Review:
    """Every check of `design` at its worst corner, its timing and its power; `nominal` as in `vertices`."""
    box = vertices(brief, coupler, design, nominal)
    branch = led_branch(brief, coupler, box)
    stage = STAGES[coupler.kind](brief, coupler, design, box, branch)
    timed, timing = timing_checks(brief, box, stage.times)
    checks = [
        *stage.checks,
        *timed,
        *led_checks(brief, coupler, design, box, branch),
        *_barrier_checks(box, coupler.barrier, brief.limits.isolation),
    ]
    worst_power = _power(brief, box, branch, stage.power)
    power = Power(_nominal_power(brief, coupler, design), float(np.max(worst_power)))
    if brief.limits.power is not None:
        checks.append(worst(box, "power", worst_power, brief.limits.power, "<=", "W"))
    return Review(design, tuple(checks), timing, power)


def review_parts(brief: Brief, coupler: Coupler, design: Design) -> tuple[Vertices, LedBranch]:
    """The box and the LED branch of a design, for those who look closer."""
    box = vertices(brief, coupler, design)
    return box, led_branch(brief, coupler, box)


def _power(brief: Brief, box: Vertices, branch: LedBranch, output_path: np.ndarray) -> np.ndarray:
    """Average power [W]: the LED path while lit, and the output path.

    Each path at its own worst temperature: within a resistor's drift of the common one, and a sum of two parts.
    """
    led_path = brief.signal.lit * (box.drive * branch.i_branch)
    return np.asarray(led_path.max(axis=0, keepdims=True) + output_path.max(axis=0, keepdims=True))


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


def _barrier_checks(box: Vertices, barrier: Barrier, needed: Isolation) -> list[Check]:
    pairs = (
        ("withstand", barrier.withstand, needed.withstand, "V"),
        ("working_voltage", barrier.working, needed.working, "V"),
        ("creepage", barrier.creepage, needed.creepage, "m"),
    )
    return [
        worst(box, name, np.nan if has is None else has, limit, ">=", unit)
        for name, has, limit, unit in pairs
        if limit is not None
    ]
