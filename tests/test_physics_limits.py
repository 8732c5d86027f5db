"""Leakage, heat and wear."""

from __future__ import annotations

import numpy as np
import pytest

from optopick.coupler import Ageing, Rating
from optopick.physics.ageing import acceleration_factor, light_left
from optopick.physics.heat import derated, output_dissipation, resistor_derated
from optopick.physics.leakage import dark_current, dark_current_held, raised

WEAR = Ageing(loss=0.1, time=1000.0, current=20e-3, temperature=100.0, n=2.0, e_a=0.43)


def test_dark_current_passes_both_points():
    found = dark_current(50e-9, 25.0, 20e-6, 85.0, np.array([25.0, 85.0, 55.0]))
    assert found == pytest.approx([50e-9, 20e-6, np.sqrt(50e-9 * 20e-6)], rel=1e-12)
    assert dark_current(50e-9, 25.0, 100e-9, 35.0, 45.0) == pytest.approx(200e-9, rel=1e-12)


def test_a_base_resistor_holds_the_leakage_down_until_it_carries_too_much():
    """Of 0.2 uA into the base 0.1 Mohm leaves 0.02 V, 0.5 Mohm just the 0.1 V."""
    found = dark_current_held(20e-6, 0.2e-6, np.array([1e5, 4.99e5, 5.01e5, np.inf]))
    assert found == pytest.approx([0.2e-6, 0.2e-6, 20e-6, 20e-6], rel=1e-12)


def test_ratings_fall_above_their_knee_to_nothing():
    found = derated(Rating(0.1, 60.0, 2e-3), np.array([-40.0, 60.0, 85.0, 110.0, 150.0]))
    assert found == pytest.approx([0.1, 0.1, 0.05, 0.0, 0.0], abs=1e-15)


def test_resistors_take_less_above_70_degrees():
    found = resistor_derated(0.25, np.array([-40.0, 70.0, 112.5, 155.0, 200.0]))
    assert found == pytest.approx([0.25, 0.25, 0.125, 0.0, 0.0])


def test_output_dissipation_is_the_most_on_the_load_line():
    v_ce = np.linspace(0, 5, 501)
    anywhere = v_ce * (5 - v_ce) / 1e3
    assert output_dissipation(5.0, 1e3, 0.0) == pytest.approx(anywhere.max(), rel=1e-6)
    assert output_dissipation(5.0, 1e3, 2e-3) == pytest.approx(anywhere.max() + 10e-3, rel=1e-6)


def test_acceleration():
    assert acceleration_factor(20e-3, 20e-3, 100.0, 100.0, 2.0, 0.43) == pytest.approx(1.0)
    assert acceleration_factor(10e-3, 20e-3, 100.0, 100.0, 2.0, 0.43) == pytest.approx(0.25)
    # an activation energy of 0.43 eV from 60 to 100 degC: 0.43/8.617e-5 K * (1/333.15 K - 1/373.15 K)
    hotter = np.exp(0.43 / 8.617333e-5 * (1 / 333.15 - 1 / 373.15))
    assert acceleration_factor(20e-3, 20e-3, 100.0, 60.0, 2.0, 0.43) == pytest.approx(hotter, rel=1e-6)
    assert hotter > 4


def test_light_left_repeats_the_loss():
    assert light_left(WEAR, 20e-3, 100.0, 0.0, 0.5) == 1.0
    assert light_left(WEAR, 20e-3, 100.0, 1000.0, 1.0) == pytest.approx(0.9)
    assert light_left(WEAR, 20e-3, 100.0, 4000.0, 0.5) == pytest.approx(0.81)
    assert light_left(WEAR, 10e-3, 100.0, 4000.0, 1.0) == pytest.approx(0.9)
    assert light_left(WEAR, 20e-3, 50.0, 1000.0, 1.0) > 0.98


def test_everything_broadcasts():
    t, i = np.linspace(-40, 100, 5).reshape(5, 1), np.array([1e-3, 1e-2, 5e-2])
    assert light_left(WEAR, i, t, 1e5, 0.5).shape == (5, 3)
    assert dark_current_held(dark_current(50e-9, 25, 1e-5, 100, t), 1e-7, i * 1e8).shape == (5, 3)
    assert output_dissipation(t + 50.0, i * 1e6, 1e-3).shape == (5, 3)
    assert resistor_derated(i, t).shape == (5, 3)
    assert derated(Rating(0.1, 60.0, 2e-3), t).shape == (5, 1)


def test_the_dark_current_grows_with_the_supply():
    """By an Early voltage of 50 V from the sheet's 5 V up; never below the sheet's figure."""
    assert raised(np.array([3.3, 5.0, 15.0, 24.0])) == pytest.approx([1.0, 1.0, 1.2, 1.38])
