"""The formulas of a transistor output a second time, at single points of the uncertainty box.

CTR by power laws between the table's points, V_CE(on) by bisection on the load line: see `oracle_led`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from oracle_led import K_OVER_Q, KELVIN, Held, Worn, above, below, chip_share, rating

from optopick.brief import Brief, OutputCircuit
from optopick.coupler import Coupler, Transfer

HELD_OFF = 0.4


def _powers(transfer: Transfer) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    i, g = np.array(transfer.curve_i), np.array(transfer.curve_g)
    return i, g, np.log(g[1:] / g[:-1]) / np.log(i[1:] / i[:-1])


def relative(transfer: Transfer, i) -> np.ndarray:
    """CTR over CTR at the test current: a power law between neighbouring points, the first one downward for ever."""
    points, g, power = _powers(transfer)
    k = np.clip(np.searchsorted(points, i, side="right") - 1, 0, len(power) - 1)
    value = (g / points ** np.append(power, power[-1]))[k] * i ** power[k]
    return np.where(i > points[-1] * (1 + 1e-12), np.nan, value)


def carried(transfer: Transfer, ctr, h, i) -> np.ndarray:
    """Collector current that an LED current can drive; none without light."""
    dark = i <= 0
    i = np.where(dark, transfer.i_ref, i)
    return np.where(dark, 0.0, ctr * h * i * relative(transfer, i))


def needed(transfer: Transfer, ctr, h, j) -> np.ndarray:
    """LED current that drives a collector current; infinite beyond the curve's end."""
    points, g, power = _powers(transfer)
    tops = points * g
    want = j / (ctr * h)
    k = np.clip(np.searchsorted(tops, want, side="right") - 1, 0, len(power) - 1)
    found = points[k] * (want / tops[k]) ** (1.0 / (1.0 + power[k]))
    return np.where(want > tops[-1] * (1 + 1e-9), np.inf, np.minimum(found, points[-1]))


def at_temperature(transfer: Transfer, t) -> np.ndarray:
    return np.interp(t, transfer.curve_t, transfer.curve_h)


def mean_ctr(transfer: Transfer) -> float:
    return float(np.sqrt(transfer.ctr_min * transfer.ctr_max))


@dataclass(frozen=True)
class Lot:
    """What one output stage is at some points: temperature, CTR, light, supply, and what follows from them."""

    t: np.ndarray
    ctr: np.ndarray
    light: np.ndarray
    v_cc: np.ndarray
    h: np.ndarray
    eta: np.ndarray
    h_fe: np.ndarray
    v_be: np.ndarray
    v_il: np.ndarray
    v_ih: np.ndarray


def lot(brief: Brief, coupler: Coupler, t, ctr, light, v_cc) -> Lot:
    transfer, transistor = coupler.transfer, coupler.transistor
    h = at_temperature(transfer, t)
    dimming = np.maximum(1.0 + transfer.light_tc * (t - 25.0), 0.1)
    eta = mean_ctr(transfer) / transistor.h_fe * dimming * light
    low, high = brief.output.supply.low, brief.output.supply.high
    share = 0.0 if high == low else (v_cc - low) / (high - low)
    return Lot(
        t, ctr, light, v_cc, h, eta, ctr * h / eta,
        transistor.v_be + transistor.v_be_tc * (t - 25.0),
        brief.output.v_il.low + share * (brief.output.v_il.high - brief.output.v_il.low),
        brief.output.v_ih.low + share * (brief.output.v_ih.high - brief.output.v_ih.low),
    )  # fmt: skip


def pulled_up(brief: Brief) -> bool:
    return brief.output.circuit is OutputCircuit.PULL_UP


def input_on(brief: Brief) -> float:
    """What the receiver adds to the load while the transistor conducts: a low input sources its own current too."""
    o = brief.output
    return max(o.input_leakage, o.input_current_low) if pulled_up(brief) else o.input_leakage


def input_off(brief: Brief) -> float:
    o = brief.output
    return o.input_leakage if pulled_up(brief) else max(o.input_leakage, o.input_current_low)


def load_of(brief: Brief, coupler: Coupler, x: Lot, r_load) -> np.ndarray:
    """Collector current in saturation."""
    return (x.v_cc - coupler.transistor.v_ce_sat) / r_load + input_on(brief)


def load_checks(brief: Brief, coupler: Coupler, x: Lot, r_load, worn: Worn) -> dict[str, Held]:
    """Checks that only the load resistor decides."""
    transfer, transistor = coupler.transfer, coupler.transistor
    j_s = load_of(brief, coupler, x, r_load)
    top = np.minimum(rating(coupler.led.i_max, x.t), transfer.curve_i[-1])
    return {
        "deliverable_current": below(j_s, carried(transfer, x.ctr, x.h, top)),
        "collector_voltage": below(x.v_cc, transistor.v_ceo),
        "collector_current": below(j_s, transistor.i_c_max),
        "output_power": below(output_heat(brief, x, r_load), rating(coupler.p_out, x.t)),
        "r_load_power": below(x.v_cc**2 / r_load, worn.power * chip_share(x.t)),
        "r_load_voltage": below(x.v_cc, worn.voltage),
    }


def output_heat(brief: Brief, x: Lot, r_load) -> np.ndarray:
    """Half the supply across the transistor, the other half across the load; the receiver's current at full supply."""
    half = x.v_cc / 2
    return half * half / r_load + x.v_cc * input_on(brief)


def base_taken(x: Lot, r_be) -> np.ndarray:
    """LED current whose light the base resistor takes."""
    return x.v_be / r_be / x.eta


def sheet_overdrive(coupler: Coupler) -> float:
    transfer, transistor = coupler.transfer, coupler.transistor
    return float(carried(transfer, transfer.ctr_min, 1.0, np.float64(transistor.sat_i_f))) / transistor.sat_i_c


def saturated(coupler: Coupler, x: Lot, j_s, overdrive) -> np.ndarray:
    """V_CE of the Ebers-Moll equations at an overdrive, anchored at the sheet's point and never below it."""
    beta_r = coupler.transistor.beta_r

    def shape(k):
        forced = x.h_fe / k
        return (1.0 + (1.0 + forced) / beta_r) / (1.0 - forced / x.h_fe)

    held = overdrive > 1
    k = np.where(held, overdrive, 2.0)
    rise = K_OVER_Q * (x.t + KELVIN) * np.log(shape(k) / shape(sheet_overdrive(coupler)))
    floor = coupler.transistor.v_ce_sat * np.maximum(1.0, j_s / coupler.transistor.sat_i_c)
    return np.where(held, floor + np.maximum(rise, 0.0), np.inf)


def v_ce_bisected(brief: Brief, coupler: Coupler, x: Lot, j, r_load, steps: int = 44) -> np.ndarray:
    """V_CE where the saturation curve crosses the load line."""
    j_s, i_in = load_of(brief, coupler, x, r_load), input_on(brief)
    low = np.zeros(np.broadcast_shapes(np.shape(j), np.shape(j_s), np.shape(x.h_fe)))
    high = low + x.v_cc
    for _ in range(steps):
        v = (low + high) / 2
        too_low = saturated(coupler, x, j_s, j / ((x.v_cc - v) / r_load + i_in)) > v
        low, high = np.where(too_low, v, low), np.where(too_low, high, v)
    return (low + high) / 2


def level_on(brief: Brief, coupler: Coupler, x: Lot, j, r_load, exact: bool) -> tuple[str, Held]:
    """The level that the conducting output must reach. Not exact: only the sign of the room, by a look at the limit."""
    noise = brief.output.noise_margin
    name = "output_low" if pulled_up(brief) else "output_high"
    most = x.v_il - noise if pulled_up(brief) else x.v_cc - x.v_ih - noise
    if not exact:
        j_s = load_of(brief, coupler, x, r_load)
        return name, below(saturated(coupler, x, j_s, j / ((x.v_cc - most) / r_load + input_on(brief))), most)
    v = v_ce_bisected(brief, coupler, x, j, r_load)
    return name, below(v, most) if pulled_up(brief) else above(x.v_cc - v, x.v_ih + noise)


def leakage(coupler: Coupler, x: Lot, i_off, r_be) -> np.ndarray:
    """Collector current with the LED off: dark current, and the light that is left."""
    transfer, transistor = coupler.transfer, coupler.transistor
    rate = np.log(transistor.i_ceo_2 / transistor.i_ceo_1) / (transistor.t_2 - transistor.t_1)
    open_base = transistor.i_ceo_1 * np.exp(rate * (x.t - transistor.t_1))
    collector_base = open_base * mean_ctr(transfer) * x.light / (x.ctr * transistor.h_fe)
    dark = np.where(collector_base * r_be < HELD_OFF, collector_base, open_base)
    g = relative(transfer, np.clip(i_off, transfer.curve_i[0], transfer.curve_i[-1]))
    return dark + x.ctr * x.h * g * i_off


def level_off(brief: Brief, coupler: Coupler, x: Lot, i_off, r_load, r_be) -> tuple[str, Held]:
    """The level that leakage alone must not spoil."""
    lift = (leakage(coupler, x, i_off, r_be) + input_off(brief)) * r_load
    if pulled_up(brief):
        return "output_high", above(x.v_cc - lift, x.v_ih + brief.output.noise_margin)
    return "output_low", below(lift, x.v_il - brief.output.noise_margin)


def barrier_checks(brief: Brief, coupler: Coupler) -> dict[str, Held]:
    held = {}
    for name, check in (("withstand", "withstand"), ("working", "working_voltage"), ("creepage", "creepage")):
        limit, has = getattr(brief.limits.isolation, name), getattr(coupler.barrier, name)
        if limit is not None:
            held[check] = above(np.float64(np.nan if has is None else has), limit)
    return held
