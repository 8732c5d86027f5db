"""The JSON Schema of a brief: it takes what the program takes, and refuses what an editor can see to be wrong."""

from __future__ import annotations

import json
import re
import tomllib
from collections.abc import Iterator

import pytest
from brief_samples import FIELD, GOOD, LEAST, SAMPLES, changed
from command import ROOT, run
from jsonschema import Draft202012Validator

from optopick.brief_schema import brief_schema
from optopick.errors import InputError
from optopick.keys import brief_sections
from optopick.read_brief import brief_from_text
from optopick.units import QuantityError, parse_quantity, quantity_pattern

SCHEMA = brief_schema()
VALIDATOR = Draft202012Validator(SCHEMA)
EXAMPLES = sorted((ROOT / "examples").glob("*.toml"))

# The sample, what is changed in it, and the key that the schema must complain of ("" for the brief as a whole).
BAD = [
    (GOOD, 'rate = "19.2 kbit/s"', 'rate = "19.2 kHz"', "signal.rate"),
    (GOOD, 'rate = "19.2 kbit/s"', 'rate = "19.2 kbit/s"\nshortest_pulse = "52 us"', "signal"),
    (GOOD, 'rate = "19.2 kbit/s"\n', "", "signal"),
    (GOOD, "lit = 0.25", "lit = 2", "signal.lit"),
    (GOOD, "lit = 0.25", "lit = true", "signal.lit"),
    (GOOD, 'circuit = "source"', 'circuit = "sauce"', "drive.circuit"),
    (GOOD, 'circuit = "source"', 'circuit = "field"', "drive"),
    (GOOD, 'supply = ["3.0 V", "3.6 V"]\n', "", "drive"),
    (GOOD, 'max_current = "8 mA"', 'max_curent = "8 mA"', "drive"),
    (GOOD, 'max_current = "8 mA"', 'max_current = "8 mV"', "drive.max_current"),
    (GOOD, 'max_current = "8 mA"', 'off_below = "5 V"', "drive"),
    (GOOD, '["3.135 V", "3.465 V"]', '["3.1 V", "3.3 V", "3.5 V"]', "output.supply"),
    (GOOD, '"LVCMOS 3.3 V"', '"LVCMOS 3.0 V"', "output.logic"),
    (GOOD, 'life = "5 years"', 'life = "5 kg"', "environment.life"),
    (GOOD, '["-20 degC", "70 degC"]', '["-20 degC", "70 degF"]', "environment.temperature"),
    (GOOD, "ctr_margin = 1.3", "ctr_margin = 0.5", "limits.ctr_margin"),
    (GOOD, 'series = "E12"', 'series = "E13"', "stock.r_led.series"),
    (GOOD, "pieces = 2", "pieces = 4", "stock.r_led.pieces"),
    (GOOD, "pieces = 2", "absent = true", "stock.r_led"),
    (GOOD, 'values = ["1k", "470R", 2200]', "values = []", "stock.r_shunt.values"),
    (GOOD, 'values = ["1k", "470R", 2200]', 'values = ["1k"]\nseries = "E12"'.replace("\n", ", "), "stock.r_shunt"),
    (GOOD, 'table = "parts.csv"\n', "", "couplers"),
    (GOOD, "channels = 2", "channels = 2.5", "couplers.at_least.channels"),
    (GOOD, 'minimize = "edge time"', 'minimize = "cost"', "goal.minimize"),
    (GOOD, "[environment]", "[enviroment]", ""),
    (LEAST, 'v_ih = "2 V"\n', "", "output"),
    (FIELD, 'type = "IEC 61131-2 type 3"', 'on = ["11 V", "30 V"]', "drive"),
    (FIELD, 'type = "IEC 61131-2 type 3"', 'type = "IEC 61131-2 type 3"\nsupply = "24 V"', "drive"),
]


def places(text: str) -> set[str]:
    """Where the schema complains."""
    errors = VALIDATOR.iter_errors(tomllib.loads(text))
    return {".".join(str(step) for step in error.absolute_path) for error in errors}


@pytest.fixture(autouse=True)
def _in_a_folder_with_parts(tmp_path, monkeypatch):
    (tmp_path / "parts.csv").touch()
    monkeypatch.chdir(tmp_path)


def test_it_is_a_schema():
    Draft202012Validator.check_schema(SCHEMA)
    assert SCHEMA["$schema"] == "https://json-schema.org/draft/2020-12/schema"


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.stem)
def test_every_example_is_valid(path):
    assert places(path.read_text(encoding="utf-8")) == set()


@pytest.mark.parametrize("name", SAMPLES)
def test_every_sample_is_valid(name):
    assert places(SAMPLES[name]) == set()


@pytest.mark.parametrize(
    ("sample", "old", "new", "where"), BAD, ids=[f"{n}-{case[2][:24]!r}" for n, case in enumerate(BAD)]
)
def test_a_bad_brief_is_refused(sample, old, new, where):
    """By the schema at the right place, and by the program too: the schema is never the stricter of the two."""
    text = changed(sample, (old, new))
    assert where in places(text), places(text)
    with pytest.raises(InputError):
        brief_from_text(text, ROOT / "link.toml")


def test_every_key_is_in_it_with_its_meaning():
    for section in brief_sections():
        inside = SCHEMA
        for name in filter(None, section.name.split(".")):
            inside = inside["properties"][name]
        for key in section.keys:
            assert (key.name in inside["properties"]) is (not key.only_in or section.name in key.only_in)
            if key.name in inside["properties"]:
                assert inside["properties"][key.name]["description"] == key.meaning
        assert inside["additionalProperties"] is False


def test_every_example_value_of_a_key_fits_it():
    for section in brief_sections():
        inside = SCHEMA
        for name in filter(None, section.name.split(".")):
            inside = inside["properties"][name]
        for key in section.keys:
            if key.name in inside["properties"]:
                assert Draft202012Validator(inside["properties"][key.name]).is_valid(key.example), key.path


def spellings() -> Iterator[tuple[str, str]]:
    """Texts of many forms beside every unit that a brief knows."""
    units = {key.unit for section in brief_sections() for key in section.keys}
    suffixes = (
        "V",
        "mV",
        "A",
        "uA",
        "µA",
        "ohm",
        "kohm",
        "k",
        "K",
        "R",
        "Ω",
        "\u2126",
        "s",
        "us",
        "W",
        "pF",
        "mm",
        "m",
        "%",
    )
    suffixes += (
        "°C",
        "degC",
        "\u2103",
        "ppm/K",
        "%/°C",
        "1/K",
        "bit/s",
        "kBd",
        "Mbps",
        "h",
        "years",
        "d",
        "kg",
        "",
        "n",
    )
    numbers = ("4.7", "-20", "\u22125", ".5", "1e-3", "+3.", "1,5", "4k7", "R47", "4n7", "47L", "0", "x")
    for unit in units:
        for number in numbers:
            for suffix in suffixes:
                for gap in ("", " ", "\u00a0"):
                    yield unit, f"{number}{gap}{suffix}"


def test_a_pattern_takes_whatever_the_reader_takes():
    """And refuses nearly all of what the reader refuses: the rest are codes with a suffix of the wrong sort."""
    read, refused, slipped = 0, 0, []
    for unit, text in spellings():
        matches = re.search(quantity_pattern(unit), text) is not None
        try:
            parse_quantity(text, unit)
        except QuantityError:
            refused += 1
            if matches:
                slipped.append((unit, text))
        else:
            read += 1
            assert matches, (unit, text)
    assert read > 1000
    assert len(slipped) < 0.01 * refused, slipped[:20]


def test_the_command_prints_it():
    ran = run("schema")
    assert ran.code == 0
    assert ran.err == ""
    assert json.loads(ran.out) == SCHEMA
