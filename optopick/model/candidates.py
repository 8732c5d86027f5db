"""What every stock value contributes to the checks of a transistor output, at every corner.

Corners C are those of `corner_list`; the ends of a resistor's own tolerance are folded in where the direction is
certain, and kept side by side (axis of two) where it is not.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from optopick.brief import Brief, OutputCircuit, Position
from optopick.corners import resistor_span
from optopick.coupler import Coupler, Kind, Transfer, Transistor
from optopick.model.corner_list import CornerList, corner_list
from optopick.model.led_candidates import DARK_FRACTION, LedCandidates, led_candidates
from optopick.model.taking import taken
from optopick.physics.charge import Base, Load
from optopick.physics.heat import derated, output_dissipation, resistor_derated
from optopick.physics.leakage import dark_current, dark_current_held, raised
from optopick.physics.saturation import (
    load_current,
    overdrive_to_hold,
    sheet_point,
    v_ce_saturated,
)
from optopick.physics.switching import Swing, swing
from optopick.physics.transfer import base_led_current, collector_current, led_current_for, relative_ctr
from optopick.physics.types import Array


@dataclass(frozen=True)
class LoadCandidates:
    """Load resistors in stock. r_load: (n,) [ohm].

    swing: over corner C, the two ends of its tolerance, and value n. Over (C, n): for_margin: LED current for the CTR
    margin [A] (None without that limit); for_level: LED current that holds the on level [A]; leak_room: leakage the off
    level allows [A]. heat: (T, n) output dissipation [W]; power: (n,) worst average power of
    the output path [W]. keep: check name to (n,) mask.
    """

    r_load: Array
    swing: Swing
    for_margin: Array | None
    for_level: Array
    leak_room: Array
    heat: Array
    power: Array
    keep: dict[str, np.ndarray]


@dataclass(frozen=True)
class BaseCandidates:
    """Base-emitter resistors in stock, infinite where the position may stay empty. r_be: (n,) [ohm].

    i_be_low, i_be_high: LED current it takes at its largest resistance and the least base-emitter voltage, and the
    other way round [A]; leak: dark current [A]; all (C, n). keep: check name to (n,) mask.
    """

    r_be: Array
    i_be_low: Array
    i_be_high: Array
    leak: Array
    keep: dict[str, np.ndarray]


@dataclass(frozen=True)
class Candidates:
    """All three positions of one coupler, its corners, and the light currents of every branch.

    i_low, i_high: (C, n_led) least light, worn, and most, new [A]; i_lit_off: (C, n_led) collector current that the
    light left in the dark LED adds [A]; i_rest: (C, n_led) LED current which that light and the dark current amount to
    [A].
    total_room: (T,) package dissipation allowed [W]; tau_s_least, tau_s_most: of units [s]; i_input_off [A].
    """

    corners: CornerList
    led: LedCandidates
    load: LoadCandidates
    base: BaseCandidates
    i_low: Array
    i_high: Array
    i_lit_off: Array
    i_rest: Array
    total_room: Array
    tau_s_least: float
    tau_s_most: float
    i_input_off: float

    @property
    def sizes(self) -> tuple[int, int, int]:
        """Number of LED branches, load resistors, base resistors."""
        return len(self.led.r_led), len(self.load.r_load), len(self.base.r_be)

    def take(self, i: np.ndarray, j: np.ndarray, m: np.ndarray) -> Candidates:
        """The same with only the LED branches `i`, load resistors `j` and base resistors `m`, in that order."""
        return replace(
            self,
            led=taken(self.led, i),
            load=taken(self.load, j),
            base=taken(self.base, m),
            i_low=self.i_low[:, i],
            i_high=self.i_high[:, i],
            i_lit_off=self.i_lit_off[:, i],
            i_rest=self.i_rest[:, i],
        )


def candidates(brief: Brief, coupler: Coupler) -> Candidates:
    """Evaluate every stock value for a coupler with a transistor output."""
    transfer, transistor = coupler.transfer, coupler.transistor
    if transfer is None or transistor is None:
        raise ValueError(f"{coupler.part} has no transistor output")
    c = corner_list(brief, transfer, transistor)
    led = led_candidates(brief, coupler, DARK_FRACTION * transfer.i_ref)
    i_off = led.i_off[c.t_index]
    i_dark = _dark_led(transfer, transistor, c)
    t = np.unique(c.t[:, 0])
    return Candidates(
        corners=c,
        led=led,
        load=_load(brief, coupler, transfer, transistor, c),
        base=_base(brief, coupler, transistor, c, c.eta * i_dark),
        i_low=led.i_min[c.t_index] * led.light,
        i_high=led.i_max[c.t_index],
        i_lit_off=_lit_off(transfer, transistor, c, i_off, i_dark),
        i_rest=(i_off + i_dark) * raised(c.v_cc),
        total_room=derated(coupler.p_total, t),
        tau_s_least=transistor.tau_s / transistor.tau_s_spread,
        tau_s_most=transistor.tau_s * transistor.tau_s_spread,
        i_input_off=input_current(brief, on=False),
    )


def _dark_led(transfer: Transfer, transistor: Transistor, c: CornerList) -> Array:
    """LED current that would carry the dark current, (C, 1) [A]."""
    return led_current_for(transfer, c.ctr, c.h, _dark(transistor, c))


def _lit_off(transfer: Transfer, transistor: Transistor, c: CornerList, i_off: Array, i_dark: Array) -> Array:
    """Collector current that the light left adds to the dark current, (C, n) [A].

    Below the CTR curve by its first point or by its slope, whichever gives more.
    """
    last = transfer.curve_i[-1]
    flat = c.ctr * c.h * relative_ctr(transfer, np.clip(i_off, transfer.curve_i[0], last)) * i_off
    both = collector_current(transfer, c.ctr, c.h, np.minimum(i_off + i_dark, last))
    return np.asarray(np.maximum(flat, both - _dark(transistor, c)) * raised(c.v_cc))


def input_current(brief: Brief, on: bool) -> float:
    """What the receiver adds to the coupler's current with the output on, or off [A].

    A low input sources input_current_low; either level leaks input_leakage.
    """
    output = brief.output
    low = on == (output.circuit is OutputCircuit.PULL_UP)
    return max(output.input_leakage, output.input_current_low) if low else output.input_leakage


def _load(brief: Brief, coupler: Coupler, transfer: Transfer, transistor: Transistor, c: CornerList) -> LoadCandidates:
    stock = brief.stock.r_load
    r = _ends(stock, brief.stock.drift, c.t)
    i_in = input_current(brief, on=True)
    at = c.v_cc[:, :, None]
    j_s = load_current(at, transistor.v_ce_sat, r, i_in)
    margin = brief.limits.ctr_margin
    lifted = None if margin is None else led_current_for(transfer, c.ctr[:, :, None], c.h[:, :, None], margin * j_s)
    t = np.unique(c.t[:, 0]).reshape(-1, 1)
    r_t = resistor_span(np.asarray(stock.values), np.asarray(stock.tolerance), brief.stock.drift, t)[0]
    v_max = float(c.v_cc.max())
    heat = output_dissipation(v_max, r_t, i_in)
    return LoadCandidates(
        r_load=np.asarray(stock.values),
        swing=_swing(brief, transfer, transistor, c, r, j_s),
        for_margin=None if lifted is None else np.asarray(lifted.max(axis=1)),
        for_level=_for_level(brief, coupler, transfer, transistor, c, r, j_s),
        leak_room=_leak_room(brief, c, r),
        heat=heat,
        power=brief.signal.lit * v_max * load_current(v_max, transistor.v_ce_sat, r_t, i_in).max(axis=0),
        keep=_load_masks(coupler, transfer, transistor, c, stock, j_s, heat, v_max * v_max / r_t),
    )


def _ends(position: Position, drift: float, t: Array) -> Array:
    """Least and largest resistance of every value at every corner, (C, 2, n) [ohm]."""
    ends = resistor_span(np.asarray(position.values), np.asarray(position.tolerance), drift, t)
    return np.stack(ends, axis=1)


def _swing(brief: Brief, transfer: Transfer, transistor: Transistor, c: CornerList, r: Array, j_s: Array) -> Swing:
    """The switching formulas' view of every load resistor, (C, 2, n)."""
    t, v_cc, v_be, eta, carried = (part[:, :, None] for part in (c.t, c.v_cc, c.v_be, c.eta, c.ctr * c.h))
    base = Base(transistor.tau_0 / transistor.h_fe, transistor.c_m / transistor.h_fe, transistor.c_be, v_be, eta)
    load = Load(j_s, v_cc, v_cc - transistor.v_ce_sat, r, brief.output.capacitance, t)
    on, off = _fractions(brief, transistor, c)
    return swing(base, load, transfer, carried, on, off)


def _fractions(brief: Brief, transistor: Transistor, c: CornerList) -> tuple[Array, Array]:
    """Share of the swing until the receiver has surely seen the change, turning on and off, (C, 1, 1) [1]."""
    full = c.v_cc - transistor.v_ce_sat
    if brief.output.circuit is OutputCircuit.PULL_UP:
        on, off = (c.v_cc - c.v_il) / full, (c.v_ih - transistor.v_ce_sat) / full
    else:
        on, off = c.v_ih / full, 1.0 - c.v_il / full
    return np.maximum(on, 0.0)[:, :, None], np.clip(off, 0.0, 1.0 - 1e-9)[:, :, None]


def _for_level(
    brief: Brief,
    coupler: Coupler,
    transfer: Transfer,
    transistor: Transistor,
    c: CornerList,
    r: Array,
    j_s: Array,
) -> Array:
    """LED current, less the base resistor's, that holds the output's on level, (C, n) [A]."""
    noise = brief.output.noise_margin
    pulled_up = brief.output.circuit is OutputCircuit.PULL_UP
    v_ce = (c.v_il - noise if pulled_up else c.v_cc - c.v_ih - noise)[:, :, None]
    sheet = sheet_point(transfer, transistor, coupler.kind is Kind.DARLINGTON)
    t, h_fe = c.t[:, :, None], c.h_fe[:, :, None]
    overdrive = overdrive_to_hold(v_ce, v_ce_saturated(sheet, j_s, t), sheet.overdrive, h_fe, sheet.beta_r, t)
    carried = np.maximum(load_current(c.v_cc[:, :, None], v_ce, r, input_current(brief, on=True)), 1e-12)
    i = led_current_for(transfer, c.ctr[:, :, None], c.h[:, :, None], overdrive * carried)
    return np.asarray(i.max(axis=1))


def _leak_room(brief: Brief, c: CornerList, r: Array) -> Array:
    """Leakage that the off level allows, the receiver's own included, (C, n) [A]."""
    noise = brief.output.noise_margin
    pulled_up = brief.output.circuit is OutputCircuit.PULL_UP
    swing = c.v_cc - c.v_ih - noise if pulled_up else c.v_il - noise
    return np.asarray((swing[:, :, None] / r).min(axis=1))


def _load_masks(
    coupler: Coupler,
    transfer: Transfer,
    transistor: Transistor,
    c: CornerList,
    stock: Position,
    j_s: Array,
    heat: Array,
    p_load: Array,
) -> dict[str, np.ndarray]:
    """Limits on the load resistor alone: check name to mask, (n,) each."""
    t = np.unique(c.t[:, 0]).reshape(-1, 1)
    top = np.minimum(derated(coupler.led.i_max, c.t), transfer.curve_i[-1])
    most = collector_current(transfer, c.ctr, c.h, top)
    v_max = float(c.v_cc.max())
    held = {
        "deliverable_current": j_s.max(axis=1) <= most,
        "collector_current": j_s.max(axis=1) <= transistor.i_c_max,
        "collector_voltage": np.full((1, len(stock.values)), v_max <= transistor.v_ceo),
        "output_power": heat <= derated(coupler.p_out, t),
        "r_load_power": p_load <= resistor_derated(np.asarray(stock.power), t),
        "r_load_voltage": np.full((1, len(stock.values)), v_max) <= np.asarray(stock.voltage),
    }
    return {name: np.asarray(mask.all(axis=0)) for name, mask in held.items()}


def _base(brief: Brief, coupler: Coupler, transistor: Transistor, c: CornerList, i_cbo: Array) -> BaseCandidates:
    stock = brief.stock.r_be if coupler.base_pin else None
    if stock is None:
        return _no_base(transistor, c)
    values = np.append(stock.values, np.inf) if stock.absent else np.asarray(stock.values)
    pad = values.size - len(stock.values)
    tolerance, rating = np.append(stock.tolerance, [0.0] * pad), np.append(stock.power, [1e9] * pad)
    low, high = resistor_span(values, tolerance, brief.stock.drift, c.t)
    leak = [dark_current_held(_dark(transistor, c), i_cbo, r) for r in (low, high)]
    least, most = c.v_be - transistor.v_be_spread, c.v_be + transistor.v_be_spread
    return BaseCandidates(
        r_be=values,
        i_be_low=base_led_current(least, high, c.eta),
        i_be_high=base_led_current(most, low, c.eta),
        leak=np.maximum(*leak) * raised(c.v_cc),
        keep={"r_be_power": np.asarray((most**2 / low <= resistor_derated(rating, c.t)).all(axis=0))},
    )


def _no_base(transistor: Transistor, c: CornerList) -> BaseCandidates:
    """The one choice of a coupler whose base is not brought out, or of a brief without that position."""
    none = np.zeros((c.count, 1))
    return BaseCandidates(np.array([np.inf]), none, none, _dark(transistor, c) * raised(c.v_cc), {})


def _dark(transistor: Transistor, c: CornerList) -> Array:
    return dark_current(transistor.i_ceo_1, transistor.t_1, transistor.i_ceo_2, transistor.t_2, c.t)


def triples(sizes: tuple[int, int, int]) -> int:
    """Number of combinations."""
    return int(np.prod(sizes))


__all__ = ["BaseCandidates", "Candidates", "LoadCandidates", "candidates", "input_current", "triples"]
