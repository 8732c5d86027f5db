"""What each LED branch in stock (series resistor, shunt) contributes, at the ends of everything that moves it."""

from __future__ import annotations

from dataclasses import dataclass
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


@dataclass(frozen=True)
class LedCandidates:
    """LED branches in stock; arrays over temperature T and branch n.

    r_led, r_shunt: (n,) [ohm], shunt infinite where absent. i_min, i_max: (T, n) extreme LED currents [A]; light:
    (n,) what end of life leaves [1]; i_off: (T, n) largest LED current when off [A]; heat: (T, n) largest LED
    dissipation [W]; power: (n,) worst average power of the LED path [W]. keep: check name to (n,) mask.
    """

    r_led: Array
    r_shunt: Array
    i_min: Array
    i_max: Array
    light: Array
    i_off: Array
    heat: Array
    power: Array
    keep: dict[str, np.ndarray]


def led_candidates(brief: Brief, coupler: Coupler, i_low: float, i_dark: float) -> LedCandidates:
    """Evaluate every branch; `i_low`: least LED current the table covers [A]; `i_dark`: LED counts as dark below [A]."""
    series, shunt = _pairs(brief.stock.r_led, brief.stock.r_shunt)
    t = np.asarray(temperatures(brief.environment, coupler.transfer).values).reshape(1, -1, 1)
    v, v_f_ref = _drives(brief, coupler)
    drift = brief.stock.drift
    r_ends = resistor_span(series.value, series.tolerance, drift, t)
    s_ends = resistor_span(shunt.value, shunt.tolerance, drift, t)
    r = np.concatenate([r_ends[a] for a, _ in product((0, 1), (0, 1))])[:, None]
    s = np.concatenate([s_ends[b] for _, b in product((0, 1), (0, 1))])[:, None]
    i = led_current(coupler.led, v_f_ref, v, r, t, s)
    v_f = forward_voltage(coupler.led, v_f_ref, i, t)
    branch = branch_current(i, v_f, s)
    i_off = _off(brief, coupler, v_f_ref, r, s, t)
    worst = _Worst(t[0, :, 0], i, v_f, branch, branch * branch * r, branch * r, v_f * v_f / s, i_off)
    hottest = float(t.max())
    left = light_left(coupler.ageing, worst.i.max(axis=0), hottest, brief.environment.life, brief.signal.lit)
    return LedCandidates(
        r_led=series.value,
        r_shunt=shunt.value,
        i_min=i.min(axis=(0, 1)),
        i_max=worst.i,
        light=np.asarray(left),
        i_off=worst.i_off,
        heat=worst.heat,
        power=brief.signal.lit * _high(_supply(brief) * branch).max(axis=0),
        keep=_masks(brief, coupler, worst, series, shunt, i.min(axis=(0, 1)), branch.min(axis=(0, 1)), i_low, i_dark),
    )


@dataclass(frozen=True)
class _Column:
    """One resistor of every branch: value [ohm], tolerance [1], power rating [W], voltage limit [V]; (n,) each."""

    value: Array
    tolerance: Array
    power: Array
    voltage: Array


class _Worst:
    """Largest values over every end, (T, n): currents, heats and voltages of the branch."""

    def __init__(
        self, t: Array, i: Array, v_f: Array, branch: Array, p_r: Array, v_r: Array, p_s: Array, i_off: Array
    ) -> None:
        self.t = t[:, None]
        self.i, self.heat, self.branch = _high(i), _high(i * v_f), _high(branch)
        self.p_series, self.v_series, self.p_shunt = _high(p_r), _high(v_r), _high(p_s)
        self.i_off = _high(i_off)


def _high(values: Array) -> Array:
    """Largest over the ends of resistors and of drives: (4, 8, T, n) to (T, n)."""
    return np.asarray(values.max(axis=(0, 1)))


def _pairs(series: Position, shunt: Position | None) -> tuple[_Column, _Column]:
    """Every pair of series and shunt value, the absent shunt as infinite resistance."""
    first = _column(series)
    second = _absent() if shunt is None else _column(shunt)
    if shunt is not None and shunt.absent:
        empty = _absent()
        second = _Column(*(np.append(getattr(second, f), getattr(empty, f)) for f in _Column.__dataclass_fields__))
    n, m = len(first.value), len(second.value)
    left = _Column(*(np.repeat(getattr(first, f), m) for f in _Column.__dataclass_fields__))
    right = _Column(*(np.tile(getattr(second, f), n) for f in _Column.__dataclass_fields__))
    return left, right


def _column(position: Position) -> _Column:
    return _Column(*(np.asarray(getattr(position, f)) for f in ("values", "tolerance", "power", "voltage")))


def _absent() -> _Column:
    return _Column(np.array([np.inf]), np.array([0.0]), np.array([np.inf]), np.array([np.inf]))


def _supply(brief: Brief) -> Array:
    """Drive supply at every end of supply, drop and forward voltage, (1, 8, 1, 1) or fewer [V]."""
    drive, drop = drive_axis(brief).values, drop_axis(brief).values
    ends = [v for v, _, _ in product(drive, drop, (0, 1))]
    return np.asarray(ends).reshape(1, -1, 1, 1)


def _drives(brief: Brief, coupler: Coupler) -> tuple[Array, Array]:
    """Voltage left for the branch, and forward voltage of the unit, at every end: (1, D, 1, 1) [V]."""
    v_f = v_f_axis(coupler).values
    v_f = (v_f[0], v_f[-1])
    ends = list(product(drive_axis(brief).values, drop_axis(brief).values, v_f))
    v = np.asarray([high - drop for high, drop, _ in ends]).reshape(1, -1, 1, 1)
    return v, np.asarray([f for _, _, f in ends]).reshape(1, -1, 1, 1)


def _off(brief: Brief, coupler: Coupler, v_f_ref: Array, r: Array, s: Array, t: Array) -> Array:
    """LED current left when off, at every end [A]."""
    drive, led = brief.drive, coupler.led
    leak = led_current_of_leak(led, v_f_ref, drive.off_leakage, t, s)
    if drive.off_voltage is None:
        return leak
    by_voltage = led_current(led, v_f_ref, drive.off_voltage, r, t, s)
    return np.asarray(
        np.maximum(np.maximum(leak, by_voltage), led_current_of_leak(led, v_f_ref, drive.off_current, t, s))
    )


def _masks(
    brief: Brief,
    coupler: Coupler,
    worst: _Worst,
    series: _Column,
    shunt: _Column,
    i_min: Array,
    branch_min: Array,
    i_low: float,
    i_dark: float,
) -> dict[str, np.ndarray]:
    """Limits on one branch alone: check name to the branches that hold it, (n,) each."""
    led, drive, t = coupler.led, brief.drive, worst.t
    held = {
        "led_current": worst.i <= derated(led.i_max, t),
        "led_power": worst.heat <= derated(led.p_max, t),
        "led_current_low": i_min >= i_low,
        "led_dark": worst.i_off <= i_dark,
        "r_led_power": worst.p_series <= resistor_derated(series.power, t),
        "r_led_voltage": worst.v_series <= series.voltage,
    }
    if brief.stock.r_shunt is not None:
        held["r_shunt_power"] = worst.p_shunt <= resistor_derated(np.minimum(shunt.power, 1e9), t)
    if drive.max_current is not None:
        held["driver_current"] = worst.branch <= drive.max_current
    if drive.on_current_min > 0:
        held["input_current"] = branch_min >= drive.on_current_min
    if drive.reverse > 0:
        held["reverse_voltage"] = np.full_like(worst.i, drive.reverse <= led.v_r_max, dtype=bool)
    return {name: np.asarray(mask.all(axis=0)) for name, mask in held.items()}
