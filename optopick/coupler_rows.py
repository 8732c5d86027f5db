"""From one row of the table to one coupler: what the cells say, and what the rules of `gaps` fill in."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cache
from typing import TypeVar

from optopick import gaps
from optopick.coupler import Ageing, Assumed, Barrier, Coupler, Kind, Led, Logic, Rating, Transfer, Transistor
from optopick.coupler_cells import Row
from optopick.coupler_columns import UNITS, schema
from optopick.coupler_curves import Curve
from optopick.coupler_sheets import SWITCHING, Bin
from optopick.gaps import Filled, Unit, UnusableError
from optopick.gaps_switching import SwitchingConstants, saturated_voltage, switching_constants
from optopick.switching_rows import PlainRow, SaturatedRow, TypicalUnit, rounded

Value = TypeVar("Value")

# The least current that the weakest unit must carry over the sheet's V_CE(sat) current for that row to be believed.
_LEAST_OVERDRIVE = 1.05


@dataclass(frozen=True)
class Sheet:
    """The switching rows of a data sheet and the typical unit they are of; saturated: the row, or what it lacks."""

    typical: TypicalUnit
    plain: PlainRow | None
    saturated: SaturatedRow | str


class _Reader:
    """One row being resolved: its cells, and what has been assumed so far."""

    def __init__(self, row: Row) -> None:
        if not row.text("kind"):
            raise UnusableError("kind: empty, and no rule fills it")
        self.row = row
        self.unit = Unit(row.name, Kind(row.text("kind")))
        self.assumed: list[Assumed] = []
        self.sheet: Sheet | None = None
        self._check_needed()

    def _check_needed(self) -> None:
        """Name every gap that makes the row unusable, so that one look at the data sheet fills them all."""
        empty = [name for name in _needed(self.unit.kind) if name not in self.row.cells]
        if empty:
            raise UnusableError(f"{', '.join(empty)}: empty, and no rule fills {'it' if len(empty) == 1 else 'them'}")

    def note(self, filled: Filled[Value]) -> Value:
        """Return the value and keep what was assumed for it."""
        if filled.assumed is not None:
            self.assumed.append(filled.assumed)
        return filled.value

    def need(self, column: str) -> float:
        """Return a quantity that no rule fills; raises UnusableError where the cell is empty."""
        value = self.row.number(column)
        if value is None:
            raise UnusableError(f"{column}: empty, and no rule fills it")
        return value

    def get(self, column: str, fill: Callable[[], Filled[float]] | None = None) -> float:
        """Return a quantity, or what `fill` makes of the gap; without `fill` the column's one constant."""
        value = self.row.number(column)
        if value is not None:
            return value
        return self.note(fill() if fill else gaps.usual(self.unit, column))

    def rating(self, column: str, value: float) -> Rating:
        """Return a limit with its fall over temperature from the columns beside it."""
        above = self.get(f"{column}_derate_above")
        slope = self.get(f"{column}_derate", lambda: gaps.derate_slope(self.unit, f"{column}_derate", value, above))
        return Rating(value, above, slope)


@cache
def _needed(kind: Kind) -> tuple[str, ...]:
    """Return the columns without which a row of this kind cannot be used."""
    columns = schema().columns.values()
    return tuple(column.name for column in columns if column.gap == "row" and kind in column.kinds)


def resolve(row: Row, bin_: Bin | None) -> Coupler:
    """Return the coupler of one row, every gap filled and listed; raises UnusableError where a gap cannot be filled.

    bin_: the row's place among the bins of its part, of a row that states CTR.
    """
    return resolve_with_sheet(row, bin_)[0]


def resolve_with_sheet(row: Row, bin_: Bin | None) -> tuple[Coupler, Sheet | None]:
    """Return `resolve`'s coupler with the switching rows behind its constants, None of a logic output."""
    r = _Reader(row)
    led = _led(r)
    stated_led, stated_total = row.number("p_led"), row.number("p_total")
    p_out = r.get("p_out", lambda: gaps.p_out(r.unit, stated_total, stated_led))
    p_total = r.get("p_total", lambda: gaps.p_total(r.unit, led.p_max.value, p_out))
    is_logic = r.unit.kind is Kind.LOGIC
    transfer = None if is_logic else _transfer(r)
    logic = _logic(r) if is_logic else None
    transistor = _transistor(r, transfer, bin_) if transfer and bin_ else None
    specified = transfer.i_ref if transfer else r.need("i_f_on")
    coupler = Coupler(
        part=row.name,
        maker=row.text("maker"),
        kind=r.unit.kind,
        base_pin=_base_pin(r),
        channels=round(r.get("channels")),
        led=led,
        p_out=r.rating("p_out", p_out),
        p_total=r.rating("p_total", p_total),
        barrier=_barrier(row),
        ageing=_ageing(r, led, specified),
        transfer=transfer,
        transistor=transistor,
        logic=logic,
        price=row.number("price"),
        sheet=row.text("sheet"),
        row=row.line,
        assumed=tuple(r.assumed),
    )
    return coupler, r.sheet


def _base_pin(r: _Reader) -> bool:
    stated = r.row.cells.get("base_pin")
    return stated if isinstance(stated, bool) else r.note(gaps.base_pin(r.unit))


def _led(r: _Reader) -> Led:
    i_max = r.need("i_f_max")
    low, high = r.row.number("v_f_min"), r.row.number("v_f_max")
    v_f_typ = r.get("v_f_typ", lambda: gaps.v_f_typ(r.unit, low, high))
    v_f_max = r.get("v_f_max", lambda: gaps.v_f_max(r.unit, v_f_typ))
    p_max = r.get("p_led", lambda: gaps.p_led(r.unit, i_max, v_f_max))
    return Led(
        v_f_min=r.get("v_f_min", lambda: gaps.v_f_min(r.unit, v_f_typ)),
        v_f_typ=v_f_typ,
        v_f_max=v_f_max,
        i_ref=r.get("v_f_at"),
        n=r.get("led_n"),
        r_s=r.get("led_r_s"),
        v_f_tc=r.get("v_f_tc"),
        i_max=r.rating("i_f", i_max),
        p_max=r.rating("p_led", p_max),
        v_r_max=r.get("v_r_max"),
    )


def _transfer(r: _Reader) -> Transfer:
    ctr_min, ctr_at = r.need("ctr_min"), r.need("ctr_at")
    over_current = _ctr_curve(r, ctr_at)
    over_temperature = _ctr_temperature(r)
    return Transfer(
        ctr_min=ctr_min,
        ctr_max=r.get("ctr_max", lambda: gaps.ctr_max(r.unit, ctr_min)),
        i_ref=ctr_at,
        curve_i=over_current.x,
        curve_g=over_current.y,
        curve_t=over_temperature.x,
        curve_h=over_temperature.y,
        light_tc=r.get("light_tc"),
    )


def _ctr_curve(r: _Reader, ctr_at: float) -> Curve:
    """Return the CTR curve over LED current [A], scaled to 1 at `ctr_at`."""
    stated = r.row.curve("ctr_curve")
    if stated is None:
        return r.note(gaps.ctr_curve(r.unit, ctr_at))
    curve = stated.with_x_times(UNITS["mA"].to_si(1.0))
    return curve.divided_by(curve.log_at(ctr_at))


def _ctr_temperature(r: _Reader) -> Curve:
    """Return CTR over temperature [degC], scaled to 1 at 25 degC."""
    stated = r.row.curve("ctr_temperature")
    if stated is None:
        return r.note(gaps.ctr_temperature(r.unit))
    return stated.divided_by(stated.linear_at(25.0))


def _transistor(r: _Reader, transfer: Transfer, bin_: Bin) -> Transistor:
    curve = Curve(transfer.curve_i, transfer.curve_g)
    h_min, h_max = r.row.number("h_fe_min"), r.row.number("h_fe_max")
    h_fe = _gain(r, bin_)
    v_be, c_be = r.get("v_be"), r.get("c_be")
    times = _switching(r, bin_, TypicalUnit(bin_.ctr, curve, h_fe, v_be, c_be))
    sat_i_f, sat_i_c = _saturation_point(r, transfer, curve)
    (i_ceo_1, t_1), (i_ceo_2, t_2) = _dark_currents(r)
    return Transistor(
        h_fe=h_fe,
        light_spread=r.note(gaps.light_spread(r.unit, transfer.ctr_max / transfer.ctr_min, h_min, h_max)),
        v_be=v_be,
        v_be_tc=r.get("v_be_tc"),
        v_be_spread=r.get("v_be_spread"),
        v_ce_sat=r.get("v_ce_sat"),
        sat_i_f=sat_i_f,
        sat_i_c=sat_i_c,
        beta_r=r.get("beta_r"),
        i_c_max=r.get("i_c_max"),
        v_ceo=r.get("v_ceo"),
        i_ceo_1=i_ceo_1,
        t_1=t_1,
        i_ceo_2=i_ceo_2,
        t_2=t_2,
        c_be=c_be,
        tau_0=times.tau_0,
        c_m=times.c_m,
        tau_s=times.tau_s,
        tau_s_spread=r.get("tau_s_spread"),
    )


def _gain(r: _Reader, bin_: Bin) -> float:
    """Return the gain of the bin's typical unit [1]."""
    stated, ctr_cb = r.row.number("h_fe_typ"), r.row.number("ctr_cb")
    h_min, h_max = r.row.number("h_fe_min"), r.row.number("h_fe_max")
    if stated is not None:
        return stated * _moved(r, bin_, "h_fe_typ")
    filled = gaps.h_fe_typ(r.unit, bin_.ctr, h_min, h_max, ctr_cb)
    # what comes of light follows the bin's own CTR already
    from_light = ctr_cb is not None or h_min is None or h_max is None
    return r.note(filled if from_light else gaps.times(filled, "h_fe_typ", _moved(r, bin_, "h_fe_min", "h_fe_max")))


def _moved(r: _Reader, bin_: Bin, *columns: str) -> float:
    """Return the gain of the bin's typical unit over that of the unit which `columns` speak of [1], and note it."""
    gain = bin_.gain_over(*columns)
    known = any(item.parameter == "bin_gain" for item in r.assumed)
    return gain if known or math.isclose(gain, 1.0) else r.note(gaps.bin_gain(r.unit, gain))


def _saturation_point(r: _Reader, transfer: Transfer, curve: Curve) -> tuple[float, float]:
    """Return the LED and collector current [A] of the V_CE(sat) row, which the weakest unit must be able to carry."""
    end = curve.x[-1]
    i_f = r.get("v_ce_sat_i_f", lambda: gaps.v_ce_sat_i_f(r.unit, end))
    i_c = r.get("v_ce_sat_i_c")
    if i_f > end * (1 + 1e-9):
        at, last = schema().show("v_ce_sat_i_f", i_f), schema().show("v_ce_sat_i_f", end)
        raise UnusableError(f"v_ce_sat_i_f: {at} lies beyond the end of ctr_curve, {last}")
    most = transfer.ctr_min * curve.log_at(i_f) * i_f
    if most <= _LEAST_OVERDRIVE * i_c:
        carried, asked = schema().show("v_ce_sat_i_c", most), schema().show("v_ce_sat_i_c", i_c)
        raise UnusableError(
            f"v_ce_sat: the weakest unit carries {carried} at v_ce_sat_i_f, hardly v_ce_sat_i_c, {asked}"
        )
    return i_f, i_c


def _dark_currents(r: _Reader) -> tuple[tuple[float, float], tuple[float, float]]:
    """Return dark current [A] and its temperature [degC], cold and hot."""
    cold, hot = r.row.number("i_ceo"), r.row.number("i_ceo_hot")
    if cold is None and hot is None:
        raise UnusableError("i_ceo, i_ceo_hot: both empty, and no rule fills them")
    t_cold = r.get("i_ceo_t")
    t_hot = r.need("i_ceo_hot_t") if hot is not None else r.get("i_ceo_hot_t")
    if hot is None:
        first = r.need("i_ceo")
        return (first, t_cold), (r.note(gaps.i_ceo_hot(r.unit, first, t_cold, t_hot)), t_hot)
    return (r.get("i_ceo", lambda: gaps.i_ceo(r.unit, hot, t_hot, t_cold)), t_cold), (hot, t_hot)


def _switching(r: _Reader, bin_: Bin, own: TypicalUnit) -> SwitchingConstants:
    """Return the switching constants of the bin's typical unit."""
    gain = _moved(r, bin_, *SWITCHING)
    typical = replace(own, ctr=rounded(own.ctr / gain), h_fe=rounded(own.h_fe / gain))
    r.sheet = Sheet(typical, _plain_row(r), _saturated_row(r))
    stated = r.row.number("c_cb")
    # noted only if used: with both switching rows c_cb goes unasked
    c_cb = gaps.usual(r.unit, "c_cb") if stated is None else Filled(stated, None)
    found = switching_constants(r.unit, typical, r.sheet.plain, r.sheet.saturated, c_cb).with_gain_times(gain)
    r.assumed.extend(found.assumed)
    return found


def _plain_row(r: _Reader) -> PlainRow | None:
    t_r, t_f = r.row.number("sw_t_r"), r.row.number("sw_t_f")
    if t_r is None and t_f is None:
        return None
    return PlainRow(t_r, t_f, r.get("sw_i_c"), r.get("sw_r_l"), r.get("sw_v_cc"))


def _saturated_row(r: _Reader) -> SaturatedRow | str:
    """Return the saturated switching row; where it lacks a figure that no rule fills, which one."""
    times = _saturated_times(r)
    i_f, r_l = r.row.number("sat_i_f"), r.row.number("sat_r_l")
    if times is None:
        return ""
    if i_f is None or r_l is None:
        lacking = [name for name in ("sat_i_f", "sat_r_l") if r.row.number(name) is None]
        return f"saturated row: {' and '.join(lacking)} empty"
    return SaturatedRow(*times, i_f, r_l, r.get("sat_v_cc"), saturated_voltage(r.unit))


def _saturated_times(r: _Reader) -> tuple[float, float] | None:
    """Return storage and turn-off time [s], one from the other where need be; None where there is neither."""
    t_s, t_off = r.row.number("sat_t_s"), r.row.number("sat_t_off")
    if t_s is not None:
        return t_s, r.get("sat_t_off", lambda: gaps.sat_t_off(r.unit, t_s))
    return None if t_off is None else (r.get("sat_t_s", lambda: gaps.sat_t_s(r.unit, t_off)), t_off)


def _logic(r: _Reader) -> Logic:
    i_f_on = r.need("i_f_on")
    t_phl, t_plh = r.need("t_phl"), r.need("t_plh")
    stated_max = r.row.number("v_cc_max")
    v_cc_min = r.get("v_cc_min", lambda: gaps.v_cc_min(r.unit, stated_max))
    return Logic(
        i_f_on=i_f_on,
        i_f_off=r.get("i_f_off", lambda: gaps.i_f_off(r.unit, i_f_on)),
        v_ol=r.get("v_ol"),
        i_ol=r.need("i_ol"),
        i_oh=r.get("i_oh"),
        i_cc=r.get("i_cc"),
        v_cc_min=v_cc_min,
        v_cc_max=r.get("v_cc_max", lambda: gaps.v_cc_max(r.unit, v_cc_min)),
        t_phl=t_phl,
        t_plh=t_plh,
        t_r=r.get("t_r", lambda: gaps.logic_edge(r.unit, "t_r", t_phl, t_plh)),
        t_f=r.get("t_f", lambda: gaps.logic_edge(r.unit, "t_f", t_phl, t_plh)),
        r_l=r.get("r_l"),
        c_l=r.get("c_l"),
        c_out=r.get("c_out"),
    )


def _ageing(r: _Reader, led: Led, specified: float) -> Ageing:
    stated = r.row.number("ctr_loss") is not None
    return Ageing(
        loss=r.get("ctr_loss"),
        time=r.get("ctr_loss_time"),
        current=r.get("ctr_loss_i_f", lambda: gaps.ctr_loss_i_f(r.unit, stated, led.i_max.value, specified)),
        temperature=r.get("ctr_loss_t", lambda: gaps.ctr_loss_t(r.unit, stated)),
        n=r.get("ageing_n"),
        e_a=r.get("ageing_e_a"),
    )


def _barrier(row: Row) -> Barrier:
    return Barrier(row.number("withstand"), row.number("working"), row.number("creepage"), row.text("insulation"))
