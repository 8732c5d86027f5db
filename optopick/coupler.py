"""One coupler and CTR bin, with every parameter resolved: what the data sheet gave and what a rule filled in.

SI throughout, temperatures in degC, CTR and losses as ratios. `read_couplers` makes these from a CSV table.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum


class Kind(StrEnum):
    """Output stage of a coupler."""

    PHOTOTRANSISTOR = "phototransistor"
    DARLINGTON = "darlington"
    LOGIC = "logic"


@dataclass(frozen=True)
class Assumed:
    """A parameter that the table lacked, in table units as text, and the rule that filled it."""

    part: str
    parameter: str
    value: str
    rule: str


@dataclass(frozen=True)
class Rating:
    """A limit that falls linearly above a temperature: `value` up to `above` [degC], then minus `slope` per kelvin."""

    value: float
    above: float
    slope: float


@dataclass(frozen=True)
class Led:
    """The LED.

    V_F min/typ/max [V] at i_ref [A] and 25 degC; emission coefficient n [1]; series resistance r_s [ohm];
    drift of V_F [V/K]; ratings of current [A] and power [W]; reverse limit [V].
    """

    v_f_min: float
    v_f_typ: float
    v_f_max: float
    i_ref: float
    n: float
    r_s: float
    v_f_tc: float
    i_max: Rating
    p_max: Rating
    v_r_max: float


@dataclass(frozen=True)
class Transfer:
    """From LED to collector current.

    CTR bin [1] at i_ref [A] and 25 degC; its relative curve over LED current (ascending [A], [1], 1 at i_ref) and
    over temperature (ascending [degC], [1], 1 at 25 degC); drift of the LED's light [1/K], negative.
    """

    ctr_min: float
    ctr_max: float
    i_ref: float
    curve_i: tuple[float, ...]
    curve_g: tuple[float, ...]
    curve_t: tuple[float, ...]
    curve_h: tuple[float, ...]
    light_tc: float


@dataclass(frozen=True)
class Transistor:
    """Output transistor.

    h_fe: typical gain [1] at the mid of the CTR bin, at Transfer.i_ref and 25 degC; light_spread [1] >= 1: gain at a
    given CTR lies within h_fe*(ctr/ctr_mid)*[1/spread, spread]. v_be [V], v_be_tc [V/K]; v_be_spread [V] >= 0: a unit's
    lies within v_be -/+ v_be_spread.
    v_ce_sat [V] max at sat_i_f, sat_i_c [A]; beta_r [1] reverse gain. i_c_max [A], v_ceo [V].
    i_ceo_1, i_ceo_2 [A] max at t_1, t_2 [degC]. c_be [F] charged before conduction.
    tau_0 [s], c_m [F], tau_s [s]: switching constants of a typical unit, gain h_fe: h_fe times the transit time, h_fe
    times the collector-base capacitance at 0 V, and the storage constant; tau_s_spread [1] >= 1: a unit's lies within
    tau_s*[1/spread, spread].
    """

    h_fe: float
    light_spread: float
    v_be: float
    v_be_tc: float
    v_be_spread: float
    v_ce_sat: float
    sat_i_f: float
    sat_i_c: float
    beta_r: float
    i_c_max: float
    v_ceo: float
    i_ceo_1: float
    t_1: float
    i_ceo_2: float
    t_2: float
    c_be: float
    tau_0: float
    c_m: float
    tau_s: float
    tau_s_spread: float


@dataclass(frozen=True)
class Logic:
    """Logic output, open collector.

    i_f_on, i_f_off [A]; v_ol [V] max at i_ol [A]; i_oh [A] max leakage; i_cc [A] max; v_cc_min, v_cc_max [V];
    t_phl, t_plh, t_r, t_f [s] worst case with r_l [ohm], c_l [F]; c_out [F].
    """

    i_f_on: float
    i_f_off: float
    v_ol: float
    i_ol: float
    i_oh: float
    i_cc: float
    v_cc_min: float
    v_cc_max: float
    t_phl: float
    t_plh: float
    t_r: float
    t_f: float
    r_l: float
    c_l: float
    c_out: float


@dataclass(frozen=True)
class Ageing:
    """LED wear.

    `loss` [1] of the light after `time` [h] at `current` [A] and `temperature` [degC]; exponent n [1] of
    current and activation energy e_a [eV] of the acceleration factor.
    """

    loss: float
    time: float
    current: float
    temperature: float
    n: float
    e_a: float


@dataclass(frozen=True)
class Barrier:
    """Isolation: withstand [V rms, 1 min], working [V], creepage [m]; None where the table is silent; class as text."""

    withstand: float | None
    working: float | None
    creepage: float | None
    insulation: str


@dataclass(frozen=True)
class Coupler:
    """One row of the table. Exactly one of `transistor` and `logic` is set, as `kind` says."""

    part: str
    maker: str
    kind: Kind
    base_pin: bool
    channels: int
    led: Led
    p_out: Rating
    p_total: Rating
    barrier: Barrier
    ageing: Ageing
    transfer: Transfer | None
    transistor: Transistor | None
    logic: Logic | None
    price: float | None
    sheet: str
    row: int
    assumed: tuple[Assumed, ...]
