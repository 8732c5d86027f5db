"""The output on: load line, Ebers and Moll's saturation, and the two resistors that just saturate."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq

from optopick.physics.led import thermal_voltage
from optopick.physics.saturation import (
    junction_part,
    load_current,
    overdrive_to_hold,
    rise_with_current,
    saturation_shape,
    smallest_base_resistor,
    smallest_load,
    v_ce_on,
    v_ce_on_load_line,
)

UNHURRIED = settings(deadline=None, max_examples=60)


def transistor_v_ce(i_b: float, i_c: float, beta_f: float, beta_r: float, i_s: float = 1e-14) -> float:
    """V_CE of the Ebers-Moll model with both junctions, solved numerically for V_BE and V_BC."""
    v_t = float(thermal_voltage(25.0))

    def forward(v_bc: float) -> float:
        # what the base current leaves for the forward diode
        return (i_b - i_s / beta_r * (np.exp(v_bc / v_t) - 1)) * beta_f

    def collector(v_bc: float) -> float:
        reverse = i_s * (np.exp(v_bc / v_t) - 1)
        return forward(v_bc) - reverse - reverse / beta_r - i_c

    v_bc = brentq(collector, -0.2, v_t * np.log(1 + i_b * beta_r / i_s), xtol=1e-15)
    return v_t * np.log(1 + forward(v_bc) / i_s) - v_bc


@pytest.mark.parametrize("overdrive", [1.05, 1.2, 1.5, 2.0, 4.0])
def test_the_rise_is_that_of_a_transistor_solved_numerically(overdrive):
    """Two operating points of one transistor at the same current; the sheet's point overdriven by 6."""
    beta_f, beta_r, i_c = 400.0, 5.0, 1e-3
    at = transistor_v_ce(overdrive * i_c / beta_f, i_c, beta_f, beta_r)
    sheet = transistor_v_ce(6.0 * i_c / beta_f, i_c, beta_f, beta_r)
    found = v_ce_on(0.2, 6.0, overdrive, beta_f, beta_r, 25.0) - 0.2
    assert found == pytest.approx(at - sheet, rel=1e-5)


def test_shape():
    """x = I_C/I_B = 200 of a gain of 400: (1.2 + 200/5)/(1 - 0.5)."""
    assert saturation_shape(2.0, 400.0, 5.0) == pytest.approx((1.2 + 40.0) / 0.5, rel=1e-12)


def test_from_the_sheets_overdrive_up_the_sheets_figure_stands():
    assert list(v_ce_on(0.3, 4.0, np.array([4.0, 5.0, 1e6]), 300.0, 5.0, 25.0)) == [0.3, 0.3, 0.3]


def test_towards_an_overdrive_of_one_the_voltage_grows_without_end_and_never_without_value():
    v = v_ce_on(0.3, 4.0, np.array([1.0 + 1e-3, 1.0 + 1e-6, 1.0 + 1e-12, 1.0, 0.5, 0.0, -1.0]), 300.0, 5.0, 25.0)
    assert not np.isnan(v).any()
    assert np.isfinite(v[:3]).all()
    assert np.all(np.diff(v[:3]) > 0.1)
    assert np.isinf(v[3:]).all()


@UNHURRIED
@given(
    overdrive=st.floats(1.001, 3.9),
    h_fe=st.floats(30, 3000),
    t=st.floats(-40, 110),
    sheet=st.floats(4.0, 50.0),
)
def test_overdrive_to_hold_undoes_v_ce_on(overdrive, h_fe, t, sheet):
    v = float(v_ce_on(0.25, sheet, overdrive, h_fe, 5.0, t))
    assert overdrive_to_hold(v, 0.25, sheet, h_fe, 5.0, t) == pytest.approx(overdrive, rel=1e-6)
    hotter_sheet = 0.25 + 0.1
    assert overdrive_to_hold(hotter_sheet, hotter_sheet, sheet, h_fe, 5.0, t) == pytest.approx(sheet, rel=1e-9)


def test_overdrive_to_hold_at_its_limits():
    found = overdrive_to_hold(np.array([0.1, 0.299, 0.3, 12.0, 1e6]), 0.3, 4.0, 300.0, 5.0, 25.0)
    assert np.isinf(found[:2]).all()
    assert found[2] == pytest.approx(4.0)
    assert found[3:] == pytest.approx([1.0, 1.0])
    assert not np.isnan(found).any()


def test_load_current():
    assert load_current(5.0, 0.3, 4.7e3) == pytest.approx(1e-3)
    assert load_current(5.0, 0.3, 4.7e3, 0.2e-3) == pytest.approx(1.2e-3)


def test_the_smallest_resistors_just_saturate():
    r = float(smallest_load(5.0, 0.4, 0.5, 5e-3, 0.1e-3))
    assert load_current(5.0, 0.4, r, 0.1e-3) == pytest.approx(0.5 * 5e-3, rel=1e-12)
    assert smallest_load(5.0, 0.4, 0.5, 1e-3, 0.6e-3) == np.inf
    r_be = float(smallest_base_resistor(0.65, 400.0, 3.3e3, 6e-6, 4.6))
    assert 400.0 * (6e-6 - 0.65 / r_be) == pytest.approx(4.6 / 3.3e3, rel=1e-12)
    assert smallest_base_resistor(0.65, 400.0, 3.3e3, 3e-6, 4.6) == np.inf


def test_the_sheets_voltage_grows_with_the_current_above_the_sheets():
    currents = np.array([0.1e-3, 1e-3, 2e-3])
    assert rise_with_current(0.2, currents, 1e-3) == pytest.approx([0.2, 0.2, 0.4])
    assert rise_with_current(0.2, currents, 1e-3, 0.08) == pytest.approx([0.2, 0.2, 0.32])
    assert rise_with_current(0.2, currents, 1e-3, 0.3) == pytest.approx([0.2, 0.2, 0.2])


def test_the_junctions_share_of_the_sheets_voltage():
    """The logarithm of the Ebers-Moll shape; in a darlington the first transistor's base too."""
    v_t = float(thermal_voltage(25.0))
    assert junction_part(2.0, 400.0, 5.0, 0.0) == pytest.approx(v_t * np.log(41.2 / 0.5), rel=1e-12)
    assert junction_part(2.0, 400.0, 5.0, 0.65) == pytest.approx(0.65 + v_t * np.log(82.4), rel=1e-12)
    assert junction_part(0.9, 400.0, 5.0, 0.65) == 0.65


def test_everything_broadcasts():
    k, h_fe, t = np.linspace(1.1, 5, 4).reshape(4, 1, 1), np.array([100.0, 900.0]).reshape(1, 2, 1), np.arange(3) * 30.0
    v = v_ce_on(0.3, 4.0, k, h_fe, 5.0, t)
    assert v.shape == (4, 2, 3)
    assert overdrive_to_hold(v + 0.01, 0.3, 4.0, h_fe, 5.0, t).shape == (4, 2, 3)
    assert v[1, 1, 2] == v_ce_on(0.3, 4.0, float(k[1, 0, 0]), 900.0, 5.0, 60.0)


@pytest.mark.parametrize("seed", range(4))
def test_on_the_load_line(seed):
    """Against bisection, drives from hardly enough to plenty, and too little ones, which stay at the supply's end."""
    rng = np.random.default_rng(seed)
    n = 400
    v_cc, r_load = rng.uniform(3.0, 24.0, n), 10 ** rng.uniform(2.5, 5.0, n)
    drive, h_fe, t = (
        (v_cc / r_load) * 10 ** rng.uniform(-0.7, 2.0, n),
        rng.uniform(60, 900, n),
        rng.uniform(-40, 100, n),
    )
    v_sat, i_input = rng.uniform(0.1, 0.4, n), float(rng.choice([0.0, 20e-6]))
    found = v_ce_on_load_line(v_sat, 6.0, drive, h_fe, 4.0, t, v_cc, r_load, i_input)

    low, high = np.zeros(n), v_cc.copy()
    for _ in range(60):
        v = (low + high) / 2
        above = v_ce_on(v_sat, 6.0, drive / load_current(v_cc, v, r_load, i_input), h_fe, 4.0, t) > v
        low, high = np.where(above, v, low), np.where(above, high, v)
    assert found == pytest.approx((low + high) / 2, abs=1e-9)
    assert np.ptp(found) > 1.0
