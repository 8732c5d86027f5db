"""The worst corner is the worst: points inside the uncertainty box do no worse.

Inside points are evaluated with `oracle_led` and `oracle_output`, the worst corner comes from `review`.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import product

import numpy as np
import oracle_led
import oracle_output
import oracle_times
import pytest
import random_links
from enumeration import resistor_ends, survey, temperatures
from oracle_led import LedState, Worn
from test_enumeration import field_drive, kinked, over_temperature, turning

from optopick.brief import Brief, Position, Span
from optopick.coupler import Coupler
from optopick.recheck import review
from optopick.result import Design

SAMPLES = 200
EXACT = 1e-9
SLACK = {
    **dict.fromkeys(("led_dark", "output_low", "output_high"), 1e-7),
    **dict.fromkeys(("led_power", "total_power"), 1e-3),
    **dict.fromkeys(("edge_off", "delay_off", "distortion", "edge_time", "delay", "shortest_pulse"), 2e-3),
}
"""What a check's worst corner may miss of its limit, or a time of itself, where the extreme need not be at a corner.

led_dark and levels: the program sends leakage through 1e12 ohm where there is no shunt, and loses a picoampere.
led_power: a series resistor gives the most to an LED that takes half the voltage, which a 3.3 V drive may have between
its ends. Times after the LED goes dark: the gain has a knee where a level's current passes a point of the CTR curve, at
whatever temperature, CTR or load that happens. Measured with 4000 points on each of 245 designs whose CTR bends over
temperature only at tried temperatures: 0.09 % of the power, 0.05 % of the off edge, less of the rest.
"""


@dataclass(frozen=True)
class Points:
    """Assignments of everything uncertain about one design, (n,) each."""

    t: np.ndarray
    age: np.ndarray
    ctr: np.ndarray
    light: np.ndarray
    v_be: np.ndarray
    v_f: np.ndarray
    drive: np.ndarray
    drop: np.ndarray
    v_cc: np.ndarray
    r_led: np.ndarray
    r_load: np.ndarray
    r_be: np.ndarray
    r_shunt: np.ndarray


def inside(rng: np.random.Generator, brief: Brief, coupler: Coupler, design: Design) -> Points:
    """Random points; most coordinates sit at an end, so that edges of the box are met too, where trouble would be."""
    transfer, spread, off = coupler.transfer, coupler.transistor.light_spread, coupler.transistor.v_be_spread

    def share() -> np.ndarray:
        return np.where(rng.random(SAMPLES) < 0.7, rng.integers(0, 2, SAMPLES), rng.random(SAMPLES))

    def between(span: Span) -> np.ndarray:
        return span.low + share() * (span.high - span.low)

    def resistor(position: Position | None, value: float | None, t: np.ndarray) -> np.ndarray:
        if value is None:
            return np.full(SAMPLES, np.inf)
        part = entry(position, value, "tolerance") + brief.stock.drift * np.abs(t - 25.0)
        return value * (1.0 + part * (2.0 * share() - 1.0))

    t = between(brief.environment.temperature)
    stock = brief.stock
    return Points(
        t=t,
        age=share(),
        ctr=between(Span(transfer.ctr_min, transfer.ctr_max)),
        light=between(Span(1.0 / spread, spread)),
        v_be=between(Span(-off, off)),
        v_f=between(Span(coupler.led.v_f_min, coupler.led.v_f_max)),
        drive=between(brief.drive.supply),
        drop=between(brief.drive.drop),
        v_cc=between(brief.output.supply),
        r_led=resistor(stock.r_led, design.r_led, t),
        r_load=resistor(stock.r_load, design.r_load, t),
        r_be=resistor(stock.r_be, design.r_be, t),
        r_shunt=resistor(stock.r_shunt, design.r_shunt, t),
    )


def entry(position: Position, value: float, column: str) -> float:
    return getattr(position, column)[position.values.index(value)]


def worn(position: Position | None, value: float | None) -> Worn | None:
    return None if value is None else Worn(entry(position, value, "power"), entry(position, value, "voltage"))


def light_at_end_of_life(brief: Brief, coupler: Coupler, design: Design) -> float:
    """Of the unit driven hardest at the hottest; that is the wear the program counts with everywhere."""
    led, drive, stock, most = coupler.led, brief.drive, brief.stock, 0.0
    for t in temperatures(brief, coupler.transfer):
        r = _two(stock.r_led, design.r_led, brief, t)
        p = _two(stock.r_shunt, design.r_shunt, brief, t)
        for v_f, v, drop, a, b in product(
            (led.v_f_min, led.v_f_max), (drive.supply.low, drive.supply.high), (drive.drop.low, drive.drop.high), r, p
        ):
            most = max(most, float(oracle_led.led_state(brief, led, t, v_f, v, drop, a, b).i_f))
    hottest = brief.environment.temperature.high
    return float(oracle_led.light_left(coupler.ageing, most, hottest, brief.environment.life, brief.signal.lit))


def _two(position: Position | None, value: float | None, brief: Brief, t: float) -> np.ndarray:
    if value is None:
        return np.array([np.inf])
    return resistor_ends(np.array(value), np.array(entry(position, value, "tolerance")), brief.stock.drift, t)


def rooms_at(brief: Brief, coupler: Coupler, design: Design, p: Points) -> tuple[dict, dict]:
    """Room of every check, and every time [s] and the power [W], at each point."""
    stock, out = brief.stock, oracle_output
    s = oracle_led.led_state(brief, coupler.led, p.t, p.v_f, p.drive, p.drop, p.r_led, p.r_shunt)
    ratings = worn(stock.r_led, design.r_led), worn(stock.r_shunt, design.r_shunt)
    held = dict(oracle_led.led_checks(brief, coupler, s, p.t, p.r_led, p.r_shunt, *ratings))
    x = out.lot(brief, coupler, p.t, p.ctr, p.light, p.v_cc, p.v_be)
    held |= out.load_checks(brief, coupler, x, p.r_load, worn(stock.r_load, design.r_load))
    if design.r_be is not None:
        most = worn(stock.r_be, design.r_be).power * oracle_led.chip_share(p.t)
        held["r_be_power"] = oracle_led.below(x.v_base**2 / p.r_be, most)
    i_eff = s.i_f * (1.0 + p.age * (light_at_end_of_life(brief, coupler, design) - 1.0))
    held |= output_rooms(brief, coupler, x, s, i_eff, p)
    swing, guard = oracle_times.swing(brief, coupler, x, p.r_load), brief.limits.timing_guard
    times = oracle_times.times(coupler, x, swing, i_eff, s.i_off, p.r_be, guard)
    timing, goals = oracle_times.timing_checks(brief, times)
    power = brief.signal.lit * (p.drive * s.i_branch + p.v_cc * out.load_of(brief, coupler, x, p.r_load))
    if brief.limits.power is not None:
        held["power"] = oracle_led.below(power, np.float64(brief.limits.power))
    values = {name: brief.limits.timing_guard * value for name, value in times._asdict().items()}
    rooms = {name: np.broadcast_to(check.room, SAMPLES) for name, check in (held | timing).items()}
    return rooms, values | {"distortion": goals["distortion"], "power": power}


def output_rooms(
    brief: Brief, coupler: Coupler, x: oracle_output.Lot, s: LedState, i_eff: np.ndarray, p: Points
) -> dict:
    out = oracle_output
    drive = out.carried(coupler.transfer, x.ctr, x.h, i_eff - out.base_taken(x, p.r_be))
    heat = s.i_f * s.v_f + out.output_heat(brief, x, p.r_load)
    held = dict([
        out.level_on(brief, coupler, x, drive, p.r_load, exact=True),
        out.level_off(brief, coupler, x, s.i_off, p.r_load, p.r_be),
        ("total_power", oracle_led.below(heat, oracle_led.rating(coupler.p_total, p.t))),
    ])  # fmt: skip
    if brief.limits.ctr_margin is not None:
        held["ctr_margin"] = oracle_led.above(drive / out.load_of(brief, coupler, x, p.r_load), brief.limits.ctr_margin)
    return held


def some_design(rng: np.random.Generator, brief: Brief, coupler: Coupler, valid: bool) -> Design:
    """A design out of the stock; a valid one where asked and where there is one."""
    if valid:
        grid = survey(brief, coupler)
        held = np.flatnonzero(grid.feasible)
        if len(held):
            return Design(*grid.winner(int(rng.choice(held))))

    def one(position: Position | None) -> float | None:
        if position is None or (position.absent and rng.random() < 0.3):
            return None
        return float(rng.choice(position.values))

    stock = brief.stock
    base = one(stock.r_be) if coupler.base_pin else None
    return Design(coupler.part, one(stock.r_led), one(stock.r_load), base, one(stock.r_shunt))


def link(seed: int) -> tuple[np.random.Generator, Brief, Coupler]:
    rng = np.random.default_rng(70_000 + seed)
    brief, coupler = random_links.brief(rng), random_links.coupler(rng)
    if seed % 7 == 6:
        brief = field_drive(rng, brief)
    return rng, brief, (lambda c: c, bent, kinked, turning)[seed % 4](coupler)


def bent(coupler: Coupler) -> Coupler:
    """The same coupler with a CTR that bends at five temperatures; each part has its own."""
    rng = np.random.default_rng(round(1e9 * coupler.transfer.ctr_max))
    t = np.sort(rng.uniform(-35.0, 95.0, 5))
    h = rng.uniform(0.7, 1.3, 5)
    return over_temperature(coupler, tuple(t.tolist()), tuple((h / np.interp(25.0, t, h)).tolist()))


def compare(seed: int) -> tuple[bool, bool, bool, bool]:
    """Look for a point worse than the worst corner; of what sort the design was."""
    rng, brief, coupler = link(seed)
    design = some_design(rng, brief, coupler, valid=seed % 3 > 0)
    reviewed = review(brief, coupler, design)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        rooms, values = rooms_at(brief, coupler, design, inside(rng, brief, coupler, design))
    saturates = all(c.value >= 1 for c in checks_of(brief, coupler, design, "ctr_margin"))
    for check in reviewed.checks:
        slack = SLACK.get(check.name, EXACT) * max(1.0, abs(check.margin))
        assert rooms[check.name].min() >= check.margin - slack, (check, design, seed)
    for name, worst in worst_values(reviewed).items():
        assert values[name].max() <= worst * (1 + SLACK.get(name, EXACT)), (name, design, seed)
    return reviewed.passed, saturates, design.r_be is not None, design.r_shunt is not None


@pytest.mark.parametrize("chunk", range(3))
def test_nothing_inside_the_box_is_worse_than_the_worst_corner(chunk):
    sorts = np.array([compare(seed) for seed in range(chunk * 24, (chunk + 1) * 24)])
    valid, saturated, with_base, with_shunt = sorts.sum(axis=0)
    assert min(valid, saturated) >= 7
    assert min(with_base, with_shunt) >= 3


def checks_of(brief: Brief, coupler: Coupler, design: Design, name: str) -> list:
    """A check of the design under a brief that asks for it."""
    asking = replace(brief, limits=replace(brief.limits, ctr_margin=1.0))
    return [check for check in review(asking, coupler, design).checks if check.name == name]


def worst_values(reviewed) -> dict[str, float]:
    timing = reviewed.timing
    names = ("edge_on", "edge_off", "storage", "delay_on", "delay_off", "distortion")
    return {name: getattr(timing, name) for name in names} | {"power": reviewed.power.worst}
