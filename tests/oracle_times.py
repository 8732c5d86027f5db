"""The switching times a second time, from charge and current at a few levels of the swing.

Between two levels the base's charge is taken as straight over LED current. What is left of the light then raises the
LED current that the output has reached as di/dt = (target - i)/tau, and tau is charge over base current, plus the
output node's own resistor and capacitance. See `oracle_led` for the purpose of all this.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from oracle_led import K_OVER_Q, KELVIN, Held, below
from oracle_output import Lot, base_taken, load_of, needed, pulled_up

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
    """What the load brings to the times: ways of the edge, up to the threshold on, down to the threshold off, and down
    by the first tenth; base charge when the output starts [C]; base voltage over V_BE in saturation [1]; LED current in
    saturation [A]; what the node's capacitance adds on the way to the threshold [A s2]."""

    edge: Way
    on: Way
    off: Way
    tenth: Way
    started: np.ndarray
    hold: np.ndarray
    i_sat: np.ndarray
    lag: np.ndarray

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
    reach, kept = np.clip(on, 1.0001 * STARTED, 0.9999), np.clip(1.0 - off, 1e-4, 0.9999)
    ladders = [*ladder(0.1, 0.9, STEPS), *ladder(STARTED, reach, STEPS), *ladder(kept, 1.0, STEPS), 0.9, 1.0]
    shares = np.stack(np.broadcast_arrays(*ladders))
    axes = max(np.ndim(r_load), np.ndim(x.eta)) + 1
    shares = shares.reshape(len(shares), *(1,) * (axes - shares.ndim), *shares.shape[1:])
    every, node = levels(brief, coupler, x, r_load, shares), r_load * brief.output.capacitance
    k = STEPS + 1
    cuts = (slice(0, k), slice(k, 2 * k), slice(2 * k, 3 * k), slice(3 * k, None))
    ways = [way(coupler, x, Levels(*(part[cut] for part in every)), node) for cut in cuts]
    extra = brief.output.capacitance * (x.v_cc - transistor.v_ce_sat) * (reach - STARTED)
    return Swing(
        *ways,
        started=every.charge[k],
        hold=every.v_base[-1] / x.v_be,
        i_sat=np.minimum(every.i[-1], coupler.transfer.curve_i[-1]),
        lag=transistor.tau_0 / transistor.h_fe * extra / x.eta,
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
    """Times [s], without guard."""

    edge_on: np.ndarray
    edge_off: np.ndarray
    storage: np.ndarray
    delay_on: np.ndarray
    delay_off: np.ndarray


def times(coupler: Coupler, x: Lot, s: Swing, i_eff, r_be) -> Times:
    b = base_taken(x, r_be)
    n = i_eff - b
    held = coupler.transistor.tau_s * np.log(np.maximum(i_eff / (s.i_sat + s.hold * b), 1.0))
    enough = np.maximum(n, s.i_sat)
    return Times(
        edge_on=np.where(n > 0, climb(s.edge, enough) * enough / np.where(n > 0, n, 1.0), np.inf),
        edge_off=fall(s.edge, b),
        storage=held + fall(s.tenth, b),
        delay_on=start(x, s.started, i_eff, r_be) + to_threshold(s, n),
        delay_off=held + fall(s.off, b),
    )


def climb(w: Way, n) -> np.ndarray:
    """Time up all steps, heading for the LED current n; endless unless n is beyond the last."""
    return np.where(n > w.high[-1], (w.tau * np.log((n - w.low) / (n - w.high))).sum(axis=0), np.inf)


def fall(w: Way, b) -> np.ndarray:
    """Time down all steps, heading for minus what the base resistor draws; none faster than the output node."""
    pull = w.hold * b
    return np.maximum(w.tau * np.log((w.high + pull) / (w.low + pull)), w.node).sum(axis=0)


def to_threshold(s: Swing, n) -> np.ndarray:
    """The node's capacitance draws charge in proportion to speed: the time is the root of t^2 - t0*t - lag/n = 0."""
    alone = climb(s.on, n)
    more = s.lag / np.maximum(n, s.on.high[-1])
    return (alone + np.sqrt(alone * alone + 4 * more)) / 2


def start(x: Lot, charge, i_eff, r_be) -> np.ndarray:
    """Time until a photocurrent, less what the base resistor takes of it at V_BE, has brought the first charge."""
    photo = x.eta * i_eff
    share = np.maximum(np.where(np.isinf(r_be), 0.0, x.v_be / (photo * r_be)), 1e-9)
    return np.where(share < 1, charge / photo * -np.log1p(-np.minimum(share, 1 - 1e-15)) / share, np.inf)


def timing_checks(brief: Brief, x: Times) -> tuple[dict[str, Held], dict[str, np.ndarray]]:
    """The checks on times, and the three goals that are times; guard included."""
    guard, limits = brief.limits.timing_guard, brief.limits
    skew = np.abs(x.delay_off - x.delay_on)
    goals = {
        "edge time": guard * np.maximum(x.edge_on, x.edge_off),
        "delay": guard * np.maximum(x.delay_on, x.delay_off),
        "distortion": guard * np.where(np.isnan(skew), np.inf, skew),
    }
    held = {"shortest_pulse": below(goals["delay"], brief.signal.shortest_pulse)}
    for name, limit in (("edge_time", limits.edge_time), ("delay", limits.delay), ("distortion", limits.distortion)):
        if limit is not None:
            held[name] = below(goals[name.replace("_", " ")], limit)
    return held, goals
