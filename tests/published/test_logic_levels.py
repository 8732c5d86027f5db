"""Named sets against what others published: levels of logic inputs and limits of field inputs, each with its source."""

from __future__ import annotations

from pathlib import Path

import pytest

from optopick.brief import Brief, Span
from optopick.errors import InputError
from optopick.keys import named_sets
from optopick.read_brief import brief_from_mapping

# set, supply [V], v_il and v_ih [V] at that supply, source
LEVELS = [
    ("LVCMOS 3.3 V", 3.3, 0.8, 2.0, "maker's table citing JEDEC; JESD8C.01 itself from memory"),
    ("LVTTL 3.3 V", 3.3, 0.8, 2.0, "maker's table citing JEDEC; JESD8C.01 itself from memory"),
    ("LVCMOS 2.5 V", 2.5, 0.7, 1.7, "maker's I/O table; JESD8-5A.01 itself from memory"),
    (
        "LVCMOS 1.8 V",
        1.8,
        0.35 * 1.8,
        0.65 * 1.8,
        "0.35 and 0.65 V_CC, read, document not recorded; JESD8-7A from memory",
    ),
    ("TTL 5 V", 5.0, 0.8, 2.0, "read, document not recorded"),
    ("CMOS 5 V", 5.0, 0.3 * 5.0, 0.7 * 5.0, "0.3 and 0.7 V_DD, from memory"),
    ("74AC14 4.5 V", 4.5, 0.9, 3.2, "upper: TI SCAS915B, largest upper threshold at 4.5 V; lower: from memory"),
]

# type, on [V], off below [V], off current, least and most on current [A], source
FIELD_INPUTS = [
    # Lenze EDKLCMZ3024 p. 62; Siemens A5E00069467-07, 4.6
    ("IEC 61131-2 type 1", Span(15.0, 30.0), 5.0, 0.5e-3, 2e-3, 15e-3),
    # from memory
    ("IEC 61131-2 type 2", Span(11.0, 30.0), 5.0, 2e-3, 6e-3, 30e-3),
    # voltages: Beckhoff EP8601 page, TI SLVAG20; currents from memory
    ("IEC 61131-2 type 3", Span(11.0, 30.0), 5.0, 1.5e-3, 2e-3, 15e-3),
]


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "parts.csv").touch()
    return tmp_path


def brief(folder: Path, drive: dict[str, object], output: dict[str, object]) -> Brief:
    document = {
        "signal": {"rate": "1 kbit/s"},
        "drive": drive,
        "output": {"circuit": "pull-up", **output},
        "environment": {"temperature": ["0 degC", "50 degC"]},
        "stock": {"r_led": {"series": "E24"}, "r_load": {"series": "E24"}},
        "couplers": {"table": "parts.csv"},
        "goal": {"minimize": "power"},
    }
    return brief_from_mapping(document, folder)


def with_logic(folder: Path, name: str, supply: list[float]) -> Brief:
    return brief(folder, {"circuit": "source", "supply": "5 V"}, {"supply": supply, "logic": name})


@pytest.mark.parametrize(("name", "supply", "v_il", "v_ih", "source"), LEVELS)
def test_levels(folder, name, supply, v_il, v_ih, source):
    output = with_logic(folder, name, [supply, supply]).output
    assert (output.v_il.low, output.v_il.high) == pytest.approx((v_il, v_il), rel=1e-12), source
    assert (output.v_ih.low, output.v_ih.high) == pytest.approx((v_ih, v_ih), rel=1e-12), source


def test_every_named_set_is_compared():
    assert set(named_sets("logic_levels.toml")) == {row[0] for row in LEVELS}
    assert set(named_sets("field_inputs.toml")) == {row[0] for row in FIELD_INPUTS}


@pytest.mark.parametrize(
    ("name", "supply", "v_il", "v_ih"),
    [
        ("LVCMOS 1.8 V", [1.65, 1.95], [0.5775, 0.6825], [1.0725, 1.2675]),  # 0.35, 0.65 V_CC: read
        ("CMOS 5 V", [4.5, 5.5], [1.35, 1.65], [3.15, 3.85]),  # 0.3, 0.7 V_DD: from memory
        ("LVCMOS 3.3 V", [3.0, 3.6], [0.8, 0.8], [2.0, 2.0]),  # fixed in volts: maker's table citing JEDEC
        ("TTL 5 V", [4.5, 5.5], [0.8, 0.8], [2.0, 2.0]),  # fixed in volts: read
    ],
)
def test_ratios_follow_the_supply_and_volts_do_not(folder, name, supply, v_il, v_ih):
    output = with_logic(folder, name, supply).output
    assert [output.v_il.low, output.v_il.high] == pytest.approx(v_il, rel=1e-12)
    assert [output.v_ih.low, output.v_ih.high] == pytest.approx(v_ih, rel=1e-12)


@pytest.mark.parametrize(
    ("name", "supply"),
    [("LVCMOS 1.8 V", 3.3), ("CMOS 5 V", 3.3), ("74AC14 4.5 V", 5.0), ("LVCMOS 1.8 V", 1.2)],
)
def test_levels_that_move_with_the_supply_are_refused_at_another(folder, name, supply):
    with pytest.raises(InputError, match="v_il and v_ih of the receiver in its place"):
        with_logic(folder, name, [supply, supply])


def test_five_volt_pull_up_into_a_lower_input_is_allowed(folder):
    """A pull-up may go to another supply than a receiver with levels fixed in volts (5 V-tolerant inputs)."""
    assert with_logic(folder, "LVCMOS 3.3 V", [4.75, 5.25]).output.v_ih == Span(2.0, 2.0)


def test_schmitt_input_is_judged_by_its_outer_thresholds(folder):
    # TI SN74AC14-Q1, SCAS915B, 4.5 V: upper threshold 1.5 min, 2.6 typ, 3.2 max
    v_ih = with_logic(folder, "74AC14 4.5 V", [4.5, 4.5]).output.v_ih
    assert v_ih == Span(3.2, 3.2)


@pytest.mark.parametrize(("name", "on", "off_below", "off_current", "least", "most"), FIELD_INPUTS)
def test_field_inputs(folder, name, on, off_below, off_current, least, most):
    drive = brief(folder, {"circuit": "field", "type": name}, {"supply": "5 V", "logic": "TTL 5 V"}).drive
    assert drive.supply == on
    assert drive.off_voltage == off_below
    assert (drive.off_current, drive.on_current_min, drive.max_current) == (off_current, least, most)
