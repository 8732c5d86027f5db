"""Charge control in steps: the switching formulas of optopick.physics.switching, with what moves the charge spelt out.

As there, drive and load are LED currents: `i_eff` the light, `i_be` what the base resistor takes of it. The swing is
cut at a few levels x, shares of the load current j_s from 0 (output at rest) to 1 (output at its end). At each level
the sheet's CTR curve gives the LED current i(x) that carries x*j_s, and `base_charge` the charge q(x) in the base.
Between two levels the charge is taken as linear in i, so a step from a to b lasts, turning on with n = i_eff - i_be,

    tau*ln[(n - i_a)/(n - i_b)],   tau = (q_b - q_a)/(eta*(i_b - i_a)) + r_load*c_load

and turning off tau*ln[(i_b + i_be)/(i_a + i_be)]: one step and a constant tau give the formulas of `switching`. A sum
of steps still depends on the light and the base resistor through n or i_be alone, so a limit on it still is one number
per load value, found by Newton's method (`drive_for_edge_on`, `drive_for_crossing_on`, `extraction_for`).
Source: charge control (Ebers and Moll 1954; Moll, Proc. IRE 42 (1954) 1773); junction charge as in Gummel and Poon,
Bell System Technical Journal 49 (1970) 827.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import TypeVar

import numpy as np

from optopick.coupler import Transfer
from optopick.physics.led import thermal_voltage
from optopick.physics.transfer import led_current_for
from optopick.physics.types import Array, Real

V_J, M_J = 0.7, 0.37
"""Built-in voltage [V] and grading exponent [1] of the collector junction: between the abrupt (1/2) and the linearly
graded junction (1/3), silicon. Fitted once over all devices of the record."""

J_V_BE = 2e-3
"""Collector current [A] at which a base-emitter voltage of 0.65 V is right for a small transistor (from memory)."""

STEPS = 3
"""Steps of an edge or of a delay: 12 differ from 3 by about 2 %, 1 by 8 %."""

ITERATIONS, SAFE, LEAST_RISE = 20, 1.0 + 1e-12, 1e-13
"""Of Newton's method; factor that keeps its result on the safe side; least drive beyond the highest level [1]."""

FIRST = 0.05
"""Share of the load current at which charging the base ends and the first step begins."""


@dataclass(frozen=True)
class Base:
    """What charges the base of a unit.

    transit: forward transit time [s], tau_0/h_fe; c_cb: collector-base capacitance at 0 V [F]; c_be: of the emitter
    junction [F], taken as constant; v_be: base-emitter voltage at J_V_BE [V]; eta: base photocurrent over LED
    current [1].
    """

    transit: Real
    c_cb: Real
    c_be: Real
    v_be: Real
    eta: Real


@dataclass(frozen=True)
class Load:
    """What the output drives: load current at the end of the swing [A], supply and swing [V], load resistor [ohm] and
    capacitance [F] of the output node, ambient [degC]."""

    j_s: Real
    v_cc: Real
    swing: Real
    r_load: Real
    c_load: Real
    t: Real


Given = TypeVar("Given", Base, Load)


@dataclass(frozen=True)
class Steps:
    """Steps from one level to the next, on the last axis: time constants [s], LED currents of the lower and the upper
    level [A], base-emitter voltage over v_be [1], and the least time of each [s], that of the output node alone.

    lag: what the load capacitance adds to the base's charge, as LED current times time squared [A s2]: `crossing_on`.
    """

    tau: Array
    i_low: Array
    i_high: Array
    hold: Array
    least: Array
    lag: Array


def base_voltage(base: Base, j: Real, t: Real) -> Array:
    """Base-emitter voltage at collector current `j` [A]: v_be + (kT/q)*ln(j/J_V_BE) [V]. Broadcasts."""
    return np.asarray(base.v_be + thermal_voltage(t) * np.log(np.asarray(j) / J_V_BE))


def junction_charge(c_0: Real, v: Real) -> Array:
    """Charge of a graded junction between 0 V and the reverse voltage `v` [C].

    c_0*V_J/(1 - M_J)*[(1 + v/V_J)^(1 - M_J) - 1]; forward of V_J/2 on with the capacitance there. c_0 [F], v [V].
    Broadcasts. Source: the depletion charge of the Gummel-Poon model.
    """
    v = np.asarray(v, dtype=float)
    u = 1.0 + np.maximum(v, -V_J / 2) / V_J
    beyond = np.minimum(v + V_J / 2, 0.0) * 0.5**-M_J
    return np.asarray(c_0 * (V_J / (1.0 - M_J) * (u ** (1.0 - M_J) - 1.0) + beyond))


def base_charge(base: Base, load: Load, x: Real) -> Array:
    """Charge that the base has taken up from rest to level `x` > 0 [C].

    transit*x*j_s + c_be*v_b + the charge of the collector junction between v_cc and v_cc - x*swing - v_b, with v_b of
    `base_voltage`. The same for a pull-up and for an emitter load. Broadcasts.
    """
    j = np.asarray(x) * load.j_s
    v_b = base_voltage(base, j, load.t)
    v_cb = load.v_cc - np.asarray(x) * load.swing - v_b
    collector = junction_charge(base.c_cb, load.v_cc) - junction_charge(base.c_cb, v_cb)
    return np.asarray(base.transit * j + base.c_be * v_b + collector)


@dataclass(frozen=True)
class Cut:
    """Where the swing is cut: from share `first` to share `last` [1], ascending, in `count` steps of equal ratio."""

    first: Real
    last: Real
    count: int


def steps(base: Base, load: Load, transfer: Transfer, carried: Real, cut: Cut) -> Steps:
    """Steps of a swing; carried: CTR at the test current times h [1].

    Where the CTR curve does not reach the highest level the time constants are infinite, and so is every time.
    Broadcasts; the steps lie on a new last axis.
    """
    lag = base.transit * load.c_load * load.swing * (np.asarray(cut.last) - cut.first) / base.eta
    base, load, carried = _stretched(base), _stretched(load), np.asarray(carried)[..., None]
    x = _levels(cut)
    q = base_charge(base, load, x) / base.eta
    i = led_current_for(transfer, carried, 1.0, x * load.j_s)
    reached = np.isfinite(i[..., -1:])
    i = np.where(reached, i, x * transfer.curve_i[-1])
    rc = np.asarray(load.r_load) * load.c_load
    v = base_voltage(base, x * load.j_s, load.t) / base.v_be
    return Steps(
        tau=np.where(reached, np.diff(q) / np.diff(i) + rc, np.inf),
        i_low=i[..., :-1],
        i_high=i[..., 1:],
        hold=np.asarray((v[..., 1:] + v[..., :-1]) / 2),
        least=np.asarray(rc * np.diff(np.log(x))),
        lag=np.asarray(lag),
    )


def _stretched(x: Given) -> Given:
    """The same with a last axis of length one behind every array."""
    return replace(x, **{f.name: np.asarray(getattr(x, f.name))[..., None] for f in fields(x)})


def _levels(cut: Cut) -> Array:
    """Shares of the swing on a new last axis."""
    first, last = (np.asarray(end, dtype=float)[..., None] for end in (cut.first, cut.last))
    return np.asarray(first * (last / first) ** np.linspace(0.0, 1.0, cut.count + 1))


def time_on(s: Steps, n: Real) -> Array:
    """Time from the lowest to the highest level as the LED lights [s]: sum of tau*ln[(n - i_low)/(n - i_high)].

    n = i_eff - i_be [A]. Infinite where n does not pass the highest level. Broadcasts.
    """
    n, last = np.asarray(n, dtype=float)[..., None], s.i_high[..., -1:]
    passes = n > last
    safe = np.where(passes, n, 2.0 * last)
    time = np.sum(s.tau * np.log((safe - s.i_low) / (safe - s.i_high)), axis=-1)
    return np.asarray(np.where(passes[..., 0], time, np.inf))


def time_off(s: Steps, i_be: Real) -> Array:
    """Time from the highest to the lowest level as the transistor lets go [s].

    Sum of max(tau*ln[(i_high + b)/(i_low + b)], least), b = hold*i_be: however hard the base resistor pulls, the output
    node follows no faster than its own resistor and capacitance. Broadcasts.
    """
    b = s.hold * np.asarray(i_be)[..., None]
    return np.asarray(np.sum(np.maximum(s.tau * np.log((s.i_high + b) / (s.i_low + b)), s.least), axis=-1))


def edge_on(s: Steps, n: Real, i_sat: Real) -> Array:
    """10 to 90 % of the swing as the LED lights [s], `s` cut from 0.1 to 0.9: `time_on`; where the drive does not
    saturate the output, as long as at the edge of saturation. Infinite where n <= 0. Broadcasts."""
    n = np.asarray(n, dtype=float)
    return np.asarray(np.where(n > 0, time_on(s, np.maximum(n, i_sat)), np.inf))


def charging(base: Base, load: Load, i_eff: Real, i_be: Real) -> Array:
    """Time from rest to the level FIRST [s]: the photocurrent less the base resistor's share fills `base_charge`.

    q/(eta*i_be)*ln[i_eff/(i_eff - i_be)], which is q/(eta*i_eff) without a base resistor. Infinite where
    i_be >= i_eff. Broadcasts.
    """
    i, b = np.asarray(i_eff, dtype=float), np.asarray(i_be, dtype=float)
    share = np.clip(b / i, 1e-9, 1.0 - 1e-15)
    time = base_charge(base, load, FIRST) / (base.eta * i) * -np.log1p(-share) / share
    return np.asarray(np.where(b < i, time, np.inf))


def crossing_on(s: Steps, n: Real) -> Array:
    """Time from the level FIRST to a threshold as the LED lights [s], `s` cut from FIRST to the threshold.

    The load capacitance draws c_load*swing*dx/dt more current, which takes transit times that more charge: the time
    t' = t + lag/(n*t') solves to t/2 + sqrt(t^2/4 + lag/n), t = `time_on`. An edge from 10 to 90 % needs no such
    term: the output already moves when it begins. Broadcasts.
    """
    t = time_on(s, n)
    n = np.maximum(np.asarray(n, dtype=float), s.i_high[..., -1])
    return np.asarray(t / 2 + np.sqrt(t * t / 4 + s.lag / n))


def held(tau_s: Real, i_eff: Real, i_be: Real, i_sat: Real, hold: Real) -> Array:
    """Time in saturation after the LED is dark [s]: tau_s*ln[i_eff/(i_sat + hold*i_be)], at least 0.

    hold: base-emitter voltage at the load's current over v_be [1]. The output has not moved yet when it ends: the time
    to 10 % of the swing is this and `time_off` from 1 to 0.9. Broadcasts.
    """
    left = np.asarray(i_sat) + hold * np.asarray(i_be)
    return np.asarray(tau_s * np.log(np.maximum(np.asarray(i_eff) / left, 1.0)))


def drive_for_edge_on(s: Steps, time: Real, i_sat: Real) -> Array:
    """Least n [A] with edge_on <= time; 0 where the edge of saturation is fast enough. Broadcasts."""
    return np.asarray(np.where(time_on(s, i_sat) <= time, 0.0, _least_drive(s, time, 0.0)))


def drive_for_crossing_on(s: Steps, time: Real) -> Array:
    """Least n [A] with crossing_on <= time; infinite for time <= 0. Broadcasts."""
    return _least_drive(s, time, s.lag)


def _least_drive(s: Steps, time: Real, lag: Real) -> Array:
    """Least n [A] with time_on + lag/(n*time) <= time, by Newton's method, within a part in 1e12 and never below.

    The left side is convex and falls with n, so from a point too small the iterates climb to the answer. What the
    last step alone needs, i_high + (i_high - i_low)/(exp(time/tau) - 1), is such a point.
    """
    t, last = np.asarray(time, dtype=float), s.i_high[..., -1]
    possible = (t > 0) & np.all(np.isfinite(s.tau), axis=-1)
    t, tau = np.where(possible, t, 1.0), np.where(possible[..., None], s.tau, 1.0)
    width = s.i_high - s.i_low
    n = last + np.maximum(width[..., -1] / np.expm1(np.minimum(t / tau[..., -1], 500.0)), last * LEAST_RISE)
    for _ in range(ITERATIONS):
        above = n[..., None] - s.i_high
        late = np.sum(tau * np.log1p(width / above), axis=-1) + lag / (n * t) - t
        slope = np.sum(tau * width / (above * (above + width)), axis=-1) + lag / (n * n * t)
        n = n + np.maximum(late, 0.0) / slope
    return np.asarray(np.where(possible, n * SAFE, np.inf))


def extraction_for(s: Steps, time: Real) -> Array:
    """Least i_be [A] with time_off <= time: 0 where none is needed, infinite where none is enough. Broadcasts.

    By Newton's method from 0, within a part in 1e12 and never below: time_off is convex and falls with i_be.
    """
    t = np.asarray(time, dtype=float)
    possible = (t > np.sum(s.least, axis=-1)) & np.all(np.isfinite(s.tau), axis=-1)
    tau = np.where(possible[..., None], s.tau, 1.0)
    i_be = np.zeros(possible.shape)
    for _ in range(ITERATIONS):
        low, high = (i + s.hold * i_be[..., None] for i in (s.i_low, s.i_high))
        step = tau * np.log(high / low)
        late = np.sum(np.maximum(step, s.least), axis=-1) - t
        slope = np.sum(np.where(step > s.least, tau * s.hold * (high - low) / (low * high), 0.0), axis=-1)
        i_be = i_be + np.maximum(late, 0.0) / np.where(slope > 0, slope, np.inf)
    return np.asarray(np.where(time_off(s, 0.0) <= t, 0.0, np.where(possible, i_be * SAFE, np.inf)))


EDGE, FIRST_TENTH = Cut(0.1, 0.9, STEPS), Cut(0.9, 1.0, 1)


@dataclass(frozen=True)
class PlainRow:
    """Data sheet row of the output not saturated: both edges [s] and their load."""

    t_r: float
    t_f: float
    load: Load


@dataclass(frozen=True)
class SaturatedRow:
    """Data sheet row of the output saturated: storage and turn-off time [s], LED current [A] and their load."""

    t_s: float
    t_off: float
    i_f: float
    load: Load


def constants(known: Base, plain: PlainRow, saturated: SaturatedRow, transfer: Transfer, carried: float) -> Base:
    """The base that reproduces both rows: transit and c_cb found; c_be, v_be, eta as known.

    Every time is linear in the charges: its values for transit alone and for c_cb alone make two equations, the longer
    edge of the plain row and t_off - t_s of the saturated one. A result that is not positive says that the rows
    contradict each other.
    """
    none, transit, c_cb = (replace(known, transit=x, c_cb=y) for x, y in ((0.0, 0.0), (1.0, 0.0), (0.0, 1.0)))

    def both(base: Base) -> Array:
        off = time_off(_cut(base, saturated, EDGE, transfer, carried), 0.0)
        return np.array([_plain_edge(base, plain, transfer, carried), float(off)])

    rest = both(none)
    per = np.array([both(transit) - rest, both(c_cb) - rest]).T
    found = np.linalg.solve(per, np.array([max(plain.t_r, plain.t_f), saturated.t_off - saturated.t_s]) - rest)
    return replace(known, transit=float(found[0]), c_cb=float(found[1]))


def constants_of_plain(known: Base, plain: PlainRow, transfer: Transfer, carried: float) -> Base:
    """The base that reproduces the plain row alone: transit found, the rest as known, c_cb too."""
    rest, more = (_plain_edge(replace(known, transit=x), plain, transfer, carried) for x in (0.0, 1.0))
    return replace(known, transit=(max(plain.t_r, plain.t_f) - rest) / (more - rest))


def storage_constant(base: Base, saturated: SaturatedRow, transfer: Transfer, carried: float) -> float:
    """tau_s [s]: what t_s leaves after the first tenth of the recovery, in which t_s ends, over ln(i_f/i_sat)."""
    i_sat = led_current_for(transfer, carried, 1.0, saturated.load.j_s)
    first_tenth = time_off(_cut(base, saturated, FIRST_TENTH, transfer, carried), 0.0)
    return float((saturated.t_s - first_tenth) / np.log(saturated.i_f / i_sat))


def zero_bias(c_cb: Real, v: Real) -> Array:
    """Collector-base capacitance at 0 V [F] from that at reverse voltage `v` [V]: c_cb*(1 + v/V_J)^M_J. Broadcasts."""
    return np.asarray(c_cb * (1.0 + np.asarray(v) / V_J) ** M_J)


def _cut(base: Base, row: PlainRow | SaturatedRow, where: Cut, transfer: Transfer, carried: float) -> Steps:
    return steps(base, row.load, transfer, carried, where)


def _plain_edge(base: Base, row: PlainRow, transfer: Transfer, carried: float) -> float:
    """The edge of the plain row that the sheet has as the longer one [s]; on, the light just carries the current."""
    edge = _cut(base, row, EDGE, transfer, carried)
    if row.t_f > row.t_r:
        return float(time_off(edge, 0.0))
    return float(time_on(edge, led_current_for(transfer, carried, 1.0, row.load.j_s)))
