"""Switching constants from the switching rows of a data sheet, and what stands in for a row that is missing.

The rows are times of the typical unit by charge control in steps (`optopick.physics.switching`). Each is linear in
transit time and collector-base capacitance, so both rows give both constants; one row gives the transit time beside a
capacitance stated or assumed. Storage lasts tau_s*ln(i_f/i_sat), then the first tenth of the recovery. SI throughout.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, TypeVar

from optopick.coupler import Assumed
from optopick.coupler_columns import schema
from optopick.gaps import Filled, Unit, UnusableError, filled
from optopick.switching_rows import PlainRow, SaturatedRow, TypicalUnit

if TYPE_CHECKING:
    from optopick.switching_fit import Linear

LN9 = math.log(9.0)

Row = TypeVar("Row", PlainRow, SaturatedRow)

# Closer to the edge of saturation than this, storage says nothing about tau_s: a small error of CTR is all of it.
_LEAST_OVERDRIVE = 1.1


@dataclass(frozen=True)
class SwitchingConstants:
    """tau_0 [s], c_m [F] and tau_s [s] of the typical unit, and what was assumed for them."""

    tau_0: float
    c_m: float
    tau_s: float
    assumed: tuple[Assumed, ...]

    def with_gain_times(self, gain: float) -> SwitchingConstants:
        """Return the constants of a unit with `gain` times the gain and the same light.

        tau_0 = h_fe*transit and c_m = h_fe*c_cb grow with gain; tau_s, the lifetime of stored charge, does not.
        """
        moved = {"tau_0": self.tau_0 * gain, "c_m": self.c_m * gain}
        told = (
            replace(a, value=schema().show(a.parameter, moved[a.parameter])) if a.parameter in moved else a
            for a in self.assumed
        )
        return SwitchingConstants(moved["tau_0"], moved["c_m"], self.tau_s, tuple(told))


@dataclass(frozen=True)
class _Timed:
    """A row's time [s], how it comes of the constants, and the row's load resistor [ohm]."""

    t: float
    by: Linear
    r_l: float


def saturated_voltage(unit: Unit) -> float:
    """Return the collector-emitter voltage of a usual unit in saturation [V]."""
    return schema().rules["switching_rows"].number("v_ce", unit.kind)


def switching_constants(
    unit: Unit, typical: TypicalUnit, plain: PlainRow | None, saturated: SaturatedRow | str, c_cb: Filled[float]
) -> SwitchingConstants:
    """Return the switching constants from both rows where they agree, else from one of them and c_cb [F].

    saturated: the row, or why it is not complete (empty text: it is not there at all). Raises UnusableError where
    there is neither row, or where what there is cannot be of this unit.
    """
    from optopick.switching_fit import plain_edge, recovery  # noqa: PLC0415 - numpy: not for tables of logic outputs

    plain, doubt_plain = _believed(plain, _doubt_plain(plain))
    row, doubt = (None, saturated) if isinstance(saturated, str) else _believed(saturated, _doubt(typical, saturated))
    first = _Timed(plain.t, plain_edge(typical, plain, plain.falls_slower), plain.r_l) if plain else None
    off = recovery(typical, row) if row else None
    second = _Timed(row.t, off.edge, row.r_l) if row and off else None
    reason = "; ".join(filter(None, (doubt_plain, doubt)))
    transit, c_0, assumed = _split(unit, typical, first, second, c_cb, reason)
    if row and off:
        tau_s = _tau_s(unit, typical, row, off.first_tenth.at(transit, c_0))
    else:
        tau_s = _tau_s_of(unit, plain, doubt)
    more = (tau_s.assumed,) if tau_s.assumed else ()
    return SwitchingConstants(typical.h_fe * transit, typical.h_fe * c_0, tau_s.value, assumed + more)


def _believed(row: Row | None, doubt: str) -> tuple[Row | None, str]:
    return None if doubt else row, doubt


def _note(reason: str) -> str:
    return f"{reason}; so " if reason else ""


def _doubt_plain(row: PlainRow | None) -> str:
    """Return why the row not saturated cannot be what it says; empty where it can."""
    if row is None or row.i_c * row.r_l < row.v_cc:
        return ""
    supply, current = schema().show("sw_v_cc", row.v_cc), schema().show("sw_i_c", row.i_c)
    return f"switching row: sw_v_cc, {supply}, cannot drive sw_i_c, {current}, through sw_r_l"


def _doubt(typical: TypicalUnit, row: SaturatedRow) -> str:
    """Return why the saturated row cannot be used with this CTR; empty where it can."""
    i_sat = typical.led_current_for(row.i_c)
    if row.i_f >= _LEAST_OVERDRIVE * i_sat:
        return ""
    return (
        f"saturated row: sat_i_f, {schema().show('sat_i_f', row.i_f)}, hardly saturates the typical unit, whose load "
        f"needs {'more than the CTR curve shows' if math.isinf(i_sat) else schema().show('sat_i_f', i_sat)}"
    )


def _split(
    unit: Unit, typical: TypicalUnit, first: _Timed | None, second: _Timed | None, c_cb: Filled[float], reason: str
) -> tuple[float, float, tuple[Assumed, ...]]:
    """Return transit time [s] and c_cb at 0 V [F], of both rows or of the one there is; of two the one not saturated.

    reason: why a row is not among them.
    """
    if first and second:
        both = _split_of_both(first, second)
        if not isinstance(both, str):
            return (*both, ())
        reason = both
    one = first or second
    if one is None:
        raise UnusableError(
            f"{reason or 'sw_t_r, sw_t_f, sat_t_s, sat_t_off: all empty'}; there is no other switching row"
        )
    return _split_by_c_cb(unit, typical, one, c_cb, reason)


def _split_of_both(first: _Timed, second: _Timed) -> tuple[float, float] | str:
    """Return transit time [s] and c_cb at 0 V [F] by two linear equations, or why the rows contradict each other."""
    if second.r_l <= first.r_l:
        return "switching rows: sat_r_l is not above sw_r_l"
    a, b = first.by, second.by
    left, right = first.t - a.rest, second.t - b.rest
    # positive while the load resistor, and so the swing for a given current, is the larger one
    det = a.per_transit * b.per_c_cb - b.per_transit * a.per_c_cb
    transit, c_0 = (left * b.per_c_cb - right * a.per_c_cb) / det, (a.per_transit * right - b.per_transit * left) / det
    if c_0 <= 0:
        return "switching rows: the saturated one is not slower, though its load resistor is larger"
    if transit <= 0:
        return "switching rows: they leave no transit time beside the junctions"
    return transit, c_0


def _split_by_c_cb(
    unit: Unit, typical: TypicalUnit, row: _Timed, c_cb: Filled[float], reason: str
) -> tuple[float, float, tuple[Assumed, ...]]:
    """Return transit time [s] and c_cb at 0 V [F], that no more than a share of what c_be leaves of the row."""
    from optopick.switching_fit import at_zero_bias  # noqa: PLC0415 - as above

    rule = schema().rules["c_m_from_c_cb"]
    share, v = rule.number("share", unit.kind), rule.number("v", unit.kind)
    left, least = row.t - row.by.rest, (1.0 - share) * row.t
    if left < least:
        # what comes of it is slower than the sheet: the safe side
        reason = "; ".join(filter(None, (reason, "switching row: c_be alone takes nearly all of its time")))
        left = least
    c_0 = min(at_zero_bias(c_cb.value, v), share * left / row.by.per_c_cb)
    transit = (left - row.by.per_c_cb * c_0) / row.by.per_transit
    c_m = filled(unit, "c_m", typical.h_fe * c_0, "c_m_from_c_cb", _note(reason))
    tau_0 = filled(unit, "tau_0", typical.h_fe * transit, "tau_0_rest", _note(reason))
    return transit, c_0, tuple(a for a in (c_cb.assumed, tau_0.assumed, c_m.assumed) if a)


def _tau_s(unit: Unit, typical: TypicalUnit, row: SaturatedRow, first_tenth: float) -> Filled[float]:
    """Return what t_s leaves after the first tenth of the recovery, in which t_s ends, over ln(i_f/i_sat) [s]."""
    per = math.log(row.i_f / typical.led_current_for(row.i_c))
    if row.t_s > first_tenth:
        return Filled((row.t_s - first_tenth) / per, None)
    return filled(unit, "tau_s", row.t_s / per, "tau_s_whole")


def _tau_s_of(unit: Unit, plain: PlainRow | None, doubt: str) -> Filled[float]:
    """Return a multiple of the time constant of the row not saturated [s]."""
    if plain is None:
        raise ValueError("neither row")
    times = schema().rules["tau_s_multiple"].number("times", unit.kind)
    return filled(unit, "tau_s", times * plain.t / LN9, "tau_s_multiple", _note(doubt))
