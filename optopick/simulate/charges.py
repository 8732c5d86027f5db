"""The transistor's charges from the switching constants of the table.

The table's tau_0 and c_m say how long edges last: ln 9*g*(tau_0 + r*c_m) with a load resistor r, g the gain relative to
that at the test current. A simulation needs the charges themselves: transit time and collector junction. Both rows
of a data sheet at their usual conditions are put back in, and the charges that give their times are solved for: an edge
from 10 to 90 % is the integral of charge over the current that moves it, linear in both unknowns.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from scipy.optimize import nnls

from optopick.coupler import Transfer, Transistor
from optopick.physics.switching import LN9
from optopick.physics.transfer import led_current_for, relative_ctr
from optopick.physics.types import Array, Real
from optopick.simulate.junction import Junction

V_J, M_J = 0.7, 0.37
"""Built-in voltage [V] and grading exponent [1] of the collector junction: silicon, between the linearly graded (1/3)
and the abrupt (1/2) junction."""

LEAST_C = 1e-15
"""Least capacitance of the collector junction [F]: with none at all the output voltage would jump."""

POINTS = 32


@dataclass(frozen=True)
class Row:
    """A switching row's usual conditions: load resistor [ohm], supply [V], collector current while on [A].

    i_f: LED current of the saturated row [A], 0 where the output does not saturate.
    """

    r: float
    v_cc: float
    i_c: float
    i_f: float


PLAIN, SATURATED = Row(100.0, 10.0, 2e-3, 0.0), Row(1900.0, 5.0, 2.5e-3, 16e-3)
"""As on the sheet of Broadcom ACPL-214; the first also on that of Vishay MOC8101."""

EDGE, FIRST_TENTH = (0.1, 0.9), (0.9, 1.0)
"""Shares of the current [1] that an edge lies between, and in which storage ends."""

LEAST_STORAGE = 0.3
"""Share of the storage time that the first tenth of the recovery leaves at least [1]."""


@dataclass(frozen=True)
class Charges:
    """Forward transit time [s], collector junction at 0 V [F] and storage constant [s] of the typical unit."""

    tau_f: float
    c_0: float
    tau_s: float


@dataclass(frozen=True)
class Shares:
    """What a part of an edge takes: per forward transit time [1], per collector junction [s/F], and anyway [s]."""

    per_transit: float
    per_c: float
    rest: float


@lru_cache(maxsize=256)
def charges(transfer: Transfer, transistor: Transistor, v_t: float) -> Charges:
    """The typical unit's charges; v_t: thermal voltage times the junctions between base and emitter, at 25 degC [V].

    tau_f and c_0 are the non-negative pair that comes nearest to the edges of both rows, in relative measure. A sheet's
    storage time ends with the first tenth of the recovery, which the simulation adds by itself: tau_s is the table's
    less that share.
    """
    system, wanted = [], []
    for row in (PLAIN, SATURATED):
        edge = _shares(transfer, transistor, v_t, row, EDGE)
        g = float(relative_ctr(transfer, np.minimum(_led_current(transfer, row.i_c), transfer.curve_i[-1])))
        time = LN9 * g * (transistor.tau_0 + row.r * transistor.c_m)
        system.append([edge.per_transit * 1e-9 / time, edge.per_c * 1e-12 / time])
        wanted.append(max(1.0 - edge.rest / time, 0.0))
    found, _ = nnls(np.array(system), np.array(wanted))
    tau_f, c_0 = float(found[0]) * 1e-9, max(float(found[1]) * 1e-12, LEAST_C)
    tenth = _shares(transfer, transistor, v_t, SATURATED, FIRST_TENTH)
    first_tenth = tenth.per_transit * tau_f + tenth.per_c * c_0 + tenth.rest
    return Charges(tau_f, c_0, _storage_constant(transfer, transistor.tau_s, first_tenth))


def _storage_constant(transfer: Transfer, tau_s: float, first_tenth: float) -> float:
    """tau_s less first_tenth/ln(i_f/i_sat) [s]; unchanged where the row would not saturate this unit."""
    overdrive = SATURATED.i_f / float(_led_current(transfer, SATURATED.i_c))
    if overdrive <= 1.0:
        return tau_s
    return max(tau_s - first_tenth / math.log(overdrive), LEAST_STORAGE * tau_s)


def _middle(transfer: Transfer) -> float:
    return math.sqrt(transfer.ctr_min * transfer.ctr_max)


def _led_current(transfer: Transfer, j: Real) -> Array:
    """LED current with which the typical unit carries `j` [A]; infinite beyond the CTR curve."""
    return led_current_for(transfer, _middle(transfer), 1.0, j)


def _shares(transfer: Transfer, transistor: Transistor, v_t: float, row: Row, part: tuple[float, float]) -> Shares:
    """What a row's edge takes between two shares of its current.

    Integrals over ln j: dq = tau_f*dj + c_be*dv_be + c_cb*dv_bc, over what charges or empties the base.
    """
    node, weight = np.polynomial.legendre.leggauss(POINTS)
    low, high = math.log(part[0]), math.log(part[1])
    j = row.i_c * np.exp(low + (node + 1.0) / 2.0 * (high - low))
    per_current = weight / 2.0 * (high - low) / _moving(transfer, transistor, row, j)
    v_bc = transistor.v_be - (row.v_cc - row.r * j)
    c = np.array([Junction(1.0, V_J, M_J).capacitance(float(v)) for v in v_bc])
    per_c = float(np.sum(per_current * c * (v_t + row.r * j)))
    return Shares(float(np.sum(per_current * j)), per_c, float(np.sum(per_current)) * transistor.c_be * v_t)


def _moving(transfer: Transfer, transistor: Transistor, row: Row, j: Array) -> Array:
    """Current that moves the base's charge at collector currents `j` [A].

    As the output lets go it is the base current. As it comes on, not saturated, it is what the light gives beyond the
    base current. A sheet's row has both edges and the table's constants come from the longer one: where the gain rises
    with current that is the edge on.
    """
    lets_go = _base_current(transfer, transistor, j)
    if row.i_f > 0:
        return lets_go
    comes_on = _base_current(transfer, transistor, np.array(row.i_c)) - lets_go
    return comes_on if np.sum(j / comes_on) > np.sum(j / lets_go) else lets_go


def _base_current(transfer: Transfer, transistor: Transistor, j: Array) -> Array:
    """Base current of the typical unit at collector currents `j` [A]; beyond the CTR curve its last gain goes on."""
    ctr, i = _middle(transfer), _led_current(transfer, j)
    return np.asarray(ctr / transistor.h_fe * np.where(np.isfinite(i), i, j / (ctr * transfer.curve_g[-1])))
