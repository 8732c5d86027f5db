"""Small coupler tables for the tests: invented rows, written cell by cell."""

import csv
import io
from pathlib import Path

from optopick.coupler import Coupler, Kind
from optopick.coupler_columns import schema
from optopick.read_couplers import CouplerTable, read_couplers

PHOTOTRANSISTOR = {
    "part": "VELM1",
    "bin": "",
    "kind": "phototransistor",
    "base_pin": "yes",
    "channels": "1",
    "i_f_max": "50",
    "i_f_derate_above": "25",
    "i_f_derate": "0.6",
    "v_r_max": "6",
    "p_led": "80",
    "p_led_derate_above": "25",
    "p_led_derate": "1",
    "p_out": "150",
    "p_out_derate_above": "25",
    "p_out_derate": "2",
    "p_total": "200",
    "p_total_derate_above": "25",
    "p_total_derate": "2.5",
    "v_f_min": "1",
    "v_f_typ": "1.2",
    "v_f_max": "1.4",
    "v_f_at": "10",
    "v_f_tc": "-1.6",
    "led_n": "1.9",
    "led_r_s": "2",
    "ctr_min": "90",
    "ctr_max": "250",
    "ctr_at": "5",
    "ctr_vce": "5",
    "ctr_curve": "0.5:0.6 1:0.75 5:1 10:0.98 20:0.9",
    "ctr_temperature": "-40:0.8 25:1 100:0.6",
    "light_tc": "-0.4",
    "v_ce_sat": "0.3",
    "v_ce_sat_i_f": "10",
    "v_ce_sat_i_c": "2",
    "beta_r": "4",
    "i_c_max": "50",
    "v_ceo": "70",
    "i_ceo": "100",
    "i_ceo_t": "25",
    "i_ceo_hot": "20",
    "i_ceo_hot_t": "85",
    "h_fe_min": "200",
    "h_fe_typ": "400",
    "h_fe_max": "800",
    "c_cb": "6",
    "c_be": "12",
    "v_be": "0.6",
    "v_be_tc": "-1.9",
    "v_be_spread": "40",
    "tau_s_spread": "1.3",
    "sw_t_r": "2",
    "sw_t_f": "3",
    "sw_v_cc": "10",
    "sw_i_c": "2",
    "sw_r_l": "100",
    "sat_t_s": "20",
    "sat_t_off": "35",
    "sat_v_cc": "5",
    "sat_i_f": "10",
    "sat_r_l": "2",
    "ctr_loss": "8",
    "ctr_loss_time": "1000",
    "ctr_loss_i_f": "20",
    "ctr_loss_t": "85",
    "ageing_n": "1.8",
    "ageing_e_a": "0.5",
    "withstand": "5",
    "working": "800",
    "creepage": "7.5",
    "insulation": "reinforced",
    "price": "0.12",
    "sheet": "rev. A p. 2",
}
"""Every column that a rule could fill is filled, so that a test empties just what it is about."""

LOGIC = {name: text for name, text in PHOTOTRANSISTOR.items() if Kind.LOGIC in schema().columns[name].kinds} | {
    "part": "VELM7",
    "kind": "logic",
    "base_pin": "no",
    "i_f_on": "5",
    "i_f_off": "0.5",
    "v_ol": "0.4",
    "i_ol": "13",
    "i_oh": "50",
    "i_cc": "8",
    "v_cc_min": "3",
    "v_cc_max": "5.5",
    "t_phl": "60",
    "t_plh": "75",
    "t_r": "25",
    "t_f": "12",
    "r_l": "350",
    "c_l": "15",
    "c_out": "6",
}

DARLINGTON = PHOTOTRANSISTOR | {
    "part": "VELM4",
    "kind": "darlington",
    "ctr_min": "600",
    "ctr_max": "2400",
    "ctr_at": "1",
    "ctr_curve": "0.2:0.6 1:1 2:1.05 10:0.7",
    "v_ce_sat": "1",
    "h_fe_min": "2000",
    "h_fe_typ": "6000",
    "h_fe_max": "20000",
    "v_be": "1.25",
    "sw_t_r": "30",
    "sw_t_f": "40",
    "sat_t_s": "60",
    "sat_t_off": "300",
}


def write_table(folder: Path, *rows: dict[str, str], name: str = "table.csv") -> Path:
    """Write rows to a table whose header is the union of their columns; the header is line 1."""
    columns = list(dict.fromkeys(column for row in rows for column in row))
    out = io.StringIO()
    writer = csv.DictWriter(out, columns, restval="", lineterminator="\n")
    writer.writeheader()
    writer.writerows(rows)
    path = folder / name
    path.write_text(out.getvalue(), encoding="utf-8")
    return path


def read_table(folder: Path, *rows: dict[str, str]) -> CouplerTable:
    return read_couplers(write_table(folder, *rows))


def only_coupler(folder: Path, row: dict[str, str], **cells: str) -> Coupler:
    """Read a table of one row, with some cells changed, that must give a coupler."""
    table = read_table(folder, row | cells)
    assert table.set_aside == ()
    return table.couplers[0]


def assumed(coupler: Coupler) -> dict[str, str]:
    """What was assumed: parameter and its value as text."""
    return {item.parameter: item.value for item in coupler.assumed}
