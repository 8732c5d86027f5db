"""Charge control: times against the exponentials that they are times of, inverses, limits."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from optopick.physics import switching

TAU = 10e-6
shares = st.floats(0.01, 0.99)
currents = st.floats(1e-5, 1e-1)


def reaches(start: float, end: float, level: float, tau: float = TAU) -> float:
    """When an exponential from `start` to `end` passes `level`, found numerically."""
    return brentq(lambda t: end + (start - end) * np.exp(-t / tau) - level, 0.0, 60 * tau, xtol=1e-18, rtol=1e-14)


@given(n=st.floats(1.01, 50), s=currents)
def test_on_edge(n, s):
    """From rest towards n loads; the load stops it at one."""
    by_hand = reaches(0, n, 0.9) - reaches(0, n, 0.1)
    assert switching.edge_on(TAU, n * s + 3e-4, 3e-4, s) == pytest.approx(by_hand, rel=1e-6)


@given(b=st.floats(0, 20), s=currents)
def test_off_edge(b, s):
    """From the load's current towards what the base resistor draws the other way."""
    by_hand = reaches(1, -b - 1e-12, 0.1) - reaches(1, -b - 1e-12, 0.9)
    assert switching.edge_off(TAU, b * s, s) == pytest.approx(by_hand, rel=1e-6)


@given(n=st.floats(1.01, 50), share=shares, s=currents)
def test_crossings(n, share, s):
    on, off = reaches(0, n, share), reaches(1, -n, 1 - share)
    assert switching.crossing_on(TAU, share, n * s + 3e-4, 3e-4, s) == pytest.approx(on, rel=1e-6)
    assert switching.crossing_off(TAU, share, n * s, s) == pytest.approx(off, rel=1e-6)


@given(b=st.floats(0, 5), over=st.floats(1.05, 30), s=currents)
def test_storage(b, over, s):
    """The base charge falls from what light less extraction holds, towards minus the extraction, to the load's."""
    light = over * (1 + b)
    by_hand = reaches(light - b, -b - 1e-15, 1.0)
    assert switching.storage(TAU, light * s, b * s, s) == pytest.approx(by_hand, rel=1e-6)


@pytest.mark.parametrize("share", [0.0, 0.3, 0.7, 0.98])
def test_base_charging(share):
    """The photocurrent into a capacitance and the base resistor beside it, integrated."""
    c_be, v_be, eta, i_eff = 10e-12, 0.65, 2e-3, 1e-3
    photo = eta * i_eff

    def slope(_: float, v: np.ndarray) -> np.ndarray:
        return (photo - share * photo * v / v_be) / c_be

    def there(_: float, v: np.ndarray) -> float:
        return v[0] - v_be

    there.terminal = True
    run = solve_ivp(slope, (0, 1e-3), [0.0], events=there, rtol=1e-10, atol=1e-12)
    found = switching.base_charging(c_be, v_be, eta, i_eff, share * i_eff)
    assert found == pytest.approx(run.t_events[0][0], rel=1e-6)


def test_base_charging_where_the_resistor_takes_all():
    assert switching.base_charging(10e-12, 0.65, 2e-3, 1e-3, 1e-3) == np.inf
    assert switching.base_charging(10e-12, 0.65, 2e-3, 1e-3, 2e-3) == np.inf


def test_time_constant():
    found = switching.time_constant(2e-6, 4e-9, 1.5, 1e3, 50e-12)
    assert found == pytest.approx(1.5 * (2e-6 + 1e3 * 4e-9) + 1e3 * 50e-12, rel=1e-12)


def test_without_base_resistor_the_off_edge_is_ln_9_time_constants():
    assert switching.edge_off(TAU, 0.0, 1e-3) == pytest.approx(np.log(9) * TAU, rel=1e-12)
    assert pytest.approx(2.197, abs=5e-4) == switching.LN9


def test_the_on_edge_where_the_output_does_not_saturate():
    edge = switching.edge_on(TAU, np.array([1.0 + 1e-9, 1.0, 0.5, 1e-9, 0.0, -1.0]), 0.0, 1.0)
    assert edge[:4] == pytest.approx(np.log(9) * TAU, rel=1e-6)
    assert np.isinf(edge[4:]).all()
    assert switching.edge_on(TAU, 1e9, 0.0, 1.0) == pytest.approx(0.0, abs=1e-8 * TAU)


def test_thresholds_that_are_never_or_at_once_passed():
    crossing = switching.crossing_on(TAU, np.array([0.0, 0.5, 0.9]), 0.7, 0.0, 1.0)
    assert crossing[0] == 0.0
    assert np.isfinite(crossing[1])
    assert np.isinf(crossing[2])
    assert switching.crossing_off(TAU, 0.0, 0.0, 1.0) == 0.0


def test_no_storage_where_the_output_is_hardly_held():
    assert switching.storage(TAU, 1.0, 0.5, 0.6) == 0.0


def test_limits_are_never_without_a_value():
    light = np.array([0.0, 1e-12, 1e-3, 1.0, 1e6])[1:, None]
    base = np.array([0.0, 1e-12, 1e-3, 1e6])
    for tau in (1e-9, TAU, np.inf):
        for time in (
            switching.edge_on(tau, light, base, 1e-3),
            switching.edge_off(tau, base, 1e-3),
            switching.storage(TAU, light, base, 1e-3),
            switching.crossing_on(tau, 0.7, light, base, 1e-3),
            switching.base_charging(1e-11, 0.65, 1e-3, light, base),
        ):
            assert not np.isnan(time).any()
            assert (time >= 0).all()


@given(time=st.floats(0.01, 2.19), s=currents)
def test_drive_for_edge_on_undoes_it(time, s):
    drive = float(switching.drive_for_edge_on(time * TAU, TAU, s))
    assert drive > s
    assert switching.edge_on(TAU, drive + 2e-4, 2e-4, s) == pytest.approx(time * TAU, rel=1e-6)


def test_an_edge_of_ln_9_time_constants_asks_for_no_drive():
    assert switching.drive_for_edge_on(2.2 * TAU, TAU, 1e-3) == 0.0


@given(time=st.floats(0.01, 2.19), s=currents)
def test_extraction_for_edge_off_undoes_it(time, s):
    base = float(switching.extraction_for_edge_off(time * TAU, TAU, s))
    assert base > 0
    assert switching.edge_off(TAU, base, s) == pytest.approx(time * TAU, rel=1e-6)
    assert switching.extraction_for_edge_off(2.2 * TAU, TAU, s) < 0


@given(time=st.floats(0.01, 5), share=shares, s=currents)
def test_drive_for_crossing_on_undoes_it(time, share, s):
    drive = float(switching.drive_for_crossing_on(time * TAU, TAU, share, s))
    assert switching.crossing_on(TAU, share, drive + 2e-4, 2e-4, s) == pytest.approx(time * TAU, rel=1e-6)


@given(share=shares, base=st.floats(1e-3, 100), s=currents)
def test_extraction_for_crossing_off_undoes_it(share, base, s):
    time = float(switching.crossing_off(TAU, share, base * s, s))
    assert switching.extraction_for_crossing_off(time, TAU, share, s) == pytest.approx(base * s, rel=1e-5)


def test_no_time_asks_for_more_than_any_drive():
    times = np.array([-1e-6, 0.0])
    assert np.isinf(switching.drive_for_crossing_on(times, TAU, 0.5, 1e-3)).all()
    assert np.isinf(switching.extraction_for_crossing_off(times, TAU, 0.5, 1e-3)).all()


def test_an_endless_time_constant_asks_for_a_drive_beyond_any():
    assert switching.drive_for_edge_on(1e-6, np.inf, 1e-3) > 1e6
    assert switching.extraction_for_edge_off(1e-6, np.inf, 1e-3) > 1e6
    assert switching.drive_for_crossing_on(1e-6, np.inf, 0.5, 1e-3) > 1e6


def test_everything_broadcasts():
    tau, light = np.array([1e-6, 2e-6]).reshape(2, 1, 1), np.array([2e-3, 5e-3, 9e-3]).reshape(3, 1)
    base = np.array([0.0, 1e-4, 2e-4, 3e-4])
    assert switching.edge_on(tau, light, base, 1e-3).shape == (2, 3, 4)
    assert switching.storage(tau, light, base, 1e-3).shape == (2, 3, 4)
    assert switching.crossing_on(tau, 0.5, light, base, 1e-3).shape == (2, 3, 4)
    assert switching.base_charging(1e-11, 0.65, 1e-3, light, base).shape == (3, 4)
    assert switching.drive_for_edge_on(1e-6, tau, base + 1e-4).shape == (2, 1, 4)
