"""Times of a device's circuits from its data sheet alone: typical unit, 25 degC, no tolerances."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace

import numpy as np

from optopick.coupler import Kind, Transfer
from optopick.coupler_columns import schema
from optopick.coupler_curves import Curve
from optopick.gaps import Filled, Unit
from optopick.gaps_switching import SwitchingConstants, saturated_voltage, switching_constants
from optopick.physics import switching
from optopick.physics.charge import Base, Load
from optopick.physics.leakage import raised
from optopick.physics.saturation import load_current
from optopick.physics.transfer import base_led_current, led_current_for
from optopick.physics.types import Array
from optopick.switching_rows import PlainRow, SaturatedRow, TypicalUnit
from tests.reference.record import Entry
from tests.reference.sheet import (
    CURVE_I,
    I_REF,
    PLAIN_I_C,
    PLAIN_R_L,
    PLAIN_V_CC,
    SAT_I_F,
    SAT_R_L,
    SAT_V_CC,
    Sheet,
)
from tests.reference.simulate import OFF_THRESHOLD, ON_THRESHOLD

UNIT = Unit("REFERENCE", Kind.PHOTOTRANSISTOR)


def _usual(column: str) -> float:
    """What optopick takes where the data sheet is silent, SI."""
    known = schema()
    value = known.rules[known.columns[column].rules[-1]].number("value", UNIT.kind)
    return known.columns[column].table_unit.to_si(value)


V_BE, C_BE = _usual("v_be"), _usual("c_be")

T = 25.0
"""Temperature of record and prediction [degC]."""


@dataclass(frozen=True)
class Links:
    """Circuits of one device as arrays; see Circuit and Entry. An absent base resistor is infinite."""

    pulled_up: Array
    v_cc: Array
    r_load: Array
    r_be: Array
    c_load: Array
    i_f: Array
    i_off: Array
    i_ceo: Array


@dataclass(frozen=True)
class Predicted:
    """Times of the circuits of one device [s]; storage: LED off until 10 % of the swing."""

    edge_on: Array
    edge_off: Array
    storage: Array
    delay_on: Array
    delay_off: Array


Predictor = Callable[[Sheet, Links], Predicted]


def links(entries: Iterable[Entry]) -> Links:
    """Arrays of circuits."""
    found = list(entries)

    def of_circuits(name: str) -> Array:
        return np.array([getattr(e.circuit, name) for e in found], dtype=float)

    return Links(
        pulled_up=of_circuits("pulled_up"),
        v_cc=of_circuits("v_cc"),
        r_load=of_circuits("r_load"),
        r_be=np.array([np.inf if e.circuit.r_be is None else e.circuit.r_be for e in found]),
        c_load=of_circuits("c_load"),
        i_f=of_circuits("i_f"),
        i_off=of_circuits("i_off"),
        i_ceo=np.array([e.i_ceo for e in found]),
    )


def transfer_of(sheet: Sheet) -> Transfer:
    """Transfer of the typical unit."""
    return Transfer(sheet.ctr, sheet.ctr, I_REF, CURVE_I, sheet.curve_g, (25.0,), (1.0,), 0.0)


def rest_of(sheet: Sheet, x: Links) -> Array:
    """LED current that the light left and the dark current amount to [A]."""
    dark = x.i_ceo > 0
    i_dark = led_current_for(transfer_of(sheet), sheet.ctr, 1.0, np.where(dark, x.i_ceo, 1.0))
    return np.asarray(x.i_off + np.where(dark, i_dark, 0.0))


def threshold_shares(x: Links, v_ce: float) -> tuple[Array, Array]:
    """Share of the swing from rest to the thresholds of the record, turning on and turning off [1]."""
    low, high, swing = ON_THRESHOLD * x.v_cc, OFF_THRESHOLD * x.v_cc, x.v_cc - v_ce
    up = x.pulled_up > 0
    return np.where(up, x.v_cc - low, high) / swing, np.where(up, high - v_ce, x.v_cc - v_ce - low) / swing


def typical_of(sheet: Sheet) -> TypicalUnit:
    """The typical unit; what the sheet does not state is as optopick takes it."""
    return TypicalUnit(sheet.ctr, Curve(CURVE_I, sheet.curve_g), sheet.h_fe, V_BE, C_BE)


def plain_row(sheet: Sheet) -> PlainRow:
    """The row of the output not saturated."""
    return PlainRow(sheet.t_r, sheet.t_f, PLAIN_I_C, PLAIN_R_L, PLAIN_V_CC)


def saturated_row(sheet: Sheet) -> SaturatedRow:
    """The row of the output saturated."""
    return SaturatedRow(sheet.t_s, sheet.t_off, SAT_I_F, SAT_R_L, SAT_V_CC, saturated_voltage(UNIT))


def constants_of_rows(sheet: Sheet) -> SwitchingConstants:
    """Constants by both switching rows."""
    return switching_constants(
        UNIT, typical_of(sheet), plain_row(sheet), saturated_row(sheet), Filled(sheet.c_cb, None)
    )


def constants_of_plain_row(sheet: Sheet) -> SwitchingConstants:
    """Constants by the plain row and the stated capacitance; the storage constant still by the saturated row."""
    found = switching_constants(UNIT, typical_of(sheet), plain_row(sheet), "", Filled(sheet.c_cb, None))
    return replace(found, tau_s=constants_of_rows(sheet).tau_s)


def predicted(sheet: Sheet, x: Links, constants: SwitchingConstants) -> Predicted:
    """Times as optopick.recheck.transistor finds them."""
    transfer, eta = transfer_of(sheet), sheet.ctr / sheet.h_fe
    base = Base(constants.tau_0 / sheet.h_fe, constants.c_m / sheet.h_fe, C_BE, V_BE, eta)
    j_s = load_current(x.v_cc, sheet.v_ce_sat, x.r_load)
    load = Load(j_s, x.v_cc, x.v_cc - sheet.v_ce_sat, x.r_load, x.c_load, T)
    i_be, i_rest = base_led_current(V_BE, x.r_be, eta), rest_of(sheet, x) * raised(x.v_cc)
    swung = switching.swing(base, load, transfer, sheet.ctr, *threshold_shares(x, sheet.v_ce_sat))
    tenth = switching.steps(base, load, transfer, sheet.ctr, switching.FIRST_TENTH)
    held = switching.storage(constants.tau_s, x.i_f, i_be, swung.i_sat, swung.hold, i_rest)
    return Predicted(
        edge_on=switching.edge_on(swung.edge, x.i_f - i_be, swung.i_sat),
        edge_off=switching.edge_off(swung.edge, switching.EDGE, i_be, i_rest),
        storage=held + switching.edge_off(tenth, switching.FIRST_TENTH, i_be, i_rest),
        delay_on=switching.delay_on(swung, eta, x.i_f, i_be),
        delay_off=switching.delay_off(swung, constants.tau_s, x.i_f, i_be, i_rest),
    )


def product(sheet: Sheet, x: Links) -> Predicted:
    """Constants by both switching rows."""
    return predicted(sheet, x, constants_of_rows(sheet))


def product_of_plain_row(sheet: Sheet, x: Links) -> Predicted:
    """Where the sheet has a capacitance but its saturated row gives the storage constant only."""
    return predicted(sheet, x, constants_of_plain_row(sheet))


PREDICTORS: dict[str, Predictor] = {"product": product, "plain-row": product_of_plain_row}
