"""Positions from a series and from a shelf list, and every mistake of a list at once."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from optopick.errors import InputError
from optopick.eseries import SERIES
from optopick.stock import (
    DEFAULT_HIGH,
    DEFAULT_LOW,
    ShelfRow,
    read_shelf,
    reduced,
    series_position,
    shelf_position,
    voltage_limit,
)
from optopick.units import format_resistor

DEFAULTS = {"tolerance": 0.01, "power": 0.1, "voltage": None, "absent": False}


def shelf(folder: Path, text: str) -> Path:
    path = folder / "shelf.csv"
    path.write_text(text, encoding="utf-8")
    return path


def mistakes(folder: Path, text: str) -> list[str]:
    with pytest.raises(InputError) as refusal:
        read_shelf(shelf(folder, text))
    return [str(mistake) for mistake in refusal.value.mistakes]


@pytest.mark.parametrize(
    ("power", "limit"),
    [
        (0.05, 25),
        (0.0624, 25),
        (0.0625, 50),
        (0.09, 50),
        (0.1, 75),
        (0.125, 150),  # 0805 chip, 0.125 W and 150 V: two makers, see published-checks
        (0.2, 150),
        (0.25, 200),
        (0.4, 200),
        (0.5, 250),
        (3, 250),
    ],
)
def test_voltage_limit_of_a_rating(power, limit):
    # all but the 0.125 W row from memory
    assert voltage_limit(power) == limit


def test_series_position():
    position = series_position("E24", DEFAULT_LOW, DEFAULT_HIGH, tolerance=0.01, power=0.25, voltage=None, absent=True)
    assert len(position.values) == 121
    assert position.values[:3] == (10.0, 11.0, 12.0)
    assert position.values[-1] == 1e6
    assert set(position.tolerance) == {0.01}
    assert set(position.power) == {0.25}
    assert set(position.voltage) == {200.0}
    assert set(position.price) == {None}
    assert position.absent
    assert position.described == "E24, 10 Ω to 1 MΩ"


def test_a_stated_voltage_wins_over_the_rating():
    position = series_position("E3", 10, 100, tolerance=0.05, power=0.25, voltage=500.0, absent=False)
    assert position.voltage == (500.0,) * 4
    assert not position.absent


def test_series_mistakes_are_value_errors():
    with pytest.raises(ValueError, match="unknown series"):
        series_position("E20", 10, 100, **DEFAULTS)
    with pytest.raises(ValueError, match="the lowest first"):
        series_position("E24", 100, 10, **DEFAULTS)


@given(st.sampled_from(SERIES), st.floats(1, 1e5), st.floats(3, 1e3))
def test_all_columns_of_a_position_go_with_its_values(name, low, ratio):
    position = series_position(name, low, low * ratio, **DEFAULTS)
    columns = (position.tolerance, position.power, position.voltage, position.price)
    assert {len(column) for column in columns} == {len(position.values)}


FULL = """\
# what is in the drawer, counted in spring
value, tolerance, power, voltage, price

4k7, 5 %, 0.25 W, 350 V, 0.02
# a comment between
330,,,,
100R, 0.1 %, 125 mW,, 0
2.2 kΩ,,0.5 W,,0.05
"""


def test_shelf_rows_keep_the_files_order_and_lines(tmp_path):
    assert read_shelf(shelf(tmp_path, FULL)) == (
        ShelfRow(4, 4700.0, 0.05, 0.25, 350.0, 0.02),
        ShelfRow(6, 330.0, None, None, None, None),
        ShelfRow(7, 100.0, 0.001, 0.125, None, 0.0),
        ShelfRow(8, 2200.0, None, 0.5, None, 0.05),
    )


def test_shelf_position_is_ascending_and_filled_from_the_defaults(tmp_path):
    position = shelf_position(shelf(tmp_path, FULL), **DEFAULTS)
    assert position.values == (100.0, 330.0, 2200.0, 4700.0)
    assert position.tolerance == (0.001, 0.01, 0.01, 0.05)
    assert position.power == (0.125, 0.1, 0.5, 0.25)
    assert position.voltage == (150.0, 75.0, 250.0, 350.0)
    assert position.price == (0.0, None, 0.05, 0.02)
    assert position.described == "shelf.csv, 4 values"
    assert not position.absent


def test_a_stated_default_voltage_fills_the_empty_cells_only(tmp_path):
    defaults = DEFAULTS | {"voltage": 60.0, "absent": True}
    position = shelf_position(shelf(tmp_path, FULL), **defaults)
    assert position.voltage == (60.0, 60.0, 60.0, 350.0)
    assert position.absent


def test_one_column_windows_line_ends_and_byte_order_mark(tmp_path):
    path = tmp_path / "one.csv"
    path.write_bytes(b"\xef\xbb\xbfvalue\r\n470\r\n")
    position = shelf_position(path, **DEFAULTS)
    assert position.values == (470.0,)
    assert position.described == "one.csv, 1 value"


def test_every_mistake_at_once(tmp_path):
    text = (
        "value,tolerance,power,voltage,price\n"
        "4k7x,1 %,0.1 W,75 V,0.01\n"
        "  # passed over\n"
        "100,-1 %,0.1 V,0 V,-1\n"
        ",1 %,,,\n"
        "0,30 %,-1 W,1e999 V,cheap\n"
        "220,1 %,,,1 %\n"
        "220R,,,,\n"
        "330,,,,,9\n"
        '"470,,,\n'
    )
    assert mistakes(tmp_path, text) == [
        'shelf.csv line 2, column value: found "4k7x"; expected a resistance such as "4.7 kohm"',
        'shelf.csv line 4, column tolerance: found "-1 %"; expected a tolerance from 0 to 20 %, such as "1 %"',
        'shelf.csv line 4, column power: found "0.1 V"; expected a power such as "40 mW"',
        'shelf.csv line 4, column voltage: found "0 V"; expected more than zero',
        'shelf.csv line 4, column price: found "-1"; expected a price of one piece such as "0.02"',
        'shelf.csv line 5, column value: found ""; expected a resistance such as "4.7 kohm"',
        'shelf.csv line 6, column value: found "0"; expected more than zero',
        'shelf.csv line 6, column tolerance: found "30 %"; expected a tolerance from 0 to 20 %, such as "1 %"',
        'shelf.csv line 6, column power: found "-1 W"; expected more than zero',
        'shelf.csv line 6, column voltage: found "1e999 V"; expected a voltage such as "3.3 V"',
        'shelf.csv line 6, column price: found "cheap"; expected a price of one piece such as "0.02"',
        'shelf.csv line 7, column price: found "1 %"; expected a price of one piece such as "0.02"',
        "shelf.csv line 8, column value: found 220 Ω; expected each value once (also on line 7)",
        "shelf.csv line 9: found 6 cells; expected at most 5, as in the header",
        'shelf.csv line 10: found ""470,,,"; expected cells with their quotes closed',
    ]


@pytest.mark.parametrize("cell", ["1", "0.5", "21 %"])
def test_a_percentage_without_its_sign_is_caught(tmp_path, cell):
    assert mistakes(tmp_path, f"value,tolerance\n100,{cell}\n") == [
        f'shelf.csv line 2, column tolerance: found "{cell}"; expected a tolerance from 0 to 20 %, such as "1 %"'
    ]


def test_the_widest_tolerance_of_the_trade_is_allowed(tmp_path):
    assert read_shelf(shelf(tmp_path, "value,tolerance\n100,20 %\n"))[0].tolerance == 0.2


def test_header_mistakes(tmp_path):
    known = "one of value, tolerance, power, voltage, price"
    assert mistakes(tmp_path, "vlaue,POWER,power,power,colour\n1,1,1,1,1\n") == [
        f'shelf.csv line 1: found column "vlaue"; expected {known} (did you mean "value"?)',
        f'shelf.csv line 1: found column "POWER"; expected {known} (did you mean "power"?)',
        'shelf.csv line 1: found column "power" 2 times; expected each column once',
        f'shelf.csv line 1: found column "colour"; expected {known}',
        "shelf.csv line 1: found no column value; expected a column value with the resistances",
    ]


def test_a_short_row_still_needs_its_value(tmp_path):
    assert mistakes(tmp_path, "power,value\n0.1 W\n") == [
        'shelf.csv line 2, column value: found ""; expected a resistance such as "4.7 kohm"'
    ]


def test_other_cells_are_checked_without_a_value_column(tmp_path):
    assert mistakes(tmp_path, "power\n5 V\n") == [
        "shelf.csv line 1: found no column value; expected a column value with the resistances",
        'shelf.csv line 2, column power: found "5 V"; expected a power such as "40 mW"',
    ]


@pytest.mark.parametrize("text", ["", "# only a comment\n\n"])
def test_an_empty_file(tmp_path, text):
    assert mistakes(tmp_path, text) == [
        "shelf.csv: found no header line; expected columns value, tolerance, power, voltage, price; "
        "only value is required"
    ]


def test_a_header_alone(tmp_path):
    assert mistakes(tmp_path, "value\n") == ["shelf.csv: found no values; expected one resistor value a line"]


def test_files_that_cannot_be_read(tmp_path):
    missing = tmp_path / "nowhere.csv"
    with pytest.raises(InputError) as refusal:
        read_shelf(missing)
    assert str(refusal.value) == f"{missing}: found no such file or directory; expected a CSV file that can be read"
    with pytest.raises(InputError) as refusal:
        read_shelf(tmp_path)
    assert str(refusal.value) == f"{tmp_path}: found is a directory; expected a CSV file that can be read"
    binary = tmp_path / "binary.csv"
    binary.write_bytes(b"value\n4\xff7\n")
    with pytest.raises(InputError) as refusal:
        read_shelf(binary)
    assert str(refusal.value) == f"{binary}: found bytes that are not UTF-8; expected a CSV file in UTF-8"


def test_reduced_keeps_order_columns_and_flags(tmp_path):
    whole = shelf_position(shelf(tmp_path, FULL), **(DEFAULTS | {"absent": True}))
    part = reduced(whole, [3, 0, 3])
    assert part.values == (100.0, 4700.0)
    assert part.tolerance == (0.001, 0.05)
    assert part.power == (0.125, 0.25)
    assert part.voltage == (150.0, 350.0)
    assert part.price == (0.0, 0.02)
    assert part.absent
    assert part.described == whole.described
    assert reduced(whole, range(4)) == whole
    assert reduced(whole, []).values == ()


@pytest.mark.parametrize("keep", [[4], [-1]])
def test_reduced_refuses_an_index_outside(tmp_path, keep):
    whole = shelf_position(shelf(tmp_path, FULL), **DEFAULTS)
    with pytest.raises(IndexError):
        reduced(whole, keep)


@given(st.sets(st.integers(1, 10**7), min_size=1, max_size=30), st.randoms(use_true_random=False))
def test_a_list_written_in_any_order_comes_back_sorted(tmp_path_factory, ohms, random):
    values = sorted({float(f"{value:.3e}") for value in ohms})
    shuffled = random.sample(values, len(values))
    lines = "\n".join(format_resistor(value) for value in shuffled)
    path = shelf(tmp_path_factory.mktemp("list"), f"value\n{lines}\n")
    assert shelf_position(path, **DEFAULTS).values == tuple(values)
