"""Every rule that fills a gap: the value, its text in table units, the sentence that goes with it."""

import math
from dataclasses import replace

import pytest
from coupler_tables import DARLINGTON, LOGIC, PHOTOTRANSISTOR, assumed, only_coupler, read_table
from hypothesis import given
from hypothesis import strategies as st

from optopick import gaps
from optopick.coupler import Assumed, Kind, Rating, Transfer
from optopick.coupler_columns import schema
from optopick.coupler_curves import Curve
from optopick.gaps import Filled, Unit, UnusableError
from optopick.gaps_switching import switching_constants
from optopick.physics import switching
from optopick.physics.charge import Base, Load, zero_bias
from optopick.physics.leakage import dark_current
from optopick.physics.led import forward_voltage
from optopick.physics.transfer import led_current_for, relative_ctr
from optopick.switching_rows import PlainRow, SaturatedRow, TypicalUnit

UNIT = Unit("VELM1", Kind.PHOTOTRANSISTOR)

# What is emptied or changed, and exactly what is then assumed. Each value is worked out by hand beside the rule's text.
ONE_ROW = [
    (PHOTOTRANSISTOR, {"base_pin": ""}, {"base_pin": "no"}),
    (PHOTOTRANSISTOR, {"channels": ""}, {"channels": "1"}),
    (PHOTOTRANSISTOR, {"i_f_derate_above": ""}, {"i_f_derate_above": "25 °C"}),
    (PHOTOTRANSISTOR, {"i_f_derate": ""}, {"i_f_derate": "0.667 mA/K"}),  # 50 mA over 75 K
    (PHOTOTRANSISTOR, {"i_f_derate": "", "i_f_derate_above": "80"}, {"i_f_derate": "2.5 mA/K"}),  # over 20 K
    (PHOTOTRANSISTOR, {"p_led_derate": ""}, {"p_led_derate": "1.07 mW/K"}),
    (PHOTOTRANSISTOR, {"p_out_derate": ""}, {"p_out_derate": "2 mW/K"}),
    (PHOTOTRANSISTOR, {"p_total_derate": ""}, {"p_total_derate": "2.67 mW/K"}),
    (PHOTOTRANSISTOR, {"v_r_max": ""}, {"v_r_max": "3 V"}),
    (PHOTOTRANSISTOR, {"p_led": ""}, {"p_led": "70 mW"}),  # 50 mA times 1.4 V
    (PHOTOTRANSISTOR, {"p_out": ""}, {"p_out": "120 mW"}),  # 200 less 80
    (PHOTOTRANSISTOR, {"p_out": "", "p_total": "80"}, {"p_out": "80 mW"}),  # 100, but p_total is less
    (PHOTOTRANSISTOR, {"p_out": "", "p_led": ""}, {"p_out": "100 mW", "p_led": "70 mW"}),
    (PHOTOTRANSISTOR, {"p_out": "", "p_total": ""}, {"p_out": "100 mW", "p_total": "100 mW"}),
    (PHOTOTRANSISTOR, {"p_total": ""}, {"p_total": "150 mW"}),
    (PHOTOTRANSISTOR, {"v_f_min": ""}, {"v_f_min": "1.05 V"}),
    (PHOTOTRANSISTOR, {"v_f_typ": "", "v_f_max": "1.3"}, {"v_f_typ": "1.15 V"}),
    (PHOTOTRANSISTOR, {"v_f_typ": "", "v_f_min": ""}, {"v_f_typ": "1.2 V", "v_f_min": "1.05 V"}),
    (PHOTOTRANSISTOR, {"v_f_typ": "", "v_f_max": ""}, {"v_f_typ": "1.15 V", "v_f_max": "1.35 V"}),
    (PHOTOTRANSISTOR, {"v_f_max": ""}, {"v_f_max": "1.4 V"}),
    (PHOTOTRANSISTOR, {"v_f_at": ""}, {"v_f_at": "5 mA"}),
    (PHOTOTRANSISTOR, {"v_f_tc": ""}, {"v_f_tc": "-1.5 mV/K"}),
    (PHOTOTRANSISTOR, {"led_n": ""}, {"led_n": "2"}),
    (PHOTOTRANSISTOR, {"led_r_s": ""}, {"led_r_s": "3 Ω"}),
    (PHOTOTRANSISTOR, {"ctr_max": ""}, {"ctr_max": "360 %"}),
    (PHOTOTRANSISTOR, {"ctr_curve": ""}, {"ctr_curve": "a usual shape"}),
    (DARLINGTON, {"ctr_curve": ""}, {"ctr_curve": "a usual shape"}),
    (PHOTOTRANSISTOR, {"ctr_temperature": ""}, {"ctr_temperature": "a usual shape"}),
    (DARLINGTON, {"ctr_temperature": ""}, {"ctr_temperature": "a usual shape"}),
    (PHOTOTRANSISTOR, {"light_tc": ""}, {"light_tc": "-0.5 %/K"}),
    (PHOTOTRANSISTOR, {"v_ce_sat": ""}, {"v_ce_sat": "0.4 V"}),
    (DARLINGTON, {"v_ce_sat": ""}, {"v_ce_sat": "1.2 V"}),
    (PHOTOTRANSISTOR, {"v_ce_sat_i_f": ""}, {"v_ce_sat_i_f": "20 mA"}),
    (DARLINGTON, {"v_ce_sat_i_f": ""}, {"v_ce_sat_i_f": "10 mA"}),  # the end of its curve
    (PHOTOTRANSISTOR, {"v_ce_sat_i_c": ""}, {"v_ce_sat_i_c": "1 mA"}),
    (PHOTOTRANSISTOR, {"beta_r": ""}, {"beta_r": "5"}),
    (PHOTOTRANSISTOR, {"i_c_max": ""}, {"i_c_max": "30 mA"}),
    (PHOTOTRANSISTOR, {"v_ceo": ""}, {"v_ceo": "20 V"}),
    (DARLINGTON, {"v_ceo": ""}, {"v_ceo": "7 V"}),
    (PHOTOTRANSISTOR, {"i_ceo": ""}, {"i_ceo": "312 nA"}),  # 20 µA over 2^6
    (PHOTOTRANSISTOR, {"i_ceo": "", "i_ceo_t": "35"}, {"i_ceo": "625 nA"}),  # over 2^5
    (PHOTOTRANSISTOR, {"i_ceo_t": ""}, {"i_ceo_t": "25 °C"}),
    (PHOTOTRANSISTOR, {"i_ceo_hot": ""}, {"i_ceo_hot": "168 µA"}),  # 0.1 µA times 2^(60/5.6)
    (
        PHOTOTRANSISTOR,
        {"i_ceo_hot": "", "i_ceo_hot_t": ""},
        {"i_ceo_hot": "1076 µA", "i_ceo_hot_t": "100 °C"},  # 2^(75/5.6)
    ),
    (PHOTOTRANSISTOR, {"h_fe_typ": ""}, {"h_fe_typ": "400"}),  # sqrt(200*800)
    (PHOTOTRANSISTOR, {"h_fe_typ": "", "ctr_cb": "0.5"}, {"h_fe_typ": "300"}),  # 150 % over 0.5 %
    (
        PHOTOTRANSISTOR,
        {"h_fe_typ": "", "h_fe_min": ""},
        {"h_fe_typ": "600", "light_spread": "1.25"},  # 150 % over 0.25 %
    ),
    (PHOTOTRANSISTOR, {"h_fe_max": ""}, {"light_spread": "1.25"}),
    (PHOTOTRANSISTOR, {"c_be": ""}, {"c_be": "14 pF"}),
    (PHOTOTRANSISTOR, {"v_be": ""}, {"v_be": "0.65 V"}),
    (DARLINGTON, {"v_be": ""}, {"v_be": "1.3 V"}),
    (PHOTOTRANSISTOR, {"v_be_tc": ""}, {"v_be_tc": "-2 mV/K"}),
    (DARLINGTON, {"v_be_tc": ""}, {"v_be_tc": "-4 mV/K"}),
    (PHOTOTRANSISTOR, {"v_be_spread": ""}, {"v_be_spread": "50 mV"}),
    (DARLINGTON, {"v_be_spread": ""}, {"v_be_spread": "100 mV"}),
    (PHOTOTRANSISTOR, {"tau_s_spread": ""}, {"tau_s_spread": "1.5"}),
    (PHOTOTRANSISTOR, {"c_cb": ""}, {}),  # both switching rows are there: nobody asks
    (PHOTOTRANSISTOR, {"sw_v_cc": ""}, {"sw_v_cc": "10 V"}),
    (PHOTOTRANSISTOR, {"sw_i_c": ""}, {"sw_i_c": "2 mA"}),
    (PHOTOTRANSISTOR, {"sw_r_l": ""}, {"sw_r_l": "100 Ω"}),
    (PHOTOTRANSISTOR, {"sw_t_r": ""}, {}),
    (PHOTOTRANSISTOR, {"sat_t_s": ""}, {"sat_t_s": "21.9 µs"}),  # 0.625 of 35
    (PHOTOTRANSISTOR, {"sat_t_off": ""}, {"sat_t_off": "32 µs"}),
    (PHOTOTRANSISTOR, {"sat_v_cc": ""}, {"sat_v_cc": "5 V"}),
    (LOGIC, {"i_f_off": ""}, {"i_f_off": "0.25 mA"}),
    (LOGIC, {"v_ol": ""}, {"v_ol": "0.6 V"}),
    (LOGIC, {"i_oh": ""}, {"i_oh": "100 µA"}),
    (LOGIC, {"i_cc": ""}, {"i_cc": "15 mA"}),
    (LOGIC, {"v_cc_min": ""}, {"v_cc_min": "4.5 V"}),
    (LOGIC, {"v_cc_min": "", "v_cc_max": "3.6"}, {"v_cc_min": "3.6 V"}),
    (LOGIC, {"v_cc_max": ""}, {"v_cc_max": "5.5 V"}),
    (LOGIC, {"v_cc_min": "10", "v_cc_max": ""}, {"v_cc_max": "10 V"}),
    (LOGIC, {"v_cc_min": "", "v_cc_max": ""}, {"v_cc_min": "4.5 V", "v_cc_max": "5.5 V"}),
    (LOGIC, {"t_r": ""}, {"t_r": "75 ns"}),
    (LOGIC, {"t_f": ""}, {"t_f": "75 ns"}),
    (LOGIC, {"r_l": ""}, {"r_l": "280 Ω"}),
    (LOGIC, {"c_l": ""}, {"c_l": "15 pF"}),
    (LOGIC, {"c_out": ""}, {"c_out": "10 pF"}),
    (PHOTOTRANSISTOR, {"ctr_loss": ""}, {"ctr_loss": "10 %"}),
    (PHOTOTRANSISTOR, {"ctr_loss_time": ""}, {"ctr_loss_time": "1000 h"}),
    (PHOTOTRANSISTOR, {"ctr_loss_i_f": ""}, {"ctr_loss_i_f": "5 mA"}),
    (LOGIC, {"ctr_loss_i_f": "", "i_f_on": "6"}, {"ctr_loss_i_f": "6 mA"}),
    (PHOTOTRANSISTOR, {"ctr_loss_i_f": "", "ctr_loss": ""}, {"ctr_loss": "10 %", "ctr_loss_i_f": "50 mA"}),
    (PHOTOTRANSISTOR, {"ctr_loss_t": ""}, {"ctr_loss_t": "25 °C"}),
    (PHOTOTRANSISTOR, {"ctr_loss_t": "", "ctr_loss": ""}, {"ctr_loss": "10 %", "ctr_loss_t": "85 °C"}),
    (PHOTOTRANSISTOR, {"ageing_n": ""}, {"ageing_n": "2"}),
    (PHOTOTRANSISTOR, {"ageing_e_a": ""}, {"ageing_e_a": "0.43 eV"}),
]

# Rules about switching are tested by their numbers below; here only that each speaks up when it is used.
SWITCHING = [
    {"sat_t_s": "", "sat_t_off": "", "c_cb": ""},
    {"sw_t_r": "", "sw_t_f": ""},
    {"sat_t_s": "0.1"},
]


@pytest.mark.parametrize(("row", "cells", "expected"), ONE_ROW)
def test_what_is_assumed_for_a_gap(tmp_path, row, cells, expected):
    assert assumed(only_coupler(tmp_path, row, **cells)) == expected


def test_every_rule_is_used_by_some_gap(tmp_path):
    used = set()
    for row, cells, _ in [*ONE_ROW, *((PHOTOTRANSISTOR, cells, {}) for cells in SWITCHING)]:
        coupler = only_coupler(tmp_path, row, **cells)
        used |= {item.rule for item in coupler.assumed}
    bins = read_table(tmp_path, PHOTOTRANSISTOR, PHOTOTRANSISTOR | {"bin": "H", "ctr_min": "150"})
    used |= {item.rule for coupler in bins.couplers for item in coupler.assumed}
    silent = {"switching_rows"}  # its constant enters a figure that the sheet's rows give, nothing is assumed
    for name, rule in schema().rules.items():
        words = {rule.words(kind) for kind in (Kind.PHOTOTRANSISTOR, Kind.DARLINGTON)}
        assert (name in silent) or words & used, name


def test_an_assumption_names_part_parameter_value_and_rule(tmp_path):
    coupler = only_coupler(tmp_path, PHOTOTRANSISTOR, bin="K", i_f_derate="")
    rule = (
        "the limit falls linearly to zero at 100 degC "
        "(Vishay MOC8101 to MOC8104 sheets: LED power reaches zero at 100.2 degC)"
    )
    assert coupler.assumed == (Assumed("VELM1-K", "i_f_derate", "0.667 mA/K", rule),)


# ---- the values themselves, in SI -----------------------------------------------------------------------------------


def test_filled_limits_in_si(tmp_path):
    row = PHOTOTRANSISTOR | dict.fromkeys(("i_f_derate_above", "i_f_derate", "p_led", "p_out", "p_total"), "")
    coupler = only_coupler(tmp_path, row)
    assert coupler.led.i_max == Rating(0.05, 25.0, pytest.approx(0.05 / 75))
    assert coupler.led.p_max.value == pytest.approx(0.07)
    assert (coupler.p_out.value, coupler.p_total.value) == (0.1, 0.1)


def test_filled_led_in_si(tmp_path):
    led = only_coupler(
        tmp_path, PHOTOTRANSISTOR, v_f_min="", v_f_max="", v_f_at="", v_f_tc="", led_n="", led_r_s=""
    ).led
    assert (led.v_f_min, led.v_f_max) == (pytest.approx(1.05), pytest.approx(1.4))
    assert (led.i_ref, led.v_f_tc, led.n, led.r_s) == (0.005, -0.0015, 2.0, 3.0)


def test_a_small_test_current_is_the_cautious_one_for_forward_voltage(tmp_path):
    filled = only_coupler(tmp_path, PHOTOTRANSISTOR, v_f_at="").led
    stated = only_coupler(tmp_path, PHOTOTRANSISTOR, v_f_at="20").led
    assert forward_voltage(filled, 1.4, 0.008, 25.0) > forward_voltage(stated, 1.4, 0.008, 25.0)


def test_the_usual_curve_is_one_at_the_test_current(tmp_path):
    transfer = only_coupler(tmp_path, PHOTOTRANSISTOR, ctr_curve="", ctr_at="2").transfer
    assert relative_ctr(transfer, 0.002) == pytest.approx(1.0)
    at_two = 0.75 * (1 / 0.75) ** (math.log(2) / math.log(5))  # from 1 mA: 0.75 to 5 mA: 1, in logarithms
    assert relative_ctr(transfer, 0.01) == pytest.approx(1.02 / at_two)
    assert (transfer.curve_i[0], transfer.curve_i[-1]) == (0.0001, 0.05)


@pytest.mark.parametrize("kind", [Kind.PHOTOTRANSISTOR, Kind.DARLINGTON])
def test_the_usual_curves_are_sound(kind):
    unit = Unit("X", kind)
    assert gaps.ctr_curve(unit, 0.001).value.carries_more
    warm = gaps.ctr_temperature(unit).value
    assert warm.linear_at(25.0) == 1.0
    assert warm.x[0] <= -40
    assert warm.x[-1] >= 100


def test_filled_dark_currents_in_si(tmp_path):
    hot = only_coupler(tmp_path, PHOTOTRANSISTOR, i_ceo_hot="", i_ceo_hot_t="").transistor
    assert (hot.i_ceo_1, hot.t_1, hot.t_2) == (1e-7, 25.0, 100.0)
    assert hot.i_ceo_2 == pytest.approx(1e-7 * 2 ** (75 / 5.6))
    assert dark_current(hot.i_ceo_1, hot.t_1, hot.i_ceo_2, hot.t_2, 30.6) == pytest.approx(2e-7)
    cold = only_coupler(tmp_path, PHOTOTRANSISTOR, i_ceo="").transistor
    assert (cold.i_ceo_1, cold.t_1) == (pytest.approx(2e-5 / 64), 25.0)
    assert dark_current(cold.i_ceo_1, cold.t_1, cold.i_ceo_2, cold.t_2, 35.0) == pytest.approx(4e-5 / 64)


def test_the_steepest_published_pair_stands_behind_the_doubling():
    # Broadcom 4N35 data sheet (read, published-checks): 50 nA at 25 degC, 500 µA at 100 degC
    assert gaps.i_ceo_hot(UNIT, 50e-9, 25.0, 100.0).value == pytest.approx(500e-6, rel=0.1)


def test_gain_and_spread_in_si(tmp_path):
    transistor = only_coupler(tmp_path, PHOTOTRANSISTOR, h_fe_typ="", ctr_cb="0.132").transistor
    assert transistor.h_fe == pytest.approx(1.5 / 0.00132)
    assert transistor.light_spread == pytest.approx(math.sqrt(4 / (250 / 90)))


@pytest.mark.parametrize(
    ("ctr_ratio", "h_fe_max", "spread"), [(2, 200, 1.0), (2, 450, 1.5), (2, 2000, 2.0), (4, 100, 1.0)]
)
def test_light_spread_lies_between_one_and_two(ctr_ratio, h_fe_max, spread):
    filled = gaps.light_spread(UNIT, ctr_ratio, 100.0, float(h_fe_max))
    assert filled == Filled(spread, None)


def test_filled_wear_in_si(tmp_path):
    wear = [name for name in PHOTOTRANSISTOR if name.startswith(("ctr_loss", "ageing"))]
    ageing = only_coupler(tmp_path, PHOTOTRANSISTOR | dict.fromkeys(wear, "")).ageing
    assert (ageing.loss, ageing.time, ageing.current, ageing.temperature) == (0.1, 1000.0, 0.05, 85.0)
    assert (ageing.n, ageing.e_a) == (2.0, 0.43)


# ---- switching ------------------------------------------------------------------------------------------------------

FLAT = Curve((1e-5, 0.1), (1.0, 1.0))
TYPICAL = TypicalUnit(ctr=1.5, curve=FLAT, h_fe=400.0, v_be=0.65, c_be=14e-12)
TRANSIT, C_0, TAU_S = 4e-9, 12e-12, 9e-6
STATED_C_CB = Filled(5e-12, None)


def edges(typical, transit, c_0, load):
    """Rise at the edge of saturation, fall, and the fall's first tenth [s], by the physics."""
    transfer = Transfer(1.0, 1.0, 5e-3, typical.curve.x, typical.curve.y, (25.0,), (1.0,), 0.0)
    base = Base(transit, c_0, typical.c_be, typical.v_be, typical.ctr / typical.h_fe)
    edge, tenth = (
        switching.steps(base, load, transfer, typical.ctr, cut) for cut in (switching.EDGE, switching.FIRST_TENTH)
    )
    lit = led_current_for(transfer, typical.ctr, 1.0, load.j_s)
    times = switching.time_on(edge, lit), switching.time_off(edge, 0.0), switching.time_off(tenth, 0.0)
    return tuple(map(float, times))


def plain_of(typical=TYPICAL, transit=TRANSIT, c_0=C_0, rising=False, i_c=0.002, r_l=100.0):
    """The row that a unit with these constants would show: its fall, or its rise, as the longer edge."""
    rise, fall, _ = edges(typical, transit, c_0, Load(i_c, 10.0, i_c * r_l, r_l, 0.0, 25.0))
    return PlainRow(rise, 0.9 * rise, i_c, r_l, 10.0) if rising else PlainRow(None, fall, i_c, r_l, 10.0)


def saturated_of(typical=TYPICAL, transit=TRANSIT, c_0=C_0, tau_s=TAU_S, r_l=1900.0):
    _, fall, tenth = edges(typical, transit, c_0, Load(4.8 / r_l, 5.0, 4.8, r_l, 0.0, 25.0))
    t_s = tau_s * math.log(0.016 / typical.led_current_for(4.8 / r_l)) + tenth
    return SaturatedRow(t_s, t_s + fall, 0.016, r_l, 5.0, 0.2)


PLAIN, SATURATED = plain_of(), saturated_of()


def fall_of(found, row, typical=TYPICAL):
    """The fall of a row by the constants found."""
    swing = row.i_c * row.r_l
    load = Load(row.i_c, row.v_cc, swing, row.r_l, 0.0, 25.0)
    return edges(typical, found.tau_0 / typical.h_fe, found.c_m / typical.h_fe, load)[1]


@given(
    transit=st.floats(2e-10, 1e-7),
    c_0=st.floats(1e-12, 5e-11),
    tau_s=st.floats(1e-7, 1e-4),
    ctr=st.floats(0.4, 8.0),
    h_fe=st.floats(100.0, 20000.0),
    at_low=st.floats(0.3, 1.2),
    at_high=st.floats(0.6, 1.5),
    rising=st.booleans(),
)
def test_constants_come_back_from_the_rows_they_make(transit, c_0, tau_s, ctr, h_fe, at_low, at_high, rising):
    """Whatever the unit, rows computed from its constants by the physics give the same constants again."""
    typical = TypicalUnit(ctr, Curve((1e-4, 0.005, 0.05), (at_low, 1.0, at_high)), h_fe, 0.6, 10e-12)
    plain, saturated = plain_of(typical, transit, c_0, rising), saturated_of(typical, transit, c_0, tau_s)
    found = switching_constants(UNIT, typical, plain, saturated, STATED_C_CB)
    assert (found.tau_0 / h_fe, found.c_m / h_fe) == (pytest.approx(transit, rel=1e-6), pytest.approx(c_0, rel=1e-6))
    assert found.tau_s == pytest.approx(tau_s, rel=1e-4)
    assert found.assumed == ()


def test_the_longer_edge_counts():
    rise, fall, _ = edges(TYPICAL, TRANSIT, C_0, Load(0.002, 10.0, 0.2, 100.0, 0.0, 25.0))
    assert PlainRow(1.0, 2.0, 0.002, 100.0, 10.0).t == 2.0
    for row in (PlainRow(0.5 * fall, fall, 0.002, 100.0, 10.0), PlainRow(rise, 0.5 * rise, 0.002, 100.0, 10.0)):
        found = switching_constants(UNIT, TYPICAL, row, SATURATED, STATED_C_CB)
        assert found.c_m / 400 == pytest.approx(C_0, rel=1e-6)
    # the same edges the other way round are a slower unit's fall and a faster unit's rise
    assert PlainRow(2.0, 1.0, 0.002, 100.0, 10.0).falls_slower is False
    assert PlainRow(2.0, None, 0.002, 100.0, 10.0).falls_slower is False
    assert PlainRow(None, 2.0, 0.002, 100.0, 10.0).falls_slower is True


def test_the_saturated_voltage_is_taken_off(tmp_path):
    """5 V less 0.2 V, or 0.8 V of a darlington; storage ends in the first tenth of the recovery."""
    kinds = ((PHOTOTRANSISTOR, 0.2, math.sqrt(0.9 * 2.5), 20e-6), (DARLINGTON, 0.8, 12.0, 60e-6))
    for row, v_ce, ctr, t_s in kinds:
        coupler = only_coupler(tmp_path, row | {"ctr_curve": "0.01:1 100:1", "i_f_max": "100"})
        q = coupler.transistor
        typical = TypicalUnit(ctr, FLAT, q.h_fe, q.v_be, q.c_be)
        j = (5.0 - v_ce) / 2000.0
        load = Load(j, 5.0, 5.0 - v_ce, 2000.0, 0.0, 25.0)
        _, fall, tenth = edges(typical, q.tau_0 / q.h_fe, q.c_m / q.h_fe, load)
        assert fall == pytest.approx((35e-6 - 20e-6) if v_ce == 0.2 else (300e-6 - 60e-6))
        assert q.tau_s * math.log(0.010 / (j / ctr)) + tenth == pytest.approx(t_s)


def test_the_supply_of_the_row_counts(tmp_path):
    """At a higher supply the junction takes less charge, so that it must be larger for the same time."""
    cells = {"sw_i_c": "2", "sw_r_l": "1000", "sat_r_l": "4.7"}
    low, high = (only_coupler(tmp_path, PHOTOTRANSISTOR | cells, sw_v_cc=v).transistor for v in ("5", "20"))
    assert low.tau_0 < high.tau_0


# ---- one row --------------------------------------------------------------------------------------------------------


def test_one_row_not_saturated_is_split_by_c_cb():
    """c_cb as measured at 5 V: at 0 V it is larger by the junction law."""
    found = switching_constants(UNIT, TYPICAL, PLAIN, "", STATED_C_CB)
    assert found.c_m == pytest.approx(400 * 5e-12 * (1 + 5 / 0.7) ** 0.37)
    assert fall_of(found, PLAIN) == pytest.approx(PLAIN.t)
    assert found.tau_s == pytest.approx(10 * PLAIN.t / math.log(9))
    shown = [schema().show(name, getattr(found, name)) for name in ("tau_0", "c_m", "tau_s")]
    assert [(item.parameter, item.value) for item in found.assumed] == [
        ("tau_0", shown[0]),
        ("c_m", shown[1]),
        ("tau_s", shown[2]),
    ]


def test_one_row_with_the_unit_s_own_capacitance_gives_its_transit_time():
    at_5_v = C_0 * (1 + 5 / 0.7) ** -0.37
    for plain, saturated in ((PLAIN, ""), (None, SATURATED)):
        found = switching_constants(UNIT, TYPICAL, plain, saturated, Filled(at_5_v, None))
        assert (found.tau_0, found.c_m) == (pytest.approx(400 * TRANSIT), pytest.approx(400 * C_0))


def test_one_saturated_row_is_split_by_c_cb():
    found = switching_constants(UNIT, TYPICAL, None, SATURATED, STATED_C_CB)
    assert found.c_m == pytest.approx(400 * float(zero_bias(5e-12, 5.0)))
    assert fall_of(found, SATURATED) == pytest.approx(SATURATED.t)
    assert found.tau_s == pytest.approx(TAU_S, rel=0.01)  # less a first tenth that hardly differs
    assert [item.parameter for item in found.assumed] == ["tau_0", "c_m"]


def test_c_cb_takes_no_more_than_nine_tenths_of_the_row():
    """Of what the emitter junction leaves of it."""
    found = switching_constants(UNIT, TYPICAL, PLAIN, "", Filled(1e-9, None))
    load = Load(0.002, 10.0, 0.2, 100.0, 0.0, 25.0)
    rest, without = edges(TYPICAL, 0.0, 0.0, load)[1], edges(TYPICAL, found.tau_0 / 400, 0.0, load)[1]
    assert fall_of(found, PLAIN) == pytest.approx(PLAIN.t)
    assert without - rest == pytest.approx(0.1 * (PLAIN.t - rest))


def test_a_row_that_the_emitter_junction_fills_errs_on_the_slow_side_and_says_so():
    rest = edges(TYPICAL, 0.0, 0.0, Load(0.002, 10.0, 0.2, 100.0, 0.0, 25.0))[1]
    quick = PlainRow(None, 1.05 * rest, 0.002, 100.0, 10.0)
    found = switching_constants(UNIT, TYPICAL, quick, "", STATED_C_CB)
    assert fall_of(found, quick) == pytest.approx(rest + 0.1 * quick.t)
    assert min(found.tau_0, found.c_m) > 0
    reason = "switching row: c_be alone takes nearly all of its time; so "
    assert [item.parameter for item in found.assumed if item.rule.startswith(reason)] == ["tau_0", "c_m"]


def test_an_assumed_c_cb_is_listed_where_it_is_used(tmp_path):
    one_row = only_coupler(tmp_path, PHOTOTRANSISTOR, c_cb="", sw_t_r="", sw_t_f="")
    assert assumed(one_row)["c_cb"] == "8 pF"
    assert one_row.transistor.c_m == pytest.approx(400 * float(zero_bias(8e-12, 5.0)))


def test_a_row_beyond_the_curve_takes_its_last_ctr():
    short, long = (replace(TYPICAL, curve=Curve((1e-5, end), (1.0, 1.0))) for end in (0.001, 0.1))
    one, other = (switching_constants(UNIT, typical, PLAIN, "", STATED_C_CB) for typical in (short, long))
    assert (one.tau_0, one.c_m) == (pytest.approx(other.tau_0), pytest.approx(other.c_m))


# ---- rows that cannot be ---------------------------------------------------------------------------------------------

SLOWER = "switching rows: the saturated one is not slower, though its load resistor is larger; so "


@pytest.mark.parametrize(
    ("plain", "saturated", "reason"),
    [
        (replace(PLAIN, t_f=12e-6), replace(SATURATED, t_off=SATURATED.t_s + 3e-6), SLOWER),
        (plain_of(c_0=0.0), saturated_of(c_0=-1e-15), SLOWER),
        (
            plain_of(transit=-0.1e-9),
            saturated_of(transit=-0.1e-9),
            "switching rows: they leave no transit time beside the junctions; so ",
        ),
        (plain_of(r_l=1900.0), SATURATED, "switching rows: sat_r_l is not above sw_r_l; so "),
        (plain_of(r_l=2500.0), SATURATED, "switching rows: sat_r_l is not above sw_r_l; so "),
    ],
)
def test_rows_that_contradict_each_other_fall_back_on_c_cb_and_say_so(plain, saturated, reason):
    found = switching_constants(UNIT, TYPICAL, plain, saturated, STATED_C_CB)
    one = switching_constants(UNIT, TYPICAL, plain, "", STATED_C_CB)
    assert (found.tau_0, found.c_m) == (one.tau_0, one.c_m)
    assert found.tau_s == pytest.approx(TAU_S, rel=0.2)  # storage is not in doubt, its first tenth hardly matters
    assert [item.parameter for item in found.assumed] == ["tau_0", "c_m"]
    assert all(item.rule.startswith(reason) for item in found.assumed)


def test_a_saturated_row_that_does_not_saturate_is_not_used_and_says_so():
    weak = SaturatedRow(t_s=20e-6, t_off=40e-6, i_f=0.017, r_l=200.0, v_cc=5.0, v_ce=0.2)  # load needs 16 mA of 17
    found = switching_constants(UNIT, TYPICAL, PLAIN, weak, STATED_C_CB)
    assert found.tau_s == pytest.approx(10 * PLAIN.t / math.log(9))
    reason = "saturated row: sat_i_f, 17 mA, hardly saturates the typical unit, whose load needs 16 mA; so "
    assert [item.parameter for item in found.assumed if item.rule.startswith(reason)] == ["tau_0", "c_m", "tau_s"]
    with pytest.raises(UnusableError, match="hardly saturates"):
        switching_constants(UNIT, TYPICAL, None, weak, STATED_C_CB)
    enough = switching_constants(UNIT, TYPICAL, PLAIN, replace(weak, i_f=0.0177), STATED_C_CB)  # 10 % over 16 mA
    assert not any("hardly saturates" in item.rule for item in enough.assumed)


def test_a_plain_row_that_its_supply_cannot_drive_is_not_used_and_says_so():
    starved = replace(PLAIN, r_l=5000.0)
    found = switching_constants(UNIT, TYPICAL, starved, SATURATED, STATED_C_CB)
    alone = switching_constants(UNIT, TYPICAL, None, SATURATED, STATED_C_CB)
    assert (found.tau_0, found.c_m, found.tau_s) == (alone.tau_0, alone.c_m, alone.tau_s)
    reason = "switching row: sw_v_cc, 10 V, cannot drive sw_i_c, 2 mA, through sw_r_l"
    assert all(item.rule.startswith(f"{reason}; so ") for item in found.assumed)
    with pytest.raises(UnusableError, match=r"cannot drive sw_i_c.*saturated row: sat_i_f empty; there is no other"):
        switching_constants(UNIT, TYPICAL, starved, "saturated row: sat_i_f empty", STATED_C_CB)


def test_storage_within_the_first_tenth_is_taken_whole():
    short = replace(SATURATED, t_s=1e-7, t_off=1e-7 + SATURATED.t)
    found = switching_constants(UNIT, TYPICAL, PLAIN, short, STATED_C_CB)
    assert found.tau_s == pytest.approx(1e-7 / math.log(0.016 / (4.8 / 1900 / 1.5)))
    assert [item.parameter for item in found.assumed] == ["tau_s"]


def test_a_saturated_row_with_a_gap_that_no_rule_fills_says_which(tmp_path):
    coupler = only_coupler(tmp_path, PHOTOTRANSISTOR, sat_i_f="")
    reasons = {item.parameter: item.rule for item in coupler.assumed}
    assert set(reasons) == {"tau_0", "c_m", "tau_s"}
    assert all(reason.startswith("saturated row: sat_i_f empty; so ") for reason in reasons.values())


def test_no_row_at_all_cannot_be_used():
    with pytest.raises(UnusableError, match="all empty; there is no other switching row"):
        switching_constants(UNIT, TYPICAL, None, "", STATED_C_CB)
