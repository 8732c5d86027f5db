"""From light to collector current and back."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optopick.coupler import Transfer
from optopick.physics.transfer import (
    base_led_current,
    collector_current,
    led_current_for,
    light_factor,
    relative_ctr,
    temperature_factor,
)

UNHURRIED = settings(deadline=None, max_examples=60)

CURVE = Transfer(
    ctr_min=0.5,
    ctr_max=2.0,
    i_ref=5e-3,
    curve_i=(0.2e-3, 1e-3, 5e-3, 10e-3, 40e-3),
    curve_g=(0.4, 0.8, 1.0, 1.02, 0.8),
    curve_t=(-40.0, 25.0, 100.0),
    curve_h=(0.9, 1.0, 0.6),
    light_tc=-0.005,
)


def test_the_curve_passes_its_points():
    assert relative_ctr(CURVE, np.array(CURVE.curve_i)) == pytest.approx(CURVE.curve_g, rel=1e-12)


def test_between_points_the_curve_is_a_power_law():
    middle = np.sqrt(0.2e-3 * 1e-3)
    assert relative_ctr(CURVE, middle) == pytest.approx(np.sqrt(0.4 * 0.8), rel=1e-12)
    third = 10e-3 * 4 ** (1 / 3)
    assert relative_ctr(CURVE, third) == pytest.approx(1.02 * (0.8 / 1.02) ** (1 / 3), rel=1e-12)


def test_below_the_first_point_the_slope_goes_on():
    slope = np.log(0.8 / 0.4) / np.log(5.0)
    assert relative_ctr(CURVE, 0.02e-3) == pytest.approx(0.4 * 0.1**slope, rel=1e-12)
    assert relative_ctr(CURVE, 0.02e-3) < 0.4


def test_above_the_last_point_there_is_no_answer():
    assert np.isnan(relative_ctr(CURVE, 41e-3))
    assert np.isnan(collector_current(CURVE, 1.0, 1.0, 41e-3))
    assert relative_ctr(CURVE, 40e-3) == pytest.approx(0.8)


def test_collector_current():
    assert collector_current(CURVE, 0.5, 0.6, 5e-3) == pytest.approx(0.5 * 0.6 * 5e-3, rel=1e-12)
    assert collector_current(CURVE, 0.5, 1.0, 10e-3) == pytest.approx(0.5 * 1.02 * 10e-3, rel=1e-12)
    assert list(collector_current(CURVE, 1.0, 1.0, np.array([-1e-3, 0.0]))) == [0.0, 0.0]


@UNHURRIED
@given(i=st.floats(1e-6, 39e-3), ctr=st.floats(0.05, 10), h=st.floats(0.3, 1.5))
def test_led_current_undoes_collector_current(i, ctr, h):
    assert led_current_for(CURVE, ctr, h, collector_current(CURVE, ctr, h, i)) == pytest.approx(i, rel=1e-9)


def test_what_the_curve_does_not_reach_needs_endless_light():
    top = float(collector_current(CURVE, 1.0, 1.0, 40e-3))
    assert led_current_for(CURVE, 1.0, 1.0, top * (1 - 1e-9)) == pytest.approx(40e-3, rel=1e-8)
    assert led_current_for(CURVE, 1.0, 1.0, 1.01 * top) == np.inf


def test_temperature():
    assert temperature_factor(CURVE, np.array([-40.0, 25.0, 100.0])) == pytest.approx([0.9, 1.0, 0.6])
    assert temperature_factor(CURVE, 62.5) == pytest.approx(0.8)
    assert temperature_factor(CURVE, -7.5) == pytest.approx(0.95)
    assert light_factor(CURVE, np.array([25.0, 85.0, -35.0])) == pytest.approx([1.0, 0.7, 1.3])
    assert light_factor(CURVE, 1e3) == 0.1


def test_what_the_base_resistor_takes():
    """0.65 V across 130 kohm are 5 uA of base current; at 0.5 % of the LED current that is 1 mA of it."""
    assert base_led_current(0.65, 130e3, 5e-3) == pytest.approx(1e-3, rel=1e-12)
    assert base_led_current(0.65, np.inf, 5e-3) == 0.0


def test_everything_broadcasts():
    ctr, i = np.array([0.5, 2.0]).reshape(2, 1), np.geomspace(1e-5, 1e-2, 7)
    j = collector_current(CURVE, ctr, 0.9, i)
    assert j.shape == (2, 7)
    assert led_current_for(CURVE, ctr, 0.9, j).shape == (2, 7)
    assert base_led_current(0.65, i.reshape(7, 1) * 1e8, ctr.reshape(2)).shape == (7, 2)
