"""The commands as a user meets them: exit codes, streams, widths, JSON, and every option of every command."""

from __future__ import annotations

import csv
import io
import json
import re
from itertools import pairwise
from pathlib import Path

import click
import pytest
from command import ESCAPE, ROOT, Ran, run, run_at_terminal
from fine_link import fine_link

import optopick
from optopick.cli import main
from optopick.errors import InputError
from optopick.report.text import amount
from optopick.result import Status

TINY = ROOT / "tests" / "golden" / "tiny.toml"
SOUND = ("--coupler", "TINYPHOTO", "--r-led", "1k", "--r-load", "10k", "--r-be", "220k")
UNSOUND = ("--coupler", "TINYPHOTO", "--r-led", "10k", "--r-load", "10k")


def changed(folder: Path, *changes: tuple[str, str], name: str = "link.toml") -> Path:
    """The tiny brief with texts replaced, in a folder of its own."""
    text = TINY.read_text(encoding="utf-8").replace('"tiny.csv"', f'"{TINY.with_name("tiny.csv")}"')
    for old, new in changes:
        assert old in text, old
        text = text.replace(old, new, 1)
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return path


@pytest.fixture
def impossible(tmp_path: Path) -> Path:
    """A brief that no design meets: a tenth of the power that the best takes."""
    return changed(tmp_path, ('power = "40 mW"', 'power = "1 mW"'))


@pytest.fixture(scope="module")
def least_distortion(tmp_path_factory: pytest.TempPathFactory) -> float:
    """The least distortion of the fine link [s], proved."""
    result = optopick.pick(fine_link(tmp_path_factory.mktemp("fine"), "distortion"))
    assert result.status is Status.OPTIMAL
    assert result.objective is not None
    return result.objective.value


@pytest.fixture
def hard(tmp_path: Path, least_distortion: float) -> Path:
    """A brief that ranges alone do not decide: distortion a little less than the least that there is."""
    return fine_link(tmp_path, "power", f"{least_distortion * (1 - 1e-4):.9g} s")


def json_of(ran: Ran) -> dict[str, object]:
    """The one JSON object that is all of standard output."""
    found = json.loads(ran.out)
    assert isinstance(found, dict)
    assert "NaN" not in ran.out
    assert "Infinity" not in ran.out
    return found


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
    def test_no_design(self, impossible, command):
        ran = run(command, impossible)
        assert ran.code == 3, ran

    def test_no_design_says_so(self, impossible):
        assert "No combination in stock" in run("pick", impossible).out
        assert json_of(run("pick", impossible, "--json"))["status"] == "infeasible"

    def test_out_of_time(self, hard):
        ran = run("pick", hard, "--time-limit", "0")
        assert ran.code == 4
        assert "Out of time" in ran.out
        assert "proved" not in ran.out

    def test_out_of_time_is_no_design_given_time(self, hard):
        assert run("pick", hard).code == 3

    def test_help_and_version(self):
        assert run("--help").code == 0
        version = run("--version")
        assert version.code == 0
        assert re.search(r"\d+\.\d+", version.out)


class TestTimeLimit:
    def test_unknown_in_json(self, hard):
        found = json_of(run("pick", hard, "--time-limit", "0", "--json"))
        assert found["status"] == "unknown"
        assert found["design"] is None
        assert found["objective"] is None

    def test_the_best_so_far_with_its_bound(self, tmp_path, least_distortion):
        """A design found in no time is not called the best; what is said of its bound is true."""
        brief = fine_link(tmp_path, "distortion")
        ran = run("pick", brief, "--time-limit", "0", "--json")
        found = json_of(ran)
        assert ran.code == 0
        assert found["status"] == "feasible"
        assert 0 <= found["objective"]["bound"] <= least_distortion * (1 + 1e-6) <= found["objective"]["value"] * 1.001
        assert all(check["passed"] for check in found["checks"])
        told = " ".join(run("pick", brief, "--time-limit", "0").out.split())
        assert "best found in the time given; no design has distortion below" in told
        assert "not proved best" in told
        assert "(proved)" not in told

    @pytest.mark.parametrize("goal", ["edge time", "delay", "distortion", "power"])
    def test_no_claim_beyond_what_is_shown(self, tmp_path, goal):
        """Out of time at once, the best found lies at or above the optimum, and the bound at or below it."""
        then = "edge time" if goal == "power" else "power"
        goals = (('minimize = "power"', f'minimize = "{goal}"'), ('then = "edge time"', f'then = "{then}"'))
        brief = changed(tmp_path, *goals, ('["2k2", "4k7", "10k"]', '["2k2", "3k3", "4k7", "6k8", "10k", "15k"]'))
        hurried, best = optopick.pick(brief, time_limit=0.0), optopick.pick(brief)
        assert best.status is Status.OPTIMAL
        assert best.objective is not None
        least = best.objective.bound
        if hurried.status is Status.UNKNOWN:
            assert hurried.objective is None
        else:
            assert hurried.objective is not None
            assert hurried.review is not None
            assert hurried.review.passed
            assert hurried.objective.bound <= least * (1 + 1e-5)
            assert hurried.objective.value >= least * (1 - 1e-5)
            proved = hurried.objective.value == pytest.approx(best.objective.value, rel=1e-5)
            assert hurried.status is Status.FEASIBLE or proved

    def test_not_a_number_of_seconds(self):
        ran = run("pick", TINY, "--time-limit", "soon")
        assert ran.code == 2
        assert "soon" in ran.err


RESULT = {"status", "objective", "second", "design", "checks", "timing", "power", "assumed", "rejected", "proof"}
RESULT |= {"cautions"}
REVIEW = {"design", "checks", "timing", "power"}
FIELDS = {
    "objective": {"name", "value", "bound", "gap", "unit"},
    "design": {"coupler", "r_led", "r_load", "r_be", "r_shunt"},
    "timing": {"edge_on", "edge_off", "storage", "delay_on", "delay_off", "distortion"},
    "power": {"nominal", "worst"},
    "proof": {"combinations", "solves", "decided_by_ranges", "seconds", "solver"},
}
CHECK = {"name", "value", "limit", "sense", "margin", "unit", "corner", "passed"}
ASSUMED = {"part", "parameter", "value", "rule"}


@pytest.fixture(scope="module")
def picked() -> dict[str, object]:
    return json_of(run("pick", ROOT / "examples" / "shortlist.toml", "--json"))


class TestJson:
    def test_pick_has_every_field(self, picked):
        assert set(picked) >= RESULT
        for name, fields in FIELDS.items():
            assert set(picked[name]) >= fields, name
        assert set(picked["second"]) >= FIELDS["objective"]
        assert all(set(check) == CHECK for check in picked["checks"])
        assert picked["assumed"]
        assert all(set(one) == ASSUMED for one in picked["assumed"])
        assert all(set(one) == {"part", "reason"} for one in picked["rejected"])

    def test_pick_is_what_python_gives(self, picked):
        result = optopick.pick(ROOT / "examples" / "shortlist.toml")
        assert picked["status"] == result.status.value == "optimal"
        assert picked["design"]["coupler"] == result.design.coupler
        assert picked["design"]["r_led"] == result.design.r_led
        assert picked["design"]["r_be"] is None
        assert picked["objective"]["value"] == result.objective.value
        assert [check["name"] for check in picked["checks"]] == [check.name for check in result.review.checks]

    def test_gap_is_value_over_bound(self, picked):
        for name in ("objective", "second"):
            one = picked[name]
            assert one["gap"] == pytest.approx(1 - one["bound"] / one["value"])

    def test_checks_are_in_si(self, picked):
        checks = {check["name"]: check for check in picked["checks"]}
        assert checks["withstand"]["limit"] == 3750.0
        assert checks["creepage"]["limit"] == pytest.approx(6e-3)
        assert checks["edge_time"]["limit"] == pytest.approx(150e-6)
        for check in checks.values():
            room = check["limit"] - check["value"] if check["sense"] == "<=" else check["value"] - check["limit"]
            assert check["margin"] == pytest.approx(room / check["limit"])
            assert check["passed"] == (check["margin"] >= -1e-9)

    def test_next_best(self):
        found = json_of(run("pick", TINY, "--json", "--next", "2", "--differ", "value"))
        assert set(found) == RESULT | {"next"}
        designs = [found["design"], *(one["design"] for one in found["next"])]
        goals = [found["objective"]["value"], *(one["objective"]["value"] for one in found["next"])]
        assert len(designs) == 3
        assert all(one != other for one, other in pairwise(designs))
        assert goals == sorted(goals)

    def test_check(self):
        found = json_of(run("check", TINY, *UNSOUND, "--json"))
        assert set(found) >= {"status", "notes", "assumed", "cautions", "nearest", *REVIEW}
        assert found["status"] == "fails"
        assert found["notes"] == ["r_led is not in the stock (470 Ω, 680 Ω, 1 kΩ)"] or "r_led" in found["notes"][0]
        assert set(found["nearest"]) >= {"changed", *REVIEW}
        assert all(check["passed"] for check in found["nearest"]["checks"])
        assert json_of(run("check", TINY, *SOUND, "--json"))["status"] == "passes"

    def test_check_with_budget(self):
        found = json_of(run("check", TINY, *SOUND, "--budget", "--json"))
        assert {share["check"] for share in found["budget"]} == {check["name"] for check in found["checks"]}

    def test_rank(self):
        found = json_of(run("rank", ROOT / "examples" / "shortlist.toml", "--json", "--workers", "1"))
        assert set(found) >= {"complete", "ranked", "rejected"}
        assert found["complete"] is True
        goals = [one["objective"]["value"] for one in found["ranked"]]
        assert len(goals) >= 2
        for one in found["ranked"]:
            assert set(one) >= {"status", "objective", "second", "tightest", "price", *REVIEW}
            assert one["tightest"]["margin"] == min(check["margin"] for check in one["checks"])

    def test_tradeoff(self):
        found = json_of(run("tradeoff", TINY, "--json"))
        assert set(found) >= {"goals", "complete", "knee", "points"}
        assert found["goals"] == ["edge time", "power"]
        firsts, seconds = ([point[name] for point in found["points"]] for name in ("first", "second"))
        assert len(firsts) >= 2
        assert firsts == sorted(firsts)
        assert seconds == sorted(seconds, reverse=True)

    def test_why_of_the_impossible(self, impossible):
        found = json_of(run("why", impossible, "--json"))
        assert set(found) >= {"status", "conflicts", "changes", "complete", "objective", "worth"}
        assert found["status"] == "infeasible"
        assert any("power" in conflict for conflict in found["conflicts"])
        assert any(change["key"].endswith("power") for change in found["changes"])

    def test_why_of_the_possible(self):
        found = json_of(run("why", TINY, "--json"))
        assert found["status"] == "optimal"
        assert found["conflicts"] == []
        assert found["objective"]["name"] == "power"


class TestBench:
    """`sweep` and `yield`."""

    def test_sweep_goes_over_the_stock(self):
        found = json_of(run("sweep", TINY, *SOUND, "--position", "r_led", "--json"))
        assert set(found) >= {"position", "chosen", "steps"}
        assert found["position"] == "r_led"
        assert [step["ohms"] for step in found["steps"]] == [470.0, 680.0, 1000.0]
        margins = []
        for step in found["steps"]:
            assert step["worst"]["design"]["r_led"] == step["ohms"]
            margins += [check["value"] for check in step["worst"]["checks"] if check["name"] == "ctr_margin"]
        assert margins == sorted(margins, reverse=True)

    def test_sweep_of_the_best_design(self):
        best = json_of(run("pick", TINY, "--json"))
        found = json_of(run("sweep", TINY, "--json"))
        chosen = next(step["worst"] for step in found["steps"] if step["ohms"] == best["design"]["r_load"])
        assert found["position"] == "r_load"
        assert chosen["design"] == best["design"]
        assert chosen["checks"] == best["checks"]

    def test_sweep_as_csv_and_picture(self, tmp_path):
        picture = tmp_path / "sweep.svg"
        ran = run("sweep", TINY, "--csv", "--plot", picture)
        assert ran.code == 0
        assert len(list(csv.reader(io.StringIO(ran.out)))) == 4
        assert b"<svg" in picture.read_bytes()

    def test_every_unit_of_a_sound_design_passes(self):
        found = json_of(run("yield", TINY, *SOUND, "--samples", "5000", "--json"))
        assert (found["samples"], found["good"]) == (5000, 5000)
        assert run("yield", TINY, *SOUND, "--samples", "2000").code == 0

    def test_no_unit_of_an_unsound_one_does(self):
        """Its LED current is too small at every vertex but few."""
        ran = run("yield", TINY, *UNSOUND, "--samples", "2000", "--json")
        assert ran.code == 1
        assert json_of(ran)["good"] < 2000

    def test_units_are_drawn_by_the_seed(self):
        def drawn(*options: str) -> str:
            return run("yield", TINY, *UNSOUND, "--samples", "2000", "--json", *options).out

        assert drawn("--seed", "4") == drawn("--seed", "4")
        assert drawn("--seed", "4") != drawn("--seed", "5")
        assert drawn("--seed", "4", "--normal") != drawn("--seed", "4")


FOLDER = {"review.html", "design.json", "bom.csv", "link.cir", "schematic.svg"}


class TestFiles:
    """`report` and `netlist`."""

    def test_report_makes_a_folder_once(self, tmp_path):
        folder = tmp_path / "review"
        ran = run("report", TINY, "--output", folder, "--date", "2026-01-02")
        assert ran.code == 0
        assert {path.name for path in folder.iterdir()} >= FOLDER
        page = (folder / "review.html").read_text(encoding="utf-8")
        assert "2026-01-02" in page
        picked = json_of(run("pick", TINY, "--json"))
        written = json.loads((folder / "design.json").read_text(encoding="utf-8"))
        assert written["design"] == picked["design"]

        (folder / "review.html").write_text("changed by hand", encoding="utf-8")
        again = run("report", TINY, "-o", folder)
        assert again.code == 2
        assert "--force" in again.err
        assert (folder / "review.html").read_text(encoding="utf-8") == "changed by hand"
        assert run("report", TINY, "-o", folder, "--force").code == 0
        assert "changed by hand" not in (folder / "review.html").read_text(encoding="utf-8")

    def test_report_of_the_impossible(self, impossible, tmp_path):
        assert run("report", impossible, "-o", tmp_path / "review").code == 3

    def test_netlist_of_the_best_and_of_a_given_design(self):
        best = run("netlist", TINY)
        assert best.code == 0
        assert run("netlist", TINY, *SOUND).out == best.out
        assert run("netlist", TINY, *SOUND, "--at", "delay_off").out != best.out
        lines = best.out.splitlines()
        assert lines[0].startswith("*")
        assert lines[-1].lower() == ".end"

    def test_simulated_designs_say_what_the_simulation_found(self):
        ran = run("pick", TINY, "--simulate", "--json")
        assert ran.code == 0
        found = json_of(ran)
        assert set(found) >= RESULT | {"simulation"}
        assert all(check["passed"] for check in found["checks"])


class TestPlainText:
    @pytest.mark.parametrize(
        "arguments",
        [
            ("pick", TINY),
            ("pick", TINY, "--next", "1", "--differ", "coupler"),
            ("check", TINY, *SOUND, "--r-shunt", "10k"),
            ("check", TINY, *UNSOUND, "--budget"),
            ("rank", TINY, "--top", "1"),
            ("tradeoff", TINY, "--first", "delay", "--second", "power", "--points", "2"),
            ("why", TINY),
            ("sweep", TINY, "--position", "r_be"),
            ("yield", TINY, "--samples", "1000"),
        ],
        ids=lambda arguments: arguments[0],
    )
    def test_piped_output_is_plain(self, arguments):
        ran = run(*arguments)
        assert ran.code in (0, 1)
        assert "\x1b" not in ran.out
        assert max(len(line) for line in ran.out.splitlines()) <= 100
        assert ran.out.splitlines()[0] == "Golden model files"
        assert "…" not in ran.out

    def test_cautions_stand_at_the_end(self):
        for ran in (run("pick", TINY), run("check", TINY, *SOUND)):
            assert "about function, not safety" in " ".join(ran.out.split())

    def test_ranking_as_csv(self):
        ran = run("rank", ROOT / "examples" / "shortlist.toml", "--csv", "--top", "2")
        rows = list(csv.DictReader(io.StringIO(ran.out)))
        assert [row["place"] for row in rows] == ["1", "2"]
        assert float(rows[0]["r_led"]) > 0

    def test_front_as_csv(self):
        rows = list(csv.DictReader(io.StringIO(run("tradeoff", TINY, "--csv").out)))
        assert len(rows) >= 2
        assert float(rows[0]["edge_time"]) < float(rows[1]["edge_time"])

    @pytest.mark.parametrize("ending", ["svg", "png"])
    def test_front_as_picture(self, tmp_path, ending):
        picture = tmp_path / f"front.{ending}"
        assert run("tradeoff", TINY, "--plot", picture).code == 0
        start = picture.read_bytes()[:200]
        assert start.startswith(b"\x89PNG") if ending == "png" else b"<?xml" in start
        assert list(tmp_path.iterdir()) == [picture]


class TestAtTerminal:
    @pytest.mark.parametrize("columns", [80, 120])
    def test_no_number_is_cut(self, columns):
        """Every value and limit that JSON gives stands whole in the table, whatever the width."""
        shown = ESCAPE.sub("", run_at_terminal(columns, "pick", "examples/shortlist.toml"))
        found = json_of(run("pick", ROOT / "examples" / "shortlist.toml", "--json"))
        assert max(len(line) for line in shown.splitlines()) <= columns
        for check in found["checks"]:
            value, limit = (amount(check[name], check["unit"]) for name in ("value", "limit"))
            pattern = rf"{re.escape(value)}\s+[≤≥] {re.escape(limit)}\s+[-\d.]+ %"
            assert re.search(pattern, shown), (check["name"], value, limit)
        for name, seconds in found["timing"].items():
            assert amount(seconds, "s") in shown, name
        assert "…" not in shown

    @pytest.mark.parametrize(
        "arguments",
        [
            ("check", TINY, *UNSOUND, "--budget"),
            ("rank", "examples/shortlist.toml"),
            ("tradeoff", "examples/shortlist.toml", "--first", "delay", "--points", "3"),
            ("why", TINY),
            ("sweep", "examples/shortlist.toml"),
            ("yield", TINY, "--samples", "1000"),
        ],
        ids=lambda arguments: arguments[0],
    )
    def test_narrow_terminals_cut_nothing(self, arguments):
        shown = ESCAPE.sub("", run_at_terminal(80, *arguments))
        assert max(len(line) for line in shown.splitlines()) <= 80
        assert "…" not in shown

    def test_colours_and_none_of_them(self):
        coloured = re.compile(r"\x1b\[[0-9;]*3[0-7][0-9;]*m")
        assert coloured.search(run_at_terminal(80, "pick", TINY))
        assert not coloured.search(run_at_terminal(80, "pick", TINY, NO_COLOR="1"))


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


def test_every_option_is_tried():
    """Each command and each of its options stands in this file, in quotes."""
    text = Path(__file__).read_text(encoding="utf-8")
    for name, command in main.commands.items():
        assert f'"{name}"' in text, name
        for parameter in command.params:
            if isinstance(parameter, click.Option) and not {"--help"} & set(parameter.opts):
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

    @staticmethod
    def _slow(monkeypatch: pytest.MonkeyPatch) -> None:
        seconds = iter(range(0, 10**6, 3))
        monkeypatch.setattr("optopick.cli.app.time.monotonic", lambda: float(next(seconds)))


class TestPython:
    def test_path_text_and_brief(self):
        by_path, by_text = optopick.pick(TINY), optopick.pick(str(TINY))
        assert by_path.design == by_text.design
        assert by_path.status is Status.OPTIMAL

    def test_wrong_input_is_an_exception(self):
        with pytest.raises(InputError) as caught:
            optopick.pick("no-such-brief.toml")
        assert caught.value.mistakes
