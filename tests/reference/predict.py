"""Times of a device's circuits from its data sheet alone: typical unit, 25 degC, no tolerances.

`product` predicts as optopick does today, `proposal` by the formulas of tests.reference.proposal.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, fields

import numpy as np

from optopick.coupler import Transfer, Transistor
from optopick.physics import switching
from optopick.physics.saturation import load_current
from optopick.physics.switching import LN9
from optopick.physics.transfer import base_led_current, led_current_for, relative_ctr
from optopick.physics.types import Array
from tests.reference import proposal as steps_of
from tests.reference.deck import Circuit
from tests.reference.proposal import (
    EDGE,
    FIRST_TENTH,
    Base,
    Cut,
    Load,
    PlainRow,
    SaturatedRow,
    Steps,
    constants,
    constants_of_plain,
    storage_constant,
    zero_bias,
)
from tests.reference.sheet import (
    C_CB_V,
    CURVE_I,
    I_REF,
    PLAIN_I_C,
    PLAIN_R_L,
    PLAIN_V_CC,
    SAT_I_F,
    SAT_R_L,
    SAT_V_CC,
    V_CE_SAT_I_C,
    V_CE_SAT_I_F,
    Sheet,
)
from tests.reference.simulate import OFF_THRESHOLD, ON_THRESHOLD

V_BE, C_BE, C_BE_PROPOSED = 0.65, 10e-12, 14e-12
"""Where the data sheet is silent [V, F]: what optopick assumes today, and with the proposal."""

T = 25.0
"""Temperature of record and prediction [degC]."""


@dataclass(frozen=True)
class Links:
    """Circuits of one device as arrays; see Circuit. An absent base resistor is infinite."""

    pulled_up: Array
    v_cc: Array
    r_load: Array
    r_be: Array
    c_load: Array
    i_f: Array


@dataclass(frozen=True)
class Predicted:
    """Times of the circuits of one device [s]; storage: LED off until 10 % of the swing."""

    edge_on: Array
    edge_off: Array
    storage: Array
    delay_on: Array
    delay_off: Array


Predictor = Callable[[Sheet, Links], Predicted]


def links(circuits: Iterable[Circuit]) -> Links:
    """Arrays of circuits."""
    found = list(circuits)
    rows = [[np.inf if getattr(c, f.name) is None else getattr(c, f.name) for c in found] for f in fields(Links)]
    return Links(*(np.array(row, dtype=float) for row in rows))


def transfer_of(sheet: Sheet) -> Transfer:
    """Transfer of the typical unit."""
    return Transfer(sheet.ctr, sheet.ctr, I_REF, CURVE_I, sheet.curve_g, (25.0,), (1.0,), 0.0)


def threshold_shares(x: Links, v_ce: float) -> tuple[Array, Array]:
    """Share of the swing from rest to the thresholds of the record, turning on and turning off [1]."""
    low, high, swing = ON_THRESHOLD * x.v_cc, OFF_THRESHOLD * x.v_cc, x.v_cc - v_ce
    up = x.pulled_up > 0
    return np.where(up, x.v_cc - low, high) / swing, np.where(up, high - v_ce, x.v_cc - v_ce - low) / swing


def transistor_of(sheet: Sheet) -> Transistor:
    """Transistor of the typical unit, its switching constants by the rules of optopick.

    tau(100 ohm) = max(t_r, t_f)/ln 9, tau(R_sat) = (t_off - t_s)/ln 9, each over the relative gain of its row;
    tau_s = t_s/ln(J/J_s).
    """
    transfer = transfer_of(sheet)
    i_sat = float(led_current_for(transfer, sheet.ctr, 1.0, _saturated_load(sheet).j_s))
    i_plain = float(led_current_for(transfer, sheet.ctr, 1.0, PLAIN_I_C))
    first = max(sheet.t_r, sheet.t_f) / LN9 / float(relative_ctr(transfer, i_plain))
    second = (sheet.t_off - sheet.t_s) / LN9 / float(relative_ctr(transfer, i_sat))
    c_m = (second - first) / (SAT_R_L - PLAIN_R_L)
    return Transistor(
        h_fe=sheet.h_fe, light_spread=1.0, v_be=V_BE, v_be_tc=0.0, v_ce_sat=sheet.v_ce_sat, sat_i_f=V_CE_SAT_I_F,
        sat_i_c=V_CE_SAT_I_C, beta_r=5.0, i_c_max=0.05, v_ceo=70.0, i_ceo_1=1e-8, t_1=25.0, i_ceo_2=1e-5, t_2=100.0,
        c_be=C_BE, tau_0=first - PLAIN_R_L * c_m, c_m=c_m, tau_s=sheet.t_s / float(np.log(SAT_I_F / i_sat)),
    )  # fmt: skip


def product(sheet: Sheet, x: Links) -> Predicted:
    """Times as optopick.recheck.transistor finds them."""
    transfer, q = transfer_of(sheet), transistor_of(sheet)
    eta = sheet.ctr / sheet.h_fe
    i_be = base_led_current(q.v_be, x.r_be, eta)
    i_sat = led_current_for(transfer, sheet.ctr, 1.0, load_current(x.v_cc, q.v_ce_sat, x.r_load))
    tau = switching.time_constant(q.tau_0, q.c_m, relative_ctr(transfer, i_sat), x.r_load, x.c_load)
    on, off = threshold_shares(x, q.v_ce_sat)
    held = switching.storage(q.tau_s, x.i_f, i_be, i_sat)
    charge = switching.base_charging(q.c_be, q.v_be, eta, x.i_f, i_be)
    return Predicted(
        edge_on=switching.edge_on(tau, x.i_f, i_be, i_sat),
        edge_off=switching.edge_off(tau, i_be, i_sat),
        storage=held,
        delay_on=charge + switching.crossing_on(tau, on, x.i_f, i_be, i_sat),
        delay_off=held + switching.crossing_off(tau, off, i_be, i_sat),
    )


def plain_row(sheet: Sheet) -> PlainRow:
    """The row of the output not saturated."""
    return PlainRow(sheet.t_r, sheet.t_f, Load(PLAIN_I_C, PLAIN_V_CC, PLAIN_I_C * PLAIN_R_L, PLAIN_R_L, 0.0, T))


def saturated_row(sheet: Sheet) -> SaturatedRow:
    """The row of the output saturated."""
    return SaturatedRow(sheet.t_s, sheet.t_off, SAT_I_F, _saturated_load(sheet))


def _saturated_load(sheet: Sheet) -> Load:
    swing = SAT_V_CC - sheet.v_ce_sat
    return Load(swing / SAT_R_L, SAT_V_CC, swing, SAT_R_L, 0.0, T)


def _known(sheet: Sheet) -> Base:
    """What of the base the switching rows need not tell; c_cb by the sheet's capacitance."""
    return Base(0.0, float(zero_bias(sheet.c_cb, C_CB_V)), C_BE_PROPOSED, V_BE, sheet.ctr / sheet.h_fe)


def base_of_rows(sheet: Sheet) -> Base:
    """Base of the typical unit by both switching rows."""
    return constants(_known(sheet), plain_row(sheet), saturated_row(sheet), transfer_of(sheet), sheet.ctr)


def base_of_plain_row(sheet: Sheet) -> Base:
    """Base of the typical unit by the plain row and the stated capacitance."""
    return constants_of_plain(_known(sheet), plain_row(sheet), transfer_of(sheet), sheet.ctr)


def proposal(sheet: Sheet, x: Links, base_of: Callable[[Sheet], Base] = base_of_rows) -> Predicted:
    """Times by charge control in steps."""
    transfer, base = transfer_of(sheet), base_of(sheet)
    swing = x.v_cc - sheet.v_ce_sat
    load = Load(swing / x.r_load, x.v_cc, swing, x.r_load, x.c_load, T)
    i_be = base_led_current(base.v_be, x.r_be, base.eta)
    i_sat = led_current_for(transfer, sheet.ctr, 1.0, load.j_s)
    on, off = threshold_shares(x, sheet.v_ce_sat)
    tau_s = storage_constant(base, saturated_row(sheet), transfer, sheet.ctr)
    held = steps_of.held(tau_s, x.i_f, i_be, i_sat, steps_of.base_voltage(base, load.j_s, T) / base.v_be)

    def cut(where: Cut) -> Steps:
        return steps_of.steps(base, load, transfer, sheet.ctr, where)

    rise, n = steps_of.charging(base, load, x.i_f, i_be), x.i_f - i_be
    return Predicted(
        edge_on=steps_of.edge_on(cut(EDGE), n, i_sat),
        edge_off=steps_of.time_off(cut(EDGE), i_be),
        storage=held + steps_of.time_off(cut(FIRST_TENTH), i_be),
        delay_on=rise + steps_of.crossing_on(cut(Cut(steps_of.FIRST, on, steps_of.STEPS)), n),
        delay_off=held + steps_of.time_off(cut(Cut(1.0 - off, 1.0, steps_of.STEPS)), i_be),
    )


def proposal_of_plain_row(sheet: Sheet, x: Links) -> Predicted:
    """The same where the sheet has a capacitance but its saturated row gives the storage constant only."""
    return proposal(sheet, x, base_of_plain_row)


PREDICTORS: dict[str, Predictor] = {
    "product": product,
    "proposal": proposal,
    "plain-row": proposal_of_plain_row,
}
