"""Briefs that are right: every key, every default, every named set, from file, text and mapping."""

from __future__ import annotations

import tomllib
from importlib import resources
from pathlib import Path

import pytest
from brief_samples import FIELD, GOOD, LEAST, changed

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
    Signal,
    Span,
)
from optopick.eseries import SERIES, series_values
from optopick.key_values import read_value
from optopick.keys import brief_sections, named_sets
from optopick.read_brief import brief_from_mapping, brief_from_text, read_brief
from optopick.stock import DEFAULT_HIGH, DEFAULT_LOW
from optopick.toml_lines import key_lines

ALL_KEYS = [key for section in brief_sections() for key in section.keys]


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "parts.csv").write_text("not read here\n", encoding="utf-8")
    (tmp_path / "shelf.csv").write_text("value,power,price\n1k,0.25 W,0.02\n330,,\n", encoding="utf-8")
    return tmp_path


def read(folder: Path, text: str) -> Brief:
    return brief_from_text(text, folder / "link.toml")


class TestEveryKey:
    def test_title_signal_and_path(self, folder):
        brief = read(folder, GOOD)
        assert brief.title == "Meter head, telemetry out"
        assert brief.signal == Signal(shortest_pulse=1 / 19200, lit=0.25)
        assert brief.path == folder / "link.toml"

    def test_drive(self, folder):
        assert read(folder, GOOD).drive == Drive(
            circuit=DriveCircuit.SOURCE,
            supply=Span(3.0, 3.6),
            drop=Span(0.1, 0.4),
            max_current=8e-3,
            off_leakage=10e-6,
            off_voltage=None,
            off_current=0.0,
            on_current_min=0.0,
            reverse=1.0,
            reverse_diode=True,
        )

    def test_output(self, folder):
        assert read(folder, GOOD).output == Output(
            circuit=OutputCircuit.PULL_UP,
            supply=Span(3.135, 3.465),
            v_il=Span(0.8, 0.8),
            v_ih=Span(2.0, 2.0),
            noise_margin=0.2,
            input_leakage=2e-6,
            input_current_low=1e-4,
            capacitance=20e-12,
        )

    def test_environment_and_limits(self, folder):
        brief = read(folder, GOOD)
        assert brief.environment == Environment(Span(-20.0, 70.0), life=5 * 8766.0)
        assert brief.limits == Limits(
            ctr_margin=1.3,
            edge_time=15e-6,
            delay=25e-6,
            distortion=10e-6,
            power=40e-3,
            isolation=Isolation(withstand=3750.0, working=300.0, creepage=6e-3),
            timing_guard=1.2,
        )

    def test_couplers_and_goal(self, folder):
        brief = read(folder, GOOD)
        assert brief.couplers == CouplerChoice(folder / "parts.csv", ("XP-1", "XP-2"), 2)
        assert brief.goal == Goal(GoalName.EDGE_TIME, GoalName.DELAY, 0.02)


class TestStock:
    def test_series(self, folder):
        position = read(folder, GOOD).stock.r_led
        assert position.values == series_values("E12", 100.0, 10e3)
        assert set(position.tolerance) == {0.02}  # that of [stock]
        assert set(position.power) == {0.25}
        assert set(position.voltage) == {200.0}  # from the rating
        assert position.absent is False

    def test_only_the_led_resistor_may_be_split(self, folder):
        stock = read(folder, GOOD).stock
        assert stock.r_led.pieces == 2
        assert {position.pieces for position in (stock.r_load, stock.r_be, stock.r_shunt) if position} == {1}
        assert read(folder, LEAST).stock.r_led.pieces == 1

    def test_own_tolerance_and_voltage_take_the_place_of_the_common_ones(self, folder):
        position = read(folder, GOOD).stock.r_load
        assert set(position.tolerance) == {0.05}
        assert set(position.voltage) == {50.0}
        assert set(position.power) == {0.1}
        assert (position.values[0], position.values[-1]) == (10.0, 1e6)

    def test_base_resistor_may_be_absent(self, folder):
        position = read(folder, GOOD).stock.r_be
        assert position is not None
        assert position.absent is True
        assert position.values[0] == 10e3

    def test_values_in_the_brief_are_sorted(self, folder):
        position = read(folder, GOOD).stock.r_shunt
        assert position is not None
        assert position.values == (470.0, 1000.0, 2200.0)
        assert position.tolerance == (0.02,) * 3
        assert position.power == (0.1,) * 3
        assert position.voltage == (75.0,) * 3
        assert position.price == (None,) * 3
        assert position.absent is False
        assert position.described == "3 values listed in the brief"

    def test_values_with_their_own_voltage(self, folder):
        text = changed(GOOD, ('["1k", "470R", 2200] }', '["1k"], voltage = "60 V", absent = true }'))
        position = read(folder, text).stock.r_shunt
        assert position is not None
        assert (position.voltage, position.absent) == ((60.0,), True)
        assert position.described == "1 value listed in the brief"

    def test_shelf_file_is_relative_to_the_brief(self, folder):
        old = 'r_load = { series = "E24", tolerance'
        position = read(folder, changed(GOOD, (old, 'r_load = { values = "shelf.csv", tolerance'))).stock.r_load
        assert position.values == (330.0, 1000.0)
        assert position.power == (0.1, 0.25)
        assert position.tolerance == (0.05, 0.05)
        assert position.voltage == (50.0, 50.0)
        assert position.price == (None, 0.02)
        assert position.described == "shelf.csv, 2 values"

    def test_drift(self, folder):
        assert read(folder, GOOD).stock.drift == pytest.approx(50e-6, rel=1e-12)

    def test_default_range_is_that_of_the_stock(self, folder):
        values = read(folder, LEAST).stock.r_led.values
        assert (values[0], values[-1]) == (DEFAULT_LOW, DEFAULT_HIGH)


class TestDefaults:
    def test_everything_left_out(self, folder):
        brief = read(folder, LEAST)
        assert brief.title == "link"  # the file's name
        assert brief.signal == Signal(1e-3, 0.5)
        assert brief.drive == Drive(DriveCircuit.SINK, Span(5.0, 5.0), Span(0.0, 0.0), None, 0.0, reverse_diode=True)
        assert brief.output == Output(
            OutputCircuit.EMITTER_LOAD, Span(5.0, 5.0), Span(0.8, 0.8), Span(2.0, 2.0), 0.0, 1e-6, 0.0, 15e-12
        )
        assert brief.environment.life == 10 * 8766.0
        assert brief.limits == Limits(None, None, None, None, None, Isolation(), 1.3)
        assert brief.stock.drift == pytest.approx(100e-6, rel=1e-12)
        assert set(brief.stock.r_led.tolerance) == {0.01}
        assert set(brief.stock.r_led.power) == {0.1}
        assert (brief.stock.r_be, brief.stock.r_shunt) == (None, None)
        assert brief.couplers == CouplerChoice(folder / "parts.csv", None, 1)

    @pytest.mark.parametrize(
        ("minimize", "then"),
        [("power", "edge time"), ("edge time", "power"), ("delay", "power"), ("distortion", "power")],
    )
    def test_second_goal(self, folder, minimize, then):
        goal = read(folder, changed(LEAST, ('minimize = "power"', f'minimize = "{minimize}"'))).goal
        assert goal == Goal(GoalName(minimize), GoalName(then), 0.0)

    def test_single_drop_is_the_worst(self, folder):
        text = changed(LEAST, ('supply = "5 V"\n[output]', 'supply = "5 V"\ndrop = "0.3 V"\n[output]'))
        assert read(folder, text).drive.drop == Span(0.0, 0.3)

    def test_some_of_isolation(self, folder):
        text = changed(LEAST, ("[stock]", '[limits.isolation]\nworking = "250 V"\n[stock]'))
        assert read(folder, text).limits.isolation == Isolation(None, 250.0, None)

    def test_couplers_with_channels_as_a_section(self, folder):
        text = changed(LEAST, ("[goal]", "[couplers.at_least]\nchannels = 4\n[goal]"))
        assert read(folder, text).couplers.at_least_channels == 4


class TestFieldInput:
    @pytest.mark.parametrize(
        ("name", "on", "off_current", "on_current_min", "max_current"),
        [
            ("IEC 61131-2 type 1", Span(15.0, 30.0), 0.5e-3, 2e-3, 15e-3),
            ("IEC 61131-2 type 2", Span(11.0, 30.0), 2e-3, 6e-3, 30e-3),
            ("IEC 61131-2 type 3", Span(11.0, 30.0), 1.5e-3, 2e-3, 15e-3),
        ],
    )
    def test_named_type(self, folder, name, on, off_current, on_current_min, max_current):
        drive = read(folder, changed(FIELD, ("IEC 61131-2 type 3", name))).drive
        assert drive == Drive(
            DriveCircuit.FIELD,
            on,
            Span(0.0, 0.0),
            max_current,
            off_leakage=0.0,
            off_voltage=5.0,
            off_current=off_current,
            on_current_min=on_current_min,
        )

    @pytest.mark.parametrize(
        ("key", "attribute", "expected"),
        [
            ('on = ["18 V", "32 V"]', "supply", Span(18.0, 32.0)),
            ('off_below = "4 V"', "off_voltage", 4.0),
            ('off_current = "1 mA"', "off_current", 1e-3),
            ('on_current_min = "3 mA"', "on_current_min", 3e-3),
            ('max_current = "10 mA"', "max_current", 10e-3),
            ('drop = "0.7 V"', "drop", Span(0.0, 0.7)),
        ],
    )
    def test_key_beside_the_type_takes_its_place(self, folder, key, attribute, expected):
        plain = read(folder, FIELD).drive
        drive = read(folder, changed(FIELD, ('type = "', f'{key}\ntype = "'))).drive
        assert getattr(drive, attribute) == expected
        assert getattr(plain, attribute) != expected
        others = set(Drive.__dataclass_fields__) - {attribute}
        assert all(getattr(drive, other) == getattr(plain, other) for other in others)

    def test_without_a_type(self, folder):
        text = changed(FIELD, ('type = "IEC 61131-2 type 3"', 'on = ["10 V", "14 V"]\noff_below = "3 V"'))
        assert read(folder, text).drive == Drive(
            DriveCircuit.FIELD, Span(10.0, 14.0), Span(0.0, 0.0), None, 0.0, off_voltage=3.0
        )


class TestLogic:
    def test_key_beside_the_set_takes_its_place(self, folder):
        text = changed(GOOD, ('logic = "LVCMOS 3.3 V"', 'logic = "LVCMOS 3.3 V"\nv_ih = "2.3 V"'))
        output = read(folder, text).output
        assert (output.v_il, output.v_ih) == (Span(0.8, 0.8), Span(2.3, 2.3))

    def test_two_values_are_at_the_two_supplies(self, folder):
        text = changed(GOOD, ('logic = "LVCMOS 3.3 V"', 'v_il = ["0.9 V", "1.0 V"]\nv_ih = ["2.1 V", "2.4 V"]'))
        output = read(folder, text).output
        assert (output.v_il, output.v_ih) == (Span(0.9, 1.0), Span(2.1, 2.4))

    def test_percentage_is_of_the_supply(self, folder):
        text = changed(GOOD, ('logic = "LVCMOS 3.3 V"', 'v_il = "20 %"\nv_ih = "60 %"'))
        output = read(folder, text).output
        assert (output.v_il.low, output.v_il.high) == pytest.approx((0.627, 0.693))
        assert (output.v_ih.low, output.v_ih.high) == pytest.approx((1.881, 2.079))

    def test_set_that_scales_is_free_of_its_supply_where_both_levels_are_given(self, folder):
        levels = 'logic = "CMOS 5 V"\nv_il = "0.8 V"\nv_ih = "2.0 V"'
        assert read(folder, changed(GOOD, ('logic = "LVCMOS 3.3 V"', levels))).output.v_ih == Span(2.0, 2.0)


class TestWaysIn:
    def test_file(self, folder):
        path = folder / "link.toml"
        path.write_text(GOOD, encoding="utf-8")
        assert read_brief(path) == read(folder, GOOD)

    @pytest.mark.parametrize("encoded", [GOOD.encode("utf-8-sig"), GOOD.replace("\n", "\r\n").encode()])
    def test_file_as_other_editors_save_it(self, folder, encoded):
        path = folder / "link.toml"
        path.write_bytes(encoded)
        assert read_brief(path) == read(folder, GOOD)

    def test_mapping_gives_the_same(self, folder):
        brief = brief_from_mapping(tomllib.loads(GOOD), folder)
        assert brief.path is None
        expected = read(folder, GOOD)
        for part in ("title", "signal", "drive", "output", "environment", "limits", "stock", "couplers", "goal"):
            assert getattr(brief, part) == getattr(expected, part)

    def test_mapping_with_paths_tuples_and_numbers(self, folder):
        document = tomllib.loads(LEAST)
        document["drive"]["supply"] = (4.5, 5.5)
        document["couplers"]["table"] = folder / "parts.csv"
        brief = brief_from_mapping(document, Path("elsewhere"))
        assert brief.title == "Untitled link"
        assert brief.drive.supply == Span(4.5, 5.5)
        assert brief.couplers.table == folder / "parts.csv"

    def test_order_of_sections_does_not_matter(self, folder):
        head, *sections = GOOD.split("\n\n")
        assert read(folder, "\n\n".join([head, *reversed(sections)])) == read(folder, GOOD)


class TestSchema:
    @pytest.mark.parametrize("key", ALL_KEYS, ids=lambda key: key.path)
    def test_example_and_default_are_valid(self, tmp_path, key):
        for file in ("catalogs/demo.csv", "briefs/shelf.csv"):  # what the examples name, from a folder of briefs
            (tmp_path / file).parent.mkdir()
            (tmp_path / file).touch()
        read_value(key, key.example, tmp_path / "briefs")
        if key.default is not None:
            read_value(key, key.default, tmp_path / "briefs")

    @pytest.mark.parametrize("key", ALL_KEYS, ids=lambda key: key.path)
    def test_what_holds_without_the_key_is_said_once(self, key):
        ways = [key.required, key.default is not None, bool(key.default_rule)]
        assert sum(ways) == 1 or (sum(ways) == 0 and key.default_from)
        assert key.meaning.endswith(".")

    def test_series_are_those_of_the_stock(self):
        choices = {key.choices for key in ALL_KEYS if key.name == "series"}
        assert choices == {SERIES}

    @pytest.mark.parametrize("file", ["logic_levels.toml", "field_inputs.toml"])
    def test_every_cell_of_a_named_set_has_a_source(self, file):
        for cells in named_sets(file).values():
            assert all(cell.source for cell in cells.values())

    def test_samples_give_every_key(self):
        """A key added to the schema must be added to a sample, else no test reads it."""
        given = {path for text in (GOOD, LEAST, FIELD) for path in key_lines(text)}
        given |= {("drive", name) for name in ("on", "off_below", "off_current", "on_current_min")}  # TestFieldInput
        # a key that the positions share is enough in one of them
        shared = {path[2] for path in given if path[0] == "stock" and len(path) == 3}
        for key in ALL_KEYS:
            path = tuple(key.path.split("."))
            assert path in given or (path[0] == "stock" and path[-1] in shared), key.path

    def test_data_files_are_installed(self):
        names = {entry.name for entry in resources.files("optopick").joinpath("data").iterdir()}
        assert {"brief_keys.toml", "logic_levels.toml", "field_inputs.toml"} <= names
