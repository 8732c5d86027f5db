"""Charge control in steps: the textbook's formulas as a special case, its integral in the limit, inverses, ends."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad, solve_ivp
from scipy.optimize import brentq

from optopick.coupler import Transfer
from optopick.physics import charge, switching
from optopick.physics.charge import Base, Load
from optopick.physics.led import thermal_voltage
from optopick.physics.switching import Cut, Steps, Swing
from optopick.physics.transfer import led_current_for

UNHURRIED = settings(deadline=None, max_examples=60)

FLAT = Transfer(1.0, 1.0, 5e-3, (1e-4, 60e-3), (1.0, 1.0), (-40.0, 110.0), (1.0, 1.0), 0.0)
CURVED = replace(FLAT, curve_i=(0.2e-3, 1e-3, 5e-3, 40e-3), curve_g=(0.4, 0.8, 1.0, 0.9))
BASE = Base(transit=20e-9, c_cb=10e-12, c_be=15e-12, v_be=0.65, eta=2.5e-3)
LOAD = Load(j_s=2e-3, v_cc=5.0, swing=4.8, r_load=2.4e3, c_load=20e-12, t=25.0)
IDEAL = replace(BASE, c_cb=0.0, c_be=0.0), replace(LOAD, c_load=0.0)
"""Only transit time: then the charge is proportional to the current and every step has the same time constant."""

TAU = 20e-9 / 2.5e-3
"""Of IDEAL at a CTR of 1 [s]: transit time times gain."""

light = st.floats(1.05, 40)
pulls = st.floats(0.0, 10.0)


def ideal(cut: Cut) -> Steps:
    return switching.steps(*IDEAL, FLAT, 1.0, cut)


def whole(transfer: Transfer = CURVED, load: Load = LOAD) -> Swing:
    return switching.swing(BASE, load, transfer, 1.0, 0.7, 0.7)


def wide(load: Load, axes: int) -> Load:
    """The same load with so many axes, for drives in an array."""
    return replace(load, j_s=np.full((1,) * axes, load.j_s))


# --- the textbook ----------------------------------------------------------------------------------------------------


def reaches(start: float, end: float, level: float) -> float:
    """When an exponential from `start` to `end` with time constant TAU passes `level`, found numerically."""
    return brentq(lambda t: end + (start - end) * np.exp(-t / TAU) - level, 0.0, 60 * TAU, xtol=1e-18, rtol=1e-14)


@UNHURRIED
@given(n=light)
def test_on_edge_of_a_constant_gain(n):
    """From rest towards n loads; the load stops it at one."""
    by_hand = reaches(0, n, 0.9) - reaches(0, n, 0.1)
    assert switching.edge_on(ideal(switching.EDGE), n * 2e-3, 2e-3) == pytest.approx(by_hand, rel=1e-6)


@UNHURRIED
@given(b=pulls)
def test_off_edge_of_a_constant_gain(b):
    """From the load's current towards what the base resistor draws, at its voltage there."""
    steps = ideal(switching.EDGE)
    steps = replace(steps, hold=np.ones_like(steps.hold))
    by_hand = reaches(1, -b - 1e-12, 0.1) - reaches(1, -b - 1e-12, 0.9)
    assert switching.time_off(steps, b * 2e-3) == pytest.approx(by_hand, rel=1e-6)


def test_without_base_resistor_the_off_edge_is_ln_9_time_constants():
    assert switching.time_off(ideal(switching.EDGE), 0.0) == pytest.approx(np.log(9) * TAU, rel=1e-9)
    assert pytest.approx(2.197, abs=5e-4) == switching.LN9


@UNHURRIED
@given(b=st.floats(0, 5), over=st.floats(1.05, 30))
def test_storage(b, over):
    """The charge beyond the load's falls from light less extraction towards minus the extraction."""
    lit = over * (1 + b)
    by_hand = reaches(lit - b, -b - 1e-15, 1.0)
    assert switching.storage(TAU, lit * 1e-3, b * 1e-3, 1e-3) == pytest.approx(by_hand, rel=1e-6)
    assert switching.storage(TAU, lit * 1e-3, b * 0.5e-3, 1e-3, 2.0) == pytest.approx(by_hand, rel=1e-6)


@pytest.mark.parametrize("share", [0.0, 0.3, 0.7, 0.98])
def test_charging(share):
    """The photocurrent into a capacitance and the base resistor beside it, integrated."""
    c, v_be, photo = 10e-12, 0.65, 2e-6

    def slope(_: float, v: np.ndarray) -> np.ndarray:
        return (photo - share * photo * v / v_be) / c

    def there(_: float, v: np.ndarray) -> float:
        return v[0] - v_be

    there.terminal = True
    run = solve_ivp(slope, (0, 1e-3), [0.0], events=there, rtol=1e-10, atol=1e-12)
    found = switching.charging(c * v_be, 2e-3, 1e-3, share * 1e-3)
    assert found == pytest.approx(run.t_events[0][0], rel=1e-6)


# --- steps -----------------------------------------------------------------------------------------------------------


def integral(n: float | None, b: float, first: float, last: float) -> float:
    """Time from the charge alone, without steps: dq over base current; the node's part as in a step of no width."""
    rc = LOAD.r_load * LOAD.c_load

    def current(x: float) -> float:
        return float(led_current_for(CURVED, 1.0, 1.0, x * LOAD.j_s))

    def rate(x: float) -> float:
        d = 1e-5 * x
        dq = float(charge.base_charge(BASE, LOAD, x + d) - charge.base_charge(BASE, LOAD, x - d)) / (2 * d)
        di = (current(x + d) - current(x - d)) / (2 * d)
        hold = float(charge.base_voltage(BASE, x * LOAD.j_s, 25.0)) / BASE.v_be
        base_current = n - current(x) if n is not None else current(x) + hold * b
        return (dq / BASE.eta + rc * di) / base_current

    knees = [x for x in np.array(CURVED.curve_i) * np.array(CURVED.curve_g) / LOAD.j_s if first < x < last]
    return quad(rate, first, last, points=knees or None, limit=200)[0]


def test_many_steps_are_the_integral_of_charge_over_base_current():
    fine = switching.steps(BASE, LOAD, CURVED, 1.0, Cut(0.1, 0.9, 600))
    assert switching.time_on(fine, 5e-3) == pytest.approx(integral(5e-3, 0.0, 0.1, 0.9), rel=1e-3)
    assert switching.time_off(fine, 1e-3) == pytest.approx(integral(None, 1e-3, 0.1, 0.9), rel=1e-3)


def test_few_steps_are_near_many():
    few, many = (switching.steps(BASE, LOAD, CURVED, 1.0, Cut(0.1, 0.9, k)) for k in (switching.STEPS, 600))
    for n in (2.4e-3, 5e-3, 20e-3):
        assert switching.time_on(few, n) == pytest.approx(switching.time_on(many, n), rel=0.04)
    for b in (0.0, 1e-3, 5e-3):
        assert switching.time_off(few, b) == pytest.approx(switching.time_off(many, b), rel=0.04)


def test_levels_and_time_constants_by_hand():
    """One step from 10 to 90 % of 2 mA at a constant CTR of 1."""
    step = switching.steps(BASE, LOAD, FLAT, 1.0, Cut(0.1, 0.9, 1))
    assert step.i_low == pytest.approx(0.2e-3, rel=1e-12)
    assert step.i_high == pytest.approx(1.8e-3, rel=1e-12)
    q = charge.base_charge(BASE, LOAD, 0.9) - charge.base_charge(BASE, LOAD, 0.1)
    assert step.tau == pytest.approx(q / 2.5e-3 / 1.6e-3 + 2.4e3 * 20e-12, rel=1e-12)
    assert step.least == pytest.approx(2.4e3 * 20e-12 * np.log(9), rel=1e-12)
    v = 0.65 + float(thermal_voltage(25.0)) * np.log(0.6e-3 / 2e-3)
    assert step.hold == pytest.approx(v / 0.65, rel=1e-9)
    three = switching.steps(BASE, LOAD, FLAT, 1.0, Cut(0.1, 0.9, 3))
    assert three.i_high / three.i_low == pytest.approx(np.full(3, 9 ** (1 / 3)), rel=1e-9)


def test_the_node_is_never_outrun():
    s = whole().edge
    rc = LOAD.r_load * LOAD.c_load
    assert switching.time_off(s, 1e3) == pytest.approx(rc * np.log(9), rel=1e-12)
    assert switching.time_off(s, 0.0) > 2 * rc * np.log(9)


def test_the_load_capacitance_adds_to_the_charge_on_the_way_to_the_threshold():
    """t = t0 + lag/(n*t), the transit time's charge for the current into the capacitance."""
    s = whole()
    n, alone = 5e-3, float(switching.time_on(s.on, 5e-3))
    t = float(switching.crossing_on(s.on, n))
    assert t == pytest.approx(alone + float(s.on.lag) / (n * t), rel=1e-12)
    swing_there = 4.8 * (0.7 - charge.FIRST)
    assert s.on.lag == pytest.approx(20e-9 * 20e-12 * swing_there / 2.5e-3, rel=1e-12)


def test_delays_are_sums_of_their_parts():
    s = whole()
    on = switching.charging(s.charge, BASE.eta, 6e-3, 1e-3) + switching.crossing_on(s.on, 5e-3)
    assert switching.delay_on(s, BASE.eta, 6e-3, 1e-3) == pytest.approx(on, rel=1e-12)
    off = switching.storage(8e-6, 6e-3, 1e-3, s.i_sat, s.hold, 1e-5) + switching.time_off(s.off, 1e-3, 1e-5)
    assert switching.delay_off(s, 8e-6, 6e-3, 1e-3, 1e-5) == pytest.approx(off, rel=1e-12)
    assert s.charge == pytest.approx(charge.base_charge(BASE, LOAD, 0.05), rel=1e-12)
    assert s.hold == pytest.approx(charge.base_voltage(BASE, 2e-3, 25.0) / 0.65, rel=1e-12)
    assert s.i_sat == pytest.approx(led_current_for(CURVED, 1.0, 1.0, 2e-3), rel=1e-12)


def test_each_edge_is_late_at_the_threshold_that_delays_it_most():
    """Thresholds at 0.6 and 0.7 of the swing on and 0.3 and 0.4 off: both delays at one threshold, the worse of two."""
    s = switching.swing(BASE, LOAD, CURVED, 1.0, 0.7, 0.4)
    upper, lower = (switching.swing(BASE, LOAD, CURVED, 1.0, share, 1 - share) for share in (0.6, 0.7))
    at = (BASE.eta, 6e-3, 1e-3)
    for one, early in ((upper, False), (lower, True)):
        on, off = switching.delay_on(one, *at), switching.delay_off(one, 8e-6, *at[1:], 0.0)
        if early:
            assert switching.late_on(s, 8e-6, *at) == pytest.approx(float(on - off), rel=1e-9)
        else:
            assert switching.late_off(s, 8e-6, *at, 0.0) == pytest.approx(float(off - on), rel=1e-9)
    charged = switching.late_off(s, 8e-6, BASE.eta, 6e-3, 0.0, 1e-9) - switching.late_off(
        s, 8e-6, BASE.eta, 6e-3, 0.0, 0.0
    )
    assert charged == pytest.approx(float(switching.charging(s.charge, BASE.eta, 6e-3, 0.0)), rel=1e-3)


# --- what is left in the dark ----------------------------------------------------------------------------------------


@UNHURRIED
@given(rest=st.floats(0.0, 0.29))
def test_the_threshold_is_met_on_the_way_to_what_is_left(rest):
    """A constant gain falls from one towards `rest` and passes 0.3 on its way."""
    s = switching.steps(*IDEAL, FLAT, 1.0, Cut(0.3, 1.0, 3))
    assert switching.time_off(s, 0.0, rest * 2e-3) == pytest.approx(reaches(1.0, rest, 0.3), rel=1e-6)


def test_what_is_left_above_the_threshold_is_never_passed():
    s = switching.steps(*IDEAL, FLAT, 1.0, Cut(0.3, 1.0, 3))
    assert np.isinf(switching.time_off(s, 0.0, 0.31 * 2e-3))
    assert np.isfinite(switching.time_off(s, 0.1 * 2e-3, 0.31 * 2e-3))
    assert np.isinf(switching.storage(1e-5, 9e-3, 0.0, 2e-3, 1.0, 2.1e-3))
    assert switching.storage(1e-5, 9e-3, 0.0, 2e-3, 1.0, 1e-3) == pytest.approx(1e-5 * np.log(9.0), rel=1e-12)


@UNHURRIED
@given(rest=st.floats(0.0, 0.9))
def test_an_edge_of_a_constant_gain_takes_as_long_wherever_it_ends(rest):
    edge = switching.edge_off(ideal(switching.EDGE), switching.EDGE, 0.0, rest * 2e-3)
    assert edge == pytest.approx(TAU * np.log(9), rel=1e-6)


@UNHURRIED
@given(rest=st.floats(1e-3, 0.5), power=st.floats(0.6, 0.95))
def test_an_edge_of_a_gain_that_falls_with_the_current(rest, power):
    """i = x^power carries the share x; a charge linear in i runs towards i_rest; levels from there, by root finding."""
    tops = (0.1**power, 0.9**power)
    step = Steps(*(np.array([v]) for v in (TAU, *tops, 1.0, 0.0)), lag=np.asarray(0.0))
    kept = rest ** (1 / power)
    first, last = ((kept + x * (1 - kept)) ** power for x in (0.1, 0.9))
    slower = 0.8 * (1 - kept) / (last - first) / (0.8 / (tops[1] - tops[0]))
    wanted = TAU * slower * np.log((last - rest) / (first - rest))
    assert switching.edge_off(step, Cut(0.1, 0.9, 1), 0.0, rest) == pytest.approx(wanted, rel=1e-9)


@UNHURRIED
@given(rest=st.floats(0.0, 1.0), share=st.floats(0.3, 3.0), transfer=st.sampled_from([FLAT, CURVED]))
def test_extraction_against_what_is_left(rest, share, transfer):
    """The least base current that is fast enough, for delays as it is, for edges not above it and close."""
    s, i_rest = whole(transfer), rest * 1e-3
    time = share * float(switching.time_off(s.off, 0.5e-3))
    found = float(switching.extraction_for(s.off, time, i_rest))
    if np.isfinite(found):
        assert switching.time_off(s.off, found, i_rest) <= time * (1 + 1e-9)
        assert found == 0.0 or switching.time_off(s.off, found * (1 - 1e-6), i_rest) > time
    time = share * float(switching.edge_off(s.edge, switching.EDGE, 0.5e-3, 0.0))
    found = float(switching.extraction_for_edge(s.edge, switching.EDGE, time, i_rest))
    if np.isfinite(found):
        assert found == 0.0 or switching.edge_off(s.edge, switching.EDGE, found * (1 - 1e-9), i_rest) > time
        more = found + 0.1 * (found + i_rest)
        assert switching.edge_off(s.edge, switching.EDGE, more, i_rest) <= time * (1 + 1e-6)


# --- ends ------------------------------------------------------------------------------------------------------------


def test_the_on_edge_of_an_output_that_does_not_saturate_never_ends():
    s = whole(load=wide(LOAD, 1))
    edge = switching.edge_on(s.edge, s.i_sat * np.array([1.0, 0.999, 1e-9, 0.0, -1.0]), s.i_sat)
    assert np.isfinite(edge[0])
    assert np.isinf(edge[1:]).all()
    assert switching.edge_on(s.edge, 1e3, s.i_sat) < 1e-9


def test_a_threshold_that_the_drive_does_not_reach_is_never_crossed():
    s = whole()
    assert np.isinf(switching.crossing_on(s.on, 0.69 * float(s.on.i_high[-1])))
    assert np.isinf(switching.delay_on(s, BASE.eta, 1e-3, 1e-3))


def test_a_load_beyond_the_ctr_curve_is_never_switched():
    heavy = replace(LOAD, j_s=1.0)
    s = whole(load=heavy)
    assert np.isinf(switching.edge_on(s.edge, 50.0, s.i_sat))
    assert np.isinf(switching.time_off(s.edge, 1e-3))
    assert np.isinf(switching.drive_for_edge_on(s.edge, 1e-3, s.i_sat))
    assert np.isinf(switching.extraction_for(s.edge, 1e-3))


def test_no_storage_where_the_output_is_hardly_held():
    assert switching.storage(1e-5, 1.0, 0.5, 0.6) == 0.0


def test_limits_are_never_without_a_value():
    lit = np.array([1e-12, 1e-3, 1.0, 1e6])[:, None]
    base = np.array([0.0, 1e-12, 1e-3, 1e6])
    for load in (LOAD, replace(LOAD, c_load=0.0), replace(LOAD, j_s=1e-9), replace(LOAD, j_s=1.0)):
        s = whole(load=wide(load, 2))
        for time in (
            switching.edge_on(s.edge, lit - base, s.i_sat),
            switching.time_off(s.edge, base),
            switching.delay_on(s, BASE.eta, lit, base),
            switching.storage(1e-5, lit, base, s.i_sat),
        ):
            assert not np.isnan(time).any()
            assert (time >= 0).all()


# --- inverses --------------------------------------------------------------------------------------------------------


@UNHURRIED
@given(n=light, transfer=st.sampled_from([FLAT, CURVED]))
def test_drive_for_edge_on_undoes_it(n, transfer):
    s = whole(transfer)
    drive = n * float(s.i_sat)
    found = switching.drive_for_edge_on(s.edge, switching.edge_on(s.edge, drive, s.i_sat), s.i_sat)
    assert found == pytest.approx(drive, rel=1e-6)
    longer = 1.25 * switching.edge_on(s.edge, s.i_sat, s.i_sat)
    assert switching.drive_for_edge_on(s.edge, longer, s.i_sat) == s.i_sat


@UNHURRIED
@given(n=light, transfer=st.sampled_from([FLAT, CURVED]))
def test_drive_for_crossing_on_undoes_it(n, transfer):
    s = whole(transfer)
    drive = n * float(s.i_sat)
    time = float(switching.crossing_on(s.on, drive))
    found = float(switching.drive_for_crossing_on(s.on, time))
    # the inverse takes its share of the lag as if all of the time were there: it never asks for too little
    assert found == pytest.approx(drive, rel=1e-6)
    assert switching.crossing_on(s.on, found) <= time * (1 + 1e-9)


@UNHURRIED
@given(b=st.floats(1e-3, 3.0), transfer=st.sampled_from([FLAT, CURVED]))
def test_extraction_for_undoes_time_off(b, transfer):
    s = whole(transfer).off
    pull = b * 2e-3
    time = float(switching.time_off(s, pull))
    if time > 1.01 * float(np.sum(s.least)):
        found = float(switching.extraction_for(s, time))
        assert switching.time_off(s, found) == pytest.approx(time, rel=1e-6)
        assert found == pytest.approx(pull, rel=1e-3)


def test_what_no_extraction_and_no_drive_can_do():
    s = whole()
    assert switching.extraction_for(s.edge, 2 * switching.time_off(s.edge, 0.0)) == 0.0
    assert np.isinf(switching.extraction_for(s.edge, 0.9 * float(np.sum(s.edge.least))))
    assert np.isinf(switching.drive_for_crossing_on(whole(load=wide(LOAD, 1)).on, np.array([0.0, -1e-6]))).all()


# --- charge ----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("v", [-0.6, -0.35, -0.2, 0.5, 4.0, 24.0])
def test_junction_charge_is_the_integral_of_a_junction_capacitance(v):
    """C = c_0*(1 + v/V_J)^-M_J, held from half the built-in voltage forward."""

    def capacitance(u: float) -> float:
        return 10e-12 * (1 + max(u, -charge.V_J / 2) / charge.V_J) ** -charge.M_J

    assert charge.junction_charge(10e-12, v) == pytest.approx(quad(capacitance, 0, v, limit=200)[0], rel=1e-7)


def test_zero_bias_undoes_the_fall_of_the_capacitance():
    at_5 = (charge.junction_charge(10e-12, 5 + 1e-6) - charge.junction_charge(10e-12, 5 - 1e-6)) / 2e-6
    assert charge.zero_bias(at_5, 5.0) == pytest.approx(10e-12, rel=1e-6)


def test_base_voltage():
    assert charge.base_voltage(BASE, 2e-3, 25.0) == pytest.approx(0.65)
    decade = float(thermal_voltage(25.0)) * np.log(10)
    assert charge.base_voltage(BASE, 20e-3, 25.0) == pytest.approx(0.65 + decade)


def test_base_charge_has_three_parts():
    v_b = float(charge.base_voltage(BASE, 1e-3, 25.0))
    transit = 20e-9 * 1e-3
    emitter = 15e-12 * v_b
    collector = float(charge.junction_charge(10e-12, 5.0) - charge.junction_charge(10e-12, 5.0 - 2.4 - v_b))
    assert charge.base_charge(BASE, LOAD, 0.5) == pytest.approx(transit + emitter + collector, rel=1e-12)
    x = np.linspace(0.02, 1.0, 50)
    assert np.all(np.diff(charge.base_charge(BASE, LOAD, x)) > 0)


def test_everything_broadcasts():
    eta = np.array([1e-3, 2e-3]).reshape(2, 1, 1)
    r = np.array([1e3, 2e3, 4e3]).reshape(1, 3, 1)
    base, load = replace(BASE, eta=eta), replace(LOAD, r_load=r, j_s=4.8 / r)
    s = switching.swing(base, load, CURVED, np.ones((2, 1, 1)), 0.7, 0.7)
    lit, pull = np.array([2e-3, 5e-3, 7e-3, 9e-3]), np.array([0.0, 1e-4, 2e-4, 3e-4])
    assert switching.edge_on(s.edge, lit - pull, s.i_sat).shape == (2, 3, 4)
    assert switching.delay_on(s, eta, lit, pull).shape == (2, 3, 4)
    assert switching.delay_off(s, 1e-5, lit, pull, 1e-5).shape == (2, 3, 4)
    assert switching.edge_off(s.edge, switching.EDGE, pull, 1e-5).shape == (2, 3, 4)
    assert switching.late_off(s, 1e-5, eta, lit, pull, 1e-5).shape == (2, 3, 4)
    assert switching.late_on(s, 1e-5, eta, lit, pull).shape == (2, 3, 4)
    alone = switching.swing(replace(BASE, eta=2e-3), replace(LOAD, r_load=2e3, j_s=2.4e-3), CURVED, 1.0, 0.7, 0.7)
    assert switching.delay_off(s, 1e-5, lit, pull, 1e-5)[1, 1, 2] == pytest.approx(
        float(switching.delay_off(alone, 1e-5, 7e-3, 2e-4, 1e-5)), rel=1e-12
    )
    picked = s.at((np.array([1]), np.array([2]), np.array([0])))
    assert picked.edge.tau.shape == (switching.STEPS, 1)
