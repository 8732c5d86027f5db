"""Checks of a transistor output (single or darlington): saturation, leakage, heat, timing, power."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from optopick.brief import Brief, OutputCircuit
from optopick.corners import thresholds
from optopick.coupler import Coupler, Kind, Transfer, Transistor
from optopick.physics import switching
from optopick.physics.charge import Base, Load
from optopick.physics.heat import derated, output_dissipation, resistor_derated
from optopick.physics.leakage import dark_current, dark_current_held, raised
from optopick.physics.saturation import load_current, sheet_point, v_ce_on_load_line, v_ce_saturated
from optopick.physics.transfer import (
    base_led_current,
    collector_current,
    led_current_for,
    light_factor,
    relative_ctr,
    temperature_factor,
)
from optopick.physics.types import Array
from optopick.recheck.led_side import DARK_FRACTION, LedBranch
from optopick.recheck.load_side import load_checks
from optopick.recheck.measured import Measured
from optopick.recheck.stage import StageReview, Times
from optopick.recheck.vertices import Vertices, rating_of
from optopick.result import Design


@dataclass(frozen=True)
class Stage:
    """The output stage at every vertex; see the glossary of optopick.physics.

    i_ceo: dark current [A]; i_dark: LED current that would carry it [A]; i_rest: that and what the dark LED keeps [A].
    """

    h: Array
    eta: Array
    h_fe: Array
    v_be: Array
    i_eff: Array
    i_be: Array
    i_ceo: Array
    i_dark: Array
    i_rest: Array
    i_input: float
    j_s: Array
    i_sat: Array
    v_il: Array
    v_ih: Array


def parts_of(coupler: Coupler) -> tuple[Transfer, Transistor]:
    """Transfer and transistor of a coupler with a transistor output."""
    if coupler.transfer is None or coupler.transistor is None:
        raise ValueError(f"{coupler.part} has no transistor output")
    return coupler.transfer, coupler.transistor


def review_stage(
    brief: Brief, coupler: Coupler, design: Design, box: Vertices, branch: LedBranch, checks_only: bool = False
) -> StageReview:
    """Every check, the times and the power of a transistor output; checks_only: see `evaluate`."""
    s = stage(brief, coupler, box, branch)
    checks = [
        *static_checks(brief, coupler, box, branch, s),
        *rating_checks(brief, coupler, design, box, branch, s),
    ]
    return StageReview(tuple(checks), times(brief, coupler, box, s, checks_only), brief.signal.lit * box.v_cc * s.j_s)


def stage(brief: Brief, coupler: Coupler, box: Vertices, branch: LedBranch, dark: float = 1.0) -> Stage:
    """Evaluate the output stage at every vertex; `dark`: share of the sheet's largest dark current that flows [1]."""
    transfer, transistor = parts_of(coupler)
    h = temperature_factor(transfer, box.t)
    ctr_mid = np.sqrt(transfer.ctr_min * transfer.ctr_max)
    eta = ctr_mid / transistor.h_fe * light_factor(transfer, box.t) * box.light
    v_be = transistor.v_be + transistor.v_be_tc * (box.t - 25.0)
    output = brief.output
    pulled_up = output.circuit is OutputCircuit.PULL_UP
    i_input = max(output.input_leakage, output.input_current_low) if pulled_up else output.input_leakage
    j_s = load_current(box.v_cc, transistor.v_ce_sat, box.r_load, i_input)
    i_ceo = dark_current(transistor.i_ceo_1, transistor.t_1, transistor.i_ceo_2, transistor.t_2, box.t)
    i_dark = dark * led_current_for(transfer, box.ctr, h, i_ceo)
    return Stage(
        h=h,
        eta=eta,
        h_fe=box.ctr * h / eta,
        v_be=v_be,
        i_eff=branch.i_f * branch.light,
        i_be=base_led_current(v_be + box.v_be, box.r_be, eta),
        i_ceo=i_ceo,
        i_dark=i_dark,
        i_rest=(branch.i_off + i_dark) * raised(box.v_cc),
        i_input=i_input,
        j_s=j_s,
        i_sat=led_current_for(transfer, box.ctr, h, j_s),
        v_il=thresholds(output.v_il, output.supply, box.v_cc),
        v_ih=thresholds(output.v_ih, output.supply, box.v_cc),
    )


def static_checks(brief: Brief, coupler: Coupler, box: Vertices, branch: LedBranch, s: Stage) -> list[Measured]:
    """Curve, dark LED, deliverable current, CTR margin and both output levels."""
    transfer, _ = parts_of(coupler)
    top = np.minimum(derated(coupler.led.i_max, box.t), transfer.curve_i[-1])
    most = collector_current(transfer, box.ctr, s.h, top)
    drive = collector_current(transfer, box.ctr, s.h, s.i_eff - s.i_be)
    checks = [
        Measured("led_current_low", branch.i_f, transfer.curve_i[0], ">=", "A"),
        Measured("led_current_high", branch.i_f, transfer.curve_i[-1], "<=", "A"),
        Measured("led_dark", branch.i_off, DARK_FRACTION * transfer.i_ref, "<=", "A"),
        Measured("deliverable_current", s.j_s, most, "<=", "A"),
    ]
    if brief.limits.ctr_margin is not None:
        checks.append(Measured("ctr_margin", drive / s.j_s, brief.limits.ctr_margin, ">=", "1"))
    on = _v_ce(coupler, box, s, drive)
    off = _off_current(coupler, box, branch, s) + _input_off(brief)
    noise = brief.output.noise_margin
    if brief.output.circuit is OutputCircuit.PULL_UP:
        low, high = on, box.v_cc - off * box.r_load
    else:
        low, high = off * box.r_load, box.v_cc - on
    checks.append(Measured("output_low", low, s.v_il - noise, "<=", "V"))
    checks.append(Measured("output_high", high, s.v_ih + noise, ">=", "V"))
    return checks


def _v_ce(coupler: Coupler, box: Vertices, s: Stage, drive: Array) -> Array:
    """Collector-emitter voltage on [V]: where the transistor's saturation curve meets the load line.

    The sheet's own figure, moved by current and heat, wherever the drive there is at least the sheet's.
    """
    sheet = sheet_point(*parts_of(coupler), coupler.kind is Kind.DARLINGTON)
    v_sat = v_ce_saturated(sheet, s.j_s, box.t)
    wide = np.broadcast_arrays(drive, v_sat, s.h_fe, box.v_cc, box.r_load, box.t)
    found = np.array(wide[1])
    weak = drive < sheet.overdrive * load_current(box.v_cc, v_sat, box.r_load, s.i_input)
    if np.any(weak):
        mask = np.broadcast_to(weak, found.shape)
        j, v, h_fe, v_cc, r_load, t = (part[mask] for part in wide)
        found[mask] = v_ce_on_load_line(v, sheet.overdrive, j, h_fe, sheet.beta_r, t, v_cc, r_load, s.i_input)
    found[np.isnan(wide[0])] = np.nan  # beyond the CTR curve nothing is known
    return found


def _input_off(brief: Brief) -> float:
    """What the receiver adds to the leakage when the output is off [A]."""
    output = brief.output
    if output.circuit is OutputCircuit.PULL_UP:
        return output.input_leakage
    return max(output.input_leakage, output.input_current_low)


def _off_current(coupler: Coupler, box: Vertices, branch: LedBranch, s: Stage) -> Array:
    """Collector current when off [A]: dark current, and what the light that is left adds to it, both at full supply.

    Below the CTR curve the light counts by the curve's first point or by its slope, whichever gives more.
    """
    transfer, _ = parts_of(coupler)
    dark = dark_current_held(s.i_ceo, s.eta * s.i_dark, box.r_be)
    g = relative_ctr(transfer, np.clip(branch.i_off, transfer.curve_i[0], transfer.curve_i[-1]))
    both = collector_current(transfer, box.ctr, s.h, np.minimum(branch.i_off + s.i_dark, transfer.curve_i[-1]))
    lit = np.maximum(box.ctr * s.h * g * branch.i_off, both - s.i_ceo)
    return np.asarray((dark + lit) * raised(box.v_cc))


def rating_checks(
    brief: Brief, coupler: Coupler, design: Design, box: Vertices, branch: LedBranch, s: Stage
) -> list[Measured]:
    """Voltages, currents and dissipations of the output and of its resistors."""
    _, transistor = parts_of(coupler)
    heat = output_dissipation(box.v_cc, box.r_load, s.i_input)
    checks = [
        Measured("collector_voltage", box.v_cc, transistor.v_ceo, "<=", "V"),
        Measured("collector_current", s.j_s, transistor.i_c_max, "<=", "A"),
        Measured("output_power", heat, derated(coupler.p_out, box.t), "<=", "W"),
        Measured("total_power", branch.i_f * branch.v_f + heat, derated(coupler.p_total, box.t), "<=", "W"),
        *load_checks(brief, design, box),
    ]
    if design.r_be is not None:
        _, power, _ = rating_of(brief, "r_be", design.r_be)
        heat_be = (s.v_be + box.v_be) ** 2 / box.r_be
        checks.append(Measured("r_be_power", heat_be, resistor_derated(power, box.t), "<=", "W"))
    return checks


def times(brief: Brief, coupler: Coupler, box: Vertices, s: Stage, checks_only: bool = False) -> Times:
    """Edges, storage and delays at every vertex, without guard [s]; storage as in sheets, until 10 % of the swing.

    checks_only: no storage, and distortion only where it has a limit.
    """
    transfer, transistor = parts_of(coupler)
    base, load = _charged(brief, transistor, box, s)
    carried = box.ctr * s.h
    skewed = not checks_only or brief.limits.distortion is not None
    swung = switching.swing(base, load, transfer, carried, *_fractions(brief, transistor, box, s), early=skewed)
    tau_s, lit = transistor.tau_s * box.storage, (s.eta, s.i_eff, s.i_be)
    distortion, storage = np.zeros(1), np.zeros(1)
    if skewed:
        # times are multiplied by the guard in the end: of a difference only the longer delay is meant
        guard = brief.limits.timing_guard
        late_off = switching.late_off(swung, tau_s, *lit, s.i_rest, guard)
        distortion = np.maximum(late_off, switching.late_on(swung, tau_s, *lit, guard))
    if not checks_only:
        tenth = switching.steps(base, load, transfer, carried, switching.FIRST_TENTH)
        held = switching.storage(tau_s, s.i_eff, s.i_be, swung.i_sat, swung.hold, s.i_rest)
        storage = held + switching.edge_off(tenth, switching.FIRST_TENTH, s.i_be, s.i_rest)
    return Times(
        edge_on=switching.edge_on(swung.edge, s.i_eff - s.i_be, swung.i_sat),
        edge_off=switching.edge_off(swung.edge, switching.EDGE, s.i_be, s.i_rest),
        storage=storage,
        delay_on=switching.delay_on(swung, *lit),
        delay_off=switching.delay_off(swung, tau_s, s.i_eff, s.i_be, s.i_rest),
        distortion=distortion,
    )


def _charged(brief: Brief, transistor: Transistor, box: Vertices, s: Stage) -> tuple[Base, Load]:
    """Base and load of the switching formulas at every vertex."""
    gain = transistor.h_fe
    base = Base(transistor.tau_0 / gain, transistor.c_m / gain, transistor.c_be, s.v_be, s.eta)
    swing = box.v_cc - transistor.v_ce_sat
    return base, Load(s.j_s, box.v_cc, swing, box.r_load, brief.output.capacitance, box.t)


def _fractions(brief: Brief, transistor: Transistor, box: Vertices, s: Stage) -> tuple[Array, Array]:
    """Share of the swing from rest until the receiver has surely seen the change, turning on and turning off [1]."""
    swing = box.v_cc - transistor.v_ce_sat
    if brief.output.circuit is OutputCircuit.PULL_UP:
        on, off = (box.v_cc - s.v_il) / swing, (s.v_ih - transistor.v_ce_sat) / swing
    else:
        on, off = s.v_ih / swing, 1.0 - s.v_il / swing
    return np.maximum(on, 0.0), np.clip(off, 0.0, 1.0 - 1e-9)
