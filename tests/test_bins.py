"""The bins of one part share the typical unit of its data sheet: same light, gain in proportion to CTR."""

import math
from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from coupler_tables import DARLINGTON, LOGIC, PHOTOTRANSISTOR, assumed, only_coupler, read_table
from hypothesis import given
from hypothesis import strategies as st
from random_links import brief

from optopick.brief import OutputCircuit
from optopick.coupler_columns import schema
from optopick.coupler_sheets import GAIN, SWITCHING, Bin
from optopick.recheck import review
from optopick.result import Design

LOW = {"bin": "L", "ctr_min": "50", "ctr_max": "100"}
HIGH = {"bin": "H", "ctr_min": "200", "ctr_max": "400"}
MIDDLE = {"bin": "M", "ctr_min": "100", "ctr_max": "200"}
WHOLE = {"bin": "W", "ctr_min": "50", "ctr_max": "400"}
PART = math.sqrt(0.5 * 4.0)


def bins(folder, *cells, row=PHOTOTRANSISTOR):
    """The couplers of one part's rows, by bin."""
    table = read_table(folder, *(row | own for own in cells))
    assert table.set_aside == ()
    return {coupler.part.rpartition("-")[2]: coupler for coupler in table.couplers}


def test_a_high_bin_is_slower_than_a_low_one_in_proportion_to_ctr(tmp_path):
    found = bins(tmp_path, LOW, HIGH)
    low, high = found["L"].transistor, found["H"].transistor
    for name in ("h_fe", "tau_0", "c_m"):
        assert getattr(high, name) == pytest.approx(4 * getattr(low, name))
        assert getattr(high, name) * getattr(low, name) == pytest.approx(getattr(typical(tmp_path), name) ** 2)
    assert high.tau_s == low.tau_s == typical(tmp_path).tau_s


def typical(folder, row=PHOTOTRANSISTOR):
    """The part's typical unit: that of one row over all of its CTR."""
    return only_coupler(folder, row, **WHOLE).transistor


@pytest.mark.parametrize("r_be", [None, 470e3])
def test_the_same_link_has_a_slower_edge_and_longer_storage_with_the_high_bin(tmp_path, r_be):
    found, link = bins(tmp_path, LOW, HIGH), brief(np.random.default_rng(7), circuit=OutputCircuit.PULL_UP)
    timing = {name: review(link, coupler, Design("", 1e3, 4.7e3, r_be, None)).timing for name, coupler in found.items()}
    assert timing["H"].edge_off > 1.5 * timing["L"].edge_off
    assert timing["H"].storage > timing["L"].storage


def test_the_middle_bin_is_the_part_itself_and_assumes_nothing(tmp_path):
    for coupler in (bins(tmp_path, LOW, WHOLE, HIGH)["W"], bins(tmp_path, LOW, MIDDLE, HIGH)["M"]):
        transistor, whole = coupler.transistor, typical(tmp_path)
        assert (transistor.h_fe, transistor.tau_0, transistor.c_m) == tuple(
            pytest.approx(getattr(whole, name)) for name in ("h_fe", "tau_0", "c_m")
        )
        assert assumed(coupler) == {}


def test_the_factor_is_listed_once(tmp_path):
    found = bins(tmp_path, LOW, HIGH)
    assert assumed(found["L"]) == {"bin_gain": "0.5"}
    assert assumed(found["H"]) == {"bin_gain": "2"}
    rule = next(item.rule for item in found["H"].assumed)
    assert "geometric mean of the smallest ctr_min and the largest ctr_max" in rule
    assert len(found["H"].assumed) == 1


@pytest.mark.parametrize("row", [PHOTOTRANSISTOR, DARLINGTON])
@pytest.mark.parametrize("other", [{"part": "VELM9"}, {"ctr_at": "2"}])
def test_a_part_with_one_bin_is_unchanged_by_other_parts_and_other_test_currents(tmp_path, row, other):
    alone = only_coupler(tmp_path, row, bin="A")
    second = row | {"bin": "B", "ctr_max": "9000"} | other
    assert read_table(tmp_path, row | {"bin": "A"}, second).couplers[0] == alone


def test_logic_outputs_have_no_bins(tmp_path):
    found = read_table(tmp_path, LOGIC | {"bin": "A"}, LOGIC | {"bin": "B", "t_phl": "90"})
    assert [coupler.assumed for coupler in found.couplers] == [(), ()]


def test_the_case_of_the_part_name_makes_no_difference(tmp_path):
    found = read_table(tmp_path, PHOTOTRANSISTOR | LOW, PHOTOTRANSISTOR | HIGH | {"part": "velm1"})
    assert [coupler.assumed[0].value for coupler in found.couplers] == ["0.5", "2"]


def test_a_row_that_is_set_aside_still_tells_how_wide_the_part_is(tmp_path):
    table = read_table(tmp_path, PHOTOTRANSISTOR | LOW | {"i_f_max": ""}, PHOTOTRANSISTOR | HIGH)
    assert [aside.part for aside in table.set_aside] == ["VELM1-L"]
    assert assumed(table.couplers[0]) == {"bin_gain": "2"}


def test_a_bin_without_ctr_max_reaches_to_what_the_rule_gives(tmp_path):
    found = bins(tmp_path, LOW, {"bin": "H", "ctr_min": "100", "ctr_max": ""})  # 100 % to 400 %
    assert assumed(found["H"]) == {"ctr_max": "400 %", "bin_gain": "1.41"}


# ---- figures that differ from bin to bin ----------------------------------------------------------------------------


def test_gains_that_differ_are_the_bins_own_and_the_times_still_follow_ctr(tmp_path):
    found = bins(tmp_path, LOW | {"h_fe_typ": "300"}, HIGH | {"h_fe_typ": "700"})
    low, high = found["L"].transistor, found["H"].transistor
    assert (low.h_fe, high.h_fe) == (300.0, 700.0)
    # the rows are those of a unit in the middle, which with each bin's own gain has another light
    of_low, of_high = (typical(tmp_path, PHOTOTRANSISTOR | {"h_fe_typ": h_fe}) for h_fe in ("600", "350"))
    assert (low.tau_0, low.c_m) == (pytest.approx(of_low.tau_0 / 2), pytest.approx(of_low.c_m / 2))
    assert (high.tau_0, high.c_m) == (pytest.approx(of_high.tau_0 * 2), pytest.approx(of_high.c_m * 2))
    assert assumed(found["H"]) == {"bin_gain": "2"}


def test_times_that_differ_are_the_bins_own_and_the_gain_still_follows_ctr(tmp_path):
    found = bins(tmp_path, LOW | {"sat_t_off": "30"}, HIGH)
    alone = only_coupler(tmp_path, PHOTOTRANSISTOR, **HIGH, h_fe_typ="800").transistor
    high = found["H"].transistor
    assert (high.tau_0, high.c_m, high.tau_s) == tuple(map(pytest.approx, (alone.tau_0, alone.c_m, alone.tau_s)))
    assert high.h_fe == pytest.approx(800)
    assert assumed(found["H"]) == {"bin_gain": "2"}


def test_with_both_their_own_nothing_is_moved(tmp_path):
    rows = (LOW | {"h_fe_typ": "300", "sw_t_f": "2.5"}, HIGH)
    assert bins(tmp_path, *rows)["H"] == replace(only_coupler(tmp_path, PHOTOTRANSISTOR, **HIGH), row=3)


def test_a_time_that_one_bin_lacks_is_a_difference_too(tmp_path):
    found = bins(tmp_path, LOW, HIGH | {"sat_t_s": "", "sat_t_off": ""})
    alone = only_coupler(tmp_path, PHOTOTRANSISTOR, **LOW, h_fe_typ="200").transistor
    assert found["L"].transistor.tau_0 == pytest.approx(alone.tau_0)


# ---- what rules fill in ---------------------------------------------------------------------------------------------


def test_gain_between_its_extremes_is_that_of_the_part(tmp_path):
    rows = [own | {"h_fe_typ": ""} for own in (LOW, HIGH)]
    found = bins(tmp_path, *rows)
    assert [found[name].transistor.h_fe for name in "LH"] == [pytest.approx(200), pytest.approx(800)]
    assert assumed(found["H"]) == {"bin_gain": "2", "h_fe_typ": "800"}  # sqrt(200*800) times 2


@pytest.mark.parametrize("light", [{"ctr_cb": "0.5"}, {"h_fe_min": ""}])
def test_gain_from_light_follows_the_bin_by_itself(tmp_path, light):
    rows = [own | {"h_fe_typ": ""} | light for own in (LOW, HIGH)]
    found, usual = bins(tmp_path, *rows), 0.005 if "ctr_cb" in light else 0.0025
    for name, ctr in (("L", math.sqrt(0.5)), ("H", math.sqrt(8.0))):
        assert found[name].transistor.h_fe == pytest.approx(ctr / usual)
        assert assumed(found[name])["h_fe_typ"] == schema().show("h_fe_typ", ctr / usual)


def test_one_row_is_split_by_the_gain_of_the_part_and_then_moved(tmp_path):
    one_row = {"sat_t_s": "", "sat_t_off": ""}
    found, whole = bins(tmp_path, LOW | one_row, HIGH | one_row), typical(tmp_path, PHOTOTRANSISTOR | one_row)
    high = found["H"].transistor
    assert high.c_m == pytest.approx(2 * whole.c_m)
    assert high.tau_0 == pytest.approx(2 * whole.tau_0)
    assert high.tau_s == pytest.approx(whole.tau_s)
    told = assumed(found["H"])
    assert {name: told[name] for name in ("c_m", "tau_0")} == {
        name: schema().show(name, getattr(high, name)) for name in ("c_m", "tau_0")
    }


def test_gains_of_their_own_split_one_row_of_the_part(tmp_path):
    one_row = {"sat_t_s": "", "sat_t_off": ""}
    found = bins(tmp_path, LOW | one_row | {"h_fe_typ": "200"}, HIGH | one_row | {"h_fe_typ": "600"})
    assert found["H"].transistor.c_m == pytest.approx(3 * found["L"].transistor.c_m)


# ---- the physics of it ----------------------------------------------------------------------------------------------


@given(edges=st.lists(st.floats(0.2, 8.0), min_size=3, max_size=5, unique=True).map(sorted))
def test_a_unit_is_as_fast_in_whatever_bin_it_is_sold(tmp_path_factory, edges):
    """Bins sort units, they do not change them: light, transit time, junction and storage are those of the sheet."""
    folder = tmp_path_factory.mktemp("bins")
    ends = [*pairwise(edges), (edges[0], edges[-1])]
    cells = [{"bin": str(k), "ctr_min": f"{100 * a}", "ctr_max": f"{100 * b}"} for k, (a, b) in enumerate(ends)]
    point = {"v_ce_sat_i_c": "0.1", "sw_i_c": "0.5", "sat_r_l": "10"}  # so that the weakest of them still saturates
    seen = set()
    for coupler in bins(folder, *cells, row=PHOTOTRANSISTOR | point).values():
        transfer, transistor = coupler.transfer, coupler.transistor
        light = math.sqrt(transfer.ctr_min * transfer.ctr_max) / transistor.h_fe
        transit, junction = transistor.tau_0 / transistor.h_fe, transistor.c_m / transistor.h_fe
        seen.add(tuple(f"{constant:.9e}" for constant in (light, transit, junction, transistor.tau_s)))
    assert len(seen) == 1


def test_only_columns_that_agree_speak_of_the_part():
    bin_ = Bin(2.0, 1.0, frozenset(GAIN))
    assert bin_.gain_over(*GAIN) == 2.0
    assert bin_.gain_over("h_fe_typ") == 2.0
    assert bin_.gain_over(*SWITCHING) == 1.0
    assert bin_.gain_over("h_fe_typ", "sw_t_r") == 1.0
