"""Checks of a logic output: LED currents that switch it, levels, sink current, supply, heat, timing, power."""

from __future__ import annotations

import numpy as np

from optopick.brief import Brief
from optopick.corners import thresholds
from optopick.coupler import Coupler, Logic
from optopick.physics.heat import derated
from optopick.physics.logic_output import discharge, rise_delay, rise_edge
from optopick.physics.saturation import load_current
from optopick.physics.types import Array
from optopick.recheck.led_side import LedBranch
from optopick.recheck.load_side import load_checks
from optopick.recheck.measured import Measured
from optopick.recheck.stage import StageReview, Times
from optopick.recheck.vertices import Vertices
from optopick.result import Design


def review_stage(
    brief: Brief, coupler: Coupler, design: Design, box: Vertices, branch: LedBranch, checks_only: bool = False
) -> StageReview:
    """Every check, the times and the power of a logic output; its times are too quick to leave any out."""
    logic = logic_of(coupler)
    i_sink = load_current(box.v_cc, logic.v_ol, box.r_load, _input_on(brief))
    heat = box.v_cc * logic.i_cc + logic.v_ol * i_sink
    checks = [
        *_level_checks(brief, logic, box, branch, i_sink),
        Measured("supply_low", box.v_cc, logic.v_cc_min, ">=", "V"),
        Measured("supply_high", box.v_cc, logic.v_cc_max, "<=", "V"),
        Measured("output_power", heat, derated(coupler.p_out, box.t), "<=", "W"),
        Measured("total_power", branch.i_f * branch.v_f + heat, derated(coupler.p_total, box.t), "<=", "W"),
        *load_checks(brief, design, box),
    ]
    power = box.v_cc * logic.i_cc + brief.signal.lit * box.v_cc * i_sink
    return StageReview(tuple(checks), _times(brief, logic, box), power)


def logic_of(coupler: Coupler) -> Logic:
    """The logic output of a coupler that has one."""
    if coupler.logic is None:
        raise ValueError(f"{coupler.part} has no logic output")
    return coupler.logic


def _input_on(brief: Brief) -> float:
    return max(brief.output.input_leakage, brief.output.input_current_low)


def _level_checks(brief: Brief, logic: Logic, box: Vertices, branch: LedBranch, i_sink: Array) -> list[Measured]:
    output = brief.output
    v_il = thresholds(output.v_il, output.supply, box.v_cc)
    v_ih = thresholds(output.v_ih, output.supply, box.v_cc)
    high = box.v_cc - (logic.i_oh + output.input_leakage) * box.r_load
    return [
        Measured("switching_current", branch.i_f * branch.light, logic.i_f_on, ">=", "A"),
        Measured("led_dark", branch.i_off, logic.i_f_off, "<=", "A"),
        Measured("sink_current", i_sink, logic.i_ol, "<=", "A"),
        Measured("output_low", logic.v_ol, v_il - output.noise_margin, "<=", "V"),
        Measured("output_high", high, v_ih + output.noise_margin, ">=", "V"),
    ]


def _times(brief: Brief, logic: Logic, box: Vertices) -> Times:
    """Times at every vertex; the sheet gives only the longest delays, so either may be near zero beside the other."""
    output = brief.output
    c = output.capacitance
    swing = box.v_cc - logic.v_ol
    fraction = np.clip((thresholds(output.v_ih, output.supply, box.v_cc) - logic.v_ol) / swing, 0.0, 1.0 - 1e-9)
    late = discharge(logic, box.v_cc, c)
    delay_on, delay_off = logic.t_phl + late, rise_delay(logic, box.r_load, c, fraction)
    return Times(
        edge_on=np.asarray(logic.t_f + late),
        edge_off=rise_edge(logic, box.r_load, c),
        storage=np.zeros_like(box.v_cc),
        delay_on=np.asarray(delay_on),
        delay_off=delay_off,
        distortion=np.asarray(np.maximum(delay_on, delay_off)),
    )
