"""Published worked examples and data-sheet figures against the program's physics and its review.

The source stands beside each value. READ: read in the source or in a copy of it; CALC: arithmetic on read numbers;
"common practice, no source": a fact of the trade.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from optopick.brief import (
    Brief,
    CouplerChoice,
    Drive,
    DriveCircuit,
    Environment,
    Goal,
    GoalName,
    Isolation,
    Limits,
    Output,
    OutputCircuit,
    Position,
    Signal,
    Span,
    Stock,
)
from optopick.coupler import Ageing, Barrier, Coupler, Kind, Led, Rating, Transfer, Transistor
from optopick.physics import switching
from optopick.physics.ageing import acceleration_factor, light_left
from optopick.physics.charge import Base, Load
from optopick.physics.heat import derated, resistor_derated
from optopick.physics.leakage import dark_current
from optopick.physics.led import branch_current, forward_voltage, led_current
from optopick.physics.saturation import load_current, smallest_base_resistor, smallest_load
from optopick.physics.transfer import collector_current, led_current_for
from optopick.recheck import review
from optopick.result import Check, Design

FLAT = Transfer(0.2, 0.4, 20e-3, (1e-4, 60e-3), (1.0, 1.0), (-40.0, 110.0), (1.0, 1.0), 0.0)
"""A CTR without curves, as worked examples take it."""


def constant_drop(v_f: float, i: float) -> Led:
    """An LED of `v_f` at `i`; examples count with a constant, so its own slope is kept small."""
    return Led(v_f, v_f, v_f, i, 0.01, 0.0, 0.0, Rating(60e-3, 60, 1e-3), Rating(0.1, 25, 1.33e-3), 5.0)


# --- a link without spread, for examples that a whole review must reproduce ------------------------------------------


def exact(value: float) -> Span:
    return Span(value, value)


def one(value: float) -> Position:
    return Position((value,), (0.0,), (10.0,), (1e3,), (None,), True, "one value")


def link(circuit: OutputCircuit, v_cc: float, v_il: float, v_ih: float, input_low: float) -> Brief:
    """A brief without tolerances at 25 degC: 20 mA from 5 V through 170 ohm."""
    return Brief(
        title="worked example",
        signal=Signal(1.0, 0.5),
        drive=Drive(DriveCircuit.SOURCE, exact(5.0), exact(0.4), None, 0.0),
        output=Output(circuit, exact(v_cc), exact(v_il), exact(v_ih), 0.0, 0.0, input_low, 15e-12),
        environment=Environment(exact(25.0), 0.0),
        limits=Limits(None, None, None, None, None, Isolation(), 1.0),
        stock=Stock(0.0, one(170.0), one(1e3), one(47e3), None),
        couplers=CouplerChoice(Path("none.csv"), None, 1),
        goal=Goal(GoalName.EDGE_TIME, GoalName.POWER, 0.0),
    )


def coupler(ctr: float, h_fe: float) -> Coupler:
    """An invented coupler of one CTR and one gain: 0.2 V at half of what it can carry; LED 100 mW, output 150 mW."""
    transistor = Transistor(
        h_fe=h_fe, light_spread=1.0, v_be=0.65, v_be_tc=0.0, v_be_spread=0.0,
        v_ce_sat=0.2, sat_i_f=20e-3, sat_i_c=10e-3 * ctr, beta_r=5.0, i_c_max=100e-3, v_ceo=70.0,
        i_ceo_1=1e-9, t_1=25.0, i_ceo_2=1e-6, t_2=100.0, c_be=1e-11, tau_0=1e-6, c_m=1e-9, tau_s=1e-5, tau_s_spread=1.0,
    )  # fmt: skip
    return Coupler(
        part="EXAMPLE-1", maker="invented", kind=Kind.PHOTOTRANSISTOR, base_pin=True, channels=1,
        led=constant_drop(1.2, 20e-3), p_out=Rating(0.15, 25, 0.0), p_total=Rating(0.25, 25, 0.0),
        barrier=Barrier(None, None, None, ""), ageing=Ageing(0.1, 1000.0, 20e-3, 100.0, 2.0, 0.43),
        transfer=replace(FLAT, ctr_min=ctr, ctr_max=ctr), transistor=transistor, logic=None,
        price=None, sheet="invented", row=1, assumed=(),
    )  # fmt: skip


def checked(brief: Brief, unit: Coupler, r_led: float, r_load: float, r_be: float | None = None) -> dict[str, Check]:
    stock = replace(brief.stock, r_led=one(r_led), r_load=one(r_load), r_be=one(r_be or 1.0))
    design = Design(unit.part, r_led, r_load, r_be, None)
    return {check.name: check for check in review(replace(brief, stock=stock), unit, design).checks}


# --- ageing and derating ---------------------------------------------------------------------------------------------


def test_led_ageing():
    """Avago, LED reliability white paper (READ in copies): 20 mA at 125 degC against 5 mA at 60 degC prints an
    acceleration of 184.7, and 1000 h become 184,767 h. Its constants are lost in the copies; N = 2 and 0.43 eV
    reproduce it (CALC), to 0.5 %."""
    assert acceleration_factor(20e-3, 5e-3, 125.0, 60.0, 2.0, 0.43) == pytest.approx(184.7, rel=5e-3)
    test_run = Ageing(0.1, 1000.0, 20e-3, 125.0, 2.0, 0.43)
    assert light_left(test_run, 5e-3, 60.0, 184_767.0, 1.0) == pytest.approx(0.9, rel=1e-3)


def test_resistor_derating():
    """Vishay RCM, a distributor's training page (READ): 1 W at 70 degC is 35 % at 125 degC, zero at 155 degC; 10 kohm
    then takes 59.2 V."""
    power = resistor_derated(1.0, 125.0)
    assert power == pytest.approx(0.35, abs=0.005)
    assert np.sqrt(power * 10e3) == pytest.approx(59.2, rel=5e-3)
    assert resistor_derated(1.0, 70.0) == 1.0
    assert resistor_derated(1.0, 155.0) == 0.0


def test_led_derating():
    """Vishay MOC8101 (READ): 100 mW, -1.33 mW/degC above 25 degC, hence zero at 100.2 degC.
    Toshiba TLP2768A (READ): 25 mA, -0.67 mA/degC above 110 degC, hence 14.95 mA at 125 degC (CALC)."""
    led = Rating(0.1, 25.0, 1.33e-3)
    assert derated(led, 25.0) == 0.1
    assert derated(led, 100.0) == pytest.approx(0.25e-3, rel=1e-9)
    assert derated(led, 100.2) == 0.0
    assert derated(Rating(25e-3, 110.0, 0.67e-3), 125.0) == pytest.approx(14.95e-3, rel=1e-9)


def test_resistor_heat_at_12_v():
    """Issue thread of an open hardware project (READ, CALC): 12 V, V_F 1.2 V, 1 kohm put 116 mW into the resistor: too
    much for 100 mW, close for 125 mW; 1.5 kohm fits."""
    led = constant_drop(1.2, 10e-3)

    def heat(r: float) -> float:
        return float(led_current(led, 1.2, 12.0, r, 25.0)) ** 2 * r

    assert heat(1e3) == pytest.approx(116e-3, rel=0.01)
    assert 0.1 < heat(1e3) < 0.125
    assert heat(1.5e3) < 0.1


def test_led_and_output_heat_are_separate_limits():
    """Common practice, no source: 40 mA at 1.2 to 1.5 V are 48 to 60 mW, about half of a 100 mW input rating; input
    (100 mW) and output (150 mW) are limits of their own."""
    brief = link(OutputCircuit.PULL_UP, 5.0, 0.8, 2.0, 0.0)
    for v_f, watts in ((1.2, 48e-3), (1.5, 60e-3)):
        unit = replace(coupler(0.2, 300.0), led=constant_drop(v_f, 40e-3))
        checks = checked(brief, unit, (4.6 - v_f) / 40e-3, 1e3)
        assert checks["led_power"].value == pytest.approx(watts, rel=1e-6)
        assert checks["led_power"].limit == 0.1
        assert checks["output_power"].limit == 0.15
        assert checks["output_power"].value == pytest.approx(5.0**2 / 4e3, rel=1e-9)


# --- LED drive -------------------------------------------------------------------------------------------------------


def test_led_drive():
    """Fairchild AN-3001 (READ in a copy): 5 V, V_F 1.2 V, V_sat 0.4 V, 20 mA: 170 ohm."""
    led = constant_drop(1.2, 20e-3)
    assert led_current(led, 1.2, 5.0 - 0.4, 170.0, 25.0) == pytest.approx(20e-3, rel=1e-9)


def test_shunt_threshold():
    """Fairchild AN-3001 (READ in a copy): I_FT = V_F/R2 and R1 = (V_A - V_F)/I_FT put the threshold at V_A. Just below
    V_A the shunt has all of the current, above it the LED has all that is more."""
    led, i_ft, v_a = constant_drop(1.2, 1e-3), 3e-3, 10.0
    r1, r2 = (v_a - 1.2) / i_ft, 1.2 / i_ft
    assert led_current(led, 1.2, 0.98 * v_a, r1, 25.0, r2) < 0.01 * i_ft
    more = led_current(led, 1.2, 2 * v_a, r1, 25.0, r2)
    assert more == pytest.approx(v_a / r1, rel=0.01)


def test_midi_loop():
    """Three 220 ohm resistors at 5 V (READ, mailing list), V_F 1.2 V: 5.76 mA (CALC); IEC 63035:2017 4.1 (READ in an
    extract): a 5 mA loop, and the receiver must turn on with less than 5 mA."""
    i = led_current(constant_drop(1.2, 5e-3), 1.2, 5.0, 3 * 220.0, 25.0)
    assert i == pytest.approx(5.76e-3, rel=2e-3)
    assert i > 5e-3


def test_pull_up_into_3_3_v():
    """Question-and-answer thread (READ): 1 kohm needs 3.3 mA; at CTR 15 % 22 mA; from 12 V with V_F at most 1.7 V at
    most 468 ohm."""
    load = load_current(3.3, 0.0, 1e3)
    assert load == pytest.approx(3.3e-3)
    i_f = led_current_for(FLAT, 0.15, 1.0, load)
    assert i_f == pytest.approx(22e-3, rel=1e-9)
    led = constant_drop(1.7, 22e-3)
    assert led_current(led, 1.7, 12.0, 468.0, 25.0) >= i_f
    assert led_current(led, 1.7, 12.0, 469.0, 25.0) < i_f
    across = forward_voltage(led, 1.7, i_f, 25.0)
    assert branch_current(i_f, across, np.inf) == i_f


# --- load and base resistor ------------------------------------------------------------------------------------------


def test_smallest_load():
    """Vishay application note 45 (READ in a damaged copy): I_F 5 mA, CTR_sat 55 %, 5 V, 0.4 V: 1.67 kohm without
    leakage, 1.70 kohm with 50 uA."""
    assert smallest_load(5.0, 0.4, 0.55, 5e-3, 0.0) == pytest.approx(1.67e3, rel=2e-3)
    assert smallest_load(5.0, 0.4, 0.55, 5e-3, 50e-6) == pytest.approx(1.70e3, rel=3e-3)


def test_base_resistor():
    """Vishay application note 45 (READ in a damaged copy): CTR_CB 0.132 %, R_L 3.3 kohm, h_FE 417: R_BE about 200 to
    215 kohm for V_BE of 0.65 to 0.70 V; the note uses 220 kohm."""
    ctr_sat, ctr_cb = 0.55, 0.132e-2
    h_fe = ctr_sat / ctr_cb
    assert h_fe == pytest.approx(417, rel=1e-3)
    found = smallest_base_resistor(np.array([0.65, 0.70]), h_fe, 3.3e3, 5e-3 * ctr_cb, 5.0 - 0.4)
    assert found == pytest.approx([200e3, 215e3], rel=0.01)
    assert np.all(found < 220e3)


def test_pull_up_of_a_weak_bin():
    """Question-and-answer thread on the CNY17-2 (READ): CTR at least 22 % at 1 mA into 5 V: pull-up at least 22.7 kohm;
    50 nA and 1 uA of leakage drop about 0.1 V on 100 kohm."""
    assert smallest_load(5.0, 0.0, 0.22, 1e-3, 0.0) == pytest.approx(22.7e3, rel=2e-3)
    unit = coupler(0.22, 300.0)
    dark = replace(unit, transistor=replace(unit.transistor, i_ceo_1=50e-9))
    brief = link(OutputCircuit.PULL_UP, 5.0, 0.8, 2.0, 0.0)
    leaking = replace(brief, output=replace(brief.output, input_leakage=1e-6))
    high = checked(leaking, dark, 3.4e3, 100e3)["output_high"]
    assert 5.0 - high.value == pytest.approx(0.105, rel=1e-3)


def test_emitter_resistor_into_a_ttl_input():
    """Vishay application note 02 (READ in a copy): R below V_IL/I_IL = 0.8 V/1.6 mA = 500 ohm; 16 mA at 50 % drive at
    most 8 mA, so R above 2 V/8 mA = 250 ohm; 390 ohm chosen; with V_IH 2.4 V the collector carries above 6.15 mA."""
    brief, unit = link(OutputCircuit.EMITTER_LOAD, 5.0, 0.8, 2.0, 1.6e-3), coupler(0.5, 300.0)
    r_led = (4.6 - 1.2) / 16e-3
    assert checked(brief, unit, r_led, 499.0)["output_low"].passed
    assert not checked(brief, unit, r_led, 501.0)["output_low"].passed
    assert checked(brief, unit, r_led, 255.0)["output_high"].passed
    assert not checked(brief, unit, r_led, 245.0)["output_high"].passed
    chosen = checked(brief, unit, r_led, 390.0)
    assert chosen["output_low"].passed
    assert chosen["output_high"].passed
    assert load_current(5.0, 5.0 - 2.4, 390.0) == pytest.approx(6.15e-3, rel=1e-3)


def test_the_led_rating_bounds_what_a_coupler_can_deliver():
    """Common practice, no source: CTR 20 % with an LED limit of 60 mA never delivers more than 12 mA, whatever the
    100 mA rating of the collector; 20 mA give 4 mA."""
    brief, unit = link(OutputCircuit.PULL_UP, 5.0, 0.8, 2.0, 0.0), coupler(0.2, 300.0)
    asked = {r: checked(brief, unit, 57.0, r) for r in (390.0, 430.0)}
    for checks in asked.values():
        assert checks["deliverable_current"].limit == pytest.approx(12e-3, rel=1e-9)
        assert checks["collector_current"].passed
    assert not asked[390.0]["deliverable_current"].passed
    assert asked[430.0]["deliverable_current"].passed
    assert collector_current(FLAT, 0.2, 1.0, 20e-3) == pytest.approx(4e-3, rel=1e-12)


def test_too_small_a_base_resistor_steals_the_drive():
    """Common practice, no source: with a gain of a few hundred 20 kohm leave the output barely moving where 47 kohm
    bring it almost to ground, at the same LED current and load."""
    brief, unit = link(OutputCircuit.PULL_UP, 5.0, 0.8, 2.0, 0.0), coupler(1.0, 300.0)
    barely, nearly = (checked(brief, unit, 340.0, 1e3, r_be)["output_low"] for r_be in (20e3, 47e3))
    assert barely.value > 0.9 * 5.0
    assert not barely.passed
    assert nearly.value < 0.1 * 5.0
    assert nearly.passed


# --- leakage and switching -------------------------------------------------------------------------------------------


def test_leakage_doubles_faster_than_every_10_k():
    """Broadcom 4N35 (READ): I_CEO 50 nA at 25 degC, 500 uA at 100 degC, though at 10 and 30 V: doubling every 5.6 K."""
    low, high = (float(dark_current(50e-9, 25.0, 500e-6, 100.0, t)) for t in (60.0, 65.6))
    assert high / low == pytest.approx(2.0, rel=0.01)


@pytest.mark.parametrize(("off_drive", "nanoseconds"), [(0.0, 23.03), (1e-3, 9.16), (2e-3, 5.98)])
def test_storage_exercise(off_drive, nanoseconds):
    """Exercise (READ; results CALC): tau_s 10 ns, beta 50, I_C,sat 10 mA, base on-drive 2 mA, off-drive 0, 1 and 2 mA.

    Referred to the LED through eta: the light makes I_B1 + I_B2, of which the base resistor takes I_B2; the load takes
    I_C,sat/beta.
    """
    eta, beta = 2e-3, 50.0
    light, base, load = (2e-3 + off_drive) / eta, off_drive / eta, 10e-3 / beta / eta
    assert switching.storage(10e-9, light, base, load) == pytest.approx(nanoseconds * 1e-9, rel=1e-3)


def test_edges_of_a_constant_time_constant():
    """Univ. at Buffalo course page (READ): i_C(t) = beta*I_B*(1 - exp(-t/tau)); hence 10 to 90 % takes
    tau*ln 9 = 2.197 tau with no extraction, and the on edge the time between its own two instants."""
    transit, eta = 2e-9, 2e-3  # no capacitance: tau is transit time times gain, 1 us
    load = Load(1e-3, 5.0, 5.0, 5e3, 0.0, 25.0)
    steps = switching.steps(Base(transit, 0.0, 0.0, 0.65, eta), load, FLAT, 1.0, switching.EDGE)
    assert switching.time_off(steps, 0.0) == pytest.approx(2.197e-6, rel=1e-3)
    drive = 4.0
    t10, t90 = (-np.log(1 - share / drive) for share in (0.1, 0.9))
    assert switching.edge_on(steps, drive * 1e-3, 1e-3) == pytest.approx((t90 - t10) * 1e-6, rel=1e-9)
