"""The LED behind its resistors: the diode law and Kirchhoff's laws hold at the currents found."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from optopick.coupler import Led, Rating
from optopick.physics.led import branch_current, forward_voltage, led_current, led_current_of_leak, thermal_voltage

UNHURRIED = settings(deadline=None, max_examples=60)

LED = Led(1.1, 1.2, 1.4, 10e-3, 2.0, 3.0, -1.5e-3, Rating(60e-3, 60, 1e-3), Rating(0.1, 60, 1.5e-3), 5.0)

temperatures = st.floats(-40, 110)
currents = st.floats(1e-6, 0.06)
shunts = st.one_of(st.just(np.inf), st.floats(100, 1e5))


def test_thermal_voltage():
    """Source: k = 1.380649e-23 J/K and q = 1.602176634e-19 C, exact in the SI of 2019; 25 degC is 298.15 K."""
    assert thermal_voltage(25.0) == pytest.approx(298.15 * 1.380649e-23 / 1.602176634e-19, rel=1e-12)
    assert thermal_voltage(25.0) == pytest.approx(25.7e-3, rel=1e-3)


def test_forward_voltage_at_and_about_the_reference():
    v_t = float(thermal_voltage(25.0))
    assert forward_voltage(LED, 1.2, 10e-3, 25.0) == pytest.approx(1.2, rel=1e-15)
    assert forward_voltage(LED, 1.2, 10e-3, 75.0) == pytest.approx(1.2 - 0.075, rel=1e-12)
    decade = forward_voltage(LED, 1.2, 1e-3, 25.0)
    assert decade == pytest.approx(1.2 - 2 * v_t * np.log(10) - 3.0 * 9e-3, rel=1e-12)
    assert forward_voltage(LED, 1.2, 20e-3, 25.0) == pytest.approx(1.2 + 2 * v_t * np.log(2) + 0.03, rel=1e-12)


@UNHURRIED
@given(v=st.floats(1.8, 60), v_f=st.floats(1.0, 1.6), r=st.floats(20, 1e5), t=temperatures, shunt=shunts)
def test_currents_and_voltages_add_up(v, v_f, r, t, shunt):
    i = led_current(LED, v_f, v, r, t, shunt)
    across = forward_voltage(LED, v_f, i, t)
    assert r * branch_current(i, across, shunt) + across == pytest.approx(v, rel=1e-9)


@UNHURRIED
@given(i=currents, v_f=st.floats(1.0, 1.6), r=st.floats(1, 1e5), t=temperatures, shunt=shunts)
def test_led_current_undoes_forward_voltage(i, v_f, r, t, shunt):
    across = forward_voltage(LED, v_f, i, t)
    v = r * branch_current(i, across, shunt) + across
    assert led_current(LED, v_f, v, r, t, shunt) == pytest.approx(i, rel=1e-7)


@UNHURRIED
@given(leak=st.floats(1e-9, 5e-3), v_f=st.floats(1.0, 1.6), t=temperatures, shunt=st.floats(100, 1e5))
def test_the_shunt_takes_its_part_of_a_leak(leak, v_f, t, shunt):
    i = float(led_current_of_leak(LED, v_f, leak, t, shunt))
    assert 0 < i <= leak
    across = max(float(forward_voltage(LED, v_f, i, t)), 0.0)
    assert i + across / shunt == pytest.approx(leak, rel=1e-6)


def test_a_leak_without_a_shunt_goes_through_the_led():
    assert led_current_of_leak(LED, 1.2, 50e-6, 25.0) == pytest.approx(50e-6, rel=1e-6)
    assert led_current_of_leak(LED, 1.2, 0.0, 25.0) == 0.0


@pytest.mark.parametrize("v", [-1.0, 0.0, 0.4])
def test_below_the_knee_next_to_nothing_flows(v):
    i = float(led_current(LED, 1.2, v, 470.0, 25.0))
    assert 0 <= i < 1e-8


def test_a_shunt_holds_the_led_dark():
    """5 V behind 2.2 kohm light an LED; 330 ohm across it leave it 0.65 V and dark."""
    assert led_current(LED, 1.2, 5.0, 2200.0, 25.0) > 1.6e-3
    assert led_current(LED, 1.2, 5.0, 2200.0, 25.0, 330.0) < 1e-6


def test_everything_broadcasts():
    v = np.linspace(3, 5, 3).reshape(3, 1, 1)
    r, t = np.geomspace(100, 1e3, 4).reshape(1, 4, 1), np.linspace(-40, 85, 5)
    i = led_current(LED, 1.2, v, r, t, 10e3)
    assert i.shape == (3, 4, 5)
    assert i[2, 1, 3] == led_current(LED, 1.2, float(v[2, 0, 0]), float(r[0, 1, 0]), float(t[3]), 10e3)
    assert forward_voltage(LED, v / 3, i, t).shape == (3, 4, 5)
    assert led_current_of_leak(LED, v / 3, 1e-3, t, r).shape == (3, 4, 5)
