"""How fast the output follows: charge control (Ebers and Moll 1954; Moll, Proc. IRE 42 (1954) 1773), in steps.

Drive and load are LED currents (see the package glossary): `i_eff` the light, `i_be` what the base resistor takes of
it. The swing is cut at a few levels x, shares of the load current j_s from 0 (output at rest) to 1 (output at its end).
At each level the sheet's CTR curve gives the LED current i(x) that carries x*j_s, and `base_charge` the charge q(x) in
the base. Between two levels the charge is taken as linear in i, so a step from a to b lasts, turning on with
n = i_eff - i_be,

    tau*ln[(n - i_a)/(n - i_b)],   tau = (q_b - q_a)/(eta*(i_b - i_a)) + r_load*c_load

and turning off tau*ln[(i_b + b)/(i_a + b)], b = i_be - i_rest: light left in the dark LED and the dark current, as LED
current i_rest, hold the output up. One step and a constant gain make the textbook formulas: 10 to 90 %
in tau*ln[(n - 0.1*i_sat)/(n - 0.9*i_sat)], and tau*ln 9 off without a base resistor. A sum of steps still depends on
light and base resistor through n or i_be alone, so a limit on it is one number for each load value, found by Newton's
method: `drive_for_edge_on`, `drive_for_crossing_on`, `extraction_for`.

Compared with circuit simulation of 1,800 random circuits over 26 device models: see tests/reference.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from optopick.coupler import Transfer
from optopick.physics.charge import FIRST, Base, Load, base_charge, base_voltage, base_voltage_of_log
from optopick.physics.transfer import led_current_for, led_current_of_log
from optopick.physics.types import Array, Real

Index = tuple[Any, ...]
"""Whatever numpy takes as an index over the loads."""

LN9 = float(np.log(9.0))
"""10 to 90 % of an exponential, in time constants: ln 9 = 2.197."""

STEPS = 3
"""Steps of an edge or of a delay: 12 differ from 3 by about 2 %, 1 by 8 %."""

ITERATIONS, CONVERGED = 30, 1e-13
"""Of Newton's method: the most, and the share of the time asked at which it stops."""

NEAR = 1e-3
"""The same where a bound will do: the method comes from the side on which it asks too little."""

SAFE, LEAST_RISE = 1.0 + 1e-11, 1e-13
"""Factor that keeps a result of Newton's method on the safe side; least drive beyond the highest level [1]."""

TINY = 1e-12
"""Least current on which a logarithm is taken, as a share of the step's highest."""

HALVINGS = 6
"""Of a bisection that may stay below its answer."""


@dataclass(frozen=True)
class Cut:
    """Where the swing is cut: from share `first` to share `last` [1], ascending, in `count` steps of equal ratio."""

    first: Real
    last: Real
    count: int


EDGE, FIRST_TENTH = Cut(0.1, 0.9, STEPS), Cut(0.9, 1.0, 1)


@dataclass(frozen=True)
class Steps:
    """Steps from one level to the next, on the first axis.

    tau: time constants [s]; i_low, i_high: LED currents of the lower and the upper level [A]; hold: base-emitter
    voltage over v_be [1]; least: the least time of each turning off, that of the output node alone [s]. Without that
    axis: lag, what the load capacitance adds to the base's charge, as LED current times time squared [A s2].
    """

    tau: Array
    i_low: Array
    i_high: Array
    hold: Array
    least: Array
    lag: Array

    def at(self, index: Index) -> Steps:
        """The steps of some of the loads, by an index behind the steps' own axis."""
        along = (slice(None), *index)
        return Steps(
            tau=self.tau[along],
            i_low=self.i_low[along],
            i_high=self.i_high[along],
            hold=self.hold[along],
            least=self.least[along],
            lag=self.lag[index],
        )

    def taken(self, values: Array) -> Steps:
        """The steps of some of the values on the last axis."""
        return self.at((..., values))

    def over(self, shape: tuple[int, ...]) -> Steps:
        """The same broadcast to loads of a shape."""
        names = ("tau", "i_low", "i_high", "hold", "least")
        wide = {name: np.broadcast_to(getattr(self, name), (len(self.tau), *shape)) for name in names}
        return Steps(**wide, lag=np.broadcast_to(self.lag, shape))


def steps(base: Base, load: Load, transfer: Transfer, carried: Real, cut: Cut) -> Steps:
    """Steps of a swing; carried: CTR at the test current times h [1].

    Where the CTR curve does not reach the highest level the time constants are infinite, and so is every time.
    Broadcasts; the steps lie on a new first axis.
    """
    x, log_x = _levels(cut, np.asarray(load.j_s * np.asarray(carried)).ndim)
    log_j = np.log(load.j_s) + log_x
    i = led_current_of_log(transfer, log_j - np.log(carried))
    reached = np.isfinite(i[-1:])
    if not reached.all():
        i = np.where(reached, i, x * transfer.curve_i[-1])
    v_b = base_voltage_of_log(base, log_j, load.t)
    q, v = base_charge(base, load, x, v_b) / base.eta, v_b / base.v_be
    rc = np.asarray(load.r_load) * load.c_load
    shape = np.broadcast_shapes(q.shape, i.shape, rc.shape, v.shape)
    q, i, v = (np.broadcast_to(part, shape) for part in (q, i, v))
    return Steps(
        tau=np.where(reached, np.diff(q, axis=0) / np.diff(i, axis=0) + rc, np.inf),
        i_low=i[:-1],
        i_high=i[1:],
        hold=np.asarray((v[1:] + v[:-1]) / 2),
        least=np.broadcast_to(rc * np.diff(log_x, axis=0), (shape[0] - 1, *shape[1:])),
        lag=np.broadcast_to(_lag(base, load, cut), shape[1:]),
    )


def _lag(base: Base, load: Load, cut: Cut) -> Array:
    return np.asarray(base.transit * load.c_load * load.swing * (np.asarray(cut.last) - cut.first) / base.eta)


def _levels(cut: Cut, dimensions: int) -> tuple[Array, Array]:
    """Shares of the swing on a new first axis, before `dimensions` others, and their logarithms."""
    first, last = np.asarray(cut.first, dtype=float), np.asarray(cut.last, dtype=float)
    step = np.log(last / first) / cut.count
    at = np.arange(cut.count + 1.0).reshape(-1, *(1,) * max(dimensions, first.ndim, last.ndim))
    ratio = np.exp(step)
    levels = [np.broadcast_to(first, np.broadcast_shapes(ratio.shape, at.shape[1:]))]
    for _ in range(cut.count):
        levels.append(levels[-1] * ratio)
    x = np.stack(levels)
    return x, np.log(first) + at * step


def time_on(s: Steps, n: Real) -> Array:
    """Time from the lowest to the highest level as the LED lights [s]: sum of tau*ln[(n - i_low)/(n - i_high)].

    n = i_eff - i_be [A]. Infinite where n does not pass the highest level. Broadcasts.
    """
    n, last = np.asarray(n, dtype=float), s.i_high[-1]
    passes = n > last
    safe = np.where(passes, n, 2.0 * last)
    time = np.sum(s.tau * np.log((safe - s.i_low) / (safe - s.i_high)), axis=0)
    return np.asarray(np.where(passes, time, np.inf))


def time_off(s: Steps, i_be: Real, i_rest: Real = 0.0) -> Array:
    """Time from the highest to the lowest level as the transistor lets go [s].

    Sum of max(tau*ln[(i_high + b)/(i_low + b)], least), b = hold*i_be - i_rest: however hard the base resistor pulls,
    the output node follows no faster than its own resistor and capacitance. i_rest: LED current that the light left and
    the dark current amount to [A]; infinite where it holds the output above the lowest level. Broadcasts.
    """
    b = s.hold * np.asarray(i_be) - i_rest
    falls = s.i_low + b > 0
    low = np.where(falls, s.i_low + b, 1.0)
    step = np.where(falls, s.tau * np.log(np.where(falls, s.i_high + b, 1.0) / low), np.inf)
    return np.asarray(np.sum(np.maximum(step, s.least), axis=0))


def edge_off(s: Steps, cut: Cut, i_be: Real, i_rest: Real) -> Array:
    """Time from share cut.last to share cut.first of the way down to the state of rest [s]; `s` cut by `cut`.

    As `time_off`, but where i_rest exceeds hold*i_be by n, at the least hold, the output comes to rest at the share r
    of the load current that n carries, and each level x becomes y = r + x*(1 - r). With i going as x^a between the
    levels, a step's ratio i_high/i_low grows by (y_b^a - r^a)/(y_a^a - r^a)*(x_a/x_b)^a, and its time constant, charge
    over LED current, by (1 - r)*(x_b^a - x_a^a)/(y_b^a - y_a^a); neither is taken below 1. Broadcasts.
    """
    i_be, rest = np.asarray(i_be), np.asarray(i_rest)
    x, _ = _levels(cut, s.i_low.ndim - 1)
    a = np.log(s.i_high[-1] / s.i_low[0]) / np.log(x[-1] / x[0])
    kept = np.clip((rest - s.hold[0] * i_be) / (s.i_high[-1] * x[-1] ** -a), 0.0, 1.0 - 1e-6)
    r = kept ** (1.0 / a)
    above = (r + x * (1.0 - r)) ** a - kept
    powers = x**a
    grown = np.maximum(above[1:] / above[:-1] * (powers[:-1] / powers[1:]), 1.0)
    slower = np.maximum((1.0 - r) * np.diff(powers, axis=0) / np.diff(above, axis=0), 1.0)
    b = np.maximum(s.hold * i_be - rest, 0.0)
    step = s.tau * slower * np.log((s.i_high + b) / (s.i_low + b) * grown)
    return np.asarray(np.sum(np.maximum(step, s.least), axis=0))


def edge_on(s: Steps, n: Real, i_sat: Real) -> Array:
    """10 to 90 % of the swing as the LED lights [s], `s` cut by EDGE: `time_on`.

    Infinite where n < i_sat: an output that does not saturate never ends its swing, and a unit whose CTR lets the drive
    just saturate is slower than those at both ends of its bin. Broadcasts.
    """
    n, least = np.asarray(n, dtype=float), np.asarray(i_sat, dtype=float)
    return np.asarray(np.where(n >= least, time_on(s, np.maximum(n, least)), np.inf))


def charging(charge: Real, eta: Real, i_eff: Real, i_be: Real) -> Array:
    """Time from rest to the level FIRST [s]: the photocurrent less the base resistor's share fills the base.

    charge/(eta*i_be)*ln[i_eff/(i_eff - i_be)], which is charge/(eta*i_eff) without a base resistor. charge: of
    `base_charge` at FIRST [C]; eta [1]. Infinite where i_be >= i_eff. Broadcasts.
    """
    i, b = np.asarray(i_eff, dtype=float), np.asarray(i_be, dtype=float)
    lit = b < i
    safe = np.where(lit, i, 1.0)
    share = np.clip(np.where(lit, b, 0.0) / safe, 1e-9, 1.0 - 1e-15)
    time = np.asarray(charge) / (eta * safe) * (-np.log1p(-share) / share)
    return np.asarray(np.where(lit, time, np.inf))


def crossing_on(s: Steps, n: Real) -> Array:
    """Time from the level FIRST to a threshold as the LED lights [s], `s` cut from FIRST to the threshold.

    The load capacitance draws c_load*swing*dx/dt more current, which takes transit times that more charge: the time
    t' = t + lag/(n*t') solves to t/2 + sqrt(t^2/4 + lag/n), t = `time_on`. An edge from 10 to 90 % needs no such
    term: the output already moves when it begins. Broadcasts.
    """
    t = time_on(s, n)
    n = np.maximum(np.asarray(n, dtype=float), s.i_high[-1])
    return np.asarray(t / 2 + np.sqrt(t * t / 4 + s.lag / n))


def storage(tau_s: Real, i_eff: Real, i_be: Real, i_sat: Real, hold: Real = 1.0, i_rest: Real = 0.0) -> Array:
    """Time in saturation after the LED is dark [s]: tau_s*ln[i_eff/(i_sat + hold*i_be - i_rest)], at least 0.

    hold: base-emitter voltage at the load's current over v_be [1]; i_rest as in `time_off`: infinite where it alone
    saturates the output. The output has not moved yet when it ends: the time to 10 % of the swing is this and
    `edge_off` by FIRST_TENTH. Broadcasts.
    """
    left = np.asarray(i_sat) + hold * np.asarray(i_be) - i_rest
    ends = left > 0
    time = tau_s * np.log(np.maximum(np.asarray(i_eff) / np.where(ends, left, 1.0), 1.0))
    return np.asarray(np.where(ends, time, np.inf))


def drive_for_edge_on(s: Steps, time: Real, i_sat: Real) -> Array:
    """Least n [A] with edge_on <= time, i_sat where the edge of saturation is fast enough. Broadcasts."""
    return np.asarray(np.maximum(_least_drive(s, time, 0.0), i_sat))


def drive_for_crossing_on(s: Steps, time: Real, near: float = CONVERGED) -> Array:
    """Least n [A] with crossing_on <= time; infinite for time <= 0. Broadcasts.

    near: share of the time by which the answer may ask too little.
    """
    return _least_drive(s, time, s.lag, near)


def _least_drive(s: Steps, time: Real, lag: Real, near: float = CONVERGED) -> Array:
    """Least n [A] with time_on + lag/(n*time) <= time, by Newton's method, never below.

    The left side is convex and falls with n, so from a point too small the iterates climb to the answer. What the
    last step alone needs, i_high + (i_high - i_low)/(exp(time/tau) - 1), is such a point.
    """
    t, last = np.asarray(time, dtype=float), s.i_high[-1]
    endless = np.isposinf(t)
    possible = (t > 0) & np.isfinite(s.tau[-1])
    t, tau = np.where(possible & ~endless, t, 1.0), np.where(possible, s.tau, 1.0)
    width = s.i_high - s.i_low
    n = last + np.maximum(width[-1] / np.expm1(np.minimum(t / tau[-1], 500.0)), last * LEAST_RISE)
    for _ in range(ITERATIONS):
        above = n - s.i_high
        drawn = lag / (n * t)
        late = np.maximum(np.sum(tau * np.log1p(width / above), axis=0) + drawn - t, 0.0)
        if np.all(late <= near * t):
            break
        n = n + late / (np.sum(tau * width / (above * (above + width)), axis=0) + drawn / n)
    n = np.where(endless, last * SAFE, n * SAFE)
    return np.asarray(np.where(possible, n, np.inf))


def extraction_for(s: Steps, time: Real, i_rest: Real = 0.0, near: float = CONVERGED) -> Array:
    """Least i_be [A] with time_off <= time: 0 where none is needed, infinite where none is enough. Broadcasts.

    near: share of the time by which the answer may ask too little.
    By Newton's method, never above: time_off is convex and falls with i_be. The start is what one step alone needs.
    """
    t, rest = np.asarray(time, dtype=float), np.asarray(i_rest, dtype=float)
    possible = (t > np.sum(s.least, axis=0)) & np.isfinite(s.tau[-1])
    tau = np.where(possible, s.tau, 1.0)
    grown = np.expm1(np.clip(np.where(possible, t, 1.0) / tau, 1e-12, 500.0))
    alone = ((s.i_high - s.i_low) / grown - s.i_low + rest) / s.hold
    i_be = np.maximum(alone.max(axis=0), 0.0)
    for _ in range(ITERATIONS):
        low, high = s.i_low + s.hold * i_be - rest, s.i_high + s.hold * i_be - rest
        low = np.maximum(low, TINY * s.i_high)
        step = tau * np.log(high / low)
        late = np.where(possible, np.maximum(np.sum(np.maximum(step, s.least), axis=0) - t, 0.0), 0.0)
        if np.all(late <= near * np.abs(t)):
            break
        slope = np.sum(np.where(step > s.least, tau * s.hold * (high - low) / (low * high), 0.0), axis=0)
        i_be = i_be + late / np.where(slope > 0, slope, np.inf)
    return np.asarray(np.where(time_off(s, 0.0, rest) <= t, 0.0, np.where(possible, i_be * SAFE, np.inf)))


def extraction_for_edge(s: Steps, cut: Cut, time: Real, i_rest: Real) -> Array:
    """An i_be [A] below which edge_off > time: 0 where none is needed, infinite where none is enough. Broadcasts.

    The least one, by `extraction_for`, where the base resistor then takes all that is left, so that the output comes to
    rest at zero; else a little below it, by a few halvings up to where it would.
    """
    t, rest = np.asarray(time, dtype=float), np.asarray(i_rest, dtype=float)
    found = extraction_for(s, t, rest)
    least = s.hold[0]
    held = np.isfinite(found) & (least * found < rest)
    if held.any():
        few = s.over(held.shape).at((held,))
        rest, t = (np.broadcast_to(part, held.shape)[held] for part in (rest, t))
        low, high = TINY * rest, rest / few.hold[0]
        for _ in range(HALVINGS):
            middle = (low + high) / 2
            enough = edge_off(few, cut, middle, rest) <= t
            low, high = np.where(enough, low, middle), np.where(enough, middle, high)
        found[held] = np.where(edge_off(few, cut, 0.0, rest) <= t, 0.0, low)
    return found


@dataclass(frozen=True)
class Swing:
    """All that the load brings to the times of one output.

    edge: steps from 10 to 90 %; on: from FIRST to where the receiver has surely seen the change; off: the part of the
    swing given back until then; on_early, off_early: until it may first have seen it; charge: of the base at FIRST [C];
    hold: base-emitter voltage at the load's current over v_be [1]; i_sat: LED current that carries the load [A], the
    curve's last where it does not reach.
    """

    edge: Steps
    on: Steps
    off: Steps
    on_early: Steps
    off_early: Steps
    charge: Array
    hold: Array
    i_sat: Array

    def at(self, index: Index) -> Swing:
        """Some of the loads, by an index behind the steps' own axis."""
        return Swing(
            edge=self.edge.at(index),
            on=self.on.at(index),
            off=self.off.at(index),
            on_early=self.on_early.at(index),
            off_early=self.off_early.at(index),
            charge=self.charge[index],
            hold=self.hold[index],
            i_sat=self.i_sat[index],
        )

    def taken(self, values: Array) -> Swing:
        """Some of the values on the last axis."""
        return self.at((..., values))


def swing(base: Base, load: Load, transfer: Transfer, carried: Real, on: Real, off: Real, early: bool = True) -> Swing:
    """The swing of a load; on, off: shares of it from rest until the receiver has surely seen the change [1].

    Lit, it may have seen it from the share 1 - off on; dark, from 1 - on: without `early` that is left out, and the
    sure thresholds stand in its place. Broadcasts.
    """
    i_sat = led_current_for(transfer, carried, 1.0, load.j_s)
    sure_on, sure_off = np.asarray(on), np.asarray(off)
    edge = steps(base, load, transfer, carried, EDGE)
    shape = edge.lag.shape

    def rising(share: Array) -> Steps:
        return steps(base, load, transfer, carried, Cut(FIRST, np.clip(share, 1.0001 * FIRST, 0.9999), STEPS))

    def falling(share: Array) -> Steps:
        return steps(base, load, transfer, carried, Cut(np.clip(1.0 - share, 1e-4, 0.9999), 1.0, STEPS))

    up, down = rising(sure_on), falling(sure_off)
    return Swing(
        edge=edge,
        on=up,
        off=down,
        on_early=rising(1.0 - sure_off) if early else up,
        off_early=falling(1.0 - sure_on) if early else down,
        charge=np.broadcast_to(base_charge(base, load, FIRST), shape),
        hold=np.broadcast_to(base_voltage(base, load.j_s, load.t) / base.v_be, shape),
        i_sat=np.broadcast_to(np.minimum(i_sat, transfer.curve_i[-1]), shape),
    )


def delay_on(s: Swing, eta: Real, i_eff: Real, i_be: Real) -> Array:
    """LED lit to the receiver's threshold [s]: `charging`, then `crossing_on`. Broadcasts."""
    return charging(s.charge, eta, i_eff, i_be) + crossing_on(s.on, np.asarray(i_eff) - i_be)


def delay_off(s: Swing, tau_s: Real, i_eff: Real, i_be: Real, i_rest: Real) -> Array:
    """LED dark to the receiver's threshold [s]: `storage`, then `time_off`. Broadcasts."""
    return storage(tau_s, i_eff, i_be, s.i_sat, s.hold, i_rest) + time_off(s.off, i_be, i_rest)


def late_off(s: Swing, tau_s: Real, eta: Real, i_eff: Real, i_be: Real, i_rest: Real, sooner: float = 1.0) -> Array:
    """By how much the LED's dark edge is seen later than its lit edge [s], at the threshold where that is most.

    `delay_off` less the delay on to the earlier threshold, whose `charging` counts by the share 1 - i_rest/(hold*i_be)
    that the base resistor leaves to be charged: none where it does not take all of i_rest. sooner >= 1: the delay on
    counts by 1/sooner, as it may be so much shorter than computed. -infinite where the output never turns on.
    Broadcasts.
    """
    charged, rest = charging(s.charge, eta, i_eff, i_be), np.asarray(i_rest, dtype=float)
    pull = np.maximum(s.hold * np.asarray(i_be), TINY * np.maximum(rest, TINY))
    left = np.where(rest > 0, np.maximum(1.0 - rest / pull, 0.0), 1.0)
    start = np.where(np.isfinite(charged), left * np.where(np.isfinite(charged), charged, 0.0), np.inf)
    on = start + crossing_on(s.on_early, np.asarray(i_eff) - i_be)
    return _difference(delay_off(s, tau_s, i_eff, i_be, i_rest), on / sooner)


def late_on(s: Swing, tau_s: Real, eta: Real, i_eff: Real, i_be: Real, sooner: float = 1.0) -> Array:
    """By how much the LED's lit edge is seen later than its dark edge [s], at the threshold where that is most.

    `delay_on` less 1/sooner of the delay off to the earlier threshold with nothing left of light and dark current.
    Broadcasts.
    """
    off = storage(tau_s, i_eff, i_be, s.i_sat, s.hold) + time_off(s.off_early, i_be)
    return _difference(delay_on(s, eta, i_eff, i_be), off / sooner)


def _difference(a: Array, b: Array) -> Array:
    """First less second; infinite where both are."""
    with np.errstate(invalid="ignore"):
        return np.nan_to_num(a - b, nan=np.inf, posinf=np.inf, neginf=-np.inf)
