"""Full enumeration: every combination in stock at every vertex of the uncertainty box, without model or solver.

The yardstick for the optimiser. Formulas come from `oracle_led`, `oracle_output` and `oracle_times`; here are the
loops. Axes of the arrays: CTR and light of the unit, ends of r_load, ends of r_be, rows of light, combinations; the
remaining vertices (temperature, output supply) are looped over.

`every_vertex`: all values of light that the LED's side can have go into the output's formulas. Without it only the
least and the largest at each temperature do, and V_CE(on) is compared with its limit instead of being solved for; a
test holds both ways to the same answer.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from itertools import product
from typing import NamedTuple

import numpy as np
import oracle_led as led_side
import oracle_output as out
import oracle_times
from oracle_led import Held, Worn

from optopick.brief import Brief, Position, Span
from optopick.coupler import Coupler, Kind, Transfer

ROUNDING = 1e-9
FIRST_SLACK = 1e-6
CHUNK = 2_000_000
EMPTY = (np.inf, 0.0, 1e12, np.inf)


class Winner(NamedTuple):
    """A combination in stock; None where a position stays empty."""

    coupler: str
    r_led: float
    r_load: float
    r_be: float | None
    r_shunt: float | None
    pieces: int = 1


@dataclass(frozen=True)
class Best:
    """What enumeration says of a brief: least first goal, least second goal near it, and who reaches both."""

    status: str
    first: float = np.inf
    second: float = np.inf
    winners: tuple[Winner, ...] = ()


@dataclass
class Grid:
    """Combinations of one coupler, (n,) each: values [ohm], worst room of every check, the goals with guard."""

    coupler: str
    r_led: np.ndarray
    r_shunt: np.ndarray
    r_load: np.ndarray
    r_be: np.ndarray
    pieces: np.ndarray
    rooms: dict[str, np.ndarray] = field(default_factory=dict)
    goals: dict[str, np.ndarray] = field(default_factory=dict)

    @property
    def feasible(self) -> np.ndarray:
        """Which combinations hold every check."""
        held = np.ones(len(self.r_led), dtype=bool)
        for room in self.rooms.values():
            held &= room >= -ROUNDING
        return held

    def winner(self, k: int) -> Winner:
        values = (float(a[k]) for a in (self.r_led, self.r_load, self.r_be, self.r_shunt))
        return Winner(self.coupler, *(v if np.isfinite(v) else None for v in values), int(self.pieces[k]))


def enumerate_best(brief: Brief, couplers: Sequence[Coupler]) -> Best:
    """The optimum over all couplers and all of the stock."""
    return best_of(brief, [survey(brief, c) for c in couplers if eligible(brief, c)])


def best_of(brief: Brief, surveyed: Sequence[Grid]) -> Best:
    """The optimum over grids."""
    grids = [grid for grid in surveyed if grid.feasible.any()]
    if not grids:
        return Best("infeasible")
    first, second = (
        np.concatenate([np.where(grid.feasible, grid.goals[goal.value], np.inf) for grid in grids])
        for goal in (brief.goal.minimize, brief.goal.then)
    )
    least = float(first.min())
    near = first <= least * (1 + brief.goal.give) * (1 + FIRST_SLACK)
    then = float(second[near].min())
    winners = np.flatnonzero(near & (second <= then * (1 + FIRST_SLACK)))
    everyone = [(grid, k) for grid in grids for k in range(len(grid.r_led))]
    return Best("feasible", least, then, tuple(everyone[k][0].winner(everyone[k][1]) for k in winners))


def eligible(brief: Brief, coupler: Coupler) -> bool:
    """Whether the brief admits the coupler at all; logic outputs are outside this yardstick."""
    choice = brief.couplers
    named = choice.only is None or coupler.part in choice.only
    return named and coupler.channels >= choice.at_least_channels and coupler.kind is not Kind.LOGIC


def feasible_grid(brief: Brief, coupler: Coupler) -> Grid:
    """Every combination at every vertex, nothing left out: rooms of all checks and the four goals."""
    return survey(brief, coupler, every_vertex=True)


@np.errstate(invalid="ignore", divide="ignore", over="ignore")
def survey(brief: Brief, coupler: Coupler, every_vertex: bool = False, failing: bool = False) -> Grid:
    """All combinations if `every_vertex` or `failing`, else those that hold every check."""
    led, load, base = led_branches(brief, coupler, every_vertex), loads(brief, coupler), bases(brief, coupler)
    barriers = {name: np.full(1, held.room) for name, held in out.barrier_checks(brief, coupler).items()}
    sides = ((led.rooms, len(led.r_led)), (load.rooms, len(load.r)), (base.rooms, len(base.r)), (barriers, 1))
    failing = failing or every_vertex
    alive = [np.arange(n) if failing else holding(rooms, n) for rooms, n in sides]
    index = np.stack([a.ravel() for a in np.meshgrid(*alive, indexing="ij")])
    step = max(1, CHUNK // (16 * led.rows))
    trials = [
        Trial(brief, coupler, led, load, base, index[:, k : k + step], every_vertex, failing)
        for k in range(0, max(1, index.shape[1]), step)
    ]
    for trial in trials:
        trial.run()
    index = np.concatenate([trial.index for trial in trials], axis=1)
    i, j, m = index[:3]
    grid = Grid(coupler.part, led.r_led[i], led.r_shunt[i], load.r[j], base.r[m], led.pieces[i])
    for (rooms, _), at in zip(sides, index, strict=True):
        grid.rooms.update({name: room[at] for name, room in rooms.items()})
    for name in trials[0].rooms:
        grid.rooms[name] = np.concatenate([trial.rooms[name] for trial in trials])
    for name in trials[0].goals:
        grid.goals[name] = np.concatenate([trial.goals[name] for trial in trials])
    return grid


def holding(rooms: dict[str, np.ndarray], n: int) -> np.ndarray:
    held = np.ones(n, dtype=bool)
    for room in rooms.values():
        held &= room >= -ROUNDING
    return np.flatnonzero(held)


# --- the box ---------------------------------------------------------------------------------------------------------


def temperatures(brief: Brief, transfer: Transfer | None) -> list[float]:
    """Coldest, 25 degC, hottest, and every point of the CTR curve between them."""
    low, high = brief.environment.temperature.low, brief.environment.temperature.high
    points = transfer.curve_t if transfer else ()
    return sorted({low, high, *(t for t in (25.0, *points) if low < t < high)})


def ends(span: Span) -> list[float]:
    return [span.low, span.high]


def resistor_ends(values: np.ndarray, tolerance: np.ndarray, drift: float, t: float) -> np.ndarray:
    """(2, n): least and largest resistance at a temperature."""
    part = tolerance + drift * abs(t - 25.0)
    return np.stack([values * (1.0 - part), values * (1.0 + part)])


def lots(brief: Brief, coupler: Coupler) -> Iterator[out.Lot]:
    """Every vertex that no resistor and no LED changes; CTR, light and V_BE vary along an axis before all others."""
    spread, off = coupler.transistor.light_spread, coupler.transistor.v_be_spread
    ends_ = product(
        (coupler.transfer.ctr_min, coupler.transfer.ctr_max), sorted({1.0 / spread, spread}), sorted({-off, off})
    )
    ctr, light, v_be = (np.array(c).reshape(-1, 1, 1, 1, 1) for c in zip(*ends_, strict=True))
    for t, v_cc in product(temperatures(brief, coupler.transfer)[::-1], ends(brief.output.supply)[::-1]):
        yield out.lot(brief, coupler, np.float64(t), ctr, light, np.float64(v_cc), v_be)


def over(values: np.ndarray) -> np.ndarray:
    """The largest over all axes but the last."""
    return values.max(axis=tuple(range(values.ndim - 1)))


def worst_of(rooms: dict[str, np.ndarray], held: dict[str, Held], n: int) -> None:
    """Keep the least room of each check over all axes but the last, of length n."""
    for name, check in held.items():
        left = np.asarray(check.left)
        if left.ndim > 1:
            left = left.min(axis=tuple(range(left.ndim - 1)))
        room = led_side.none_is_least(np.broadcast_to(left, (n,)))
        rooms[name] = np.minimum(rooms[name], room) if name in rooms else room


# --- what one position decides alone ---------------------------------------------------------------------------------


@dataclass
class Branches:
    """LED branches (n,). By temperature: light reaching the output as LED current [A] (rows, n), LED current off [A]
    (rows, n), LED heat [W] (n,). power: worst average of the LED path [W]."""

    r_led: np.ndarray
    pieces: np.ndarray
    r_shunt: np.ndarray
    rooms: dict[str, np.ndarray]
    light: dict[float, np.ndarray]
    off: dict[float, np.ndarray]
    heat: dict[float, np.ndarray]
    power: np.ndarray

    @property
    def rows(self) -> int:
        return max(a.shape[0] for a in (*self.light.values(), *self.off.values()))


def led_branches(brief: Brief, coupler: Coupler, every_vertex: bool) -> Branches:
    series, pieces, shunts = _branches(brief.stock.r_led, brief.stock.r_shunt)
    led, drive = coupler.led, brief.drive
    axes = ((led.v_f_min, led.v_f_max), ends(drive.supply), ends(drive.drop), (0, 1), (0, 1))
    v_f, v, drop, at, to = (np.array(c)[:, None] for c in zip(*product(*axes), strict=True))
    worn = Worn(*series[2:]), None if brief.stock.r_shunt is None else Worn(*shunts[2:])
    rooms: dict[str, np.ndarray] = {}
    fewer: dict[str, np.ndarray] = {}
    states, power = {}, np.zeros(1)
    for t in temperatures(brief, coupler.transfer):
        r = resistor_ends(series[0] * pieces, series[1], brief.stock.drift, t)[at[:, 0]]
        p = resistor_ends(*shunts[:2], brief.stock.drift, t)[to[:, 0]]
        states[t] = s = led_side.led_state(brief, led, t, v_f, v, drop, r, p)
        worst_of(rooms, led_side.led_checks(brief, coupler, s, t, r / pieces, p, *worn), len(pieces))
        one_less = r / np.maximum(pieces - 1, 1)
        worst_of(fewer, led_side.series_checks(s, t, one_less, worn[0]), len(pieces))
        power = np.maximum(power, (v * s.i_branch).max(axis=0))
    most = np.max([s.i_f.max(axis=0) for s in states.values()], axis=0)
    left = led_side.light_left(coupler.ageing, most, max(states), brief.environment.life, brief.signal.lit)
    thin: Callable[[np.ndarray], np.ndarray] = (lambda a: a) if every_vertex else _least_and_most
    if brief.stock.r_led.pieces > 1:
        spared = np.minimum(*fewer.values()) >= 0
        rooms["fewest_pieces"] = np.where((pieces > 1) & spared, -1.0, 1.0)
    return Branches(
        series[0],
        pieces,
        shunts[0],
        rooms,
        light={t: thin(np.concatenate([s.i_f, s.i_f * left])) for t, s in states.items()},
        off={t: thin(np.concatenate([np.broadcast_to(s.i_off, s.i_f.shape)] * 2)) for t, s in states.items()},
        heat={t: (s.i_f * s.v_f).max(axis=0) for t, s in states.items()},
        power=brief.signal.lit * power,
    )


def _branches(series: Position, shunt: Position | None) -> tuple[tuple[np.ndarray, ...], ...]:
    """Columns of the series resistor, its pieces, columns of the shunt: every way to put one of each together."""
    first = _columns(series)
    second = tuple(np.array([x]) for x in EMPTY) if shunt is None else _columns(shunt)
    every = list(product(range(len(first[0])), range(1, series.pieces + 1), range(len(second[0]))))
    a, pieces, b = (np.array(c) for c in zip(*every, strict=True))
    return tuple(c[a] for c in first), pieces, tuple(c[b] for c in second)


def _least_and_most(rows: np.ndarray) -> np.ndarray:
    return np.stack([rows.min(axis=0), rows.max(axis=0)])


def _columns(position: Position) -> tuple[np.ndarray, ...]:
    """Values, tolerances, ratings, voltage limits; an empty position as endless resistance that bears anything."""
    columns = (position.values, position.tolerance, position.power, position.voltage)
    return tuple(np.array([*c, e] if position.absent else c) for c, e in zip(columns, EMPTY, strict=True))


@dataclass
class Loads:
    """Load resistors (n,): ends (2, n) [ohm] and output heat [W] by temperature, worst average power [W]."""

    r: np.ndarray
    ends: dict[float, np.ndarray]
    rooms: dict[str, np.ndarray]
    heat: dict[float, np.ndarray]
    power: np.ndarray


def loads(brief: Brief, coupler: Coupler) -> Loads:
    r, tolerance, power, voltage = _columns(brief.stock.r_load)
    at = {t: resistor_ends(r, tolerance, brief.stock.drift, t) for t in temperatures(brief, coupler.transfer)}
    found = Loads(r, at, {}, dict.fromkeys(at, np.zeros(len(r))), np.zeros(len(r)))
    for x in lots(brief, coupler):
        t, ends_ = float(x.t), at[float(x.t)]
        worst_of(found.rooms, out.load_checks(brief, coupler, x, ends_, Worn(power, voltage)), len(r))
        found.heat[t] = np.maximum(found.heat[t], over(out.output_heat(brief, x, ends_)))
        path = brief.signal.lit * x.v_cc * out.load_of(brief, coupler, x, ends_)
        found.power = np.maximum(found.power, over(path))
    return found


@dataclass
class Bases:
    """Base-emitter resistors (n,), endless where the position stays empty: ends by temperature (2, n) [ohm]."""

    r: np.ndarray
    ends: dict[float, np.ndarray]
    rooms: dict[str, np.ndarray]


def bases(brief: Brief, coupler: Coupler) -> Bases:
    hot, stock = temperatures(brief, coupler.transfer), brief.stock.r_be
    if stock is None or not coupler.base_pin:
        return Bases(np.array([np.inf]), {t: np.full((2, 1), np.inf) for t in hot}, {})
    r, tolerance, power, _ = _columns(stock)
    at = {t: resistor_ends(r, tolerance, brief.stock.drift, t) for t in hot}
    rooms: dict[str, np.ndarray] = {}
    for x in lots(brief, coupler):
        r_be = at[float(x.t)]
        held = {"r_be_power": led_side.below(x.v_base**2 / r_be, power * led_side.chip_share(x.t))}
        worst_of(rooms, held, len(r))
    return Bases(r, at, rooms)


# --- what they decide together ---------------------------------------------------------------------------------------


@dataclass
class Trial:
    """Combinations on trial: branch, load, base resistor and barrier by index (4, n)."""

    brief: Brief
    coupler: Coupler
    led: Branches
    load: Loads
    base: Bases
    index: np.ndarray
    every_vertex: bool
    failing: bool
    rooms: dict[str, np.ndarray] = field(default_factory=dict)
    goals: dict[str, np.ndarray] = field(default_factory=dict)

    def run(self) -> None:
        """Find rooms and goals at the worst of all vertices; failures are dropped early unless they are wanted."""
        for look in (self._sums, self._static, self._timing):
            for x in lots(self.brief, self.coupler):
                look(x, *self.index[:3])
                if not self.failing:
                    self._drop()

    def _drop(self) -> None:
        keep = holding(self.rooms, self.index.shape[1])
        if len(keep) < self.index.shape[1]:
            self.index = self.index[:, keep]
            self.rooms = {name: room[keep] for name, room in self.rooms.items()}
            self.goals = {name: goal[keep] for name, goal in self.goals.items()}

    def _sums(self, x: out.Lot, i: np.ndarray, j: np.ndarray, _: np.ndarray) -> None:
        """What is a sum of a share of the branch and one of the load resistor: package heat, average power."""
        t, most = float(x.t), self.brief.limits.power
        held = {
            "total_power": led_side.below(
                self.led.heat[t][i] + self.load.heat[t][j], led_side.rating(self.coupler.p_total, x.t)
            )
        }
        self.goals["power"] = self.led.power[i] + self.load.power[j]
        if most is not None:
            held["power"] = led_side.below(self.goals["power"], np.float64(most))
        worst_of(self.rooms, held, len(i))

    def _ends(self, x: out.Lot, i: np.ndarray, j: np.ndarray, m: np.ndarray) -> tuple[np.ndarray, ...]:
        """Light, LED current off, load and base resistor at a vertex, each along its own axis."""
        t = float(x.t)
        light, off = self.led.light[t][None, None, :, i], self.led.off[t][None, None, :, i]
        return light, off, self.load.ends[t][:, None, None, j], self.base.ends[t][None, :, None, m]

    def _static(self, x: out.Lot, i: np.ndarray, j: np.ndarray, m: np.ndarray) -> None:
        brief, coupler = self.brief, self.coupler
        light, off, r_load, r_be = self._ends(x, i, j, m)
        drive = out.carried(coupler.transfer, x.ctr, x.h, light - out.base_taken(x, r_be))
        held = dict([
            out.level_on(brief, coupler, x, drive, r_load, self.every_vertex),
            out.level_off(brief, coupler, x, off, r_load, r_be),
        ])  # fmt: skip
        if brief.limits.ctr_margin is not None:
            held["ctr_margin"] = led_side.above(drive / out.load_of(brief, coupler, x, r_load), brief.limits.ctr_margin)
        worst_of(self.rooms, held, len(i))

    def _timing(self, x: out.Lot, i: np.ndarray, j: np.ndarray, m: np.ndarray) -> None:
        light, off, _, r_be = self._ends(x, i, j, m)
        swing = oracle_times.swing(self.brief, self.coupler, x, self.load.ends[float(x.t)][:, None, None, :]).taken(j)
        times = oracle_times.times(self.coupler, x, swing, light, off, r_be, self.brief.limits.timing_guard)
        held, goals = oracle_times.timing_checks(self.brief, times)
        worst_of(self.rooms, held, len(i))
        for name, goal in goals.items():
            most = over(goal)
            self.goals[name] = np.maximum(self.goals[name], most) if name in self.goals else most
