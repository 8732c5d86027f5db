"""Switching constants from the switching rows of a data sheet, and what stands in for a row that is missing.

The typical unit of the sheet, with a load resistor r_l and carrying i_c, follows with the time constant
g(i)*(tau_0 + r_l*c_m), where i is the LED current that carries i_c and g the CTR curve there: its gain falls as its CTR
does. An edge from 10 to 90 % lasts ln 9 time constants. Storage lasts tau_s*ln(i_f/i). SI throughout.
Source: charge control (Ebers and Moll 1954; Moll, Proc. IRE 42 (1954) 1773).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

from optopick.coupler import Assumed
from optopick.coupler_columns import schema
from optopick.coupler_curves import Curve
from optopick.gaps import Filled, Unit, UnusableError, filled

LN9 = math.log(9.0)

# Closer to the edge of saturation than this, storage says nothing about tau_s: a small error of CTR is all of it.
_LEAST_OVERDRIVE = 1.1


@dataclass(frozen=True)
class TypicalUnit:
    """The unit that the times are of: CTR [1], its curve over LED current ([A], 1 at the test current), gain [1]."""

    ctr: float
    curve: Curve
    h_fe: float

    def led_current_for(self, i_c: float) -> float:
        """Return the LED current [A] that carries `i_c` [A]; infinite beyond the curve."""
        return self.curve.x_carrying(i_c / self.ctr)

    def relative_gain(self, i_c: float) -> float:
        """Return the gain carrying `i_c` [A] over that at the test current [1]; beyond the curve, that at its end."""
        return self.curve.log_at(min(self.led_current_for(i_c), self.curve.x[-1]))


@dataclass(frozen=True)
class PlainRow:
    """Output not saturated: the longer edge `t` [s] at collector current `i_c` [A] and load resistor `r_l` [ohm]."""

    t: float
    i_c: float
    r_l: float


@dataclass(frozen=True)
class SaturatedRow:
    """Output saturated: storage and turn-off time [s], load current `i_c` [A], LED current [A], load resistor [ohm]."""

    t_s: float
    t_off: float
    i_c: float
    i_f: float
    r_l: float


@dataclass(frozen=True)
class SwitchingConstants:
    """tau_0 [s], c_m [F] and tau_s [s] of the typical unit, and what was assumed for them."""

    tau_0: float
    c_m: float
    tau_s: float
    assumed: tuple[Assumed, ...]

    def with_gain_times(self, gain: float) -> SwitchingConstants:
        """Return the constants of a unit with `gain` times the gain and the same light.

        tau_0 = h_fe*tau_f and c_m = h_fe*c_cb grow with gain; tau_s, the lifetime of stored charge, does not.
        """
        moved = {"tau_0": self.tau_0 * gain, "c_m": self.c_m * gain}
        told = (
            replace(a, value=schema().show(a.parameter, moved[a.parameter])) if a.parameter in moved else a
            for a in self.assumed
        )
        return SwitchingConstants(moved["tau_0"], moved["c_m"], self.tau_s, tuple(told))


def saturated_current(unit: Unit, v_cc: float, r_l: float) -> float:
    """Return the load current in saturation [A]: (v_cc - v_ce)/r_l, v_ce that of a usual unit."""
    return (v_cc - schema().rules["switching_rows"].number("v_ce", unit.kind)) / r_l


def switching_constants(
    unit: Unit, typical: TypicalUnit, plain: PlainRow | None, saturated: SaturatedRow | str, c_cb: Filled[float]
) -> SwitchingConstants:
    """Return the switching constants from both rows where they agree, else from one of them and c_cb [F].

    saturated: the row, or why it is not complete (empty text: it is not there at all). Raises UnusableError where
    there is neither row, or only a saturated one that contradicts the CTR.
    """
    doubt = saturated if isinstance(saturated, str) else _doubt(typical, saturated)
    sound = None if doubt or isinstance(saturated, str) else saturated
    if plain is None and sound is None:
        reason = doubt or "sw_t_r, sw_t_f, sat_t_s, sat_t_off: all empty"
        raise UnusableError(f"{reason}; there is no other switching row")
    split = _split_of_both(typical, plain, sound) if plain and sound else doubt
    if isinstance(split, str):
        tau, r_l = _one_time_constant(typical, plain, sound)
        tau_0, c_m, assumed = _split_by_c_cb(unit, typical, tau, r_l, c_cb, _note(split))
    else:
        (tau_0, c_m), assumed = split, ()
    tau_s = _tau_s(unit, typical, plain, sound, _note(doubt))
    more = (tau_s.assumed,) if tau_s.assumed else ()
    return SwitchingConstants(tau_0, c_m, tau_s.value, assumed + more)


def _note(reason: str) -> str:
    return f"{reason}; so " if reason else ""


def _doubt(typical: TypicalUnit, row: SaturatedRow) -> str:
    """Return why the saturated row cannot be used with this CTR; empty where it can."""
    i_sat = typical.led_current_for(row.i_c)
    if row.i_f >= _LEAST_OVERDRIVE * i_sat:
        return ""
    return (
        f"saturated row: sat_i_f, {schema().show('sat_i_f', row.i_f)}, hardly saturates the typical unit, whose load "
        f"needs {'more than the CTR curve shows' if math.isinf(i_sat) else schema().show('sat_i_f', i_sat)}"
    )


def _plain_tau(typical: TypicalUnit, row: PlainRow) -> float:
    """Return tau_0 + r_l*c_m [s] by the row of the output not saturated."""
    return row.t / (LN9 * typical.relative_gain(row.i_c))


def _saturated_tau(typical: TypicalUnit, row: SaturatedRow) -> float:
    """Return tau_0 + r_l*c_m [s] by the saturated row: what turn-off lasts beyond storage."""
    return (row.t_off - row.t_s) / (LN9 * typical.relative_gain(row.i_c))


def _split_of_both(typical: TypicalUnit, plain: PlainRow, saturated: SaturatedRow) -> tuple[float, float] | str:
    """Return tau_0 [s] and c_m [F], or why the rows contradict each other."""
    if saturated.r_l <= plain.r_l:
        return "switching rows: sat_r_l is not above sw_r_l"
    first, second = _plain_tau(typical, plain), _saturated_tau(typical, saturated)
    c_m = (second - first) / (saturated.r_l - plain.r_l)
    tau_0 = first - plain.r_l * c_m
    if c_m <= 0:
        return "switching rows: the saturated one is not slower, though its load resistor is larger"
    if tau_0 <= 0:
        return "switching rows: they leave no time constant without load resistor"
    return tau_0, c_m


def _one_time_constant(
    typical: TypicalUnit, plain: PlainRow | None, saturated: SaturatedRow | None
) -> tuple[float, float]:
    """Return tau_0 + r_l*c_m [s] and r_l [ohm] of the row there is; of two the one not saturated."""
    if plain is not None:
        return _plain_tau(typical, plain), plain.r_l
    if saturated is not None:
        return _saturated_tau(typical, saturated), saturated.r_l
    raise ValueError("neither row")


def _split_by_c_cb(
    unit: Unit, typical: TypicalUnit, tau: float, r_l: float, c_cb: Filled[float], note: str
) -> tuple[float, float, tuple[Assumed, ...]]:
    """Return tau_0 [s] and c_m [F] = h_fe*c_cb, no more than a share of what tau = tau_0 + r_l*c_m allows."""
    share = schema().rules["c_m_from_c_cb"].number("share", unit.kind)
    c_m = filled(unit, "c_m", min(typical.h_fe * c_cb.value, share * tau / r_l), "c_m_from_c_cb", note)
    tau_0 = filled(unit, "tau_0", tau - r_l * c_m.value, "tau_0_rest", note)
    return tau_0.value, c_m.value, tuple(a for a in (c_cb.assumed, tau_0.assumed, c_m.assumed) if a)


def _tau_s(
    unit: Unit, typical: TypicalUnit, plain: PlainRow | None, saturated: SaturatedRow | None, note: str
) -> Filled[float]:
    """Return t_s/ln(i_f/i_sat) [s] by the saturated row, else a multiple of the other row's time constant."""
    if saturated is not None:
        i_sat = typical.led_current_for(saturated.i_c)
        return Filled(saturated.t_s / math.log(saturated.i_f / i_sat), None)
    if plain is None:
        raise ValueError("neither row")
    times = schema().rules["tau_s_multiple"].number("times", unit.kind)
    return filled(unit, "tau_s", times * plain.t / LN9, "tau_s_multiple", note)
