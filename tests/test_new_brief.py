"""A starting brief: it runs at once, explains every line from the list of keys, and destroys nothing."""

from __future__ import annotations

import os
import pty
import re
import subprocess
import sys
import textwrap
import threading
import tomllib
from pathlib import Path

import pytest
from command import ESCAPE, ROOT, run
from coupler_tables import PHOTOTRANSISTOR, write_table

import optopick
from optopick.brief import DriveCircuit
from optopick.cli.commands_start import KINDS
from optopick.errors import InputError
from optopick.keys import brief_sections
from optopick.read_brief import brief_from_text, read_brief
from optopick.result import Status
from optopick.uses.new_brief import OPTIONS, answer, key_at, new_brief, start_of, starts, typed, with_answers

DEMO = ROOT / "catalogs" / "demo.csv"
LEFT = re.compile(r"^# (\w+ = .*)$", re.MULTILINE)


@pytest.fixture(params=KINDS)
def made(request, tmp_path: Path) -> Path:
    """A brief of each kind, with its table beside it."""
    path = tmp_path / "link.toml"
    ran = run("new", path, "--kind", request.param)
    assert ran.code == 0, ran
    return path


def test_it_says_what_was_written(tmp_path):
    path = tmp_path / "link.toml"
    ran = run("new", path, "--kind", "serial")
    assert ran.err == ""
    assert ran.out == (
        f"{tmp_path / 'couplers.csv'}: written, a table of invented parts to try it with\n"
        f"{path}: written; next: optopick pick {path}\n"
    )
    assert sorted(entry.name for entry in tmp_path.iterdir()) == ["couplers.csv", "link.toml"]


def test_it_runs_at_once(made):
    """With a design that is proved; the coupler is one of the table beside the brief."""
    result = optopick.pick(read_brief(made))
    assert result.status is Status.OPTIMAL
    assert result.design is not None


def test_the_packaged_table_is_the_demonstration_table(made):
    assert (made.parent / "couplers.csv").read_bytes() == DEMO.read_bytes()


def test_the_kinds_are_those_of_the_data_file():
    assert tuple(starts()) == KINDS


def test_every_kind_gives_and_asks_for_keys_that_exist():
    options = set(OPTIONS.values())
    for start in starts().values():
        for path in start.values:
            assert key_at(path).path == path
        assert set(start.asked) <= options
        assert set(start.asked) <= set(start.values), start.kind


def test_every_comment_is_a_meaning(made):
    """Beside the lines on top and the keys left to their default, only meanings stand in the comments."""
    head, _, body = made.read_text(encoding="utf-8").partition("\n\n")
    assert all(line.startswith("# ") for line in head.splitlines())
    meanings = {section.meaning for section in brief_sections()}
    meanings |= {key.meaning for section in brief_sections() for key in section.keys}
    comments = re.findall(r"(?:^# .*\n)+", LEFT.sub("", body), re.MULTILINE)
    assert len(comments) > 20
    for comment in comments:
        words = " ".join(line.removeprefix("# ") for line in comment.splitlines())
        # where one meaning follows another, as that of a section that of its first key, the brief has a line between
        assert words.partition(" Without it: ")[0] in meanings, words


def test_every_key_given_is_explained_once(made):
    text = " ".join(line.removeprefix("# ") for line in made.read_text(encoding="utf-8").splitlines())
    for path in tomllib_paths(tomllib.loads(made.read_text(encoding="utf-8"))):
        count = text.count(key_at(path).meaning)
        assert count >= 1, path


def tomllib_paths(table: dict[str, object], above: str = "") -> list[str]:
    found: list[str] = []
    for name, value in table.items():
        path = f"{above}.{name}" if above else name
        found += tomllib_paths(value, path) if isinstance(value, dict) else [path]
    return found


def test_every_line_left_out_can_be_taken_in(made):
    """Each by itself, with the value shown."""
    text = made.read_text(encoding="utf-8")
    lines = list(LEFT.finditer(text))
    assert len(lines) > 10
    for line in lines:
        taken = text[: line.start()] + line[1] + text[line.end() :]
        brief_from_text(taken, made)


def test_what_is_said_of_a_default_is_the_default(made):
    """Taking in the line with the default in place of the example changes nothing."""
    text, checked = made.read_text(encoding="utf-8"), 0
    before = brief_from_text(text, made)
    for found in re.finditer(r"Without it:\s(?:# )?([^\n]*)\.\n# (\w+) = .*", text):
        default, name = found[1].replace("\n# ", " ").rpartition("else ")[2], found[2]
        if default.startswith(('"', "true", "1")) and not found[1].startswith("as "):
            taken = text[: found.end()] + f"\n{name} = {default}" + text[found.end() :]
            assert brief_from_text(taken, made) == before
            checked += 1
    assert checked > 3


def test_no_line_is_too_long(made):
    assert max(map(len, made.read_text(encoding="utf-8").splitlines())) <= 120


def test_the_current_loop_names_its_standard_and_keeps_to_it():
    """IEC 63035:2017, 4.1: 31.25 kBd, 5 mA, edges under 2 us; 5 V over 660 ohm and 1.2 V of LED is 5.76 mA."""
    start = start_of("current-loop")
    assert "IEC 63035:2017, 4.1" in start.source
    text = new_brief(start, Path("link.toml"), DEMO).text
    brief = brief_from_text(text, ROOT / "link.toml")
    assert brief.signal.shortest_pulse == pytest.approx(32e-6)
    assert brief.limits.edge_time == pytest.approx(2e-6)
    (ohms,) = brief.stock.r_led.values
    assert 0.005 <= (5.0 - 1.2) / ohms <= 0.006


class TestTable:
    def test_a_table_of_ones_own_is_named_from_the_folder_of_the_brief(self, tmp_path):
        (tmp_path / "parts").mkdir()
        (tmp_path / "links").mkdir()
        mine = write_table(tmp_path / "parts", PHOTOTRANSISTOR)
        brief = tmp_path / "links" / "link.toml"
        assert run("new", brief, "--kind", "battery", "--table", mine).code == 0
        assert 'table = "../parts/table.csv"' in brief.read_text(encoding="utf-8")
        assert read_brief(brief).couplers.table.samefile(mine)
        assert [entry.name for entry in brief.parent.iterdir()] == ["link.toml"]

    def test_a_table_that_is_there_is_used_and_left_alone(self, tmp_path):
        mine = write_table(tmp_path, PHOTOTRANSISTOR, name="couplers.csv")
        before = mine.read_bytes()
        ran = run("new", tmp_path / "link.toml", "--kind", "serial", "--force")
        assert ran.code == 0
        assert "invented" not in ran.out
        assert mine.read_bytes() == before

    @pytest.mark.parametrize("name", ["couplers.csv", "mine.csv"])
    def test_a_table_with_a_mistake_is_refused_before_anything_is_written(self, tmp_path, name):
        mine = write_table(tmp_path, PHOTOTRANSISTOR | {"v_r_max": "900"}, name=name)
        own = [] if name == "couplers.csv" else ["--table", mine]
        ran = run("new", tmp_path / "link.toml", "--kind", "serial", *own)
        assert ran.code == 2
        assert ran.err.startswith(f'optopick: {name} line 2, column v_r_max: found "900"')
        assert not (tmp_path / "link.toml").exists()

    def test_a_table_that_is_not_there(self, tmp_path):
        ran = run("new", tmp_path / "link.toml", "--kind", "serial", "--table", tmp_path / "none.csv")
        assert ran.code == 2
        assert "none.csv: found no such file or directory; expected a CSV file that can be read" in ran.err

    def test_a_path_that_no_brief_can_hold(self, tmp_path):
        mine = write_table(tmp_path, PHOTOTRANSISTOR, name="a\nb.csv")
        ran = run("new", tmp_path / "link.toml", "--kind", "serial", "--table", mine)
        assert ran.code == 2
        assert (
            ran.err == "optopick: --table: found a path with characters that cannot be printed; expected another path\n"
        )


class TestOptions:
    GIVEN = (
        ("--title", 'A "quoted" title, and a long one at that: \\ and what else a title may have in it, up to here'),
        ("--rate", "19.2 kbit/s"),
        ("--lit", "40 %"),
        ("--drive-supply", "3.0 V to 3.6 V"),
        ("--max-current", "8 mA"),
        ("--off-leakage", "1 uA"),
        ("--output-supply", "5 V"),
        ("--logic", "TTL 5 V"),
        ("--temperature", "-20 degC to 70 degC"),
        ("--life", "7 years"),
        ("--delay", "25 us"),
        ("--withstand", "5 kV"),
        ("--minimize", "delay"),
    )

    def test_each_gives_its_key(self, tmp_path):
        path = tmp_path / "link.toml"
        assert run("new", path, "--kind", "serial", *[word for pair in self.GIVEN for word in pair]).code == 0
        brief, document = read_brief(path), tomllib.loads(path.read_text(encoding="utf-8"))
        for option, text in self.GIVEN:
            found: object = document
            for name in OPTIONS[option].split("."):
                found = found[name]
            assert found == (text.split(" to ") if " to " in text and option != "--title" else text), option
        assert brief.title == self.GIVEN[0][1]
        assert brief.drive.supply.high == 3.6
        # the second goal of the kind was the one that is now the first
        assert "then" not in document["goal"]

    def test_those_of_a_field_input(self, tmp_path):
        path = tmp_path / "link.toml"
        given = ("--pulse", "1 ms", "--field-type", "IEC 61131-2 type 1")
        assert run("new", path, "--kind", "field", *given).code == 0
        brief = read_brief(path)
        assert brief.drive.circuit is DriveCircuit.FIELD
        assert brief.drive.supply.low == 15.0
        assert brief.signal.shortest_pulse == pytest.approx(1e-3)

    @pytest.mark.parametrize(("kind", "option", "text"), [("serial", "--pulse", "1 ms"), ("field", "--rate", "9600")])
    def test_rate_and_pulse_take_each_others_place(self, tmp_path, kind, option, text):
        path = tmp_path / "link.toml"
        assert run("new", path, "--kind", kind, option, text).code == 0
        document = tomllib.loads(path.read_text(encoding="utf-8"))
        assert ("rate" in document["signal"]) is (option == "--rate")
        assert ("shortest_pulse" in document["signal"]) is (option == "--pulse")

    def test_every_option_of_the_command_is_a_key(self):
        from optopick.cli import main  # noqa: PLC0415

        names = {parameter.opts[0] for parameter in main.commands["new"].params if parameter.opts[0].startswith("--")}
        assert names - {"--kind", "--table", "--force"} == set(OPTIONS)
        assert {"--kind", "--table", "--force"} <= names

    @pytest.mark.parametrize(
        ("kind", "given", "says"),
        [
            ("serial", ("--life", "5 kg"), '--life: found "5 kg"; expected a life such as "10 years"'),
            ("serial", ("--lit", "120 %"), '--lit: found "120 %"; expected at least 0 and at most 1'),
            ("serial", ("--minimize", "cost"), '--minimize: found "cost"; expected one of "edge time", "delay"'),
            ("serial", ("--logic", "TTL 5"), '(did you mean "TTL 5 V"?)'),
            (
                "serial",
                ("--drive-supply", "5 V to 3 V"),
                '--drive-supply: found ["5 V", "3 V"]; expected the lowest value first',
            ),
            ("serial", ("--drive-supply", "1 V to 2 V to 3 V"), "or a list of two, lowest first"),
            ("serial", ("--title", "two\nlines"), "--title: found"),
            ("serial", ("--title", "  "), '--title: found ""; expected text such as'),
            ("serial", ("--title", "\udcff"), "expected one line of printable text"),
            (
                "serial",
                ("--field-type", "IEC 61131-2 type 3"),
                "found an option for circuit field; expected no such option with --kind serial",
            ),
            (
                "field",
                ("--drive-supply", "24 V"),
                "found an option for circuit source and sink; expected no such option with --kind field",
            ),
            (
                "serial",
                ("--rate", "9600", "--pulse", "1 ms"),
                "--pulse: found --rate and --pulse; expected one of the two",
            ),
            (
                "serial",
                ("--drive-supply", "0.4 V"),
                "key drive.drop: found 500 mV; expected less than the lowest drive, 400 mV",
            ),
            (
                "serial",
                ("--logic", "CMOS 5 V"),
                '--logic: found "CMOS 5 V" at 3.135 V to 3.465 V; expected a supply from',
            ),
        ],
    )
    def test_a_wrong_one_is_named_and_nothing_is_written(self, tmp_path, kind, given, says):
        ran = run("new", tmp_path / "link.toml", "--kind", kind, *given)
        assert ran.code == 2
        assert ran.out == ""
        assert says in ran.err, ran.err
        assert list(tmp_path.iterdir()) == []

    def test_all_mistakes_are_told_at_once(self, tmp_path):
        ran = run("new", tmp_path / "link.toml", "--kind", "serial", "--life", "5 kg", "--lit", "x")
        assert [line.split(":")[1].strip() for line in ran.err.splitlines()] == ["--life", "--lit"] or (
            [line.split(":")[1].strip() for line in ran.err.splitlines()] == ["--lit", "--life"]
        )


class TestRefused:
    def test_a_kind_that_is_none(self, tmp_path):
        ran = run("new", tmp_path / "link.toml", "--kind", "parallel")
        assert ran.code == 2
        assert "'parallel' is not one of 'serial', 'field', 'battery', 'current-loop'" in ran.err
        with pytest.raises(InputError, match="--kind"):
            start_of("parallel")

    def test_no_kind_and_no_terminal(self, tmp_path, monkeypatch):
        monkeypatch.setattr("sys.stdin", open(os.devnull, encoding="utf-8"))  # noqa: PTH123, SIM115
        ran = run("new", tmp_path / "link.toml")
        assert ran.code == 2
        expected = "optopick: --kind: found nothing, and no terminal to ask at; expected one of serial, field, battery"
        assert ran.err.startswith(expected)

    def test_a_brief_that_is_there(self, tmp_path):
        path = tmp_path / "link.toml"
        path.write_text("mine", encoding="utf-8")
        ran = run("new", path, "--kind", "serial")
        assert ran.code == 2
        assert ran.err == f"optopick: {path}: found a file that is there already; expected a new file, or --force\n"
        assert path.read_text(encoding="utf-8") == "mine"
        assert run("new", path, "--kind", "serial", "--force").code == 0
        assert read_brief(path).title == "Serial line"

    def test_a_folder(self, tmp_path):
        (tmp_path / "link.toml").mkdir()
        ran = run("new", tmp_path / "link.toml", "--kind", "serial", "--force")
        assert ran.code == 2
        assert "found a directory; expected the name of a file" in ran.err

    def test_another_ending(self, tmp_path):
        ran = run("new", tmp_path / "couplers.csv", "--kind", "serial")
        assert ran.code == 2
        assert "expected a file name that ends in .toml" in ran.err

    def test_a_folder_that_is_not_there(self, tmp_path):
        ran = run("new", tmp_path / "none" / "link.toml", "--kind", "serial")
        assert ran.code == 2
        assert "whose folder does not exist; expected a file in a folder that does" in ran.err

    def test_nothing_half_written_stays(self, tmp_path, monkeypatch):
        def full(*_: object) -> None:
            raise OSError(28, "No space left on device")

        monkeypatch.setattr(Path, "replace", full)
        ran = run("new", tmp_path / "link.toml", "--kind", "serial")
        assert ran.code == 2
        assert "found no space left on device; expected a path that can be written" in ran.err
        assert list(tmp_path.iterdir()) == []


def answered(folder: Path, *arguments: str, answers: str) -> tuple[int, str]:
    """Exit code and all that a terminal shows of `optopick new` in `folder`, to which `answers` are typed."""
    leader, follower = pty.openpty()
    process = subprocess.Popen(
        [sys.executable, "-c", "from optopick.cli import main; main()", "new", *arguments],
        cwd=folder,
        env={**os.environ, "PYTHONPATH": str(ROOT), "TERM": "xterm", "LANG": "C.UTF-8"},
        stdin=follower,
        stdout=follower,
        stderr=follower,
    )
    os.close(follower)
    # a question too many must fail the test, not hold it up
    limit = threading.Timer(30, process.kill)
    limit.start()
    os.write(leader, answers.encode())
    shown = bytearray()
    try:
        while chunk := os.read(leader, 65536):
            shown += chunk
    except OSError:  # how Linux says that the other end is closed
        pass
    os.close(leader)
    code = process.wait()
    limit.cancel()
    return code, ESCAPE.sub("", shown.decode()).replace("\r\n", "\n")


class TestQuestions:
    def test_the_defaults_are_the_start(self, tmp_path):
        asked = len(start_of("serial").asked)
        code, shown = answered(tmp_path, "link.toml", answers="\n" * (asked + 2))
        assert code == 0, shown
        for path in start_of("serial").asked:
            assert key_at(path).meaning in " ".join(shown.split())
        assert (tmp_path / "link.toml").read_text(encoding="utf-8") == new_brief(
            start_of("serial"), Path("link.toml"), None
        ).text
        assert (tmp_path / "couplers.csv").exists()

    def test_answers_are_taken_and_wrong_ones_asked_again(self, tmp_path):
        mine = write_table(tmp_path, PHOTOTRANSISTOR)
        lines = ["battery", "Probe", "5 kg", "3 ms", "", "2.7 V to 3.3 V", "", "", "", "", "", str(mine)]
        code, shown = answered(tmp_path, "link.toml", answers="\n".join(lines) + "\n")
        assert code == 0, shown
        assert 'found "5 kg"; expected a time such as "52 us"' in shown
        brief = read_brief(tmp_path / "link.toml")
        assert brief.title == "Probe"
        assert brief.signal.shortest_pulse == pytest.approx(3e-3)
        assert brief.drive.supply.low == pytest.approx(2.7)
        assert brief.couplers.table.samefile(mine)
        assert not (tmp_path / "couplers.csv").exists()

    def test_an_option_is_not_asked_for(self, tmp_path):
        count = len(start_of("serial").asked) - 1
        code, shown = answered(tmp_path, "link.toml", "--title", "Mine", answers="\n" * (count + 2))
        assert code == 0, shown
        assert key_at("title").meaning not in shown
        assert read_brief(tmp_path / "link.toml").title == "Mine"

    def test_giving_up_writes_nothing(self, tmp_path):
        code, shown = answered(tmp_path, "link.toml", answers="\n\n\x04")
        assert code == 1
        assert "Aborted" in shown
        assert "Traceback" not in shown
        assert list(tmp_path.iterdir()) == []


def test_what_is_typed_and_what_is_written_come_back_to_each_other():
    for start in starts().values():
        for path in start.asked:
            assert answer(path, typed(start.values[path])) in (start.values[path], str(start.values[path]))


def test_a_start_is_not_changed_by_its_answers():
    before = dict(start_of("serial").values)
    with_answers(start_of("serial"), {"--pulse": "1 ms", "--minimize": "power"})
    assert dict(start_of("serial").values) == before


def test_the_option_help_is_about_the_key():
    """Said in short in --help, where the list of keys is not loaded; no option may speak of another unit."""
    ran = run("new", "--help")
    for option in OPTIONS:
        assert option in ran.out
    examples = re.findall(r'(--[\w-]+) \w+\s+(?:(?!--)[^"])*?such as\s+"([^"]+)"', textwrap.dedent(ran.out))
    assert len(examples) > 8
    for option, example in examples:
        answer(OPTIONS[option], " ".join(example.split()))
