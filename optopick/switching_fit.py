"""Times of switching rows by the formulas of `optopick.physics.switching`, as what each constant adds to them.

Apart from the rest of the table because it needs numpy, which a table without transistors never loads.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from optopick.coupler import Transfer
from optopick.physics.charge import Base, Load, zero_bias
from optopick.physics.switching import EDGE, FIRST_TENTH, Cut, Steps, steps, time_off, time_on
from optopick.physics.transfer import led_current_for
from optopick.physics.types import Array
from optopick.switching_rows import PlainRow, SaturatedRow, TypicalUnit

T_SHEET = 25.0
"""Ambient of data sheet rows [degC]."""

_SHARED = 4096
"""Rows kept: more than any table has parts."""


@dataclass(frozen=True)
class Linear:
    """A time as rest + per_transit*transit + per_c_cb*c_cb [s]: every charge is linear in these constants.

    rest: what c_be alone takes [s]; per_transit [1]; per_c_cb, of c_cb at 0 V [s/F].
    """

    rest: float
    per_transit: float
    per_c_cb: float

    def at(self, transit: float, c_cb: float) -> float:
        """Return the time with these constants [s]."""
        return self.rest + self.per_transit * transit + self.per_c_cb * c_cb


@dataclass(frozen=True)
class Recovery:
    """Turning off out of saturation: 10 to 90 % of the recovery, and its first tenth, in which t_s ends."""

    edge: Linear
    first_tenth: Linear


@lru_cache(maxsize=_SHARED)
def plain_edge(typical: TypicalUnit, row: PlainRow, falling: bool) -> Linear:
    """An edge of the row whose output is not saturated; rising, the light just carries the row's current."""
    transfer = _transfer(typical)
    cut = _steps(typical, transfer, Load(np.array([row.i_c]), row.v_cc, row.i_c * row.r_l, row.r_l, 0.0, T_SHEET), EDGE)
    if falling:
        return _linear(time_off(cut, 0.0))
    return _linear(time_on(cut, led_current_for(transfer, typical.ctr, 1.0, row.i_c)))


@lru_cache(maxsize=_SHARED)
def recovery(typical: TypicalUnit, row: SaturatedRow) -> Recovery:
    """Turning off of the row whose output is saturated."""
    load = Load(np.array([row.i_c]), row.v_cc, row.v_cc - row.v_ce, row.r_l, 0.0, T_SHEET)
    transfer = _transfer(typical)
    edge, tenth = (_linear(time_off(_steps(typical, transfer, load, cut), 0.0)) for cut in (EDGE, FIRST_TENTH))
    return Recovery(edge, tenth)


def at_zero_bias(c_cb: float, v: float) -> float:
    """Collector-base capacitance at 0 V [F] from that at `v` [V]."""
    return float(zero_bias(c_cb, v))


def _transfer(typical: TypicalUnit) -> Transfer:
    """The transfer of the typical unit; beyond its curve CTR is taken as constant, so that every row has an edge."""
    i, g = typical.curve.x, typical.curve.y
    return Transfer(typical.ctr, typical.ctr, i[0], (*i, 1e4 * i[-1]), (*g, g[-1]), (T_SHEET,), (1.0,), 0.0)


def _steps(typical: TypicalUnit, transfer: Transfer, load: Load, cut: Cut) -> Steps:
    """Steps with no constant at all, with transit 1 s alone and with c_cb 1 F alone, on the last axis."""
    base = Base(np.array([0.0, 1.0, 0.0]), np.array([0.0, 0.0, 1.0]), typical.c_be, typical.v_be, typical.eta)
    return steps(base, load, transfer, typical.ctr, cut)


def _linear(times: Array) -> Linear:
    rest, transit, c_cb = times.tolist()
    return Linear(rest, transit - rest, c_cb - rest)
