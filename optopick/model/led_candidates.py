"""What each LED branch in stock (series resistor, pieces, shunt) contributes, at the ends of all that moves it."""

from __future__ import annotations

from dataclasses import dataclass, fields
from itertools import product

import numpy as np

from optopick.brief import Brief, Position
from optopick.corners import drive_axis, drop_axis, resistor_span, temperatures, v_f_axis
from optopick.coupler import Coupler
from optopick.physics.ageing import light_left
from optopick.physics.heat import derated, resistor_derated
from optopick.physics.led import branch_current, forward_voltage, led_current, led_current_of_leak
from optopick.physics.types import Array

DARK_FRACTION = 0.01
"""An LED counts as dark below this share of the current at which its coupler is specified (a rule of this program)."""


@dataclass(frozen=True)
class LedCandidates:
    """LED branches in stock; arrays over temperature T and branch n.

    r_led, r_shunt: (n,) [ohm], shunt infinite where absent; pieces: (n,) resistors of r_led in series. i_min, i_max:
    (T, n) extreme LED currents [A]; light: (n,) what end of life leaves [1]; i_off: (T, n) largest LED current when
    off [A]; heat: (T, n) largest LED dissipation [W]; power: (n,) worst average power of the LED path [W].
    keep: check name to (n,) mask.
    """

    r_led: Array
    pieces: Array
    r_shunt: Array
    i_min: Array
    i_max: Array
    light: Array
    i_off: Array
    heat: Array
    power: Array
    keep: dict[str, np.ndarray]


@dataclass(frozen=True)
class _Column:
    """One resistor of every branch: value [ohm], tolerance [1], power rating [W], voltage limit [V]; (n,) each."""

    values: Array
    tolerance: Array
    power: Array
    voltage: Array

    def at(self, index: np.ndarray) -> _Column:
        return _Column(*(getattr(self, field.name)[index] for field in fields(self)))


@dataclass(frozen=True)
class _Branches:
    """Every branch: its series resistor, in how many pieces, and its shunt."""

    series: _Column
    pieces: Array
    shunt: _Column


@dataclass(frozen=True)
class _Solved:
    """The branches at every end: resistors (4, 1, T, n), drive voltage, drop and forward voltage (1, D, 1, 1)."""

    t: Array
    supply: Array
    r: Array
    i: Array
    v_f: Array
    branch: Array
    shunted: Array
    i_off: Array


def led_candidates(brief: Brief, coupler: Coupler, i_dark: float) -> LedCandidates:
    """Evaluate every branch; `i_dark`: LED counts as dark below [A]. Where there is a CTR curve it is not left."""
    branches = _branches(brief.stock.r_led, brief.stock.r_shunt)
    solved = _solve(brief, coupler, branches)
    i_max, lit = _high(solved.i), brief.signal.lit
    hottest = float(solved.t.max())
    keep = _masks(brief, coupler, branches, solved)
    if coupler.transfer is not None:
        first, last = coupler.transfer.curve_i[0], coupler.transfer.curve_i[-1]
        keep["led_current_low"] = np.asarray((solved.i.min(axis=(0, 1)) >= first).all(axis=0))
        keep["led_current_high"] = np.asarray((i_max <= last).all(axis=0))
    keep["led_dark"] = np.asarray((_high(solved.i_off) <= i_dark).all(axis=0))
    return LedCandidates(
        r_led=branches.series.values,
        pieces=branches.pieces,
        r_shunt=branches.shunt.values,
        i_min=solved.i.min(axis=(0, 1)),
        i_max=i_max,
        light=light_left(coupler.ageing, i_max.max(axis=0), hottest, brief.environment.life, lit),
        i_off=_high(solved.i_off),
        heat=_high(solved.i * solved.v_f),
        power=lit * _high(solved.supply * solved.branch).max(axis=0),
        keep=keep,
    )


def _branches(series: Position, shunt: Position | None) -> _Branches:
    """Every series value, in one or more pieces, with every shunt; the absent shunt as infinite resistance."""
    first, second = _column(series), _absent() if shunt is None else _column(shunt)
    if shunt is not None and shunt.absent:
        empty = _absent()
        second = _Column(*(np.append(getattr(second, f.name), getattr(empty, f.name)) for f in fields(second)))
    counts = range(1, series.pieces + 1)
    chosen = list(product(range(len(first.values)), counts, range(len(second.values))))
    at, pieces, across = (np.asarray(column) for column in zip(*chosen, strict=True))
    return _Branches(first.at(at), pieces, second.at(across))


def _column(position: Position) -> _Column:
    return _Column(*(np.asarray(getattr(position, field.name)) for field in fields(_Column)))


def _absent() -> _Column:
    return _Column(np.array([np.inf]), np.array([0.0]), np.array([np.inf]), np.array([np.inf]))


def _solve(brief: Brief, coupler: Coupler, branches: _Branches) -> _Solved:
    led, drift = coupler.led, brief.stock.drift
    t = np.asarray(temperatures(brief.environment, coupler.transfer).values).reshape(1, -1, 1)
    r_ends = resistor_span(branches.series.values * branches.pieces, branches.series.tolerance, drift, t)
    s_ends = resistor_span(branches.shunt.values, branches.shunt.tolerance, drift, t)
    r = np.concatenate([r_ends[a] for a, _ in product((0, 1), (0, 1))])[:, None]
    s = np.concatenate([s_ends[b] for _, b in product((0, 1), (0, 1))])[:, None]
    ends = list(product(drive_axis(brief).values, drop_axis(brief).values, v_f_axis(coupler).values))
    supply, drop, v_f_ref = (np.asarray(column).reshape(1, -1, 1, 1) for column in zip(*ends, strict=True))
    i = led_current(led, v_f_ref, supply - drop, r, t, s)
    v_f = forward_voltage(led, v_f_ref, i, t)
    return _Solved(
        t=t[0],
        supply=supply,
        r=r,
        i=i,
        v_f=v_f,
        branch=branch_current(i, v_f, s),
        shunted=v_f * v_f / s,
        i_off=_off(brief, coupler, v_f_ref, r, s, t),
    )


def _off(brief: Brief, coupler: Coupler, v_f_ref: Array, r: Array, s: Array, t: Array) -> Array:
    """LED current left when off, at every end [A]."""
    drive, led = brief.drive, coupler.led
    leak = led_current_of_leak(led, v_f_ref, drive.off_leakage, t, s)
    if drive.off_voltage is None:
        return leak
    by_voltage = led_current(led, v_f_ref, drive.off_voltage, r, t, s)
    by_current = led_current_of_leak(led, v_f_ref, drive.off_current, t, s)
    return np.asarray(np.maximum(leak, np.maximum(by_voltage, by_current)))


def _high(values: Array) -> Array:
    """Largest over the ends of resistors and of drives: (4, D, T, n) to (T, n)."""
    return np.asarray(values.max(axis=(0, 1)))


def _masks(brief: Brief, coupler: Coupler, branches: _Branches, solved: _Solved) -> dict[str, np.ndarray]:
    """Limits on one branch alone: check name to the branches that hold it, (n,) each."""
    led, drive, t = coupler.led, brief.drive, solved.t
    heat, volts = _high(solved.branch**2 * solved.r), _high(solved.branch * solved.r)
    rating = resistor_derated(branches.series.power, t)
    pieces, fewer = branches.pieces, np.maximum(branches.pieces - 1, 1)
    cool, within = heat / pieces <= rating, volts / pieces <= branches.series.voltage
    would_do = (heat / fewer <= rating) & (volts / fewer <= branches.series.voltage)
    held = {
        "led_current": _high(solved.i) <= derated(led.i_max, t),
        "led_power": _high(solved.i * solved.v_f) <= derated(led.p_max, t),
        "r_led_power": cool,
        "r_led_voltage": within,
    }
    if brief.stock.r_shunt is not None:
        held["r_shunt_power"] = _high(solved.shunted) <= resistor_derated(np.minimum(branches.shunt.power, 1e9), t)
    if drive.max_current is not None:
        held["driver_current"] = _high(solved.branch) <= drive.max_current
    if drive.on_current_min > 0:
        held["input_current"] = solved.branch.min(axis=(0, 1)) >= drive.on_current_min
    if drive.reverse > 0 and not drive.reverse_diode:
        held["reverse_voltage"] = np.full(rating.shape, drive.reverse <= led.v_r_max)
    masks = {name: np.asarray(mask.all(axis=0)) for name, mask in held.items()}
    return masks | {"fewest_pieces": np.asarray((pieces == 1) | ~would_do.all(axis=0))}
