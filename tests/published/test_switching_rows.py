"""A published pair of switching rows: the constants resolved from it give both rows back, by the physics.

Source: Broadcom ACPL-214 data sheet, read. Output not saturated: V_CC 10 V, I_C 2 mA, R_L 100 ohm: t_r 2, t_f 3 µs.
Saturated: V_CC 5 V, I_F 16 mA, R_L 1.9 kohm: t_on 2, t_s 25, t_off 40 µs.
The CTR rank and the other cells are not from that sheet: CTR 50 to 600 % at 5 mA and 5 V is the unranked bin of Toshiba
TLP785 (read), the rest is only there to make the row complete and does not enter.
"""

import math

import pytest

from optopick.physics import switching
from optopick.physics.transfer import led_current_for, relative_ctr
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


@pytest.mark.parametrize("ctr_curve", ["", "0.01:1 50:1", "0.5:0.5 1:0.65 5:1 10:1.1 20:1.05 50:0.8"])
def test_both_rows_come_back(tmp_path, ctr_curve):
    coupler = resolve(tmp_path, ctr_curve=ctr_curve)
    transfer, transistor = coupler.transfer, coupler.transistor
    ctr = math.sqrt(0.5 * 6.0)

    def tau(r_load, i_c):
        gain = relative_ctr(transfer, led_current_for(transfer, ctr, 1.0, i_c))
        return switching.time_constant(transistor.tau_0, transistor.c_m, gain, r_load, 0.0)

    i_c_saturated = (5.0 - 0.2) / 1900.0
    i_sat = led_current_for(transfer, ctr, 1.0, i_c_saturated)
    stored = switching.storage(transistor.tau_s, 0.016, 0.0, i_sat)
    assert switching.edge_off(tau(100.0, 0.002), 0.0, 0.002) == pytest.approx(3e-6)  # the longer of t_r and t_f
    assert stored == pytest.approx(25e-6)
    assert stored + switching.edge_off(tau(1900.0, i_c_saturated), 0.0, i_sat) == pytest.approx(40e-6)


def test_the_constants_of_a_flat_ctr_curve_by_hand(tmp_path):
    transistor = resolve(tmp_path, ctr_curve="0.01:1 50:1").transistor
    # 3 µs/ln 9 = 1.365 µs at 100 ohm, 15 µs/ln 9 = 6.827 µs at 1.9 kohm
    assert transistor.c_m == pytest.approx(3.034e-9, rel=1e-3)
    assert transistor.tau_0 == pytest.approx(1.062e-6, rel=1e-3)
    # 16 mA over (4.8 V/1.9 kohm)/1.732 = 1.4586 mA
    assert transistor.tau_s == pytest.approx(25e-6 / math.log(16 / 1.4586), rel=1e-3)


def test_the_figures_that_the_rules_quote_from_this_sheet(tmp_path):
    transistor = resolve(tmp_path, ctr_curve="0.01:1 50:1").transistor
    assert transistor.c_m / 400 == pytest.approx(7.6e-12, rel=0.01)
    assert transistor.tau_s / (3e-6 / math.log(9)) == pytest.approx(8, abs=0.5)


def test_a_time_at_100_ohm_says_little_of_a_saturated_switch(tmp_path):
    """The sheet's own lesson: 3 µs not saturated, 40 µs saturated. One row alone must not promise the fast figure."""
    coupler = resolve(tmp_path, ctr_curve="0.01:1 50:1", sat_t_s="", sat_t_off="")
    transistor = coupler.transistor
    i_sat = (5.0 - 0.2) / 1900.0 / math.sqrt(3.0)
    tau = switching.time_constant(transistor.tau_0, transistor.c_m, 1.0, 1900.0, 0.0)
    t_off = switching.storage(transistor.tau_s, 0.016, 0.0, i_sat) + switching.edge_off(tau, 0.0, i_sat)
    assert t_off > 40e-6
