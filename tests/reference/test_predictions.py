"""How near the proposal comes to the simulator, and that it is what it says."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from optopick.physics import switching
from optopick.physics.transfer import led_current_for
from tests.reference import proposal as p
from tests.reference.compare import ratios, report
from tests.reference.predict import (
    PREDICTORS,
    base_of_plain_row,
    base_of_rows,
    plain_row,
    saturated_row,
    transfer_of,
)
from tests.reference.record import RECORDS, read_record
from tests.reference.sheet import I_REF, Sheet

SHEETS = read_record("record").sheets
SHEET = SHEETS["plain"]
TRANSFER, BASE = transfer_of(SHEET), base_of_rows(SHEET)
LOAD = p.Load(5.0 / np.array([470.0, 2.2e3, 22e3]), 5.2, 5.0, np.array([470.0, 2.2e3, 22e3]), 50e-12, 25.0)


def cut(where: p.Cut = p.EDGE, load: p.Load = LOAD, base: p.Base = BASE) -> p.Steps:
    return p.steps(base, load, TRANSFER, SHEET.ctr, where)


@pytest.mark.parametrize("name", RECORDS)
@pytest.mark.parametrize("predictor", ["proposal", "plain-row"])
def test_predictions_are_within_reach(name: str, predictor: str) -> None:
    record = read_record(name)
    for quantity, ratio in ratios(PREDICTORS[predictor], record.entries, record.sheets).by_quantity.items():
        assert abs(np.median(ratio) - 1.0) < 0.10, quantity
        assert np.mean(np.abs(ratio - 1.0) <= 0.25) > 0.95, quantity
        assert np.all((ratio > 0.6) & (ratio < 1.8)), quantity


def test_every_circuit_is_compared_once() -> None:
    record = read_record("record")
    found = ratios(PREDICTORS["proposal"], record.entries, record.sheets)
    assert len(found.entries) == len(record.entries) == len(set(map(id, found.entries)))
    lines = report(record, "proposal")
    assert f"proposal, all ({len(record.entries)} circuits)" in lines


@pytest.mark.parametrize("sheet", SHEETS.values(), ids=lambda s: s.name)
def test_constants_give_the_rows_back(sheet: Sheet) -> None:
    transfer, plain, saturated = transfer_of(sheet), plain_row(sheet), saturated_row(sheet)
    base = base_of_rows(sheet)
    edge = p.steps(base, saturated.load, transfer, sheet.ctr, p.EDGE)
    assert float(p.time_off(edge, 0.0)) == pytest.approx(sheet.t_off - sheet.t_s, rel=1e-9)
    for found in (base, base_of_plain_row(sheet)):
        edge = p.steps(found, plain.load, transfer, sheet.ctr, p.EDGE)
        n = led_current_for(transfer, sheet.ctr, 1.0, plain.load.j_s)
        longer = p.time_off(edge, 0.0) if sheet.t_f > sheet.t_r else p.time_on(edge, n)
        assert float(longer) == pytest.approx(max(sheet.t_r, sheet.t_f), rel=1e-9)
    tau_s = p.storage_constant(base, saturated, transfer, sheet.ctr)
    i_sat = led_current_for(transfer, sheet.ctr, 1.0, saturated.load.j_s)
    tenth = p.time_off(p.steps(base, saturated.load, transfer, sheet.ctr, p.FIRST_TENTH), 0.0)
    assert float(p.held(tau_s, saturated.i_f, 0.0, i_sat, 1.0) + tenth) == pytest.approx(sheet.t_s, rel=1e-9)


def test_without_junctions_and_with_constant_gain_the_steps_are_the_old_formulas() -> None:
    flat = replace(TRANSFER, curve_g=(1.0,) * len(TRANSFER.curve_g))
    base = replace(BASE, c_cb=0.0, c_be=0.0)
    j_s, c_load = np.array([1e-3, 4e-3]), 100e-12
    load = p.Load(j_s, 5.0, 4.9, 4.9 / j_s, c_load, 25.0)
    i_sat = led_current_for(flat, 1.0, 1.0, j_s)
    tau = base.transit / base.eta + 4.9 / j_s * c_load
    edge = p.steps(base, load, flat, 1.0, p.EDGE)
    n = np.array([1.4, 5.0]) * i_sat
    np.testing.assert_allclose(p.time_on(edge, n), switching.edge_on(tau, n, 0.0, i_sat), rtol=1e-9)
    flat_hold = replace(edge, hold=np.ones_like(edge.hold))
    np.testing.assert_allclose(p.time_off(flat_hold, 0.3 * n), switching.edge_off(tau, 0.3 * n, i_sat), rtol=1e-9)
    part = p.steps(base, load, flat, 1.0, p.Cut(1e-6, 0.7, 1))
    np.testing.assert_allclose(p.time_on(part, n), switching.crossing_on(tau, 0.7, n, 0.0, i_sat), rtol=1e-5)


def test_junction_charge_is_the_integral_of_its_capacitance() -> None:
    v, c_0 = np.linspace(-0.6, 24.0, 200_001), 10e-12
    c = c_0 * np.minimum((1 + np.maximum(v, -p.V_J / 2) / p.V_J) ** -p.M_J, 0.5**-p.M_J)
    by_hand = np.concatenate([[0.0], np.cumsum((c[1:] + c[:-1]) / 2 * np.diff(v))])
    found = p.junction_charge(c_0, v)
    np.testing.assert_allclose(found - found[0], by_hand, rtol=1e-6, atol=1e-18)
    assert float(p.junction_charge(c_0, 0.0)) == 0.0
    assert float(p.zero_bias(c_0 * (1 + 5 / p.V_J) ** -p.M_J, 5.0)) == pytest.approx(c_0)


def test_base_charge_adds_transit_emitter_junction_and_swing() -> None:
    base = p.Base(transit=5e-9, c_cb=0.0, c_be=12e-12, v_be=0.65, eta=2.5e-3)
    load = p.Load(2e-3, 5.0, 4.9, 2450.0, 0.0, 25.0)
    assert float(p.base_charge(base, load, 1.0)) == pytest.approx(5e-9 * 2e-3 + 12e-12 * 0.65)
    low = 0.65 + 0.025693 * math.log(0.1)
    assert float(p.base_charge(base, load, 0.1)) == pytest.approx(5e-9 * 0.2e-3 + 12e-12 * low, rel=1e-5)
    swing = p.base_charge(replace(base, c_cb=1e-12), load, 1.0) - p.base_charge(base, load, 1.0)
    assert float(swing) == pytest.approx(float(p.junction_charge(1e-12, 5.0) - p.junction_charge(1e-12, 0.1 - 0.65)))


def test_inverses_meet_their_times() -> None:
    edge, part = cut(), cut(p.Cut(p.FIRST, 0.7, p.STEPS))
    i_sat = led_current_for(TRANSFER, SHEET.ctr, 1.0, LOAD.j_s)
    for factor in (1.05, 2.0, 20.0):
        n = factor * i_sat
        for steps, takes, least in (
            (edge, p.time_on, lambda s, t: p.drive_for_edge_on(s, t, i_sat)),
            (part, p.crossing_on, p.drive_for_crossing_on),
        ):
            found = least(steps, takes(steps, n))
            np.testing.assert_allclose(found, n, rtol=1e-9)
            assert np.all(takes(steps, found) <= takes(steps, n))
        i_be = factor * i_sat / 10
        found = p.extraction_for(edge, p.time_off(edge, i_be))
        np.testing.assert_allclose(found, i_be, rtol=1e-9)
        assert np.all(p.time_off(edge, found) <= p.time_off(edge, i_be))


def test_inverses_at_their_ends() -> None:
    edge, part = cut(), cut(p.Cut(p.FIRST, 0.7, p.STEPS))
    i_sat = led_current_for(TRANSFER, SHEET.ctr, 1.0, LOAD.j_s)
    assert np.all(p.drive_for_edge_on(edge, p.time_on(edge, i_sat) * 1.001, i_sat) == 0.0)
    assert np.all(p.drive_for_edge_on(edge, p.time_on(edge, i_sat) * 0.999, i_sat) > i_sat)
    assert np.all(np.isinf(p.drive_for_crossing_on(part, 0.0)))
    assert np.all(np.isinf(p.drive_for_crossing_on(part, -1e-6)))
    assert np.all(p.extraction_for(edge, p.time_off(edge, 0.0)) == 0.0)
    floor = np.sum(edge.least, axis=-1)
    assert np.all(np.isinf(p.extraction_for(edge, floor)))
    reached = p.extraction_for(edge, floor * 1.01)
    assert np.all(np.isfinite(reached))
    assert np.all(p.time_off(edge, reached) <= floor * 1.01)


def test_times_move_the_way_the_search_counts_on() -> None:
    edge, part = cut(), cut(p.Cut(p.FIRST, 0.7, p.STEPS))
    i_sat = led_current_for(TRANSFER, SHEET.ctr, 1.0, LOAD.j_s)
    more = np.linspace(1.01, 12.0, 60)[:, None] * i_sat
    assert np.all(np.diff(p.edge_on(edge, more, i_sat), axis=0) < 0)
    assert np.all(np.diff(p.crossing_on(part, more), axis=0) < 0)
    assert np.all(np.diff(p.charging(BASE, LOAD, more, 0.3 * i_sat), axis=0) < 0)
    assert np.all(np.diff(p.held(1e-5, more + 0.3 * i_sat, 0.3 * i_sat, i_sat, 1.0), axis=0) > 0)
    taken = np.linspace(0.0, 4.0, 60)[:, None] * i_sat
    assert np.all(np.diff(p.time_off(edge, taken), axis=0) < 0)
    assert np.all(np.diff(p.charging(BASE, LOAD, 5.0 * i_sat, taken), axis=0) > 0)
    assert np.all(np.diff(p.held(1e-5, 6.0 * i_sat, taken, i_sat, 1.0), axis=0) < 0)


def test_an_output_that_cannot_saturate() -> None:
    edge = cut()
    i_sat = led_current_for(TRANSFER, SHEET.ctr, 1.0, LOAD.j_s)
    np.testing.assert_array_equal(p.edge_on(edge, 0.5 * i_sat, i_sat), p.edge_on(edge, i_sat, i_sat))
    assert np.all(np.isinf(p.edge_on(edge, 0.0 * i_sat, i_sat)))
    assert np.all(np.isinf(p.crossing_on(cut(p.Cut(p.FIRST, 0.7, p.STEPS)), 0.5 * i_sat)))
    assert np.all(np.isinf(p.charging(BASE, LOAD, i_sat, i_sat)))
    beyond = p.Load(0.5, 5.2, 5.0, 10.0, 50e-12, 25.0)
    for time in (p.time_on(cut(load=beyond), 1.0), p.time_off(cut(load=beyond), 0.0)):
        assert np.isinf(time)
    assert np.isinf(p.drive_for_crossing_on(cut(load=beyond), 1e-3))
    assert np.isinf(p.extraction_for(cut(load=beyond), 1e-3))


def test_charging_without_base_resistor_is_charge_over_photocurrent() -> None:
    found = p.charging(BASE, LOAD, I_REF, 0.0)
    np.testing.assert_allclose(found, p.base_charge(BASE, LOAD, p.FIRST) / (BASE.eta * I_REF), rtol=1e-8)
    slower = p.charging(BASE, LOAD, I_REF, I_REF / 2)
    np.testing.assert_allclose(slower / found, 2 * math.log(2), rtol=1e-8)


def test_the_load_capacitance_alone_bounds_turning_off() -> None:
    edge = cut()
    np.testing.assert_allclose(p.time_off(edge, 1e6), LOAD.r_load * LOAD.c_load * math.log(9), rtol=1e-9)


def test_the_load_capacitance_delays_the_first_move() -> None:
    part = cut(p.Cut(p.FIRST, 0.7, p.STEPS))
    n = 3.0 * led_current_for(TRANSFER, SHEET.ctr, 1.0, LOAD.j_s)
    time, without = p.crossing_on(part, n), p.time_on(part, n)
    # transit times the current that charges c_load through 0.05 to 0.7 of 5 V in that time, out of the light left
    extra = BASE.transit * (50e-12 * 5.0 * 0.65 / time) / (BASE.eta * n)
    np.testing.assert_allclose(time - without, extra, rtol=1e-9)
