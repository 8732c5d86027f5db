"""The formulas of the LED's side and of ratings a second time, at single points of the uncertainty box.

With `oracle_output` this is what `enumeration` tries every vertex with. Written from the meaning of each quantity and
not from the program's code: the LED by Newton's method on the diode law. Shares only the frozen types.
A check is a value, a limit and a sense; `room` is what is left of the limit, as a share of it.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from optopick.brief import Brief
from optopick.coupler import Ageing, Coupler, Led, Rating

K_OVER_Q = 1.380649e-23 / 1.602176634e-19
KELVIN = 273.15
DARK = 0.01
DIODE = 1.0


class Held(NamedTuple):
    """One check at some points: value, limit, and +1 where the value must stay below the limit, -1 above."""

    value: np.ndarray
    limit: np.ndarray
    sense: int

    @property
    def left(self) -> np.ndarray:
        """Share of the limit that is left (the plain difference for a limit of zero)."""
        if np.ndim(self.limit) == 0:
            return (self.limit - self.value) * (self.sense / (abs(self.limit) or 1.0))
        return self.sense * (self.limit - self.value) / np.where(self.limit == 0, 1.0, np.abs(self.limit))

    @property
    def room(self) -> np.ndarray:
        """The same; -inf where there is no value."""
        return none_is_least(self.left)


def none_is_least(room: np.ndarray) -> np.ndarray:
    return np.where(np.isnan(room), -np.inf, room)


def below(value: np.ndarray, limit: np.ndarray) -> Held:
    return Held(value, limit, 1)


def above(value: np.ndarray, limit: np.ndarray) -> Held:
    return Held(value, limit, -1)


# --- LED -------------------------------------------------------------------------------------------------------------


def diode(led: Led, v_f_ref: np.ndarray, u: np.ndarray, t: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Current, voltage, and slope of the voltage in u = ln(current / reference current)."""
    i = led.i_ref * np.exp(u)
    ideal = led.n * K_OVER_Q * (t + KELVIN)
    v = v_f_ref + ideal * u + led.r_s * (i - led.i_ref) + led.v_f_tc * (t - 25.0)
    return i, v, ideal + led.r_s * i


def behind_resistor(led: Led, v_f_ref, v, r, r_shunt, t) -> tuple[np.ndarray, np.ndarray]:
    """LED current and voltage of a source `v` behind `r` with a shunt: Kirchhoff's laws by Newton's method.

    In u the residual is convex and rises, so that steps from the right of the root never overshoot it.
    """
    u = np.maximum(0.0, np.log(np.maximum(v, 1e-3) / (r * led.i_ref)))
    u = u + np.zeros(np.broadcast_shapes(*(np.shape(x) for x in (v_f_ref, v, r, r_shunt, t))))
    for _ in range(200):
        i, v_f, slope = diode(led, v_f_ref, u, t)
        step = (r * (i + v_f / r_shunt) + v_f - v) / (r * (i + slope / r_shunt) + slope)
        u = u - step
        if np.all(np.abs(step) < 1e-13 * np.maximum(1.0, np.abs(u))):
            break
    i, v_f, _ = diode(led, v_f_ref, u, t)
    return i, v_f


def of_leakage(led: Led, v_f_ref, i_leak: float, r_shunt, t) -> np.ndarray:
    """LED current out of a leakage current that the shunt shares: a source of i_leak*r_shunt behind r_shunt."""
    none = np.isinf(r_shunt)
    r = np.where(none, 1.0, r_shunt)
    shared, _ = behind_resistor(led, v_f_ref, i_leak * r, r, np.inf, t)
    return np.where(none, i_leak, np.minimum(shared, i_leak))


def light_left(ageing: Ageing, i_f, t: float, life: float, lit: float) -> np.ndarray:
    """Share of the light that is left: the sheet's loss compounded over the accelerated hours."""
    hours = life * lit * (i_f / ageing.current) ** ageing.n
    hours = hours * np.exp(ageing.e_a / K_OVER_Q * (1 / (ageing.temperature + KELVIN) - 1 / (t + KELVIN)))
    return np.exp(np.log(1.0 - ageing.loss) * hours / ageing.time)


class LedState(NamedTuple):
    """LED current and voltage on, LED current off, current of the series resistor."""

    i_f: np.ndarray
    v_f: np.ndarray
    i_off: np.ndarray
    i_branch: np.ndarray


def led_state(brief: Brief, led: Led, t, v_f_ref, drive, drop, r_led, r_shunt) -> LedState:
    i_f, v_f = behind_resistor(led, v_f_ref, drive - drop, r_led, r_shunt, t)
    i_off = of_leakage(led, v_f_ref, brief.drive.off_leakage, r_shunt, t)
    if brief.drive.off_voltage is not None:
        i_off = np.maximum(i_off, behind_resistor(led, v_f_ref, brief.drive.off_voltage, r_led, r_shunt, t)[0])
        i_off = np.maximum(i_off, of_leakage(led, v_f_ref, brief.drive.off_current, r_shunt, t))
    return LedState(i_f, v_f, i_off, i_f + v_f / r_shunt)


class Worn(NamedTuple):
    """Rating [W] and voltage limit [V] of a resistor."""

    power: np.ndarray
    voltage: np.ndarray


def series_checks(s: LedState, t, r_led, worn: Worn) -> dict[str, Held]:
    """What one piece of the series resistor bears; r_led: of that piece."""
    return {
        "r_led_power": below(s.i_branch**2 * r_led, worn.power * chip_share(t)),
        "r_led_voltage": below(s.i_branch * r_led, worn.voltage),
    }


def led_checks(brief: Brief, coupler: Coupler, s: LedState, t, r_led, r_shunt, series: Worn, shunt: Worn | None):
    led, drive, transfer = coupler.led, brief.drive, coupler.transfer
    most_dark = DARK * transfer.i_ref if transfer else coupler.logic.i_f_off
    held = {
        "led_current": below(s.i_f, rating(led.i_max, t)),
        "led_power": below(s.i_f * s.v_f, rating(led.p_max, t)),
        "led_dark": below(s.i_off, most_dark),
        **series_checks(s, t, r_led, series),
    }
    if transfer:
        held["led_current_low"] = above(s.i_f, transfer.curve_i[0])
        held["led_current_high"] = below(s.i_f, transfer.curve_i[-1])
    if drive.max_current is not None:
        held["driver_current"] = below(s.i_branch, drive.max_current)
    if drive.on_current_min > 0:
        held["input_current"] = above(s.i_branch, drive.on_current_min)
    if drive.reverse > 0:
        guarded = drive.reverse_diode and drive.reverse > led.v_r_max
        held["reverse_voltage"] = below(np.float64(DIODE if guarded else drive.reverse), led.v_r_max)
    if shunt is not None:
        held["r_shunt_power"] = below(s.v_f**2 / r_shunt, shunt.power * chip_share(t))
    return held


# --- ratings ---------------------------------------------------------------------------------------------------------


def rating(limit: Rating, t) -> np.ndarray:
    over = np.clip(t - limit.above, 0.0, None)
    return np.clip(limit.value - limit.slope * over, 0.0, None)


def chip_share(t) -> np.ndarray:
    """Share of its power that a chip resistor may take: all up to 70 degC, none from 155 degC, a line between."""
    return np.interp(t, [70.0, 155.0], [1.0, 0.0])
