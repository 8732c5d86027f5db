"""Reading coupler tables: what the cells become, what is passed over, what is set aside."""

import csv
import io
import math
import time
from collections import Counter
from pathlib import Path

import pytest
from coupler_tables import DARLINGTON, LOGIC, PHOTOTRANSISTOR, assumed, only_coupler, read_table, write_table

from optopick.coupler import Kind, Rating
from optopick.coupler_columns import UNITS, schema
from optopick.coupler_curves import Curve
from optopick.errors import InputError
from optopick.physics.transfer import led_current_for, relative_ctr
from optopick.read_couplers import blank_template, columns_markdown, read_couplers
from optopick.stock import read_shelf

CATALOGS = Path(__file__).parents[1] / "catalogs"


def test_a_complete_row_assumes_nothing(tmp_path):
    for row in (PHOTOTRANSISTOR, DARLINGTON, LOGIC):
        assert only_coupler(tmp_path, row).assumed == ()


def test_every_column_that_a_rule_could_fill_is_in_the_complete_rows():
    filled = set(PHOTOTRANSISTOR) | set(LOGIC)
    assert {name for name, column in schema().columns.items() if column.rules} <= filled


def test_a_phototransistor_row_in_si(tmp_path):
    coupler = only_coupler(tmp_path, PHOTOTRANSISTOR, bin="K", maker="Velmora")
    led, transfer, transistor, ageing = coupler.led, coupler.transfer, coupler.transistor, coupler.ageing
    assert (coupler.part, coupler.maker, coupler.kind) == ("VELM1-K", "Velmora", Kind.PHOTOTRANSISTOR)
    assert (coupler.base_pin, coupler.channels, coupler.price, coupler.sheet) == (True, 1, 0.12, "rev. A p. 2")
    assert (coupler.row, coupler.logic) == (2, None)
    assert (led.v_f_min, led.v_f_typ, led.v_f_max, led.i_ref) == (1.0, 1.2, 1.4, 0.01)
    assert (led.n, led.r_s, led.v_f_tc, led.v_r_max) == (1.9, 2.0, -0.0016, 6.0)
    assert led.i_max == Rating(0.05, 25.0, 0.0006)
    assert led.p_max == Rating(0.08, 25.0, 0.001)
    assert coupler.p_out == Rating(0.15, 25.0, 0.002)
    assert coupler.p_total == Rating(0.2, 25.0, 0.0025)
    assert (transfer.ctr_min, transfer.ctr_max, transfer.i_ref, transfer.light_tc) == (0.9, 2.5, 0.005, -0.004)
    assert transfer.curve_i == pytest.approx((0.0005, 0.001, 0.005, 0.01, 0.02))
    assert transfer.curve_g == pytest.approx((0.6, 0.75, 1, 0.98, 0.9))
    assert (transfer.curve_t, transfer.curve_h) == ((-40.0, 25.0, 100.0), (0.8, 1.0, 0.6))
    assert (transistor.h_fe, transistor.v_be, transistor.v_be_tc, transistor.beta_r) == (400.0, 0.6, -0.0019, 4.0)
    assert (transistor.v_be_spread, transistor.tau_s_spread) == (0.04, 1.3)
    assert (transistor.v_ce_sat, transistor.sat_i_f, transistor.sat_i_c) == (0.3, 0.01, 0.002)
    assert (transistor.i_c_max, transistor.v_ceo, transistor.c_be) == (0.05, 70.0, 12e-12)
    assert (transistor.i_ceo_1, transistor.t_1, transistor.i_ceo_2, transistor.t_2) == (1e-7, 25.0, 2e-5, 85.0)
    assert (ageing.loss, ageing.time, ageing.current, ageing.temperature) == (0.08, 1000.0, 0.02, 85.0)
    assert (ageing.n, ageing.e_a) == (1.8, 0.5)
    barrier = coupler.barrier
    assert (barrier.withstand, barrier.working, barrier.creepage) == (5000.0, 800.0, 0.0075)
    assert barrier.insulation == "reinforced"


def test_a_logic_row_in_si(tmp_path):
    coupler = only_coupler(tmp_path, LOGIC)
    logic = coupler.logic
    assert (coupler.kind, coupler.transfer, coupler.transistor) == (Kind.LOGIC, None, None)
    assert (logic.i_f_on, logic.i_f_off, logic.v_ol, logic.i_ol) == (0.005, 0.0005, 0.4, 0.013)
    assert (logic.i_oh, logic.i_cc, logic.v_cc_min, logic.v_cc_max) == (50e-6, 0.008, 3.0, 5.5)
    assert (logic.t_phl, logic.t_plh, logic.t_r, logic.t_f) == (60e-9, 75e-9, 25e-9, 12e-9)
    assert (logic.r_l, logic.c_l, logic.c_out) == (350.0, 15e-12, 6e-12)


@pytest.mark.parametrize(
    ("column", "plain", "quantity"),
    [
        ("i_f_max", "60", "60 mA"),
        ("i_f_max", "60", "0.06 A"),
        ("ctr_min", "55", "55 %"),
        ("light_tc", "-0.5", "-0.5 %/K"),
        ("i_f_derate", "0.7", "0.7 mA/K"),
        ("p_led", "70", "70 mW"),
        ("p_led_derate", "1.1", "1.1 mW/°C"),
        ("v_f_tc", "-1.5", "-1.5 mV/K"),
        ("i_ceo", "50", "0.05 uA"),
        ("i_ceo_hot", "500", "500 µA"),
        ("c_be", "8", "8 pF"),
        ("v_be_spread", "30", "0.03 V"),
        ("sat_r_l", "1.9", "1k9"),
        ("sat_t_s", "25", "25 us"),
        ("withstand", "3.75", "3750 V"),
        ("creepage", "6", "6 mm"),
        ("ctr_loss_time", "24", "1 day"),
        ("i_ceo_hot_t", "100", "100 degC"),
        ("ageing_e_a", "0.4", "0.4 eV"),
    ],
)
def test_a_quantity_with_its_unit_means_the_plain_number(tmp_path, column, plain, quantity):
    first = only_coupler(tmp_path, PHOTOTRANSISTOR, **{column: plain})
    assert first == only_coupler(tmp_path, PHOTOTRANSISTOR, **{column: quantity})
    assert first != only_coupler(tmp_path, PHOTOTRANSISTOR)


def test_every_unit_of_the_schema_converts_there_and_back():
    for unit in UNITS.values():
        assert unit.from_si(unit.to_si(3.7)) == pytest.approx(3.7)
    assert {column.unit for column in schema().columns.values()} <= set(UNITS)


@pytest.mark.parametrize("word", ["", "-", "–", "n/a", "N/A", "  "])
def test_words_for_an_empty_cell(tmp_path, word):
    assert only_coupler(tmp_path, PHOTOTRANSISTOR, withstand=word).barrier.withstand is None
    assert only_coupler(tmp_path, PHOTOTRANSISTOR, price=word).price is None


def test_the_curves_are_scaled_whatever_their_scale(tmp_path):
    scaled = only_coupler(
        tmp_path, PHOTOTRANSISTOR, ctr_curve="0.5:60 1:75 5:100 10:98 20:90", ctr_temperature="-40:160 25:200 100:120"
    )
    plain = only_coupler(tmp_path, PHOTOTRANSISTOR)
    assert scaled.transfer.curve_g == pytest.approx(plain.transfer.curve_g)
    assert scaled.transfer.curve_h == pytest.approx(plain.transfer.curve_h)


def test_the_curve_is_scaled_between_its_points_in_logarithms(tmp_path):
    transfer = only_coupler(tmp_path, PHOTOTRANSISTOR, ctr_at="2", ctr_curve="1:0.5 4:1 20:0.9").transfer
    at_two = math.sqrt(0.5)  # half way from 1 to 4 in logarithms, so the geometric mean
    assert transfer.curve_g == pytest.approx((0.5 / at_two, 1 / at_two, 0.9 / at_two))
    assert relative_ctr(transfer, 0.002) == pytest.approx(1.0)


def test_the_temperature_curve_is_scaled_between_its_points_linearly(tmp_path):
    transfer = only_coupler(tmp_path, PHOTOTRANSISTOR, ctr_temperature="0:0.9 50:1.1 100:0.6").transfer
    assert transfer.curve_h == pytest.approx((0.9, 1.1, 0.6))
    transfer = only_coupler(tmp_path, PHOTOTRANSISTOR, ctr_temperature="0:1 100:0.6").transfer
    assert transfer.curve_h == pytest.approx((1 / 0.9, 0.6 / 0.9))


def test_the_curve_arithmetic_is_that_of_the_physics(tmp_path):
    transfer = only_coupler(tmp_path, PHOTOTRANSISTOR).transfer
    curve = Curve(transfer.curve_i, transfer.curve_g)
    for i in (0.0001, 0.0007, 0.003, 0.0199):
        assert curve.log_at(i) == pytest.approx(float(relative_ctr(transfer, i)))
    for j in (0.00005, 0.0011, 0.006, 0.0179, 0.5):
        assert curve.x_carrying(j / 1.3) == pytest.approx(float(led_current_for(transfer, 1.3, 1.0, j)))


def test_comments_blank_lines_and_padded_lines_keep_the_line_numbers(tmp_path):
    header, row = write_table(tmp_path, PHOTOTRANSISTOR).read_text().splitlines()
    padding = "," * header.count(",")
    quoted = '"# quoted, padded"' + padding[1:]
    text = f'# a comment, with "one quote\n\n{header}\n  # indented\n{padding}\n{quoted}\n{row}\n'
    path = tmp_path / "spaced.csv"
    path.write_text(text)
    assert read_couplers(path).couplers[0].row == 7


def test_a_cell_of_two_lines_keeps_the_line_numbers(tmp_path):
    rows = [PHOTOTRANSISTOR | {"part": "A", "sheet": '"two\nlines"'}, PHOTOTRANSISTOR | {"part": "B", "ctr_min": "x"}]
    with pytest.raises(InputError) as raised:
        read_table(tmp_path, *rows)
    assert [mistake.where for mistake in raised.value.mistakes] == [
        "table.csv line 2, column sheet",
        "table.csv line 4, column ctr_min",
    ]


@pytest.mark.parametrize("delimiter", [",", ";", "\t"])
@pytest.mark.parametrize("newline", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("mark", ["", "\ufeff"])
def test_delimiters_line_ends_and_byte_order_mark(tmp_path, delimiter, newline, mark):
    expected = read_table(tmp_path, PHOTOTRANSISTOR)
    out = io.StringIO()
    csv.writer(out, delimiter=delimiter, lineterminator=newline).writerows(
        csv.reader(expected.path.read_text().splitlines())
    )
    path = tmp_path / "other.csv"
    path.write_bytes((mark + out.getvalue()).encode())
    assert read_couplers(path).couplers == expected.couplers


def test_the_header_is_read_in_any_case_and_order(tmp_path):
    shuffled = {name.upper(): PHOTOTRANSISTOR[name] for name in sorted(PHOTOTRANSISTOR)}
    assert read_table(tmp_path, shuffled).couplers == read_table(tmp_path, PHOTOTRANSISTOR).couplers


def test_bins_of_one_part_are_rows_of_their_own(tmp_path):
    rows = [PHOTOTRANSISTOR | {"bin": name} for name in ("", "A", "B")]
    assert [coupler.part for coupler in read_table(tmp_path, *rows).couplers] == ["VELM1", "VELM1-A", "VELM1-B"]


def test_barrier_figures_are_never_filled(tmp_path):
    barrier = only_coupler(
        tmp_path, PHOTOTRANSISTOR, withstand="", working="", creepage="", insulation="", price="", maker="", sheet=""
    ).barrier
    assert (barrier.withstand, barrier.working, barrier.creepage, barrier.insulation) == (None, None, None, "")


@pytest.mark.parametrize(
    ("row", "cells", "reason"),
    [
        (PHOTOTRANSISTOR, {"kind": ""}, "kind: empty, and no rule fills it"),
        (PHOTOTRANSISTOR, {"i_f_max": ""}, "i_f_max: empty, and no rule fills it"),
        (PHOTOTRANSISTOR, {"ctr_min": "", "ctr_at": ""}, "ctr_min, ctr_at: empty, and no rule fills them"),
        (LOGIC, {"i_ol": "", "t_phl": ""}, "i_ol, t_phl: empty, and no rule fills them"),
        (
            PHOTOTRANSISTOR,
            {"v_f_min": "", "v_f_typ": "", "v_f_max": ""},
            "v_f_min, v_f_typ, v_f_max: all empty, and no rule fills them",
        ),
        (
            PHOTOTRANSISTOR,
            {"i_ceo": "", "i_ceo_hot": ""},
            "i_ceo, i_ceo_hot: both empty, and no rule fills them",
        ),
        (PHOTOTRANSISTOR, {"i_ceo_hot_t": ""}, "i_ceo_hot_t: empty, and no rule fills it"),
        (
            PHOTOTRANSISTOR,
            {"i_f_derate": "", "i_f_derate_above": "100"},
            "i_f_derate: empty, and i_f_derate_above lies at or above 100 °C, where the rule ends",
        ),
        (
            PHOTOTRANSISTOR,
            {"ctr_curve": "", "ctr_at": "50.1", "i_f_max": "60"},
            "ctr_curve: empty, and the usual curve does not reach ctr_at, 50.1 mA",
        ),
        (
            PHOTOTRANSISTOR,
            {"v_ce_sat_i_f": "30"},
            "v_ce_sat_i_f: 30 mA lies beyond the end of ctr_curve, 20 mA",
        ),
        (
            PHOTOTRANSISTOR,
            {"v_ce_sat_i_c": "8.45"},
            "v_ce_sat: the weakest unit carries 8.82 mA at v_ce_sat_i_f, hardly v_ce_sat_i_c, 8.45 mA",
        ),
        (
            PHOTOTRANSISTOR,
            {"h_fe_typ": "", "h_fe_min": "", "h_fe_max": "", "ctr_min": "4", "ctr_max": "16", "ctr_cb": "2"}
            | {"v_ce_sat_i_c": "0.1"},
            "h_fe_typ: empty, and CTR over ctr_cb gives a gain of only 4",
        ),
        (
            PHOTOTRANSISTOR,
            {"sw_t_r": "", "sw_t_f": "", "sat_t_s": "", "sat_t_off": ""},
            "sw_t_r, sw_t_f, sat_t_s, sat_t_off: all empty; there is no other switching row",
        ),
        (
            PHOTOTRANSISTOR,
            {"sw_t_r": "", "sw_t_f": "", "sat_i_f": "", "sat_r_l": ""},
            "saturated row: sat_i_f and sat_r_l empty; there is no other switching row",
        ),
        (
            PHOTOTRANSISTOR,
            {"sw_t_r": "", "sw_t_f": "", "sat_r_l": "0.25"},
            "saturated row: sat_i_f, 10 mA, hardly saturates the typical unit, whose load needs 13.6 mA; "
            "there is no other switching row",
        ),
        (
            PHOTOTRANSISTOR,
            {"sw_t_r": "", "sw_t_f": "", "sat_r_l": "0.1"},
            "saturated row: sat_i_f, 10 mA, hardly saturates the typical unit, whose load needs more than the CTR "
            "curve shows; there is no other switching row",
        ),
    ],
)
def test_a_gap_that_no_rule_fills_sets_the_row_aside_and_the_others_go_on(tmp_path, row, cells, reason):
    table = read_table(tmp_path, row | {"part": "FIRST"} | cells, row | {"part": "SECOND"})
    assert [(item.part, item.row, item.reason) for item in table.set_aside] == [("FIRST", 2, reason)]
    assert [coupler.part for coupler in table.couplers] == ["SECOND"]


def test_the_saturation_row_is_believed_down_to_an_overdrive_of_1_05(tmp_path):
    # 0.9*0.98*10 mA/8.35 mA = 1.056
    assert only_coupler(tmp_path, PHOTOTRANSISTOR, v_ce_sat_i_c="8.35").transistor.sat_i_c == 0.00835


@pytest.mark.parametrize("ctr_at", ["1", "15.88"])
def test_the_test_current_may_be_an_end_of_the_curve(tmp_path, ctr_at):
    # 15.88 mA becomes 0.01588 A and comes back as a little more than 15.88 mA
    transfer = only_coupler(tmp_path, PHOTOTRANSISTOR, ctr_at=ctr_at, ctr_curve="1:0.75 10:1 15.88:0.9").transfer
    assert relative_ctr(transfer, transfer.i_ref) == pytest.approx(1.0)


@pytest.mark.parametrize("i_f", ["10", "20"])
def test_the_saturation_row_may_stand_at_the_end_of_the_curve(tmp_path, i_f):
    curve = f"0.5:0.6 1:0.75 5:1 {i_f}:0.9"
    assert only_coupler(tmp_path, PHOTOTRANSISTOR, v_ce_sat_i_f=i_f, ctr_curve=curve).transistor.sat_i_f > 0


def test_a_thousand_rows_in_well_under_a_second(tmp_path):
    rows = [PHOTOTRANSISTOR | {"bin": str(k), "ctr_min": f"{100 + k / 1000:.3f}"} for k in range(1000)]
    gappy = [row | dict.fromkeys(("v_f_tc", "c_cb", "sat_t_s", "ctr_loss", "p_out"), "") for row in rows]
    path = write_table(tmp_path, *gappy)
    start = time.process_time()  # not wall time: other work on the machine is no concern of this test
    table = read_couplers(path)
    assert time.process_time() - start < 0.8
    assert len(table.couplers) == 1000


def test_the_template_is_read_as_a_table_without_rows(tmp_path):
    path = tmp_path / "blank.csv"
    path.write_text(blank_template(), encoding="utf-8")
    with pytest.raises(InputError, match="no rows"):
        read_couplers(path)
    template = blank_template().splitlines()
    assert template[-1].split(",") == list(schema().columns)
    assert "# ctr_at [mA]: LED current at which CTR is stated" in template
    assert "# part: Part number without its bin" in template
    assert "# beta_r: Reverse current gain" in template
    path.write_text(blank_template() + ",".join(PHOTOTRANSISTOR.get(name, "") for name in schema().columns) + "\n")
    assert read_couplers(path).couplers[0].part == "VELM1"


def test_the_schema_names_only_rules_and_columns_that_exist():
    known = schema()
    for column in known.columns.values():
        assert column.gap in ("mistake", "row", "open") or column.rules
        assert set(column.rules) <= set(known.rules)
    assert {name for names, _ in known.orders for name in names} <= set(known.columns)


def test_every_rule_can_say_what_it_does():
    for rule in schema().rules.values():
        assert "{" not in rule.general_sentence() + rule.words(Kind.PHOTOTRANSISTOR) + rule.words(Kind.DARLINGTON)
        assert rule.source


def test_the_demo_table_is_usable_and_says_that_it_is_invented():
    path = CATALOGS / "demo.csv"
    table = read_couplers(path)
    kinds = Counter(coupler.kind for coupler in table.couplers)
    assert len(table.couplers) >= 62
    assert kinds[Kind.PHOTOTRANSISTOR] >= 40
    assert kinds[Kind.DARLINGTON] >= 12
    assert kinds[Kind.LOGIC] >= 10
    assert {coupler.base_pin for coupler in table.couplers} == {True, False}
    assert {coupler.channels for coupler in table.couplers} == {1, 2, 4}
    assert len({coupler.maker for coupler in table.couplers}) == 5
    assert [(item.part, item.reason) for item in table.set_aside] == [
        ("PYRA29", "ctr_at: empty, and no rule fills it"),
        ("KESTRO62", "t_plh: empty, and no rule fills it"),
    ]
    assert "INVENTED" in path.read_text(encoding="utf-8").splitlines()[0]
    assert "c_m" in assumed(next(coupler for coupler in table.couplers if coupler.part == "KESTRO28-L"))


PLAUSIBLE = {
    # transit time [s], collector junction at 0 V [F], storage constant [s], gain [1]: least and most
    Kind.PHOTOTRANSISTOR: ((0.4e-9, 6e-9), (2e-12, 25e-12), (0.5e-6, 40e-6), (70, 3000)),
    Kind.DARLINGTON: ((1e-9, 12e-9), (2e-12, 30e-12), (10e-6, 250e-6), (3000, 30000)),
}


def test_the_demo_table_resolves_to_plausible_transistors():
    for coupler in read_couplers(CATALOGS / "demo.csv").couplers:
        if coupler.kind is Kind.LOGIC:
            continue
        transistor = coupler.transistor
        constants = (transistor.tau_0 / transistor.h_fe, transistor.c_m / transistor.h_fe, transistor.tau_s)
        for constant, (low, high) in zip((*constants, transistor.h_fe), PLAUSIBLE[coupler.kind], strict=True):
            assert low < constant < high, coupler.part
        assert transistor.i_ceo_2 > transistor.i_ceo_1
        assert not any("; so " in item.rule for item in coupler.assumed), coupler.part  # its rows agree


def test_the_demo_darlingtons_are_slow_and_strong():
    for coupler in read_couplers(CATALOGS / "demo.csv").couplers:
        if coupler.kind is Kind.DARLINGTON:
            assert 6.0 <= coupler.transfer.ctr_min < coupler.transfer.ctr_max <= 75.0
            assert 0.9 <= coupler.transistor.v_ce_sat <= 1.2
            assert 10e-6 < coupler.transistor.tau_0 < 150e-6


def test_the_demo_logic_outputs_span_fast_slow_and_frugal():
    logic = {c.part: c.logic for c in read_couplers(CATALOGS / "demo.csv").couplers if c.kind is Kind.LOGIC}
    assert min(one.i_f_on for one in logic.values()) == 0.5e-3
    assert max(one.i_f_on for one in logic.values()) == 5e-3
    assert min(one.t_phl for one in logic.values()) == pytest.approx(50e-9)
    assert max(one.t_plh for one in logic.values()) > 2e-6
    assert {(one.v_cc_min, one.v_cc_max) for one in logic.values()} >= {(3.0, 5.5), (4.5, 5.5), (4.5, 20.0)}
    assert all(0.4 <= one.v_ol <= 0.6 and 4e-3 <= one.i_ol <= 16e-3 for one in logic.values())


def test_the_shelf_list_can_be_read():
    assert len(read_shelf(CATALOGS / "shelf.csv")) > 30


def test_the_page_of_columns_is_up_to_date():
    page = (CATALOGS / "README.md").read_text(encoding="utf-8")
    assert columns_markdown() in page
