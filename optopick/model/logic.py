"""The rows and times of a coupler with a logic output: everything depends on one position alone."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import product

import numpy as np

from optopick.brief import Brief, Position
from optopick.corners import resistor_span, supply_axis, temperatures, thresholds
from optopick.coupler import Coupler, Logic
from optopick.model.led_candidates import LedCandidates, led_candidates
from optopick.model.ranges import Live, holding
from optopick.model.rows import Ask, Rows, Scores, scaled, stack
from optopick.model.taking import taken
from optopick.physics.heat import derated, resistor_derated
from optopick.physics.logic_output import discharge, rise_delay, rise_edge
from optopick.physics.saturation import load_current
from optopick.physics.types import Array


@dataclass(frozen=True)
class Pulls:
    """Pull-up resistors in stock.

    r_load (n,) [ohm]; worst edge, delay [s]; heat of the output (T, n) [W]; worst average power
    of the output path (n,) [W]; keep: check name to (n,) mask.
    """

    r_load: Array
    edge: Array
    delay: Array
    heat: Array
    power: Array
    keep: dict[str, np.ndarray]


class LogicModel:
    """One coupler with a logic output, against every value in stock."""

    def __init__(self, led: LedCandidates, pulls: Pulls, total_room: Array) -> None:
        self.led, self.pulls, self.total_room = led, pulls, total_room
        self.sizes = (len(led.r_led), len(pulls.r_load), 1)

    @classmethod
    def of(cls, brief: Brief, coupler: Coupler) -> LogicModel:
        """The model of a coupler over all that the brief stocks."""
        if coupler.logic is None:
            raise ValueError(f"{coupler.part} has no logic output")
        led = led_candidates(brief, coupler, coupler.logic.i_f_off)
        weakest = led.i_min * np.minimum(led.light, 1.0)
        keep = led.keep | {"switching_current": np.asarray((weakest >= coupler.logic.i_f_on).all(axis=0))}
        t = np.asarray(temperatures(brief.environment, coupler.transfer).values)
        return cls(replace(led, keep=keep), _pulls(brief, coupler, coupler.logic, t), derated(coupler.p_total, t))

    def take(self, i: np.ndarray, j: np.ndarray, m: np.ndarray) -> LogicModel:
        """The model over some of the values."""
        return LogicModel(taken(self.led, i), taken(self.pulls, j), self.total_room)

    @property
    def power(self) -> tuple[Array, Array]:
        """Worst average power of each LED branch and of each load resistor [W]."""
        return self.led.power, self.pulls.power

    def values(self, i: int, j: int, m: int) -> tuple[float, int, float, float, float]:
        """Resistors of a combination: r_led, pieces, r_shunt, r_load, r_be [ohm], infinite where absent."""
        led = self.led
        return float(led.r_led[i]), int(led.pieces[i]), float(led.r_shunt[i]), float(self.pulls.r_load[j]), np.inf

    @property
    def heat(self) -> tuple[Array, Array, Array]:
        """Heat of each LED branch (T, n), of the output with each load (T, n), and of the package at most (T,) [W]."""
        return self.led.heat, self.pulls.heat, self.total_room

    def start(self, dropped: frozenset[str] = frozenset()) -> Live:
        """The values that hold the limits on one value alone."""
        return holding((self.led.keep, self.pulls.keep, {}), self.sizes, dropped)

    def ready_rows(self, ask: Ask) -> Rows:
        """All of them."""
        return self.rows(ask)

    def rows(self, ask: Ask) -> Rows:
        """Every linear row of what is asked; all exact."""
        return stack(self._blocks(ask), self.sizes)

    def _blocks(self, ask: Ask) -> Iterator[Rows]:
        zero_led, zero = np.zeros(self.sizes[0]), np.zeros(1)
        if "total_power" not in ask.dropped:
            room = self.total_room.reshape(-1, 1) - self.led.heat
            yield scaled("total_power", room, -self.pulls.heat, np.zeros((len(room), 1)))
        for name, limit, time in (("edge", ask.edge, self.pulls.edge), ("delay", ask.slowest, self.pulls.delay)):
            if np.isfinite(limit):
                yield scaled(name, zero_led, limit - time, zero)
        if np.isfinite(ask.power):
            p, q = self.power
            yield scaled("power", ask.power - p, -q, zero)

    def scores(self, i: np.ndarray, j: np.ndarray, m: np.ndarray) -> Scores:
        """Worst-case goals of K designs; the sheet bounds each delay only from above, so distortion is the longer."""
        pulls, (p, q) = self.pulls, self.power
        return Scores(edge=pulls.edge[j], delay=pulls.delay[j], distortion=pulls.delay[j], power=p[i] + q[j])

    def cuts(self, ask: Ask, i: int, j: int, m: int) -> Rows:
        """None: every row is exact."""
        return stack([], self.sizes)


def _pulls(brief: Brief, coupler: Coupler, logic: Logic, t: Array) -> Pulls:
    stock, output = brief.stock.r_load, brief.output
    ends = list(product(supply_axis(brief).values, (0, 1)))
    v_cc = np.asarray([v for v, _ in ends]).reshape(-1, 1, 1)
    spans = resistor_span(np.asarray(stock.values), np.asarray(stock.tolerance), brief.stock.drift, t.reshape(-1, 1))
    r = np.stack([spans[end] for _, end in ends])
    i_sink = load_current(v_cc, logic.v_ol, r, max(output.input_leakage, output.input_current_low))
    v_ih = thresholds(output.v_ih, output.supply, v_cc)
    fraction = np.clip((v_ih - logic.v_ol) / (v_cc - logic.v_ol), 0.0, 1.0 - 1e-9)
    late = discharge(logic, v_cc, output.capacitance)
    edge = np.maximum(logic.t_f + late, rise_edge(logic, r, output.capacitance))
    delay = np.maximum(logic.t_phl + late, rise_delay(logic, r, output.capacitance, fraction))
    heat = v_cc * logic.i_cc + logic.v_ol * i_sink
    return Pulls(
        r_load=np.asarray(stock.values),
        edge=_high(edge),
        delay=_high(delay),
        heat=np.asarray(heat.max(axis=0)),
        power=_high(v_cc * logic.i_cc + brief.signal.lit * v_cc * i_sink),
        keep=_masks(brief, coupler, logic, _Ends(t.reshape(-1, 1), v_cc, r, i_sink, heat), stock),
    )


def _high(values: Array) -> Array:
    return np.asarray(values.max(axis=(0, 1)))


@dataclass(frozen=True)
class _Ends:
    """Temperature (T, 1), supply (S, 1, 1), resistor, sink current and heat (S, T, n) at every end."""

    t: Array
    v_cc: Array
    r: Array
    i_sink: Array
    heat: Array


def _masks(brief: Brief, coupler: Coupler, logic: Logic, at: _Ends, stock: Position) -> dict[str, np.ndarray]:
    """Limits on the pull-up alone: check name to mask, (n,) each."""
    output = brief.output
    v_il, v_ih = (thresholds(span, output.supply, at.v_cc) for span in (output.v_il, output.v_ih))
    high = at.v_cc - (logic.i_oh + output.input_leakage) * at.r
    rating = resistor_derated(np.asarray(stock.power), at.t)
    held = {
        "sink_current": at.i_sink <= logic.i_ol,
        "output_low": (logic.v_ol <= v_il - output.noise_margin) & np.isfinite(at.r),
        "output_high": high >= v_ih + output.noise_margin,
        "supply_low": (at.v_cc >= logic.v_cc_min) & np.isfinite(at.r),
        "supply_high": (at.v_cc <= logic.v_cc_max) & np.isfinite(at.r),
        "output_power": at.heat <= derated(coupler.p_out, at.t),
        "r_load_power": at.v_cc**2 / at.r <= rating,
        "r_load_voltage": (at.v_cc <= np.asarray(stock.voltage)) & np.isfinite(at.r),
    }
    return {name: np.asarray(mask.all(axis=(0, 1))) for name, mask in held.items()}
