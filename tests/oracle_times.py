"""The switching times a second time, from charge and current at a few levels of the swing.

Between two levels the base's charge is taken as straight over LED current. What is left of the light then raises the
LED current that the output has reached as di/dt = (target - i)/tau, and tau is charge over base current, plus the
output node's own resistor and capacitance. See `oracle_led` for the purpose of all this.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from oracle_led import K_OVER_Q, KELVIN, Held, below
from oracle_output import Lot, base_taken, dark_as_light, early, load_of, needed, pulled_up

from optopick.brief import Brief
from optopick.coupler import Coupler

BUILT_IN, GRADING = 0.7, 0.37
V_BE_AT = 2e-3
STARTED, STEPS = 0.05, 3


class Way(NamedTuple):
    """Steps from level to level of the swing, on the first axis: time constant [s], LED currents at both ends [A], base
    voltage over V_BE [1], and the time that the output node alone takes [s]."""

    tau: np.ndarray
    low: np.ndarray
    high: np.ndarray
    hold: np.ndarray
    node: np.ndarray


class Swing(NamedTuple):
    """What the load brings to the times: ways of the edge, up to the later and the earlier threshold, down to the later
    and the earlier threshold, and down by the first tenth; base charge when the output starts [C]; base voltage over V_BE in saturation [1]; LED current in
    saturation [A]; what the node's capacitance adds on the way to the threshold [A s2]."""

    edge: Way
    on: Way
    on_soon: Way
    off: Way
    off_soon: Way
    tenth: Way
    started: np.ndarray
    hold: np.ndarray
    i_sat: np.ndarray
    lag: np.ndarray
    lag_soon: np.ndarray

    def taken(self, index: np.ndarray) -> Swing:
        """For some of the loads, on the last axis; what does not depend on the load stays."""
        return _taken(self, index)


def _taken(part, index: np.ndarray):
    if isinstance(part, tuple):
        return type(part)(*(_taken(p, index) for p in part))
    return part[..., index] if np.ndim(part) and part.shape[-1] > 1 else part


class Levels(NamedTuple):
    """Levels of the swing, on the first axis: share [1], LED current [A], base charge [C], base voltage [V]."""

    share: np.ndarray
    i: np.ndarray
    charge: np.ndarray
    v_base: np.ndarray


def junction(c_0: float, v: np.ndarray) -> np.ndarray:
    """Charge of the collector junction at reverse voltage v: the integral of c_0*(1 + v/0.7 V)^-0.37 from zero; the
    capacitance no longer grows from half the built-in voltage forward."""
    edge = -BUILT_IN / 2
    inside = c_0 * BUILT_IN / (1 - GRADING) * (np.power(1 + np.maximum(v, edge) / BUILT_IN, 1 - GRADING) - 1)
    return inside + np.where(v < edge, c_0 * np.power(0.5, -GRADING) * (v - edge), 0.0)


def levels(brief: Brief, coupler: Coupler, x: Lot, r_load: np.ndarray, share) -> Levels:
    transistor = coupler.transistor
    j = share * load_of(brief, coupler, x, r_load)
    v_base = x.v_be + K_OVER_Q * (x.t + KELVIN) * np.log(j / V_BE_AT)
    i = needed(coupler.transfer, x.ctr, x.h, j)
    c_cb = transistor.c_m / transistor.h_fe
    v_collector_base = x.v_cc - share * (x.v_cc - transistor.v_ce_sat) - v_base
    charge = transistor.tau_0 / transistor.h_fe * j + transistor.c_be * v_base
    return Levels(share, i, charge + junction(c_cb, x.v_cc) - junction(c_cb, v_collector_base), v_base)


def way(coupler: Coupler, x: Lot, e: Levels, node) -> Way:
    """The steps between neighbouring levels; node: the output node's own time constant [s]."""
    out_of_reach = np.isinf(e.i[-1:])
    i = np.where(out_of_reach, e.share * coupler.transfer.curve_i[-1], e.i)
    tau = (e.charge[1:] - e.charge[:-1]) / x.eta / (i[1:] - i[:-1]) + node
    hold = (e.v_base[1:] + e.v_base[:-1]) / 2 / x.v_be
    alone = node * np.log(e.share[1:] / e.share[:-1])
    return Way(np.where(out_of_reach, np.inf, tau), i[:-1], i[1:], hold, alone)


def swing(brief: Brief, coupler: Coupler, x: Lot, r_load) -> Swing:
    """All ways of a load at once."""
    transistor = coupler.transistor
    on, off = fractions(brief, coupler, x)
    reach, soon = (np.clip(share, 1.0001 * STARTED, 0.9999) for share in (on, 1.0 - off))
    kept, kept_soon = (np.clip(share, 1e-4, 0.9999) for share in (1.0 - off, on))
    ways = [(0.1, 0.9), (STARTED, reach), (STARTED, soon), (kept, 1.0), (kept_soon, 1.0)]
    ladders = [share for first, last in ways for share in ladder(first, last, STEPS)] + [0.9, 1.0]
    shares = np.stack(np.broadcast_arrays(*ladders))
    axes = max(np.ndim(r_load), np.ndim(x.eta)) + 1
    shares = shares.reshape(len(shares), *(1,) * (axes - shares.ndim), *shares.shape[1:])
    every, node = levels(brief, coupler, x, r_load, shares), r_load * brief.output.capacitance
    k = STEPS + 1
    cuts = [slice(n * k, (n + 1) * k) for n in range(len(ways))] + [slice(len(ways) * k, None)]
    stepped = [way(coupler, x, Levels(*(part[cut] for part in every)), node) for cut in cuts]
    per_share = brief.output.capacitance * (x.v_cc - transistor.v_ce_sat) * transistor.tau_0 / transistor.h_fe / x.eta
    return Swing(
        *stepped,
        started=every.charge[k],
        hold=every.v_base[-1] / x.v_be,
        i_sat=np.minimum(every.i[-1], coupler.transfer.curve_i[-1]),
        lag=per_share * (reach - STARTED),
        lag_soon=per_share * (soon - STARTED),
    )


def ladder(first, last, count: int) -> list:
    """Shares of the swing in equal ratio."""
    return [first * (last / first) ** (k / count) for k in range(count + 1)]


def fractions(brief: Brief, coupler: Coupler, x: Lot) -> tuple[np.ndarray, np.ndarray]:
    """Shares of the swing at which the receiver has surely seen the change, lighting up and going dark."""
    v_ce_sat = coupler.transistor.v_ce_sat
    full = x.v_cc - v_ce_sat
    on, off = (x.v_cc - x.v_il, x.v_ih - v_ce_sat) if pulled_up(brief) else (x.v_ih, full - x.v_il)
    return np.maximum(on / full, 0.0), np.clip(off / full, 0.0, 1.0 - 1e-9)


class Times(NamedTuple):
    """Times [s], without guard. skew: by how much one edge is seen later than the other."""

    edge_on: np.ndarray
    edge_off: np.ndarray
    storage: np.ndarray
    delay_on: np.ndarray
    delay_off: np.ndarray
    skew: np.ndarray


def times(coupler: Coupler, x: Lot, s: Swing, i_eff, i_off, r_be, guard: float) -> Times:
    """i_off: LED current left in the dark. guard: by so much the delay that is subtracted may be shorter."""
    b, rest = base_taken(x, r_be), (i_off + dark_as_light(coupler, x)) * early(x)
    n = i_eff - b
    tau_s, spread = coupler.transistor.tau_s, coupler.transistor.tau_s_spread
    # storage takes a time in proportion to its constant: long where the fall must be early, short where it must be late
    held = saturated_for(tau_s * spread, s, i_eff, s.hold * b - rest)
    enough = np.maximum(n, s.i_sat)
    charge, to_late = start(x, s.started, i_eff, r_be), to_threshold(s.on, s.lag, n)
    to_soon = to_threshold(s.on_soon, s.lag_soon, n)
    off = held + fall(s.off, b, rest)
    off_soon = saturated_for(tau_s / spread, s, i_eff, s.hold * b) + fall(s.off_soon, b, 0.0)
    on_soon = to_soon + np.where(
        np.isinf(charge),
        np.inf,
        charge * np.where(rest > 0, np.clip(1 - rest / np.maximum(s.hold * b, 1e-30), 0, 1), 1.0),
    )
    skews = [
        np.where(np.isinf(a) & np.isinf(c), np.inf, a - c / guard)
        for a, c in ((off, on_soon), (charge + to_late, off_soon))
    ]
    return Times(
        edge_on=np.where(n < s.i_sat, np.inf, climb(s.edge, enough)),
        edge_off=slide(s.edge, (0.1, 0.9, STEPS), b, rest),
        storage=held + slide(s.tenth, (0.9, 1.0, 1), b, rest),
        delay_on=charge + to_late,
        delay_off=off,
        skew=np.maximum(*skews),
    )


def saturated_for(tau_s, s: Swing, i_eff, pull) -> np.ndarray:
    """Time until the charge that a saturated base holds too much is gone, the base losing `pull` more than it gets."""
    left = s.i_sat + pull
    return np.where(left > 0, tau_s * np.log(np.maximum(i_eff / np.where(left > 0, left, 1), 1)), np.inf)


def climb(w: Way, n) -> np.ndarray:
    """Time up all steps, heading for the LED current n; endless unless n is beyond the last."""
    return np.where(n > w.high[-1], (w.tau * np.log((n - w.low) / (n - w.high))).sum(axis=0), np.inf)


def fall(w: Way, b, rest) -> np.ndarray:
    """Time down all steps, heading for what is left less what the base resistor draws: endless if that is above the
    lowest. None faster than the output node."""
    goal = rest - w.hold * b
    there = w.low > goal
    ratio = np.where(there, w.high - goal, 1.0) / np.where(there, w.low - goal, 1.0)
    return np.where(there, np.maximum(w.tau * np.log(ratio), w.node), np.inf).sum(axis=0)


def slide(w: Way, cut: tuple[float, float, int], b, rest) -> np.ndarray:
    """Time down all steps where the levels count from the state of rest.

    What is left beyond the base resistor's draw keeps a share of the load's current; the LED current over a share of
    the load's is taken as one power law between the lowest and the highest level, for what moving the levels changes.
    """
    first, last, count = cut
    x = np.array(ladder(first, last, count)).reshape(-1, *(1,) * (w.low.ndim - 1))
    power = np.log(w.high[-1] / w.low[0]) / np.log(last / first)
    goal = rest - w.hold * b
    at_full = w.high[-1] / last**power
    # the lowest base voltage takes least
    kept = np.power(np.clip((rest - w.hold[0] * b) / at_full, 0.0, 1 - 1e-6), 1 / power)
    up = np.power(kept + (1 - kept) * x[1:], power) - np.power(kept, power)
    down = np.power(kept + (1 - kept) * x[:-1], power) - np.power(kept, power)
    longer = np.maximum(up / down / np.power(x[1:] / x[:-1], power), 1.0)
    # charge goes with the load's share, so that a step holds more of it for each LED current the flatter the law there
    slower = np.maximum((1 - kept) * np.diff(np.power(x, power), axis=0) / (up - down), 1.0)
    pull = np.maximum(-goal, 0.0)
    return np.maximum(w.tau * slower * np.log(longer * (w.high + pull) / (w.low + pull)), w.node).sum(axis=0)


def to_threshold(w: Way, lag, n) -> np.ndarray:
    """The node's capacitance draws charge in proportion to speed: the time is the root of t^2 - t0*t - lag/n = 0."""
    alone = climb(w, n)
    more = lag / np.maximum(n, w.high[-1])
    return (alone + np.sqrt(alone * alone + 4 * more)) / 2


def start(x: Lot, charge, i_eff, r_be) -> np.ndarray:
    """Time until a photocurrent, less what the base resistor takes of it at V_BE, has brought the first charge."""
    photo = x.eta * i_eff
    share = np.maximum(np.where(np.isinf(r_be), 0.0, x.v_base / (photo * r_be)), 1e-9)
    return np.where(share < 1, charge / photo * -np.log1p(-np.minimum(share, 1 - 1e-15)) / share, np.inf)


def timing_checks(brief: Brief, x: Times) -> tuple[dict[str, Held], dict[str, np.ndarray]]:
    """The checks on times, and the three goals that are times; guard included."""
    guard, limits = brief.limits.timing_guard, brief.limits
    goals = {
        "edge time": guard * np.maximum(x.edge_on, x.edge_off),
        "delay": guard * np.maximum(x.delay_on, x.delay_off),
        "distortion": guard * x.skew,
    }
    held = {"shortest_pulse": below(goals["delay"], brief.signal.shortest_pulse)}
    for name, limit in (("edge_time", limits.edge_time), ("delay", limits.delay), ("distortion", limits.distortion)):
        if limit is not None:
            held[name] = below(goals[name.replace("_", " ")], limit)
    return held, goals
