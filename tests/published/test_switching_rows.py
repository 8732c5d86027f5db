"""A published pair of switching rows: the constants resolved from it give both rows back, by the physics.

Source: Broadcom ACPL-214 data sheet, read. Output not saturated: V_CC 10 V, I_C 2 mA, R_L 100 ohm: t_r 2, t_f 3 µs.
Saturated: V_CC 5 V, I_F 16 mA, R_L 1.9 kohm: t_on 2, t_s 25, t_off 40 µs.
The CTR rank and the other cells are not from that sheet: CTR 50 to 600 % at 5 mA and 5 V is the unranked bin of Toshiba
TLP785 (read), the rest is only there to make the row complete and does not enter.
"""

import math
from itertools import pairwise

import pytest

from optopick.physics import switching
from optopick.physics.charge import Base, Load, zero_bias
from optopick.physics.switching import EDGE
from optopick.physics.transfer import led_current_for
from optopick.read_couplers import read_couplers

ROWS = {
    "sw_t_r": "2",
    "sw_t_f": "3",
    "sw_v_cc": "10",
    "sw_i_c": "2",
    "sw_r_l": "100",
    "sat_t_on": "2",
    "sat_t_s": "25",
    "sat_t_off": "40",
    "sat_v_cc": "5",
    "sat_i_f": "16",
    "sat_r_l": "1.9",
}
REST = {
    "part": "SHEET",
    "kind": "phototransistor",
    "i_f_max": "50",
    "v_f_typ": "1.2",
    "ctr_min": "50",
    "ctr_max": "600",
    "ctr_at": "5",
    "i_ceo": "100",
}


def resolve(tmp_path, **cells):
    row = REST | ROWS | cells
    path = tmp_path / "sheet.csv"
    path.write_text(",".join(row) + "\n" + ",".join(row.values()) + "\n")
    return read_couplers(path).couplers[0]


CTR = math.sqrt(0.5 * 6.0)
CURVES = ["", "0.01:1 50:1", "0.5:0.5 1:0.65 5:1 10:1.1 20:1.05 50:0.8"]


def saturated_load(r_load: float = 1900.0) -> Load:
    """4.8 V of 5 V: a usual unit keeps 0.2 V."""
    return Load(4.8 / r_load, 5.0, 4.8, r_load, 0.0, 25.0)


def base_of(coupler):
    transistor = coupler.transistor
    transit, c_cb = transistor.tau_0 / transistor.h_fe, transistor.c_m / transistor.h_fe
    return Base(transit, c_cb, transistor.c_be, transistor.v_be, CTR / transistor.h_fe)


def fall(coupler, load, cut):
    return float(switching.time_off(switching.steps(base_of(coupler), load, coupler.transfer, CTR, cut), 0.0))


def stored(coupler, load):
    i_sat = led_current_for(coupler.transfer, CTR, 1.0, load.j_s)
    return float(switching.storage(coupler.transistor.tau_s, 0.016, 0.0, i_sat))


@pytest.mark.parametrize("ctr_curve", CURVES)
@pytest.mark.parametrize("gain", ["", "250", "1200"])
def test_both_rows_come_back(tmp_path, ctr_curve, gain):
    coupler = resolve(tmp_path, ctr_curve=ctr_curve, h_fe_typ=gain)
    assert not {"tau_0", "c_m", "tau_s"} & {item.parameter for item in coupler.assumed}
    plain, saturated = Load(2e-3, 10.0, 0.2, 100.0, 0.0, 25.0), saturated_load()
    assert fall(coupler, plain, switching.EDGE) == pytest.approx(3e-6)  # the longer of t_r and t_f
    t_s = stored(coupler, saturated) + fall(coupler, saturated, switching.FIRST_TENTH)
    assert t_s == pytest.approx(25e-6)
    assert t_s + fall(coupler, saturated, switching.EDGE) == pytest.approx(40e-6)


def test_the_rising_row_comes_back_where_it_is_the_longer(tmp_path):
    coupler = resolve(tmp_path, sw_t_r="3", sw_t_f="2")
    edge = switching.steps(base_of(coupler), Load(2e-3, 10.0, 0.2, 100.0, 0.0, 25.0), coupler.transfer, CTR, EDGE)
    lit = led_current_for(coupler.transfer, CTR, 1.0, 2e-3)
    assert float(switching.time_on(edge, lit)) == pytest.approx(3e-6)


def test_the_constants_of_a_flat_ctr_curve_by_hand(tmp_path):
    """Charge between four levels from 10 to 90 %, each 9^(1/3) times the last, over the change of LED current."""
    transistor = resolve(tmp_path, ctr_curve="0.01:1 50:1").transistor
    transit, c_0 = transistor.tau_0 / transistor.h_fe, transistor.c_m / transistor.h_fe

    def junction(v):
        return c_0 * 0.7 / 0.63 * ((1 + v / 0.7) ** 0.63 - 1)

    def charge(x, j, v_cc, swing):
        v_b = 0.65 + 0.025693 * math.log(x * j / 2e-3)
        return transit * x * j + 14e-12 * v_b + junction(v_cc) - junction(v_cc - x * swing - v_b)

    def fall_by_hand(j, v_cc, swing):
        levels = [0.1 * 9 ** (k / 3) for k in range(4)]
        eta = CTR / transistor.h_fe
        taus = (
            (charge(b, j, v_cc, swing) - charge(a, j, v_cc, swing)) / (eta * (b - a) * j / CTR)
            for a, b in pairwise(levels)
        )
        return sum(taus) * math.log(9) / 3

    assert fall_by_hand(2e-3, 10.0, 0.2) == pytest.approx(3e-6, rel=1e-4)
    assert fall_by_hand(4.8 / 1900, 5.0, 4.8) == pytest.approx(15e-6, rel=1e-4)


def test_the_figures_that_the_rules_quote_from_this_sheet(tmp_path):
    """At a CTR of 100 % and a gain of 400; the usual CTR curve."""
    unit = resolve(tmp_path, ctr_min="100", ctr_max="100").transistor
    assert unit.h_fe == pytest.approx(400)
    assert unit.c_m / unit.h_fe == pytest.approx(float(zero_bias(7.6e-12, 5.0)), rel=0.01)
    assert unit.tau_s / (3e-6 / math.log(9)) == pytest.approx(10, abs=0.5)
    middle = resolve(tmp_path).transistor
    assert middle.c_m / middle.h_fe < unit.c_m / unit.h_fe
    assert middle.tau_s / (3e-6 / math.log(9)) == pytest.approx(8, abs=0.5)


@pytest.mark.parametrize("ctr_curve", CURVES)
def test_a_time_at_100_ohm_says_little_of_a_saturated_switch(tmp_path, ctr_curve):
    """The sheet's own lesson: 3 µs not saturated, 40 µs saturated. One row alone must not promise the fast figure."""
    coupler = resolve(tmp_path, ctr_curve=ctr_curve, sat_t_s="", sat_t_off="")
    load = saturated_load()
    t_s = stored(coupler, load) + fall(coupler, load, switching.FIRST_TENTH)
    assert t_s + fall(coupler, load, switching.EDGE) > 40e-6
