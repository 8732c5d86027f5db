"""Which way each quantity hurts: the directions that the model counts on, as properties of the physics."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import pytest
import random_links

from optopick.coupler import Coupler, Transfer
from optopick.physics import switching
from optopick.physics.ageing import light_left
from optopick.physics.charge import Base, Load
from optopick.physics.heat import derated, output_dissipation, resistor_derated
from optopick.physics.leakage import dark_current, dark_current_held, raised
from optopick.physics.led import branch_current, forward_voltage, led_current, led_current_of_leak
from optopick.physics.saturation import load_current, overdrive_to_hold, rise_with_current, v_ce_on
from optopick.physics.transfer import base_led_current, collector_current, led_current_for
from optopick.recheck import review
from optopick.result import Design


@dataclass(frozen=True)
class Link:
    """One unit at one corner, with what follows from its resistors through the program's physics."""

    coupler: Coupler
    v: float = 5.0
    v_cc: float = 5.0
    t: float = 25.0
    r_led: np.ndarray | float = 680.0
    r_load: np.ndarray | float = 10e3
    r_be: np.ndarray | float = 1e6
    left: np.ndarray | float = 1.0
    ctr: np.ndarray | float = 1.0
    i_rest: np.ndarray | float = 0.0

    @property
    def i_eff(self):
        return self.left * led_current(self.coupler.led, self.coupler.led.v_f_typ, self.v, self.r_led, self.t)

    @property
    def eta(self):
        return 1.0 / self.coupler.transistor.h_fe

    @property
    def i_be(self):
        return base_led_current(self.coupler.transistor.v_be, self.r_be, self.eta)

    @property
    def j_s(self):
        return load_current(self.v_cc, self.coupler.transistor.v_ce_sat, self.r_load)

    @property
    def i_sat(self):
        return led_current_for(self.coupler.transfer, self.ctr, 1.0, self.j_s)

    @property
    def swing(self):
        """All that the load brings to the times; arrays of one axis throughout."""
        transistor, ctr = self.coupler.transistor, np.atleast_1d(self.ctr)
        gain, j_s = transistor.h_fe, np.atleast_1d(self.j_s)
        base = Base(transistor.tau_0 / gain, transistor.c_m / gain, transistor.c_be, transistor.v_be, self.eta)
        load = Load(j_s, self.v_cc, self.v_cc - transistor.v_ce_sat, np.atleast_1d(self.r_load), 15e-12, self.t)
        return switching.swing(base, load, self.coupler.transfer, ctr, 0.7, 0.7)

    @property
    def margin(self):
        return collector_current(self.coupler.transfer, self.ctr, 1.0, self.i_eff - self.i_be) / self.j_s

    @property
    def edge_on(self):
        return switching.edge_on(self.swing.edge, self.i_eff - self.i_be, self.i_sat)

    @property
    def edge_off(self):
        return switching.edge_off(self.swing.edge, switching.EDGE, self.i_be, self.i_rest)

    @property
    def storage(self):
        tau_s, s = self.coupler.transistor.tau_s, self.swing
        return switching.storage(tau_s, self.i_eff, self.i_be, s.i_sat, s.hold, self.i_rest)

    @property
    def delay_on(self):
        return switching.delay_on(self.swing, self.eta, self.i_eff, self.i_be)

    @property
    def delay_off(self):
        return switching.delay_off(self.swing, self.coupler.transistor.tau_s, self.i_eff, self.i_be, self.i_rest)

    @property
    def late_off(self):
        tau_s = self.coupler.transistor.tau_s
        return switching.late_off(self.swing, tau_s, self.eta, self.i_eff, self.i_be, self.i_rest)

    @property
    def late_on(self):
        return switching.late_on(self.swing, self.coupler.transistor.tau_s, self.eta, self.i_eff, self.i_be)


SWEEPS = {
    "r_led": np.geomspace(270, 1e3, 40),
    "r_load": np.geomspace(6.8e3, 47e3, 40),
    "r_be": np.geomspace(680e3, 10e6, 40),
    "left": np.linspace(0.6, 1.0, 40),
    "ctr": np.linspace(0.9, 3.0, 40),
    "i_rest": np.linspace(0.0, 20e-6, 40),
}

RISES = [
    *(("margin", name) for name in ("r_load", "r_be", "left", "ctr")),
    *(("edge_on", name) for name in ("r_led",)),
    *(("edge_off", name) for name in ("r_be", "ctr")),
    *(("storage", name) for name in ("r_load", "r_be", "left", "ctr", "i_rest")),
    *(("delay_on", name) for name in ("r_led",)),
    *(("delay_off", name) for name in ("r_be", "left", "ctr", "i_rest")),
    *(("late_off", name) for name in ("r_be", "left", "ctr", "i_rest")),
    *(("late_on", name) for name in ("r_led",)),
]
FALLS = [
    *(("margin", name) for name in ("r_led",)),
    *(("edge_on", name) for name in ("r_be", "left", "ctr")),
    *(("storage", name) for name in ("r_led",)),
    *(("delay_on", name) for name in ("r_be", "left", "ctr")),
    *(("delay_off", name) for name in ("r_led",)),
    *(("late_off", name) for name in ("r_led",)),
    *(("late_on", name) for name in ("r_be", "left", "ctr")),
    *(("i_sat", name) for name in ("r_load", "ctr")),
    *(("i_be", name) for name in ("r_be",)),
]


def couplers() -> list[Coupler]:
    """Random couplers; the sweeps keep their outputs saturated."""
    return [random_links.coupler(np.random.default_rng(seed)) for seed in range(12)]


@pytest.mark.parametrize(("quantity", "name"), RISES)
def test_rises(quantity, name):
    for coupler in couplers():
        values = getattr(replace(Link(coupler), **{name: SWEEPS[name]}), quantity)
        assert np.all(np.diff(values) > 0), coupler


@pytest.mark.parametrize(("quantity", "name"), FALLS)
def test_falls(quantity, name):
    for coupler in couplers():
        values = getattr(replace(Link(coupler), **{name: SWEEPS[name]}), quantity)
        assert np.all(np.diff(values) < 0), coupler


@pytest.mark.parametrize("name", ["r_led", "left"])
def test_the_off_edge_knows_nothing_of_the_light(name):
    coupler = couplers()[0]
    assert np.ptp(np.broadcast_to(replace(Link(coupler), **{name: SWEEPS[name]}).edge_off, 40)) == 0.0


def test_off_edge_rises_with_the_load_without_base_resistor():
    """Then it is time constants times logarithms of fixed ratios, and the time constants rise."""
    for coupler in couplers():
        assert np.all(np.diff(Link(coupler, r_load=SWEEPS["r_load"], r_be=np.inf).edge_off) > 0)


def at_constant_ctr(transit: float, c_cb: float, r_load: np.ndarray) -> switching.Swing:
    """5 V and a CTR of 1 whatever the current: time constants from transit time and collector capacitance alone."""
    flat = Transfer(1.0, 1.0, 5e-3, (1e-9, 60e-3), (1.0, 1.0), (-40.0, 110.0), (1.0, 1.0), 0.0)
    base = Base(transit, c_cb, 0.0, 0.65, 2.5e-3)
    return switching.swing(base, Load(4.8 / r_load, 5.0, 4.8, r_load, 0.0, 25.0), flat, np.ones(len(r_load)), 0.7, 0.7)


def test_off_edge_may_fall_with_the_load_beside_a_base_resistor():
    """A larger load resistor lowers the current to be switched off against a fixed extraction.

    The logarithm falls like 1/r_load once extraction outweighs the load; the time constant makes up for it only by the
    charge of the collector junction over a falling current. So the edge falls while the transit time's charge is most
    of it and the base resistor strong; with the junction's charge alone it comes to rest at charge over extraction.
    """
    r_load = np.geomspace(1e3, 200e3, 60)
    slow_itself, slow_by_load = (
        switching.time_off(at_constant_ctr(transit, c_cb, r_load).edge, 5e-3)
        for transit, c_cb in ((20e-9, 0.0), (0.0, 10e-12))
    )
    assert falls(slow_itself)
    assert slow_itself[-1] < 0.05 * slow_itself[0]
    assert rises(slow_by_load)
    assert slow_by_load[-1] < 1.5 * slow_by_load[30]


def test_on_edge_falls_with_the_load_only_while_the_gain_is_slow_by_itself():
    """Saturated deeply it is about charge over base current: the transit time's charge falls with the load's current,
    the collector junction's does not."""
    r_load = np.geomspace(1e3, 50e3, 30)
    slow_itself, slow_by_load = (
        switching.time_on(at_constant_ctr(transit, c_cb, r_load).edge, 50e-3)
        for transit, c_cb in ((20e-9, 0.0), (0.0, 10e-12))
    )
    assert falls(slow_itself)
    assert slow_itself[-1] == pytest.approx(20e-9 * 0.8 * 4.8 / 50e3 / (2.5e-3 * 50e-3), rel=0.01)
    assert slow_by_load[-1] == pytest.approx(slow_by_load[15], rel=0.02)


def falls(values) -> bool:
    return bool(np.all(np.diff(np.asarray(values)) < 0))


def rises(values) -> bool:
    return bool(np.all(np.diff(np.asarray(values)) > 0))


def test_led_currents():
    led = couplers()[0].led
    r, v = np.geomspace(100, 10e3, 40), np.linspace(2.0, 30.0, 40)
    assert falls(led_current(led, 1.2, 5.0, r, 25.0))
    assert rises(led_current(led, 1.2, v, 470.0, 25.0))
    assert falls(led_current(led, np.linspace(1.0, 1.6, 40), 5.0, 470.0, 25.0))
    assert rises(led_current(led, 1.2, 5.0, 470.0, np.linspace(-40, 100, 40)))
    assert rises(led_current(led, 1.2, 5.0, 470.0, 25.0, r))
    assert rises(led_current_of_leak(led, 1.2, 1e-3, 25.0, r))
    i_f = led_current(led, 1.2, 5.0, 470.0, 25.0, r)
    assert falls(branch_current(i_f, forward_voltage(led, 1.2, i_f, 25.0), r))


def test_levels():
    overdrive = np.linspace(1.01, 5.0, 60)
    v = v_ce_on(0.2, 8.0, overdrive, 400.0, 5.0, 25.0)
    assert falls(v)
    assert rises(v_ce_on(0.2, 8.0, 1.3, np.geomspace(50, 2e3, 40), 5.0, 25.0))
    assert rises(v_ce_on(0.2, 8.0, 1.3, 400.0, 5.0, np.linspace(-40, 100, 40)))
    assert falls(overdrive_to_hold(np.linspace(0.21, 0.3, 40), 0.2, 8.0, 400.0, 5.0, 25.0))
    assert rises(rise_with_current(0.2, np.linspace(1.1e-3, 9e-3, 20), 1e-3))
    assert falls(load_current(5.0, np.linspace(0, 4, 20), 1e3))
    assert falls(load_current(5.0, 0.2, SWEEPS["r_load"]))
    assert rises(dark_current(50e-9, 25.0, 20e-6, 100.0, np.linspace(-40, 110, 40)))
    assert rises(raised(np.linspace(5.1, 30, 20)))
    held = dark_current_held(20e-6, 0.2e-6, np.geomspace(1e4, 1e8, 40))
    assert set(held) == {0.2e-6, 20e-6}
    assert np.all(np.diff(held) >= 0)


def test_heat_and_wear():
    coupler, t = couplers()[0], np.linspace(71.0, 154.0, 40)
    assert falls(resistor_derated(0.25, t))
    assert falls(derated(coupler.led.i_max, np.linspace(61.0, 110.0, 40)))
    assert falls(output_dissipation(5.0, SWEEPS["r_load"], 1e-3))
    assert rises(output_dissipation(np.linspace(3, 24, 20), 1e3, 1e-3))
    ageing = coupler.ageing
    assert falls(light_left(ageing, np.linspace(1e-3, 50e-3, 40), 70.0, 1e5, 0.5))
    assert falls(light_left(ageing, 10e-3, np.linspace(-20.0, 100.0, 40), 1e5, 0.5))
    assert falls(light_left(ageing, 10e-3, 70.0, np.linspace(1e3, 2e5, 40), 0.5))
    assert falls(light_left(ageing, 10e-3, 70.0, 1e5, np.linspace(0.05, 1.0, 40)))


def test_power_falls_with_both_resistors():
    """Through the review: each part of the average power is a supply times a current that its resistor sets."""
    rng = np.random.default_rng(70_000)
    brief, coupler = random_links.brief(rng), random_links.coupler(rng)
    r_led, r_load = brief.stock.r_led.values, brief.stock.r_load.values
    by_led = [review(brief, coupler, Design("", r, r_load[5], None, None)).power for r in r_led[::6]]
    by_load = [review(brief, coupler, Design("", r_led[5], r, None, None)).power for r in r_load[::6]]
    for powers in (by_led, by_load):
        assert falls([p.worst for p in powers])
        assert falls([p.nominal for p in powers])
        assert all(p.nominal < p.worst for p in powers)
