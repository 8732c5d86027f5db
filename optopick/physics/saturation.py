"""The output on: load current, overdrive, and how low the collector-emitter voltage goes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from optopick.coupler import Transfer, Transistor
from optopick.physics.led import thermal_voltage
from optopick.physics.transfer import collector_current
from optopick.physics.types import Array, Real

NO_DRIVE = 1e-18
"""Collector current that stands for none [A]."""

STEPS_TO_MEET, MEETS = 100, 1e-12
"""Of `v_ce_on_load_line`: the most steps, and the last step at which it stops [V]."""


def load_current(v_cc: Real, v_ce: Real, r_load: Real, i_input: Real = 0.0) -> Array:
    """Current the output must carry at `v_ce` [A]: (v_cc - v_ce)/r_load + i_input.

    Voltages [V], r_load > 0 [ohm], i_input: what the receiver adds [A]. Broadcasts.
    """
    return np.asarray((np.asarray(v_cc) - v_ce) / np.asarray(r_load) + i_input)


def smallest_load(v_cc: Real, v_ol: Real, ctr: Real, i_f: Real, i_l: Real) -> Array:
    """Smallest load resistor that still saturates [ohm]: (v_cc - v_ol)/(ctr*i_f - i_l).

    ctr: in saturation [1], currents [A], voltages [V]; infinite where the drive does not even cover `i_l`.
    Broadcasts. Source: Vishay application note 45.
    """
    left = np.asarray(ctr) * i_f - i_l
    return np.asarray(np.where(left > 0, (np.asarray(v_cc) - v_ol) / np.where(left > 0, left, 1.0), np.inf))


def smallest_base_resistor(v_be: Real, h_fe: Real, r_load: Real, i_cb: Real, v_swing: Real) -> Array:
    """Base-emitter resistor below which the output no longer saturates [ohm].

    v_be*h_fe*r_load/(i_cb*h_fe*r_load - v_swing): the photocurrent `i_cb` [A] less v_be/r_be, times h_fe, carries
    v_swing/r_load. Infinite where the light alone does not saturate. Broadcasts. Source: Vishay application note 45.
    """
    left = np.asarray(i_cb) * h_fe * r_load - v_swing
    return np.asarray(np.where(left > 0, np.asarray(v_be) * h_fe * r_load / np.where(left > 0, left, 1.0), np.inf))


def saturation_shape(overdrive: Real, h_fe: Real, beta_r: float) -> Array:
    """Argument of the Ebers-Moll saturation logarithm [1]: (1/alpha_r + x/beta_r)/(1 - x/h_fe), x = h_fe/overdrive.

    overdrive > 1: base current over what the load needs [1]. v_ce differs by (kT/q)*ln of the ratio of two of these.
    Broadcasts. Source: Ebers and Moll, Proc. IRE 42 (1954) 1761.
    """
    y = 1.0 / np.asarray(overdrive)
    inverse_alpha = (1.0 + beta_r) / beta_r
    return np.asarray((inverse_alpha + y * np.asarray(h_fe) / beta_r) / (1.0 - y))


def v_ce_on(v_ce_sat: Real, overdrive_sheet: Real, overdrive: Real, h_fe: Real, beta_r: float, t: Real) -> Array:
    """Collector-emitter voltage on [V]: the sheet's figure from the sheet's overdrive up, more below it.

    v_ce_sat + (kT/q)*max(0, ln(shape(overdrive)/shape(overdrive_sheet))); infinite for overdrive <= 1.
    Broadcasts. See `saturation_shape`.
    """
    k = np.asarray(overdrive, dtype=float)
    safe = np.where(k > 1, k, 2.0)
    ratio = saturation_shape(safe, h_fe, beta_r) / saturation_shape(overdrive_sheet, h_fe, beta_r)
    return np.asarray(np.where(k > 1, v_ce_sat + thermal_voltage(t) * np.maximum(np.log(ratio), 0.0), np.inf))


def v_ce_on_load_line(  # noqa: PLR0913, PLR0917 - the transistor's and the load line's quantities
    v_ce_sat: Real,
    overdrive_sheet: float,
    drive: Real,
    h_fe: Real,
    beta_r: float,
    t: Real,
    v_cc: Real,
    r_load: Real,
    i_input: float,
) -> Array:
    """Collector-emitter voltage where `v_ce_on` meets the load line [V], from 0 to v_cc, to within MEETS.

    v = v_ce_on(drive/load_current(v)): the left side rises, the right side falls, so there is one such v. drive [A]:
    collector current that the light could drive. By Newton's method, and by halving where that leaves the bracket.
    Broadcasts.
    """
    parts = np.broadcast_arrays(*(np.asarray(x, dtype=float) for x in (v_ce_sat, drive, h_fe, t, v_cc, r_load)))
    floor, drive, h_fe, t, v_cc, r_load = parts
    drive = np.maximum(drive, NO_DRIVE)
    v_t, slope, inverse_alpha = thermal_voltage(t), 1.0 / (r_load * drive), (1.0 + beta_r) / beta_r
    sheet = saturation_shape(overdrive_sheet, h_fe, beta_r)
    low, high, v = np.zeros_like(floor), np.array(v_cc), np.minimum(floor, v_cc)
    for _ in range(STEPS_TO_MEET):
        y = load_current(v_cc, v, r_load, i_input) / drive
        left, lost = inverse_alpha + y * h_fe / beta_r, 1.0 - y
        carries = lost > 0
        rise = v_t * np.log(left / (np.where(carries, lost, 1.0) * sheet))
        above = np.where(carries, floor + np.maximum(rise, 0.0) - v, np.inf)
        low, high = np.where(above > 0, v, low), np.where(above > 0, high, v)
        fall = np.where(rise > 0, v_t * slope * (h_fe / beta_r / left + 1.0 / np.where(carries, lost, 1.0)), 0.0)
        guess = v + np.where(carries, above, 0.0) / (1.0 + fall)
        inside = carries & (guess >= low) & (guess <= high)
        moved = np.where(inside, guess, (low + high) / 2)
        if np.all(np.abs(moved - v) <= MEETS):
            return np.asarray(moved)
        v = moved
    return np.asarray(v)


def overdrive_to_hold(v_ce: Real, v_ce_sat: Real, overdrive_sheet: Real, h_fe: Real, beta_r: float, t: Real) -> Array:
    """Overdrive that holds the output at `v_ce` or lower [1]: the inverse of `v_ce_on`.

    Above 1, towards 1 for high v_ce. Infinite where v_ce < v_ce_sat: the sheet does not promise it at any drive.
    Broadcasts.
    """
    room = (np.asarray(v_ce, dtype=float) - v_ce_sat) / thermal_voltage(t)
    reach = np.exp(np.clip(room, 0.0, 500.0)) * saturation_shape(overdrive_sheet, h_fe, beta_r)
    inverse_alpha = (1.0 + beta_r) / beta_r
    overdrive = (np.asarray(h_fe) / beta_r + reach) / (reach - inverse_alpha)
    return np.asarray(np.where(room < -1e-9, np.inf, overdrive))


def junction_part(overdrive_sheet: float, h_fe: float, beta_r: float, v_inner: float) -> float:
    """What the junctions account for of a sheet's v_ce_sat at 25 degC [V]: v_inner + (kT/q)*ln(saturation_shape).

    overdrive_sheet > 1: at the sheet's point [1] (at or below 1: v_inner alone); h_fe, beta_r [1]; v_inner: voltage of
    the first transistor's base in a darlington, else 0 [V].
    """
    if overdrive_sheet <= 1:
        return v_inner
    shape = float(saturation_shape(overdrive_sheet, h_fe, beta_r))
    return v_inner + float(thermal_voltage(25.0)) * float(np.log(shape))


def rise_with_heat(overdrive_sheet: float, h_fe: float, beta_r: float, t: Real) -> Array:
    """By how much a sheet's v_ce_sat of 25 degC is larger when hot [V]: (k/q)*max(0, t - 25)*ln(saturation_shape).

    The junctions' part goes with absolute temperature; below 25 degC the sheet's figure stays. overdrive_sheet, h_fe,
    beta_r as in `junction_part` (no rise for overdrive_sheet <= 1), t [degC]. Broadcasts. See `saturation_shape`.
    """
    if overdrive_sheet <= 1:
        return np.zeros_like(np.asarray(t, dtype=float))
    shape = float(saturation_shape(overdrive_sheet, h_fe, beta_r))
    return np.asarray((thermal_voltage(np.maximum(t, 25.0)) - thermal_voltage(25.0)) * np.log(shape))


def rise_with_current(v_ce_sat: float, i_c: Real, i_c_sheet: float, v_junctions: float = 0.0) -> Array:
    """The sheet's v_ce_sat [V] carried to a larger collector current: flat up to `i_c_sheet` [A], then rising.

    v_ce_sat + max(0, v_ce_sat - v_junctions)*max(0, i_c/i_c_sheet - 1). A rule of this program on the safe side: all
    that `junction_part` does not account for is resistance. Broadcasts.
    """
    resistive = max(v_ce_sat - v_junctions, 0.0)
    return np.asarray(v_ce_sat + resistive * np.maximum(np.asarray(i_c) / i_c_sheet - 1.0, 0.0))


@dataclass(frozen=True)
class SheetPoint:
    """Where a sheet states the output's saturation voltage.

    v_ce_sat: the largest [V], at collector current i_c [A] and 25 degC; overdrive: of the weakest unit there [1]; h_fe,
    beta_r: of a typical one [1]; v_inner: as in `junction_part` [V].
    """

    v_ce_sat: float
    i_c: float
    overdrive: float
    h_fe: float
    beta_r: float
    v_inner: float


def sheet_overdrive(transfer: Transfer, transistor: Transistor) -> float:
    """Overdrive of the weakest unit at the saturation row of the sheet [1]: what it could carry over what it does."""
    return float(collector_current(transfer, transfer.ctr_min, 1.0, transistor.sat_i_f)) / transistor.sat_i_c


def sheet_point(transfer: Transfer, transistor: Transistor, darlington: bool) -> SheetPoint:
    """The saturation row of a coupler's sheet; a darlington's output lies above the first transistor's base."""
    return SheetPoint(
        v_ce_sat=transistor.v_ce_sat,
        i_c=transistor.sat_i_c,
        overdrive=sheet_overdrive(transfer, transistor),
        h_fe=transistor.h_fe,
        beta_r=transistor.beta_r,
        v_inner=transistor.v_be / 2 if darlington else 0.0,
    )


def v_ce_saturated(p: SheetPoint, i_c: Real, t: Real) -> Array:
    """The sheet's v_ce_sat [V] at collector current `i_c` [A] and `t` [degC]: rise_with_current + rise_with_heat."""
    junctions = junction_part(p.overdrive, p.h_fe, p.beta_r, p.v_inner)
    carried = rise_with_current(p.v_ce_sat, i_c, p.i_c, junctions)
    return np.asarray(carried + rise_with_heat(p.overdrive, p.h_fe, p.beta_r, t))
