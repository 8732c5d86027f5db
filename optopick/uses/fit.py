"""Switching rows of a coupler table beside the times that the resolved constants give for them."""

from __future__ import annotations

import math
from collections.abc import Iterator
from pathlib import Path

from optopick.answers import Fitted, FittedTime
from optopick.coupler import Coupler
from optopick.coupler_rows import Sheet
from optopick.read_couplers import sheets_of
from optopick.switching_fit import plain_edge, recovery
from optopick.switching_rows import PlainRow, SaturatedRow

SO = "; so "
"""What ends the reason in an assumption's sentence: see `optopick.gaps_switching`."""


def fit_report(table_path: Path) -> tuple[Fitted, ...]:
    """Every part and bin with a transistor output: its switching rows as given and as its constants reproduce them.

    Rows set aside and logic outputs are left out. Raises InputError with every mistake of the file.
    """
    return tuple(_fitted(coupler, sheet) for coupler, sheet in sheets_of(table_path) if sheet is not None)


def _fitted(coupler: Coupler, sheet: Sheet) -> Fitted:
    transistor = coupler.transistor
    if transistor is None:
        raise ValueError(f"{coupler.part} has no transistor output")
    transit, c_cb = transistor.tau_0 / transistor.h_fe, transistor.c_m / transistor.h_fe
    times = [*_plain(sheet, transit, c_cb), *_saturated(sheet, transit, c_cb, transistor.tau_s)]
    return Fitted(coupler.part, transit, c_cb, transistor.tau_s, tuple(times), _note(coupler))


def _plain(sheet: Sheet, transit: float, c_cb: float) -> Iterator[FittedTime]:
    """The edges of the row not saturated; the constants are fitted to the longer one."""
    row = sheet.plain
    if not isinstance(row, PlainRow):
        return
    for column, given, falling in (("sw_t_r", row.t_r, False), ("sw_t_f", row.t_f, True)):
        if given is not None:
            found = plain_edge(sheet.typical, row, falling).at(transit, c_cb)
            yield FittedTime(column, given, found, falling is row.falls_slower)


def _saturated(sheet: Sheet, transit: float, c_cb: float, tau_s: float) -> Iterator[FittedTime]:
    """Storage and turn-off time of the saturated row; where the typical unit does not saturate there are none."""
    row = sheet.saturated
    if not isinstance(row, SaturatedRow):
        return
    overdrive = row.i_f / sheet.typical.led_current_for(row.i_c)
    if overdrive <= 1.0:
        return
    off = recovery(sheet.typical, row)
    t_s = tau_s * math.log(overdrive) + off.first_tenth.at(transit, c_cb)
    yield FittedTime("sat_t_s", row.t_s, t_s, True)
    yield FittedTime("sat_t_off", row.t_off, t_s + off.edge.at(transit, c_cb), True)


def _note(coupler: Coupler) -> str:
    """Why a row was not used: what the assumptions for the constants begin with."""
    rules = (item.rule for item in coupler.assumed if item.parameter in ("tau_0", "c_m", "tau_s"))
    reasons = dict.fromkeys(rule.rpartition(SO)[0] for rule in rules if SO in rule)
    return "; ".join(reasons)
