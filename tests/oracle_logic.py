"""The formulas of a logic output a second time, and its full enumeration: see `oracle_led` for the purpose.

An open collector with the sheet's own delays; the pull-up and the node's capacitance add an RC of which the sheet's
test circuit has had its share. Written from that; shares only the frozen types with the program.
"""

from __future__ import annotations

from itertools import product
from typing import NamedTuple

import numpy as np
from enumeration import Grid, ends, led_branches, resistor_ends, temperatures, worst_of
from oracle_led import Held, above, below, chip_share, rating
from oracle_output import barrier_checks

from optopick.brief import Brief, Position
from optopick.coupler import Coupler, Logic


class Pull(NamedTuple):
    """Pull-ups at one temperature and supply: resistance (2, n) [ohm], sunk current [A], heat of the output [W]."""

    t: float
    v_cc: float
    r: np.ndarray
    sunk: np.ndarray
    heat: np.ndarray


def pull(brief: Brief, logic: Logic, t: float, v_cc: float, r: np.ndarray) -> Pull:
    """The output low: the pull-up from the supply, and the larger of what the receiver leaks and what it sources."""
    o = brief.output
    sunk = (v_cc - logic.v_ol) / r + max(o.input_leakage, o.input_current_low)
    return Pull(t, v_cc, r, sunk, logic.v_ol * sunk + logic.i_cc * v_cc)


def threshold(span, supply, v_cc: float) -> float:
    """A receiver's threshold at a supply voltage: a straight line between the ends."""
    return float(np.interp(v_cc, [supply.low, supply.high], [span.low, span.high]))


def pull_checks(brief: Brief, coupler: Coupler, x: Pull, stock: Position) -> dict[str, Held]:
    """Checks that only the pull-up decides."""
    logic, o = coupler.logic, brief.output
    v_il, v_ih = threshold(o.v_il, o.supply, x.v_cc), threshold(o.v_ih, o.supply, x.v_cc)
    lifted = x.v_cc - x.r * (o.input_leakage + logic.i_oh)
    return {
        "sink_current": below(x.sunk, logic.i_ol),
        "output_low": below(np.float64(logic.v_ol), v_il - o.noise_margin),
        "output_high": above(lifted, v_ih + o.noise_margin),
        "supply_low": above(np.float64(x.v_cc), logic.v_cc_min),
        "supply_high": below(np.float64(x.v_cc), logic.v_cc_max),
        "output_power": below(x.heat, rating(coupler.p_out, x.t)),
        "r_load_power": below(x.v_cc**2 / x.r, np.array(stock.power) * chip_share(x.t)),
        "r_load_voltage": below(np.float64(x.v_cc), np.array(stock.voltage)),
    }


def times(brief: Brief, logic: Logic, x: Pull) -> tuple[np.ndarray, np.ndarray]:
    """Longest edge and longest delay [s], without guard.

    Rising: the node nears the supply exponentially, from the low level; the sheet's delay holds the RC of its own
    circuit. Falling: the rated current takes the charge that the sheet's circuit did not have.
    """
    o = brief.output
    rc = np.maximum(x.r * (o.capacitance + logic.c_out) - logic.r_l * (logic.c_l + logic.c_out), 0.0)
    to_go = (x.v_cc - threshold(o.v_ih, o.supply, x.v_cc)) / (x.v_cc - logic.v_ol)
    to_go = min(max(to_go, 1e-9), 1.0)
    drain = max(o.capacitance - logic.c_l, 0.0) * x.v_cc / logic.i_ol
    rise = logic.t_r + rc * (np.log(0.9) - np.log(0.1))
    late = logic.t_plh - rc * np.log(to_go)
    return np.maximum(rise, logic.t_f + drain), np.maximum(late, logic.t_phl + drain)


class Pulls(NamedTuple):
    """Pull-ups in stock, (n,) each: rooms, heat by temperature [W], worst average power [W], edge and delay [s]."""

    rooms: dict[str, np.ndarray]
    heat: dict[float, np.ndarray]
    power: np.ndarray
    edge: np.ndarray
    delay: np.ndarray


def pulls(brief: Brief, coupler: Coupler) -> Pulls:
    """Every pull-up at every vertex."""
    logic, stock, n = coupler.logic, brief.stock.r_load, len(brief.stock.r_load.values)
    rooms: dict[str, np.ndarray] = {}
    heat: dict[float, np.ndarray] = {}
    power, edge, delay = np.zeros(n), np.zeros(n), np.zeros(n)
    for t, v_cc in product(temperatures(brief, None), ends(brief.output.supply)):
        r = resistor_ends(np.array(stock.values), np.array(stock.tolerance), brief.stock.drift, t)
        x = pull(brief, logic, t, v_cc, r)
        worst_of(rooms, pull_checks(brief, coupler, x, stock), n)
        heat[t] = np.maximum(heat.get(t, 0.0), x.heat.max(axis=0))
        drawn = v_cc * (logic.i_cc + brief.signal.lit * x.sunk)
        slow, late = times(brief, logic, x)
        power, edge, delay = (
            np.maximum(kept, new.max(axis=0)) for kept, new in ((power, drawn), (edge, slow), (delay, late))
        )
    return Pulls(rooms, heat, power, edge, delay)


def survey_logic(brief: Brief, coupler: Coupler, every_vertex: bool = False) -> Grid:
    """All combinations of a logic output with rooms and goals."""
    led, load, n = led_branches(brief, coupler, every_vertex), pulls(brief, coupler), len(brief.stock.r_load.values)
    i, j = (a.ravel() for a in np.meshgrid(np.arange(len(led.r_led)), np.arange(n), indexing="ij"))
    none = np.full(len(i), np.inf)
    grid = Grid(coupler.part, led.r_led[i], led.r_shunt[i], np.array(brief.stock.r_load.values)[j], none, led.pieces[i])
    grid.rooms = {name: room[i] for name, room in led.rooms.items()} | {n_: room[j] for n_, room in load.rooms.items()}
    grid.rooms |= {name: np.full(len(i), held.room) for name, held in barrier_checks(brief, coupler).items()}
    weakest = np.min([light.min(axis=0) for light in led.light.values()], axis=0)
    grid.rooms["switching_current"] = above(weakest, coupler.logic.i_f_on).room[i]
    for t, heat in load.heat.items():
        worst_of(grid.rooms, {"total_power": below(led.heat[t][i] + heat[j], rating(coupler.p_total, t))}, len(i))
    _goals(brief, grid, led.power[i] + load.power[j], load.edge[j], load.delay[j])
    return grid


def _goals(brief: Brief, grid: Grid, power: np.ndarray, edge: np.ndarray, delay: np.ndarray) -> None:
    """Goals with guard, and the limits on them; one delay may be near none, so the other is the distortion."""
    guard, limits = brief.limits.timing_guard, brief.limits
    grid.goals = {"edge time": guard * edge, "delay": guard * delay, "distortion": guard * delay, "power": power}
    grid.rooms["shortest_pulse"] = below(grid.goals["delay"], np.float64(brief.signal.shortest_pulse)).room
    for name in ("edge_time", "delay", "distortion", "power"):
        limit = getattr(limits, name)
        if limit is not None:
            grid.rooms[name] = below(grid.goals[name.replace("_", " ")], np.float64(limit)).room
