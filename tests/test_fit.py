"""The report that sets switching rows beside the times that the constants give for them."""

import math
from pathlib import Path

import pytest
from coupler_tables import DARLINGTON, LOGIC, PHOTOTRANSISTOR, write_table

from optopick.errors import InputError
from optopick.physics import switching
from optopick.physics.charge import Base, Load
from optopick.physics.transfer import led_current_for
from optopick.read_couplers import read_couplers
from optopick.uses.fit import fit_report

CATALOGS = Path(__file__).parents[1] / "catalogs"
BOTH = ("sw_t_r", "sw_t_f", "sat_t_s", "sat_t_off")


def times_of(fitted):
    return {time.column: time for time in fitted.times}


def only_report(folder, row, **cells):
    (fitted,) = fit_report(write_table(folder, row | cells))
    return fitted


@pytest.mark.parametrize("row", [PHOTOTRANSISTOR, DARLINGTON])
def test_rows_that_agree_are_met_but_for_the_shorter_edge(tmp_path, row):
    found = only_report(tmp_path, row)
    times = times_of(found)
    assert tuple(times) == BOTH
    assert found.note == ""
    assert [name for name, time in times.items() if not time.fitted] == ["sw_t_r"]
    assert all(abs(time.residual) < 1e-6 for time in times.values() if time.fitted)
    assert abs(times["sw_t_r"].residual) > 1.0
    assert times["sat_t_off"].given == pytest.approx(float(row["sat_t_off"]) * 1e-6)


def test_the_shorter_edge_is_that_of_the_physics(tmp_path):
    path = write_table(tmp_path, PHOTOTRANSISTOR)
    (found,), coupler = fit_report(path), read_couplers(path).couplers[0]
    ctr, q = math.sqrt(0.9 * 2.5), coupler.transistor
    assert (found.transit, found.c_cb, found.tau_s) == (q.tau_0 / q.h_fe, q.c_m / q.h_fe, q.tau_s)
    base = Base(found.transit, found.c_cb, q.c_be, q.v_be, ctr / q.h_fe)
    edge = switching.steps(base, Load(2e-3, 10.0, 0.2, 100.0, 0.0, 25.0), coupler.transfer, ctr, switching.EDGE)
    lit = led_current_for(coupler.transfer, ctr, 1.0, 2e-3)
    rise = times_of(found)["sw_t_r"]
    assert rise.reproduced == pytest.approx(float(switching.time_on(edge, lit)))
    assert rise.residual == pytest.approx(100 * (rise.reproduced / 2e-6 - 1))


def test_rows_that_contradict_each_other_say_so_and_show_how_far(tmp_path):
    found = only_report(tmp_path, PHOTOTRANSISTOR, sat_t_off="20.5")
    assert found.note.startswith("switching rows: the saturated one is not slower")
    times = times_of(found)
    assert times["sw_t_f"].residual == pytest.approx(0, abs=1e-6)  # what it falls back on
    assert times["sat_t_s"].residual == pytest.approx(0, abs=1e-6)
    assert times["sat_t_off"].residual > 10


def test_a_row_that_does_not_saturate_has_nothing_to_compare(tmp_path):
    found = only_report(tmp_path, PHOTOTRANSISTOR, sat_i_f="0.5")
    assert tuple(times_of(found)) == ("sw_t_r", "sw_t_f")
    assert "hardly saturates the typical unit" in found.note


def test_one_row_is_met_and_nothing_is_wrong_with_it(tmp_path):
    found = only_report(tmp_path, PHOTOTRANSISTOR, sat_t_s="", sat_t_off="")
    assert (tuple(times_of(found)), found.note) == (("sw_t_r", "sw_t_f"), "")
    assert times_of(found)["sw_t_f"].residual == pytest.approx(0, abs=1e-6)


def test_every_bin_is_held_against_the_rows_of_the_part(tmp_path):
    low, high = PHOTOTRANSISTOR | {"bin": "L"}, PHOTOTRANSISTOR | {"bin": "H", "ctr_min": "250", "ctr_max": "600"}
    found = fit_report(write_table(tmp_path, low, high))
    assert [one.part for one in found] == ["VELM1-L", "VELM1-H"]
    for one in found:
        assert all(abs(time.residual) < 1e-6 for time in one.times if time.fitted)


def test_logic_outputs_and_rows_set_aside_are_left_out(tmp_path):
    rows = (LOGIC, PHOTOTRANSISTOR | {"part": "VELM2", "i_f_max": ""}, DARLINGTON)
    assert [one.part for one in fit_report(write_table(tmp_path, *rows))] == ["VELM4"]


def test_every_transistor_of_the_demo_table_is_reported():
    path = CATALOGS / "demo.csv"
    expected = [coupler.part for coupler in read_couplers(path).couplers if coupler.transistor]
    found = fit_report(path)
    assert [one.part for one in found] == expected
    for one in found:
        if not one.note:
            assert all(abs(time.residual) < 1e-6 for time in one.times if time.fitted), one.part


def test_mistakes_of_the_table_are_told(tmp_path):
    with pytest.raises(InputError):
        fit_report(tmp_path / "none.csv")
