"""The commands as a user meets them: exit codes, wrong input, progress; every option of every command is tried."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import click
import pytest
from cli_links import SOUND, TINY, UNSOUND, changed, impossible, json_of
from command import commands_of, run

import optopick
from optopick.cli import main
from optopick.errors import InputError
from optopick.result import Status


class TestExitCodes:
    def test_a_valid_design(self):
        assert run("pick", TINY).code == 0

    def test_a_design_that_passes(self):
        assert run("check", TINY, *SOUND).code == 0

    def test_a_design_that_fails(self):
        ran = run("check", TINY, *UNSOUND)
        assert ran.code == 1
        assert "checks fail" in ran.out

    def test_wrong_input(self, tmp_path):
        ran = run("pick", changed(tmp_path, ("lit = 0.5", 'lit = "green"')))
        assert ran.code == 2
        assert ran.out == ""
        assert "lit" in ran.err

    @pytest.mark.parametrize("command", ["pick", "rank", "tradeoff", "why", "sweep", "yield", "netlist"])
    def test_no_design(self, tmp_path, command):
        ran = run(command, impossible(tmp_path))
        assert ran.code == 3, ran

    def test_no_design_says_so(self, tmp_path):
        assert "No combination in stock" in run("pick", impossible(tmp_path)).out
        assert json_of(run("pick", impossible(tmp_path), "--json"))["status"] == "infeasible"

    def test_help_and_version(self):
        assert run("--help").code == 0
        version = run("--version")
        assert version.code == 0
        assert re.search(r"\d+\.\d+", version.out)


class TestWrongInput:
    @pytest.mark.parametrize(
        ("arguments", "said"),
        [
            (("pick", "no-such-brief.toml"), "no-such-brief.toml"),
            (("pick",), "Missing argument"),
            (("pick", TINY, "--differ", "colour"), "colour"),
            (("pick", TINY, "--next", "-1"), "-1"),
            (("pick", TINY, "--fast"), "No such option"),
            (("choose", TINY), "choose"),
            (("check", TINY, "--coupler", "TINYPHOTO", "--r-load", "1k"), "--r-led"),
            (("check", TINY, "--coupler", "TINYFOTO", "--r-led", "1k", "--r-load", "1k"), "TINYPHOTO"),
            (("check", TINY, "--coupler", "TINYPHOTO", "--r-led", "1 mA", "--r-load", "1k"), "--r-led"),
            (("check", TINY, "--coupler", "TINYPHOTO", "--r-led", "-1k", "--r-load", "0"), "--r-load"),
            (("check", TINY, "--coupler", "TINYLOGIC", "--r-led", "1k", "--r-load", "1k", "--r-be", "1k"), "--r-be"),
            (("rank", TINY, "--top", "0"), "--top"),
            (("rank", TINY, "--workers", "none"), "--workers"),
            (("tradeoff", TINY, "--first", "speed"), "--first"),
            (("tradeoff", TINY, "--first", "power"), "--second"),
            (("tradeoff", TINY, "--points", "1"), "--points"),
            (("tradeoff", TINY, "--plot", "front.gif"), "front.gif"),
            (("tradeoff", TINY, "--plot", "no/such/folder/front.svg"), "front.svg"),
            (("why", TINY, "--time-limit", "-1"), "--time-limit"),
            (("sweep", TINY, "--position", "r_x"), "r_x"),
            (("sweep", TINY, "--position", "r_shunt"), "r_shunt"),
            (("sweep", TINY, "--r-led", "1k"), "--coupler"),
            (("sweep", TINY, "--coupler", "TINYPHOTO"), "--r-led"),
            (("yield", TINY, "--samples", "0"), "--samples"),
            (("yield", TINY, "--seed", "x"), "--seed"),
            (("netlist", TINY, "--at", "noon"), "noon"),
            (("report", TINY), "--output"),
        ],
    )
    def test_a_message_and_no_traceback(self, arguments, said):
        ran = run(*arguments)
        assert ran.code == 2
        assert said in ran.err
        assert "Traceback" not in ran.err + ran.out
        assert ran.out == ""

    def test_all_mistakes_at_once(self, tmp_path):
        brief = changed(tmp_path, ("lit = 0.5", "lit = 7"), ('drop = "0.2 V"', 'drop = "0.2 A"'), ("[goal]", "[goals]"))
        ran = run("pick", brief)
        assert ran.code == 2
        lines = ran.err.splitlines()
        assert len(lines) >= 3
        assert all(line.startswith("optopick: ") for line in lines)
        for word in ("lit", "drop", "goals"):
            assert word in ran.err

    def test_both_values_of_a_check(self):
        ran = run("check", TINY, "--coupler", "TINYPHOTO", "--r-led", "red", "--r-load", "blue")
        assert "--r-led" in ran.err
        assert "--r-load" in ran.err

    def test_all_that_a_check_lacks(self):
        ran = run("check", TINY)
        assert ran.code == 2
        assert [line.split(": ")[1] for line in ran.err.splitlines()] == ["--coupler", "--r-led", "--r-load"]

    @pytest.mark.parametrize("ohms", ["1e-9", "0.05", "0", "2G"])
    def test_a_resistance_that_no_resistor_has(self, ohms):
        ran = run("check", TINY, "--coupler", "TINYPHOTO", "--r-led", ohms, "--r-load", "1k")
        assert ran.code == 2
        assert "from 0.1 Ω to 1 GΩ" in ran.err


def test_what_lies_beyond_the_curve_is_said():
    found = json_of(run("check", TINY, "--coupler", "TINYPHOTO", "--r-led", "10", "--r-load", "1k", "--json"))
    told = {check["name"]: check["corner"] for check in found["checks"] if check["value"] is None}
    assert told["output_low"] == told["ctr_margin"] == "beyond the end of the CTR curve"


def test_every_option_is_tried():
    """Each command and each of its options stands in some test, in quotes."""
    text = "".join(path.read_text(encoding="utf-8") for path in Path(__file__).parent.glob("test_*.py"))
    for name, command in commands_of(main):
        assert '"' + name.replace(" ", '", "') + '"' in text, name
        for parameter in command.params:
            if isinstance(parameter, click.Option) and "--help" not in parameter.opts:
                assert any(f'"{opt}"' in text for opt in parameter.opts), (name, parameter.opts)
    for parameter in main.params:
        assert any(f'"{opt}"' in text for opt in parameter.opts), parameter.opts


class TestProgress:
    def test_quick_work_is_quiet(self):
        assert run("check", TINY, *SOUND).err == ""

    def test_slow_work_tells_on_standard_error(self, monkeypatch):
        """As if each look at the clock came three seconds after the last."""
        self._slow(monkeypatch)
        ran = run("pick", TINY)
        assert re.search(r"^optopick: .* \d+ s$", ran.err, re.MULTILINE)
        assert "optopick: " not in ran.out

    @pytest.mark.parametrize("option", ["--quiet", "-q"])
    def test_quiet_when_told(self, monkeypatch, option):
        self._slow(monkeypatch)
        assert run(option, "pick", TINY).err == ""

    @pytest.mark.parametrize("option", ["--verbose", "-v"])
    def test_every_stage_when_told(self, option):
        told = run(option, "pick", TINY).err.splitlines()
        assert [line.split(", from ")[0] for line in told] == ["optopick: least power", "optopick: least edge time"]

    def test_not_both(self):
        ran = run("--verbose", "--quiet", "pick", TINY)
        assert ran.code == 2
        assert "--quiet and --verbose" in ran.err

    @staticmethod
    def _slow(monkeypatch: pytest.MonkeyPatch) -> None:
        seconds = iter(range(0, 10**6, 3))
        monkeypatch.setattr("optopick.cli.app.time.monotonic", lambda: float(next(seconds)))


@pytest.mark.parametrize("shell", ["bash", "zsh", "fish"])
def test_the_shell_can_complete(shell):
    """What README says to evaluate is a script for the shell, and the script's question is answered."""
    words = {"bash": {"COMP_WORDS": "optopick pi", "COMP_CWORD": "1"}}.get(
        shell, {"COMP_WORDS": "optopick pi", "COMP_CWORD": "pi" if shell == "fish" else "1"}
    )
    script = completed(f"{shell}_source", {})
    assert "_OPTOPICK_COMPLETE" in script
    assert "pick" in completed(f"{shell}_complete", words)


def completed(instruction: str, environment: dict[str, str]) -> str:
    """What the installed command says to a shell."""
    command = Path(sys.executable).with_name("optopick")
    asked = {**os.environ, "_OPTOPICK_COMPLETE": instruction, **environment}
    return subprocess.run([command], env=asked, capture_output=True, text=True, check=False).stdout


class TestPython:
    def test_path_text_and_brief(self):
        by_path, by_text = optopick.pick(TINY), optopick.pick(str(TINY))
        assert by_path.design == by_text.design
        assert by_path.status is Status.OPTIMAL

    def test_wrong_input_is_an_exception(self):
        with pytest.raises(InputError) as caught:
            optopick.pick("no-such-brief.toml")
        assert caught.value.mistakes
