"""What a coupler table leaves out, filled in by rule: one small function a rule, each with what it assumed.

The sentence, source and constants of every rule stand in data/coupler_columns.toml; where a choice had to be made they
lean to the worst case. Arguments and results are in SI, temperatures in degC. Barrier figures have no rule: what
insulation can take is never assumed.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Generic, TypeVar

from optopick.coupler import Assumed, Kind
from optopick.coupler_columns import UNITS, schema
from optopick.coupler_curves import Curve, read_points

Value_co = TypeVar("Value_co", covariant=True)


class UnusableError(Exception):
    """A gap that no rule fills, or figures no design can rest on: the reason a row is set aside."""


@dataclass(frozen=True)
class Unit:
    """The row that rules are applied to: its full part name and output stage."""

    part: str
    kind: Kind


@dataclass(frozen=True)
class Filled(Generic[Value_co]):
    """A value and, where a rule filled it in, what was assumed."""

    value: Value_co
    assumed: Assumed | None


def filled(unit: Unit, parameter: str, value: float, rule: str, note: str = "") -> Filled[float]:
    """Return a value [SI] that `rule` gave to `parameter`; `note` adds why the rule was needed."""
    words = schema().rules[rule].words(unit.kind)
    return Filled(value, Assumed(unit.part, parameter, schema().show(parameter, value), note + words))


def times(found: Filled[float], parameter: str, factor: float) -> Filled[float]:
    """Return a filled value [SI] of `parameter` multiplied by `factor` [1], what was assumed for it told anew."""
    value, assumed = found.value * factor, found.assumed
    return Filled(value, assumed and replace(assumed, value=schema().show(parameter, value)))


def usual(unit: Unit, column: str) -> Filled[float]:
    """Return the constant of the column's last rule: for columns whose gap is filled by one number."""
    return constant(unit, column, schema().columns[column].rules[-1])


def constant(unit: Unit, column: str, rule: str) -> Filled[float]:
    """Return the constant `value` of a rule, in SI."""
    return filled(unit, column, _si(unit, column, rule, "value"), rule)


def _si(unit: Unit, column: str, rule: str, name: str) -> float:
    """Return a constant of a rule that is in the unit of a column, in SI."""
    return schema().columns[column].table_unit.to_si(_number(unit, rule, name))


def _number(unit: Unit, rule: str, name: str) -> float:
    return schema().rules[rule].number(name, unit.kind)


# ---- the part and its limits ----------------------------------------------------------------------------------------


def base_pin(unit: Unit) -> Filled[bool]:
    """Return no base pin."""
    words = schema().rules["base_pin_absent"].words(unit.kind)
    return Filled(False, Assumed(unit.part, "base_pin", "no", words))


def derate_slope(unit: Unit, column: str, limit: float, above: float) -> Filled[float]:
    """Return limit/(zero - above) [per kelvin]: `limit` falls from `above` [degC] linearly to nothing.

    Raises UnusableError where the fall would have to begin at or beyond its end.
    """
    zero = _number(unit, "derate_to_zero", "zero")
    if above >= zero:
        raise UnusableError(f"{column}: empty, and {column}_above lies at or above {zero:g} °C, where the rule ends")
    return filled(unit, column, limit / (zero - above), "derate_to_zero")


def p_led(unit: Unit, i_f_max: float, v_f_max: float) -> Filled[float]:
    """Return i_f_max*v_f_max [W]."""
    return filled(unit, "p_led", i_f_max * v_f_max, "p_led_product")


def p_out(unit: Unit, p_total: float | None, p_led_stated: float | None) -> Filled[float]:
    """Return p_total - p_led [W] where the table states both and that is more than nothing, else a usual figure."""
    if p_total is not None and p_led_stated is not None and p_total > p_led_stated:
        return filled(unit, "p_out", p_total - p_led_stated, "p_out_rest")
    least = _si(unit, "p_out", "p_out_usual", "value")
    return filled(unit, "p_out", least if p_total is None else min(least, p_total), "p_out_usual")


def p_total(unit: Unit, p_led_: float, p_out_: float) -> Filled[float]:
    """Return the larger of the two powers [W]."""
    return filled(unit, "p_total", max(p_led_, p_out_), "p_total_larger")


# ---- LED ------------------------------------------------------------------------------------------------------------


def v_f_typ(unit: Unit, v_f_min_: float | None, v_f_max_: float | None) -> Filled[float]:
    """Return the typical forward voltage [V] from the extremes; raises UnusableError where there is neither."""
    if v_f_min_ is not None and v_f_max_ is not None:
        return filled(unit, "v_f_typ", (v_f_min_ + v_f_max_) / 2, "v_f_between")
    if v_f_max_ is not None:
        return filled(unit, "v_f_typ", v_f_max_ - _number(unit, "v_f_from_max", "above"), "v_f_from_max")
    if v_f_min_ is not None:
        return filled(unit, "v_f_typ", v_f_min_ + _number(unit, "v_f_from_min", "below"), "v_f_from_min")
    raise UnusableError("v_f_min, v_f_typ, v_f_max: all empty, and no rule fills them")


def v_f_min(unit: Unit, v_f_typ_: float) -> Filled[float]:
    """Return the smallest forward voltage [V] below the typical one."""
    return filled(unit, "v_f_min", v_f_typ_ - _number(unit, "v_f_below", "below"), "v_f_below")


def v_f_max(unit: Unit, v_f_typ_: float) -> Filled[float]:
    """Return the largest forward voltage [V] above the typical one."""
    return filled(unit, "v_f_max", v_f_typ_ + _number(unit, "v_f_above", "above"), "v_f_above")


# ---- transfer -------------------------------------------------------------------------------------------------------


def ctr_max(unit: Unit, ctr_min: float) -> Filled[float]:
    """Return a multiple of ctr_min [1]."""
    return filled(unit, "ctr_max", ctr_min * _number(unit, "ctr_max_wide", "times"), "ctr_max_wide")


def ctr_curve(unit: Unit, ctr_at: float) -> Filled[Curve]:
    """Return the usual CTR curve over LED current [A], 1 at `ctr_at` [A].

    Raises UnusableError where `ctr_at` lies outside the usual curve.
    """
    curve = _usual_curve(unit, "ctr_curve_usual").with_x_times(UNITS["mA"].to_si(1.0))
    if not curve.covers(ctr_at):
        at = schema().show("ctr_at", ctr_at)
        raise UnusableError(f"ctr_curve: empty, and the usual curve does not reach ctr_at, {at}")
    return Filled(curve.divided_by(curve.log_at(ctr_at)), _assumed_curve(unit, "ctr_curve", "ctr_curve_usual"))


def ctr_temperature(unit: Unit) -> Filled[Curve]:
    """Return the usual CTR over temperature [degC], 1 at 25 degC."""
    curve = _usual_curve(unit, "ctr_temperature_usual")
    assumed = _assumed_curve(unit, "ctr_temperature", "ctr_temperature_usual")
    return Filled(curve.divided_by(curve.linear_at(25.0)), assumed)


def _usual_curve(unit: Unit, rule: str) -> Curve:
    return read_points(str(schema().rules[rule].constant("shape", unit.kind)))


def _assumed_curve(unit: Unit, column: str, rule: str) -> Assumed:
    return Assumed(unit.part, column, "a usual shape", schema().rules[rule].words(unit.kind))


# ---- transistor output ----------------------------------------------------------------------------------------------


def v_ce_sat_i_f(unit: Unit, curve_end: float) -> Filled[float]:
    """Return a large LED current [A], no more than the end of the CTR curve."""
    rule = "v_ce_sat_i_f_large"
    return filled(unit, "v_ce_sat_i_f", min(_si(unit, "v_ce_sat_i_f", rule, "value"), curve_end), rule)


def i_ceo(unit: Unit, i_ceo_hot_: float, t_hot: float, t_cold: float) -> Filled[float]:
    """Return the dark current [A] at `t_cold` from that at `t_hot`: i_ceo_hot/2^((t_hot - t_cold)/10 K)."""
    halvings = (t_hot - t_cold) / _number(unit, "i_ceo_from_hot", "halves_each")
    return filled(unit, "i_ceo", i_ceo_hot_ / 2**halvings, "i_ceo_from_hot")


def i_ceo_hot(unit: Unit, i_ceo_: float, t_cold: float, t_hot: float) -> Filled[float]:
    """Return the dark current [A] at `t_hot` from that at `t_cold`: i_ceo*2^((t_hot - t_cold)/5.6 K)."""
    doublings = (t_hot - t_cold) / _number(unit, "i_ceo_doubling", "doubles_each")
    return filled(unit, "i_ceo_hot", i_ceo_ * 2**doublings, "i_ceo_doubling")


def h_fe_typ(
    unit: Unit, ctr_mid: float, h_fe_min: float | None, h_fe_max: float | None, ctr_cb: float | None
) -> Filled[float]:
    """Return the gain in the middle of the bin [1]: ctr_mid/ctr_cb, else from the extremes, else from usual light.

    Raises UnusableError where ctr_cb leaves hardly any gain.
    """
    if ctr_cb is not None:
        if ctr_mid / ctr_cb < schema().columns["h_fe_typ"].low:
            raise UnusableError(f"h_fe_typ: empty, and CTR over ctr_cb gives a gain of only {ctr_mid / ctr_cb:.2g}")
        return filled(unit, "h_fe_typ", ctr_mid / ctr_cb, "h_fe_from_ctr_cb")
    if h_fe_min is not None and h_fe_max is not None:
        return filled(unit, "h_fe_typ", math.sqrt(h_fe_min * h_fe_max), "h_fe_between")
    usual_light = _si(unit, "ctr_cb", "h_fe_from_light", "ctr_cb")
    return filled(unit, "h_fe_typ", ctr_mid / usual_light, "h_fe_from_light")


def bin_gain(unit: Unit, gain: float) -> Filled[float]:
    """Return `gain`, that of the bin's typical unit over that of the part's [1], as taken by rule."""
    return filled(unit, "bin_gain", gain, "bins_of_a_part")


def light_spread(unit: Unit, ctr_ratio: float, h_fe_min: float | None, h_fe_max: float | None) -> Filled[float]:
    """Return how far gain may lie from what CTR suggests [1]: sqrt((h_fe_max/h_fe_min)/ctr_ratio), within 1 to 2.

    CTR is light times gain: what the spread of gain has beyond that of CTR (`ctr_ratio`, largest over smallest [1])
    must be spread of light against it, half of it to either side.
    """
    if h_fe_min is None or h_fe_max is None:
        return filled(unit, "light_spread", _number(unit, "light_spread_usual", "value"), "light_spread_usual")
    largest = _number(unit, "light_spread_usual", "largest")
    return Filled(min(max(math.sqrt(h_fe_max / h_fe_min / ctr_ratio), 1.0), largest), None)


def sat_t_s(unit: Unit, t_off: float) -> Filled[float]:
    """Return the storage time [s] as a share of the turn-off time."""
    return filled(unit, "sat_t_s", t_off * _number(unit, "sat_t_s_share", "share"), "sat_t_s_share")


def sat_t_off(unit: Unit, t_s: float) -> Filled[float]:
    """Return the turn-off time [s] from the storage time, the same share the other way."""
    return filled(unit, "sat_t_off", t_s / _number(unit, "sat_t_off_share", "share"), "sat_t_off_share")


# ---- logic output ---------------------------------------------------------------------------------------------------


def i_f_off(unit: Unit, i_f_on: float) -> Filled[float]:
    """Return a small share of i_f_on [A]."""
    return filled(unit, "i_f_off", i_f_on * _number(unit, "i_f_off_share", "share"), "i_f_off_share")


def v_cc_min(unit: Unit, v_cc_max_: float | None) -> Filled[float]:
    """Return the narrowest usual lower end of the supply [V], no more than a stated upper one."""
    usual_ = _number(unit, "v_cc_min_narrow", "value")
    return filled(unit, "v_cc_min", usual_ if v_cc_max_ is None else min(usual_, v_cc_max_), "v_cc_min_narrow")


def v_cc_max(unit: Unit, v_cc_min_: float) -> Filled[float]:
    """Return the narrowest usual upper end of the supply [V], no less than the lower one."""
    return filled(unit, "v_cc_max", max(_number(unit, "v_cc_max_narrow", "value"), v_cc_min_), "v_cc_max_narrow")


def logic_edge(unit: Unit, column: str, t_phl: float, t_plh: float) -> Filled[float]:
    """Return the larger delay [s] for the edge `column`, t_r or t_f."""
    return filled(unit, column, max(t_phl, t_plh), "edge_as_delay")


# ---- wear -----------------------------------------------------------------------------------------------------------


def ctr_loss_i_f(unit: Unit, loss_stated: bool, i_f_max: float, i_f_specified: float) -> Filled[float]:
    """Return the LED current of the life test [A]: the largest for an assumed loss, the specified for a stated one."""
    if loss_stated:
        return filled(unit, "ctr_loss_i_f", i_f_specified, "ctr_loss_i_f_mild")
    return filled(unit, "ctr_loss_i_f", i_f_max, "ctr_loss_i_f_max")


def ctr_loss_t(unit: Unit, loss_stated: bool) -> Filled[float]:
    """Return the temperature of the life test [degC]: hot for an assumed loss, room temperature for a stated one."""
    return constant(unit, "ctr_loss_t", "ctr_loss_t_mild" if loss_stated else "ctr_loss_t_hot")
