"""`table new`, `table check`, `table fit`; help and examples of every command; the shell's completion."""

from __future__ import annotations

import json
import os
import re
import shlex
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import click
import pytest
from command import ROOT, run
from coupler_tables import DARLINGTON, LOGIC, PHOTOTRANSISTOR, write_table

from optopick.cli import main
from optopick.coupler_columns import schema
from optopick.read_couplers import read_couplers
from optopick.uses.table_check import check_table

DEMO = ROOT / "catalogs" / "demo.csv"


def commands(group: click.Group, above: str = "") -> Iterator[tuple[str, click.Command]]:
    """Every command by its words, those of groups too."""
    for name, command in group.commands.items():
        yield f"{above}{name}", command
        if isinstance(command, click.Group):
            yield from commands(command, f"{above}{name} ")


COMMANDS = dict(commands(main))


class TestNew:
    def test_a_blank_table_explains_every_column(self, tmp_path):
        path = tmp_path / "parts.csv"
        assert run("table", "new", path).code == 0
        lines = path.read_text(encoding="utf-8").splitlines()
        assert lines[-1].split(",") == list(schema().columns)
        for column in schema().columns.values():
            assert any(line.startswith(f"# {column.name}") and column.meaning in line for line in lines), column.name

    def test_one_line_filled_in_makes_it_a_table(self, tmp_path):
        path = tmp_path / "parts.csv"
        run("table", "new", path)
        with path.open("a", encoding="utf-8") as file:
            file.write(",".join(PHOTOTRANSISTOR.get(name, "") for name in schema().columns) + "\n")
        assert run("table", "check", path).code == 0

    def test_a_file_that_is_there_is_refused(self, tmp_path):
        path = write_table(tmp_path, PHOTOTRANSISTOR)
        before = path.read_bytes()
        ran = run("table", "new", path)
        assert ran.code == 2
        assert ran.err == f"optopick: {path}: found a file that is there already; expected a new file, or --force\n"
        assert path.read_bytes() == before
        assert run("table", "new", path, "--force").code == 0
        assert path.read_bytes() != before

    def test_another_ending_is_refused(self, tmp_path):
        ran = run("table", "new", tmp_path / "parts.xlsx")
        assert ran.code == 2
        assert "expected a file name that ends in .csv" in ran.err

    def test_a_folder_that_is_not_there(self, tmp_path):
        ran = run("table", "new", tmp_path / "none" / "parts.csv")
        assert ran.code == 2
        assert "found no such file or directory; expected a path that can be written" in ran.err


class TestCheck:
    def test_mistakes_end_with_two(self, tmp_path):
        ran = run("table", "check", write_table(tmp_path, PHOTOTRANSISTOR | {"v_r_max": "900", "channels": "x"}))
        assert ran.code == 2
        assert ran.out == ""
        assert "table.csv line 2, column v_r_max" in ran.err
        assert "table.csv line 2, column channels" in ran.err

    def test_a_complete_table(self, tmp_path):
        ran = run("table", "check", write_table(tmp_path, PHOTOTRANSISTOR, DARLINGTON, LOGIC))
        assert ran.code == 0
        assert "3 rows: 3 usable, 0 set aside." in ran.out
        assert "Nothing had to be assumed." in ran.out
        assert "Missing" not in ran.out

    def test_what_is_missing_and_what_that_costs(self, tmp_path):
        rows = (PHOTOTRANSISTOR | {"v_ceo": "", "c_be": ""}, DARLINGTON | {"v_ceo": ""}, LOGIC | {"t_plh": ""})
        ran = run("table", "check", write_table(tmp_path, *rows))
        told = " ".join(ran.out.split())
        assert ran.code == 0
        assert "3 rows: 2 usable, 1 set aside." in told
        assert "VELM7 4 t_plh: empty, and no rule fills it" in told
        # the rule differs by output stage, and so do the lines
        assert "v_ceo 1 20 V 20 V, the least of usual parts" in told
        assert "v_ceo 1 7 V 7 V, the least of usual parts" in told
        assert re.search(r"VELM1 2 (v_ceo, c_be|c_be, v_ceo)\b", told)

    def test_the_same_gap_is_counted_and_the_commonest_comes_first(self, tmp_path):
        rows = [PHOTOTRANSISTOR | {"part": f"VELM{n}", "v_ceo": "", "c_be": "" if n < 2 else "9"} for n in range(3)]
        check = check_table(write_table(tmp_path, *rows))
        assert [(gap.parameter, len(gap.parts)) for gap in check.gaps] == [("v_ceo", 3), ("c_be", 2)]
        assert check.gaps[1].parts == ("VELM0", "VELM1")

    def test_a_table_without_a_usable_row_ends_with_one(self, tmp_path):
        ran = run("table", "check", write_table(tmp_path, PHOTOTRANSISTOR | {"ctr_at": ""}))
        assert ran.code == 1
        assert "1 rows: 0 usable, 1 set aside." in ran.out

    def test_json_tells_the_same(self):
        ran = run("table", "check", DEMO, "--json")
        found, table = json.loads(ran.out), read_couplers(DEMO)
        assert ran.code == 0
        assert found["file"] == "demo.csv"
        assert found["usable"] == len(table.couplers) == len(found["rows"])
        assert [row["part"] for row in found["rows"]] == [coupler.part for coupler in table.couplers]
        assert [aside["reason"] for aside in found["set_aside"]] == [aside.reason for aside in table.set_aside]
        assumed = {(one.part, one.parameter) for coupler in table.couplers for one in coupler.assumed}
        assert {(part, gap["parameter"]) for gap in found["gaps"] for part in gap["parts"]} == assumed
        assert all(gap["count"] == len(gap["parts"]) for gap in found["gaps"])

    def test_no_such_file(self, tmp_path):
        ran = run("table", "check", tmp_path / "none.csv")
        assert ran.code == 2
        assert "none.csv: found no such file or directory; expected a CSV file that can be read" in ran.err


class TestFit:
    def test_times_given_and_reproduced(self, tmp_path):
        told = " ".join(run("table", "fit", write_table(tmp_path, PHOTOTRANSISTOR)).out.split())
        assert "VELM1 sw_t_r 2 µs (" in told
        assert "sw_t_f 3 µs 3 µs 0.0 %" in told
        assert "sat_t_off 35 µs 35 µs 0.0 %" in told
        assert "Not used, and why" not in told

    def test_rows_that_contradict_each_other_are_told(self, tmp_path):
        path = write_table(tmp_path, PHOTOTRANSISTOR | {"sat_t_off": "20.5"})
        told = " ".join(run("table", "fit", path).out.split())
        assert "Not used, and why VELM1: switching rows: the saturated one is not slower" in told
        assert re.search(r"sat_t_off 20.5 µs [\d.]+ µs \+\d+\.\d %", told)

    def test_json(self, tmp_path):
        ran = run("table", "fit", write_table(tmp_path, PHOTOTRANSISTOR), "--json")
        (part,) = json.loads(ran.out)["parts"]
        assert part["part"] == "VELM1"
        assert [time["column"] for time in part["times"]] == ["sw_t_r", "sw_t_f", "sat_t_s", "sat_t_off"]
        for time in part["times"]:
            assert time["residual"] == pytest.approx(100 * (time["reproduced"] / time["given"] - 1))

    def test_a_table_without_transistors(self, tmp_path):
        ran = run("table", "fit", write_table(tmp_path, LOGIC))
        assert ran.code == 0
        assert "No usable row has a transistor output" in ran.out

    def test_mistakes_end_with_two(self, tmp_path):
        ran = run("table", "fit", write_table(tmp_path, PHOTOTRANSISTOR | {"v_r_max": "900"}))
        assert ran.code == 2
        assert "column v_r_max" in ran.err


class TestHelp:
    @pytest.mark.parametrize("name", COMMANDS)
    def test_every_option_has_help(self, name):
        for parameter in COMMANDS[name].params:
            if isinstance(parameter, click.Option):
                assert parameter.help, (name, parameter.opts)
                assert parameter.help.endswith(".") or "Example: " in parameter.help, (name, parameter.opts)

    def test_every_option_of_the_program_has_help(self):
        assert all(parameter.help for parameter in main.params if isinstance(parameter, click.Option))

    @pytest.mark.parametrize("name", COMMANDS)
    def test_every_command_has_an_example_that_can_be_typed(self, name):
        """Its words are those of the command, and all its options exist."""
        command = COMMANDS[name]
        examples = re.findall(r"Example: optopick (.+)", command.help or "")
        assert len(examples) == 1, name
        words = shlex.split(examples[0].partition(" > ")[0])
        assert words[: len(name.split())] == name.split()
        parsed = command
        if isinstance(command, click.Group):
            parsed = command.commands[words[1]]
            words = words[1:]
        rest = words[len(name.split()) if parsed is command else 1 :]
        parsed.make_context(name, rest, resilient_parsing=False)
        for word in rest:
            if word.startswith(("examples/", "catalogs/")):
                assert (ROOT / word).exists(), word

    def test_there_are_all_commands(self):
        assert {"new", "table", "table new", "table check", "table fit", "schema", "pick", "report"} <= set(COMMANDS)


@pytest.mark.parametrize(
    ("shell", "says"), [("bash", "complete -o"), ("zsh", "compdef"), ("fish", "complete --no-files")]
)
def test_the_shell_completes(shell, says):
    """Click's own completion, as README describes it."""
    ran = completed(_OPTOPICK_COMPLETE=f"{shell}_source")
    assert says in ran
    assert "_OPTOPICK_COMPLETE" in ran


def test_completion_knows_commands_and_options():
    assert "plain,table" in completed(_OPTOPICK_COMPLETE="bash_complete", COMP_WORDS="optopick ta", COMP_CWORD="1")
    found = completed(_OPTOPICK_COMPLETE="bash_complete", COMP_WORDS="optopick new --ki", COMP_CWORD="2")
    assert "plain,--kind" in found


def completed(**environment: str) -> str:
    """What the installed program prints when the shell asks it."""
    ran = subprocess.run(
        [sys.executable, "-c", "from optopick.cli import main; main(prog_name='optopick')"],
        env={**os.environ, **environment},
        cwd=Path(ROOT),
        capture_output=True,
        text=True,
        check=False,
    )
    assert "Traceback" not in ran.stderr
    return ran.stdout
