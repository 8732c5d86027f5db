"""The rows, exact times and cuts of a coupler with a transistor output."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.model.candidates import Candidates, candidates
from optopick.model.ranges import Live, holding
from optopick.model.rows import Ask, Rows, Scores, scaled, stack
from optopick.physics import switching
from optopick.physics.types import Array

Index = np.ndarray

STAIRCASES = 48
"""How many base resistors get a cut at once."""


@dataclass(frozen=True)
class Family:
    """A time at corners and load ends, monotone in the light and in what the base resistor takes.

    more_light_hurts, more_base_hurts: the directions; what is left of light and dark current never helps. limit: the
    field of Ask.
    """

    name: str
    limit: str
    more_light_hurts: bool
    more_base_hurts: bool


FAMILIES = (
    Family("edge_off", "edge", more_light_hurts=True, more_base_hurts=False),
    Family("delay_on", "delay", more_light_hurts=False, more_base_hurts=True),
    Family("delay_off", "delay", more_light_hurts=True, more_base_hurts=False),
    Family("late_off", "distortion", more_light_hurts=True, more_base_hurts=False),
    Family("late_on", "distortion", more_light_hurts=False, more_base_hurts=True),
)
"""late_off: delay off less delay on; late_on: the other way round. The edge on needs no cuts: its row is exact."""


@dataclass(frozen=True)
class Extremes:
    """The live values at one extreme, (C, 1, 1) each [A]: light, what the base resistor takes of it, what is left."""

    i_low: Array
    i_high: Array
    i_be_low: Array
    i_be_high: Array
    i_rest: Array


@dataclass(frozen=True)
class Point:
    """Light, what the base resistor takes of it, and what is left when dark, as LED currents [A]."""

    i_eff: Array
    i_be: Array
    i_rest: Array


class TransistorModel:
    """One coupler with a transistor output, against every value in stock."""

    def __init__(self, brief: Brief, found: Candidates) -> None:
        self.brief = brief
        self.candidates = found
        self.sizes = found.sizes

    @classmethod
    def of(cls, brief: Brief, coupler: Coupler) -> TransistorModel:
        """The model of a coupler over all that the brief stocks."""
        return cls(brief, candidates(brief, coupler))

    def take(self, i: Index, j: Index, m: Index) -> TransistorModel:
        """The model over some of the values."""
        return TransistorModel(self.brief, self.candidates.take(i, j, m))

    @property
    def power(self) -> tuple[Array, Array]:
        """Worst average power of each LED branch and of each load resistor [W]."""
        return self.candidates.led.power, self.candidates.load.power

    @property
    def heat(self) -> tuple[Array, Array, Array]:
        """Heat of each LED branch (T, n), of the output with each load (T, n), and of the package at most (T,) [W]."""
        x = self.candidates
        return x.led.heat, x.load.heat, x.total_room

    def start(self, dropped: frozenset[str] = frozenset()) -> Live:
        """The values that hold the limits on one value alone."""
        x = self.candidates
        return holding((x.led.keep, x.load.keep, x.base.keep), self.sizes, dropped)

    def values(self, i: int, j: int, m: int) -> tuple[float, int, float, float, float]:
        """Resistors of a combination: r_led, pieces, r_shunt, r_load, r_be [ohm], infinite where absent."""
        x = self.candidates
        led = (float(x.led.r_led[i]), int(x.led.pieces[i]), float(x.led.r_shunt[i]))
        return *led, float(x.load.r_load[j]), float(x.base.r_be[m])

    def rows(self, ask: Ask) -> Rows:
        """Every linear row of what is asked; for delays a relaxation, the closer the fewer values are left."""
        return stack([self.ready_rows(ask), *self._edges(ask), *self._delays(ask)], self.sizes)

    def ready_rows(self, ask: Ask) -> Rows:
        """The linear rows of what is asked but for those on times."""
        blocks = list(self._static(ask.dropped))
        if np.isfinite(ask.power):
            p, q = self.power
            blocks.append(scaled("power", ask.power - p, -q, np.zeros(self.sizes[2])))
        return stack(blocks, self.sizes)

    @cached_property
    def _all_static(self) -> tuple[Rows, ...]:
        x = self.candidates
        zero_base = np.zeros(self.sizes[2])
        blocks = []
        if x.load.for_margin is not None:
            blocks.append(scaled("ctr_margin", x.i_low, -x.load.for_margin, -x.base.i_be_high))
        level_on, level_off = self._levels
        blocks.append(scaled(level_on, x.i_low, -x.load.for_level, -x.base.i_be_high))
        blocks.append(scaled(level_off, -x.i_lit_off, x.load.leak_room - x.i_input_off, -x.base.leak))
        total = scaled("total_power", x.total_room.reshape(-1, 1) - x.led.heat, -x.load.heat, zero_base)
        conducts = scaled("conducts", x.i_low, 0.0 * x.load.leak_room, -x.base.i_be_high * (1 + 1e-6))
        return (*blocks, total, conducts)

    @property
    def _levels(self) -> tuple[str, str]:
        """The checks of the level that the conducting output must reach, and of the one that leakage must not spoil."""
        pulled_up = self.brief.output.circuit == "pull-up"
        return ("output_low", "output_high") if pulled_up else ("output_high", "output_low")

    def _static(self, dropped: frozenset[str]) -> Iterator[Rows]:
        level_on, _ = self._levels
        # that the output conducts at all is part of the level that it must reach
        left_out = dropped | {"conducts"} if level_on in dropped else dropped
        return (block for block in self._all_static if block.names[0] not in left_out)

    def _edges(self, ask: Ask) -> Iterator[Rows]:
        """Edge on: i_eff - i_be >= phi[j], exact; edge off: i_be >= rho[j], exact where all branches leave alike."""
        if not np.isfinite(ask.edge):
            return
        x, edge = self.candidates, self.candidates.load.swing.edge
        phi = switching.drive_for_edge_on(edge, ask.edge, x.load.swing.i_sat).max(axis=1)
        rest = x.i_rest.min(axis=1)[:, None, None]
        rho = switching.extraction_for_edge(edge, switching.EDGE, ask.edge, rest).max(axis=1)
        yield scaled("edge_on", x.i_low, -phi, -x.base.i_be_high)
        yield scaled("edge_off", np.zeros(self.sizes[0]), -rho, x.base.i_be_low)

    def _delays(self, ask: Ask) -> Iterator[Rows]:
        """Each part of a delay must fit beside the least that the other parts can be.

        A limit on distortion bounds each delay by the most that the other can be.
        """
        if not ask.has_delays:
            return
        swing, eta, tau_s = self.candidates.load.swing, self._eta, self.candidates.tau_s_most
        strong, weak = self._extremes(light_most=True), self._extremes(light_most=False)
        # a limit on lateness bounds one delay by the other's longest, at whichever threshold: the sure one is later
        longest_on = switching.delay_on(swing, eta, weak.i_high, weak.i_be_low)
        longest_off = switching.delay_off(swing, tau_s, strong.i_low, strong.i_be_high, strong.i_rest)
        yield from self._on_rows(np.minimum(ask.delay, ask.distortion + longest_off), strong)
        yield from self._off_rows(np.minimum(ask.delay, ask.distortion + longest_on), weak)

    def _extremes(self, light_most: bool) -> Extremes:
        """The values at each corner that switch on fastest (most light, least taken), or off fastest."""
        x = self.candidates
        first, second = (np.max, np.min) if light_most else (np.min, np.max)

        def over(values: Array, extreme: Callable[..., Array]) -> Array:
            return np.asarray(extreme(values, axis=1))[:, None, None]

        return Extremes(
            i_low=over(x.i_low, first),
            i_high=over(x.i_high, first),
            i_be_low=over(x.base.i_be_low, second),
            i_be_high=over(x.base.i_be_high, second),
            i_rest=over(x.i_rest, first),
        )

    @property
    def _eta(self) -> Array:
        return self.candidates.corners.eta[:, :, None]

    def _on_rows(self, limit: Array, strong: Extremes) -> Iterator[Rows]:
        """Delay on within `limit` (C, 2, n): the crossing beside the shortest charging."""
        x = self.candidates
        charge = switching.charging(x.load.swing.charge, self._eta, strong.i_low, strong.i_be_high)
        phi = switching.drive_for_crossing_on(x.load.swing.on, _left(limit, charge), switching.NEAR)
        yield scaled("delay_on", x.i_low, -phi.max(axis=1), -x.base.i_be_high)

    def _off_rows(self, limit: Array, weak: Extremes) -> Iterator[Rows]:
        """Delay off within `limit` (C, 2, n): the fall beside the shortest storage, and the storage beside the fall."""
        x, swing = self.candidates, self.candidates.load.swing
        held = switching.storage(x.tau_s_most, weak.i_high, weak.i_be_low, swing.i_sat, swing.hold, weak.i_rest)
        rho = switching.extraction_for(swing.off, _left(limit, held), weak.i_rest, switching.NEAR)
        yield scaled("delay_off", np.zeros(self.sizes[0]), -rho.max(axis=1), x.base.i_be_low)
        fall = switching.time_off(swing.off, weak.i_be_low, weak.i_rest)
        stretch = np.exp(np.clip(_left(limit, fall) / x.tau_s_most, -50.0, 50.0))
        room = (stretch * (swing.i_sat - weak.i_rest)).min(axis=1)
        most = (stretch * swing.hold).max(axis=(1, 2))[:, None]
        yield scaled("storage", -x.i_high, room, most * x.base.i_be_low)

    def _time(self, family: str, swing: switching.Swing, eta: Array, at: Point) -> Array:
        """The time of a family [s]; every argument broadcasts."""
        tau_s, guard = self.candidates.tau_s_most, self.brief.limits.timing_guard
        if family == "edge_off":
            return switching.edge_off(swing.edge, switching.EDGE, at.i_be, at.i_rest)
        if family == "delay_on":
            return switching.delay_on(swing, eta, at.i_eff, at.i_be)
        if family == "delay_off":
            return switching.delay_off(swing, tau_s, at.i_eff, at.i_be, at.i_rest)
        if family == "late_off":
            return switching.late_off(swing, tau_s, eta, at.i_eff, at.i_be, at.i_rest, guard)
        return switching.late_on(swing, self.candidates.tau_s_least, eta, at.i_eff, at.i_be, guard)

    def _worst_times(self, family: Family, i: Index, swing: switching.Swing, m: Index) -> Array:
        """Times of K designs at every corner and load end, (C, 2, K) [s]; swing: of their loads."""
        x = self.candidates
        light = (x.i_high if family.more_light_hurts else x.i_low)[:, None, i]
        taken = (x.base.i_be_high if family.more_base_hurts else x.base.i_be_low)[:, None, m]
        at = Point(light, taken, x.i_rest[:, None, i])
        return self._time(family.name, swing, self._eta, at)

    def scores(self, i: Index, j: Index, m: Index) -> Scores:
        """Worst-case goals of K designs, exactly."""
        x = self.candidates
        swing = x.load.swing.taken(j)
        on = switching.edge_on(swing.edge, x.i_low[:, None, i] - x.base.i_be_high[:, None, m], swing.i_sat)
        by_name = {family.name: self._worst_times(family, i, swing, m).max(axis=(0, 1)) for family in FAMILIES}
        p, q = self.power
        return Scores(
            edge=np.maximum(on.max(axis=(0, 1)), by_name["edge_off"]),
            delay=np.maximum(by_name["delay_on"], by_name["delay_off"]),
            distortion=np.maximum(by_name["late_on"], by_name["late_off"]),
            power=p[i] + q[j],
        )

    def cuts(self, ask: Ask, i: int, j: int, m: int) -> Rows:
        """Staircase rows that forbid (i, j, m) and all that are worse, for each family of times that it fails.

        Other base resistors get their staircases at the same corner too: they would fail next.
        """
        blocks: list[Rows] = []
        others = _spread(np.arange(self.sizes[2]), STAIRCASES).tolist()
        swing = self.candidates.load.swing.taken(np.array([j]))
        for family in FAMILIES:
            limit = getattr(ask, family.limit)
            late = self._worst_times(family, np.array([i]), swing, np.array([m]))[:, :, 0]
            if late.max() > limit:
                corner, end = (int(k) for k in np.unravel_index(int(late.argmax()), late.shape))
                blocks.extend(self._staircase(family, limit, (corner, end), j, k) for k in sorted({m, *others}))
        return stack(blocks, self.sizes)

    def _staircase(self, family: Family, limit: float, at: tuple[int, int], j: int, m: int) -> Rows:
        """For base resistor m and those that are worse at this corner: the least rank of branch that each load needs.

        Branches rank by their time with load j, the longest first; what a load needs is that the first so many all
        fail with it.
        """
        x, (corner, end) = self.candidates, at
        light = (x.i_high if family.more_light_hurts else x.i_low)[corner]
        taken = (x.base.i_be_high if family.more_base_hurts else x.base.i_be_low)[corner]
        load = np.arange(self.sizes[1])[:, None]
        swing = x.load.swing.at((np.full_like(load, corner), np.full_like(load, end), load))
        point = Point(light[None, :], taken[m], x.i_rest[corner][None, :])
        late = self._time(family.name, swing, x.corners.eta[corner, 0], point)
        order = np.argsort(-late[j], kind="stable")
        fails = np.logical_and.accumulate(late[:, order] > limit, axis=1)
        rank = np.empty(len(order))
        rank[order] = np.arange(len(order)) / len(order)
        need = fails.sum(axis=1) / len(order)
        worse = taken >= taken[m] if family.more_base_hurts else taken <= taken[m]
        return Rows((family.name,), rank[None, :], -need[None, :], np.where(worse, 0.0, 1.0)[None, :])


def _left(limit: Array, spent: Array) -> Array:
    """What is left of a limit; of an endless one, all."""
    return np.where(np.isposinf(limit), np.inf, limit - np.where(np.isposinf(limit), 0.0, spent))


def _spread(live: Index, count: int) -> Index:
    """At most `count` of the live values, evenly."""
    picked: Index = live if len(live) <= count else live[np.unique(np.linspace(0, len(live) - 1, count).astype(int))]
    return picked
