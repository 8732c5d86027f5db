"""Switching constants from the switching rows of a data sheet, and what stands in for a row that is missing.

The rows are times of the typical unit by charge control in steps (`optopick.physics.switching`). Each is linear in
transit time and collector-base capacitance, so both rows give both constants; one row gives the transit time beside a
capacitance stated or assumed. Storage lasts tau_s*ln(i_f/i_sat), then the first tenth of the recovery. SI throughout.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from optopick.coupler import Assumed
from optopick.coupler_columns import schema
from optopick.gaps import Filled, Unit, UnusableError, filled
from optopick.switching_rows import PlainRow, SaturatedRow, TypicalUnit

if TYPE_CHECKING:
    from optopick.switching_fit import Linear, Recovery

LN9 = math.log(9.0)

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
    """A row's time [s] and how it comes of the constants."""

    t: float
    by: Linear


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
    from optopick.switching_fit import plain_edge, recovery  # noqa: PLC0415 - numpy, not for tables without transistors

    doubt_plain = "" if plain is None else _doubt_plain(plain)
    doubt = saturated if isinstance(saturated, str) else _doubt_saturated(typical, saturated)
    sound_plain = None if doubt_plain else plain
    sound = None if doubt or isinstance(saturated, str) else saturated
    first = sound_plain and _Timed(sound_plain.t, plain_edge(typical, sound_plain, sound_plain.falls_slower))
    off = sound and recovery(typical, sound)
    second = sound and off and _Timed(sound.t, off.edge)
    reason = "; ".join(filter(None, (doubt_plain, doubt)))
    if sound_plain and sound and first and second:
        reason = "switching rows: sat_r_l is not above sw_r_l" if sound.r_l <= sound_plain.r_l else ""
        split = reason or _split_of_both(first, second)
    else:
        split = reason
    if isinstance(split, str):
        one = first or second
        if one is None:
            raise UnusableError(f"{reason or 'sw_t_r, sw_t_f, sat_t_s, sat_t_off: all empty'}; there is no other switching row")
        transit, junction, assumed = _split_by_c_cb(unit, typical, one, c_cb, split)
    else:
        (transit, junction), assumed = split, ()
    if sound and off:
        tau_s = _tau_s(unit, typical, sound, off.first_tenth.at(transit, junction))
    ...
