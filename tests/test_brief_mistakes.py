"""Briefs that are wrong: what is said of each mistake, and that nothing but InputError ever comes out."""

from __future__ import annotations

import datetime
import tomllib
from pathlib import Path

import pytest
from brief_samples import FIELD, GOOD, LEAST, SAMPLES, assert_sound, changed

from optopick.errors import InputError, Mistake
from optopick.key_values import shown
from optopick.read_brief import brief_from_mapping, brief_from_text, read_brief

CASES = tomllib.loads(Path(__file__).with_name("brief_mistakes.toml").read_text(encoding="utf-8"))["case"]
SECTIONS = "one of title, signal, drive, output, environment, limits, stock, couplers, goal"


@pytest.fixture(autouse=True)
def _in_a_folder_with_parts(tmp_path, monkeypatch):
    (tmp_path / "parts.csv").touch()
    (tmp_path / "shelf.csv").write_text("value\n1k\n-5\n1k\n", encoding="utf-8")
    monkeypatch.chdir(tmp_path)


def mistakes_of(text: str) -> tuple[Mistake, ...]:
    with pytest.raises(InputError) as refusal:
        brief_from_text(text, Path("link.toml"))
    return refusal.value.mistakes


@pytest.mark.parametrize("case", CASES, ids=[f"{number}-{case['new'][:30]!r}" for number, case in enumerate(CASES)])
def test_one_mistake(case):
    text = changed(SAMPLES[case["sample"]], (case["old"], case["new"]))
    assert [str(mistake) for mistake in mistakes_of(text)] == case["says"]


def test_every_case_is_another():
    assert len({(case["sample"], case["old"], case["new"]) for case in CASES}) == len(CASES) >= 45


class TestSeveralAtOnce:
    def test_all_are_said_in_the_order_of_the_file(self):
        text = changed(
            GOOD,
            ("lit = 0.25", "lit = 2"),
            ('drop = ["0.1 V", "0.4 V"]', 'drop = "4 V"'),
            ('max_current = "8 mA"', 'max_curent = "8 mA"'),
            ('noise_margin = "0.2 V"', 'noise_margin = "0.9 V"'),
            ('life = "5 years"\n', 'life = "5 kg"\n'),
            ("ctr_margin = 1.3", "ctr_margin = 0.5"),
            ('from = "100R", to = "10k"', 'from = "10k", to = "100R"'),
            ('values = ["1k", "470R", 2200]', 'series = "E1"'),
            ('table = "parts.csv"\n', ""),
            ('give = "2 %"', "give = 2"),
        )
        assert [mistake.where for mistake in mistakes_of(text)] == [
            "link.toml line 5, signal.lit",
            "link.toml line 10, drive.drop",
            "link.toml line 11, drive.max_curent",
            "link.toml line 19, output.noise_margin",
            "link.toml line 26, environment.life",
            "link.toml line 29, limits.ctr_margin",
            "link.toml line 40, stock.r_led.from",
            "link.toml line 43, stock.r_shunt.series",
            "link.toml line 52, goal.give",
            "link.toml: key couplers.table",
        ]

    def test_a_brief_of_one_line_lacks_every_required_section(self):
        wheres = [mistake.where for mistake in mistakes_of('title = "x"')]
        names = ("signal", "drive", "output", "environment", "stock", "couplers", "goal")
        assert wheres == [f"link.toml: key {name}" for name in names]

    def test_empty_sections_lack_every_required_key(self):
        text = "[signal]\n[drive]\n[output]\n[environment]\n[stock]\n[couplers]\n[goal]\n"
        wheres = [mistake.where.removeprefix("link.toml: key ") for mistake in mistakes_of(text)]
        assert wheres == [
            "drive.circuit",
            "output.circuit",
            "output.supply",
            "output.v_il",
            "output.v_ih",
            "environment.temperature",
            "stock.r_led",
            "stock.r_load",
            "couplers.table",
            "goal.minimize",
            "signal.rate",
        ]

    def test_mistakes_of_a_shelf_used_twice_are_said_once(self):
        shelf = 'values = "shelf.csv"'
        text = changed(LEAST, ('r_led = { series = "E24"', f"r_led = {{ {shelf}"), ('series = "E24"', shelf))
        assert [mistake.where for mistake in mistakes_of(text)] == [
            "shelf.csv line 3, column value",
            "shelf.csv line 4, column value",
        ]

    def test_one_mistake_does_not_make_others(self):
        """A value that cannot be read is not also missing, out of range or at odds with another."""
        for old in ('"3.135 V", "3.465 V"', '"LVCMOS 3.3 V"', '"0.2 V"', '"E24", tolerance = "5 %"', '"parts.csv"'):
            assert len(mistakes_of(changed(GOOD, (old, '"?"')))) == 1, old
        for old in ('"IEC 61131-2 type 3"', '"field"', '"LVTTL 3.3 V"', '"E24", absent'):
            assert len(mistakes_of(changed(FIELD, (old, '"?"' + ", absent" * ("absent" in old))))) == 1, old

    @pytest.mark.parametrize(
        "name", ["signal", "drive", "output", "environment", "limits", "stock", "couplers", "goal"]
    )
    def test_section_that_is_none(self, name):
        document = {**tomllib.loads(GOOD), name: 3}
        with pytest.raises(InputError) as refusal:
            brief_from_mapping(document, Path())
        assert refusal.value.mistakes == (Mistake(f"brief: key {name}", "3", f"a section, [{name}]"),)

    @pytest.mark.parametrize("name", ["r_led", "r_load", "r_be", "r_shunt"])
    @pytest.mark.parametrize(
        ("position", "found", "expected"),
        [
            (3, "3", "a section, [stock.{}]"),
            ({}, "neither series nor values", 'one of the two, such as series = "E24"'),
        ],
    )
    def test_position_that_is_none(self, name, position, found, expected):
        document = tomllib.loads(GOOD)
        document["stock"][name] = position
        with pytest.raises(InputError) as refusal:
            brief_from_mapping(document, Path())
        assert refusal.value.mistakes == (Mistake(f"brief: key stock.{name}", found, expected.format(name)),)


LOGIC = 'logic = "LVCMOS 3.3 V"'


class TestEdgesOfTheRules:
    """One end only, and exactly at the edge."""

    @pytest.mark.parametrize(
        ("sample", "old", "new"),
        [
            (GOOD, "lit = 0.25", "lit = 1"),
            (GOOD, "lit = 0.25", "lit = 0"),
            (GOOD, '["-20 degC", "70 degC"]', '["-60 degC", "175 degC"]'),
            (GOOD, "timing_guard = 1.2", "timing_guard = 1"),
            (GOOD, 'give = "2 %"', "give = 1"),
            (FIELD, 'type = "', 'on_current_min = "15 mA"\ntype = "'),
            (FIELD, 'type = "', 'off_below = "10.9 V"\ntype = "'),
            (FIELD, 'type = "', 'drop = "10.9 V"\ntype = "'),
            (GOOD, LOGIC, 'v_il = "0.21 V"\nv_ih = "2.93 V"'),
            (GOOD, LOGIC, 'v_il = ["0.5 V", "1.5 V"]\nv_ih = ["1 V", "2.5 V"]'),
            (GOOD, LOGIC, 'v_il = "0.8 V"\nv_ih = ["2 V", "3.2 V"]'),
            (GOOD, 'from = "100R", to = "10k"', 'from = "1k", to = "1k"'),
            (GOOD, '["3.135 V", "3.465 V"]\n' + LOGIC, '["1.6 V", "2.0 V"]\nlogic = "LVCMOS 1.8 V"'),
        ],
    )
    def test_allowed(self, sample, old, new):
        assert_sound(brief_from_text(changed(sample, (old, new)), Path("link.toml")))

    @pytest.mark.parametrize(
        ("sample", "old", "new", "says"),
        [
            (FIELD, 'type = "', 'off_below = "11 V"\ntype = "', "found off_below 11 V; expected less than on, 11 V"),
            (
                GOOD,
                LOGIC,
                'v_il = "1 V"\nv_ih = ["1 V", "2 V"]',
                "v_il: found v_il 1 V; expected less than v_ih, 1 V to 2 V",
            ),
            (
                GOOD,
                LOGIC,
                'v_il = ["0.5 V", "2 V"]\nv_ih = "2 V"',
                "v_il: found v_il 500 mV to 2 V; expected less than v_ih, 2 V",
            ),
            (
                GOOD,
                LOGIC,
                'v_il = ["0.2 V", "1 V"]\nv_ih = "2 V"',
                "noise_margin 200 mV; expected less than v_il, 200 mV",
            ),
            (
                GOOD,
                f'{LOGIC}\nnoise_margin = "0.2 V"',
                'v_il = "0.8 V"\nv_ih = "3.135 V"',
                "v_ih 3.135 V and noise_margin 0 V; expected a sum less than the supply, 3.135 V to 3.465 V",
            ),
            (
                GOOD,
                f'{LOGIC}\nnoise_margin = "0.2 V"',
                'v_il = "0.8 V"\nv_ih = ["2 V", "3.465 V"]',
                "v_ih 2 V to 3.465 V and noise_margin 0 V; expected a sum less than the supply, 3.135 V to 3.465 V",
            ),
            (
                GOOD,
                LOGIC,
                'v_il = "0.8 V"\nv_ih = "2.95 V"',
                "v_ih 2.95 V and noise_margin 200 mV; expected a sum less than the supply, 3.135 V to 3.465 V",
            ),
            (
                GOOD,
                LOGIC,
                'v_il = "0.8 V"\nv_ih = ["2 V", "3.3 V"]',
                "v_ih 2 V to 3.3 V and noise_margin 200 mV; expected a sum less than the supply, 3.135 V to 3.465 V",
            ),
            (
                GOOD,
                '["3.135 V", "3.465 V"]\n' + LOGIC,
                '["4.4 V", "5.5 V"]\nlogic = "CMOS 5 V"',
                'found "CMOS 5 V" at 4.4 V to 5.5 V; expected a supply from 4.5 V to 5.5 V, or v_il and v_ih of the'
                " receiver in its place",
            ),
            (
                GOOD,
                '["3.135 V", "3.465 V"]\n' + LOGIC,
                '["4.5 V", "5.6 V"]\nlogic = "CMOS 5 V"\nv_il = "0.8 V"',
                'found "CMOS 5 V" at 4.5 V to 5.6 V; expected a supply from 4.5 V to 5.5 V, or v_il and v_ih of the'
                " receiver in its place",
            ),
        ],
    )
    def test_refused(self, sample, old, new, says):
        (mistake,) = mistakes_of(changed(sample, (old, new)))
        assert str(mistake).endswith(says)

    def test_both_ends_of_a_span_are_held_to_the_range(self):
        for span in ('["-61 degC", "20 degC"]', '["20 degC", "176 degC"]'):
            (mistake,) = mistakes_of(changed(GOOD, ('["-20 degC", "70 degC"]', span)))
            assert mistake.expected == "at least -60 degC and at most 175 degC"


@pytest.mark.parametrize(
    ("value", "text"),
    [
        ("x" * 60, '"' + "x" * 60 + '"'),
        ("x" * 61, '"' + "x" * 57 + '..."'),
        ([1, 2, 3, 4, 5, 6], "[1, 2, 3, 4, 5, 6]"),
        ([1, 2, 3, 4, 5, 6, 7], "[1, 2, 3, 4, 5, 6, ...]"),
        ((True, {}, None), "[true, a table, nothing]"),
        (10**60 - 1, "9" * 60),
        (10**60, "a number of more than 60 digits"),
        (1e300, "1e+300"),
        (datetime.date(2026, 1, 1), "a date"),
        ("µ\n", '"µ\\n"'),
    ],
)
def test_shown_as_the_brief_would_write_it(value, text):
    assert shown(value) == text


class TestFile:
    def refusal(self, path: Path) -> tuple[Mistake, ...]:
        with pytest.raises(InputError) as refusal:
            read_brief(path)
        return refusal.value.mistakes

    def test_missing(self):
        assert self.refusal(Path("none.toml")) == (Mistake("none.toml", "no such file", "a brief in TOML"),)

    def test_directory(self, tmp_path):
        assert self.refusal(tmp_path) == (Mistake(str(tmp_path), "a directory", "a brief in TOML"),)

    def test_inside_a_file(self):
        assert self.refusal(Path("parts.csv/x.toml")) == (
            Mistake("parts.csv/x.toml", "not a directory", "a brief in TOML"),
        )

    def test_name_that_no_file_can_have(self):
        assert self.refusal(Path("a\0b")) == (Mistake("a\0b", "no usable path", "a brief in TOML"),)

    @pytest.mark.parametrize("content", [b"", b"\n \n", b"\xef\xbb\xbf"])
    def test_empty(self, content):
        Path("link.toml").write_bytes(content)
        assert self.refusal(Path("link.toml")) == (Mistake("link.toml", "an empty file", "a brief in TOML"),)

    def test_not_utf_8(self):
        Path("link.toml").write_bytes(GOOD.replace('"2 uA"', '"2 µA"').encode("latin-1"))
        assert self.refusal(Path("link.toml")) == (
            Mistake("link.toml line 20", "bytes that are not UTF-8", "a brief in TOML in UTF-8"),
        )

    def test_not_utf_8_from_the_first_byte(self):
        Path("link.toml").write_bytes(b"\xb5")
        assert self.refusal(Path("link.toml"))[0].where == "link.toml line 1"

    def test_line_that_is_long_or_not_printable_is_shown_short_and_clean(self):
        (mistake,) = mistakes_of("a\x01" + "b" * 100)
        assert mistake.found == "a?" + "b" * 58

    def test_only_comments(self):
        Path("link.toml").write_text("# nothing yet\n", encoding="utf-8")
        assert len(self.refusal(Path("link.toml"))) == 7

    def test_windows_line_ends(self):
        text = changed(GOOD, ("lit = 0.25", "lit = 2")).replace("\n", "\r\n")
        assert mistakes_of(text) == (Mistake("link.toml line 5, signal.lit", "2", "at least 0 and at most 1"),)

    def test_name_of_a_coupler_table_that_no_file_can_have(self):
        for name in ("a\\u0000b", "x" * 5000):
            (mistake,) = mistakes_of(changed(GOOD, ("parts.csv", name)))
            assert mistake.where == "link.toml line 46, couplers.table"
            assert mistake.found.endswith(", where there is no file")

    def test_number_of_thousands_of_digits(self):
        assert mistakes_of(changed(GOOD, ("0.25", "9" * 5000))) == (
            Mistake("link.toml", "a number of thousands of digits", "numbers of a usable size"),
        )

    def test_thousands_of_brackets(self):
        assert mistakes_of(changed(GOOD, ("0.25", "[" * 5000))) == (
            Mistake("link.toml", "brackets nested too deep", "lists and tables a few levels deep"),
        )

    def test_brackets_just_too_deep_to_show(self):
        nested: object = []
        for _ in range(5000):
            nested = [nested]
        document = tomllib.loads(GOOD)
        document["signal"]["lit"] = nested
        with pytest.raises(InputError) as refusal:
            brief_from_mapping(document, Path())
        assert refusal.value.mistakes == (
            Mistake("brief: key signal.lit", "lists nested too deep", 'a value such as "50 %"'),
        )


class TestMapping:
    def test_no_mapping(self):
        with pytest.raises(InputError) as refusal:
            brief_from_mapping(["signal"], Path())  # type: ignore[arg-type]
        assert refusal.value.mistakes == (Mistake("brief", '["signal"]', "a mapping with the sections of a brief"),)

    def test_place_has_no_line(self):
        document = tomllib.loads(GOOD)
        document["drive"]["max_current"] = None
        with pytest.raises(InputError) as refusal:
            brief_from_mapping(document, Path())
        assert refusal.value.mistakes == (
            Mistake("brief: key drive.max_current", "nothing", 'a current such as "10 mA"'),
        )

    def test_key_that_is_no_text(self):
        document = {**tomllib.loads(GOOD), 5: {}}
        with pytest.raises(InputError) as refusal:
            brief_from_mapping(document, Path())  # type: ignore[arg-type]
        assert refusal.value.mistakes == (Mistake("brief: key 5", "an unknown section", SECTIONS),)
