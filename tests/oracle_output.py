"""The formulas of a transistor output a second time, at single points of the uncertainty box.

CTR by power laws between the table's points, V_CE(on) by bisection on the load line: see `oracle_led`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from oracle_led import K_OVER_Q, KELVIN, Held, Worn, above, below, chip_share, rating

from optopick.brief import Brief, OutputCircuit
from optopick.coupler import Coupler, Kind, Transfer

HELD_OFF = 0.1


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
    v_base: np.ndarray
    v_il: np.ndarray
    v_ih: np.ndarray


def lot(brief: Brief, coupler: Coupler, t, ctr, light, v_cc, off=0.0) -> Lot:
    """off: how far the base-emitter voltage lies from the typical unit's [V]."""
    transfer, transistor = coupler.transfer, coupler.transistor
    h = at_temperature(transfer, t)
    dimming = np.maximum(1.0 + transfer.light_tc * (t - 25.0), 0.1)
    eta = mean_ctr(transfer) / transistor.h_fe * dimming * light
    low, high = brief.output.supply.low, brief.output.supply.high
    share = 0.0 if high == low else (v_cc - low) / (high - low)
    return Lot(
        t, ctr, light, v_cc, h, eta, ctr * h / eta,
        transistor.v_be + transistor.v_be_tc * (t - 25.0),
        transistor.v_be + transistor.v_be_tc * (t - 25.0) + off,
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
    return x.v_base / r_be / x.eta


def sheet_overdrive(coupler: Coupler) -> float:
    transfer, transistor = coupler.transfer, coupler.transistor
    return float(carried(transfer, transfer.ctr_min, 1.0, np.float64(transistor.sat_i_f))) / transistor.sat_i_c


def ebers_moll(h_fe, beta_r: float, overdrive):
    """exp of V_CE of a saturated transistor over kT/q."""
    forced = h_fe / overdrive
    return (1.0 + (1.0 + forced) / beta_r) / (1.0 - forced / h_fe)


def floor_of(coupler: Coupler, j_s, t) -> np.ndarray:
    """The sheet's V_CE(sat); beyond its current all that its junctions do not explain grows like a resistor's.

    What the junctions explain but for the inner base grows with absolute temperature above 25 degC."""
    x, k = coupler.transistor, sheet_overdrive(coupler)
    hotter = 0.0
    explained = x.v_be / 2 if coupler.kind is Kind.DARLINGTON else 0.0
    if k > 1:
        explained += K_OVER_Q * (25.0 + KELVIN) * np.log(ebers_moll(x.h_fe, x.beta_r, k))
        hotter = K_OVER_Q * np.maximum(t - 25.0, 0.0) * np.log(ebers_moll(x.h_fe, x.beta_r, k))
    ohms = max(x.v_ce_sat - explained, 0.0) / x.sat_i_c
    return x.v_ce_sat + hotter + ohms * np.maximum(j_s - x.sat_i_c, 0.0)


def saturated(coupler: Coupler, x: Lot, j_s, overdrive) -> np.ndarray:
    """V_CE of the Ebers-Moll equations at an overdrive, anchored at the sheet's point and never below it."""
    beta_r, held = coupler.transistor.beta_r, overdrive > 1
    shapes = [ebers_moll(x.h_fe, beta_r, k) for k in (np.where(held, overdrive, 2.0), sheet_overdrive(coupler))]
    rise = K_OVER_Q * (x.t + KELVIN) * np.log(shapes[0] / shapes[1])
    return np.where(held, floor_of(coupler, j_s, x.t) + np.maximum(rise, 0.0), np.inf)


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


def open_base(coupler: Coupler, x: Lot) -> np.ndarray:
    """Dark current with nothing at the base."""
    transistor = coupler.transistor
    rate = np.log(transistor.i_ceo_2 / transistor.i_ceo_1) / (transistor.t_2 - transistor.t_1)
    return transistor.i_ceo_1 * np.exp(rate * (x.t - transistor.t_1))


def dark_as_light(coupler: Coupler, x: Lot) -> np.ndarray:
    """LED current that would do to this unit what its dark current does."""
    return needed(coupler.transfer, x.ctr, x.h, open_base(coupler, x))


def leakage(coupler: Coupler, x: Lot, i_off, r_be) -> np.ndarray:
    """Collector current with the LED off: dark current, and what the light that is left adds to it."""
    transfer, alone = coupler.transfer, open_base(coupler, x)
    base_leak = x.eta * dark_as_light(coupler, x)
    dark = np.where(base_leak * r_be < HELD_OFF, base_leak, alone)
    g = relative(transfer, np.clip(i_off, transfer.curve_i[0], transfer.curve_i[-1]))
    together = carried(transfer, x.ctr, x.h, np.minimum(i_off + dark_as_light(coupler, x), transfer.curve_i[-1]))
    return (dark + np.maximum(x.ctr * x.h * g * i_off, together - alone)) * early(x)


def early(x: Lot) -> np.ndarray:
    """Growth of a current from 5 V to the full supply, by an Early voltage of 50 V."""
    return np.maximum((x.v_cc + 45.0) / 50.0, 1.0)


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
