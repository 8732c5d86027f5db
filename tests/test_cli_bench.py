"""The commands `sweep`, `yield`, `report`, `netlist`, and `pick --simulate`."""

from __future__ import annotations

import csv
import io
import json
import re
from xml.etree import ElementTree

from cli_links import RESULT, SOUND, TINY, UNSOUND, changed, impossible, json_of
from command import run


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

    def test_sweep_tries_the_empty_position_last(self):
        found = json_of(run("sweep", TINY, *SOUND, "--position", "r_be", "--json"))
        assert [step["ohms"] for step in found["steps"]] == [220e3, 470e3, None]
        assert [step["worst"]["design"]["r_be"] for step in found["steps"]] == [220e3, 470e3, None]

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

    def test_schematic_carries_its_style(self, tmp_path):
        """Opened on its own, every class that the drawing uses has a rule, and every colour a value."""
        assert run("report", TINY, "-o", tmp_path / "review").code == 0
        root = ElementTree.fromstring((tmp_path / "review" / "schematic.svg").read_bytes())
        (style,) = root.iter("{http://www.w3.org/2000/svg}style")
        used = {name for node in root.iter() for name in node.get("class", "").split()} - {"wires"}
        assert used >= {"schematic", "outline", "barrier", "package"}
        assert {name for name in used if not re.search(rf"\.{name}\b", style.text)} == set()
        assert set(re.findall(r"var\((--[\w-]+)\)", style.text)) <= set(re.findall(r"(--[\w-]+):", style.text))

    def test_a_load_of_one_value_leaves_the_led_resistor_to_move_along(self, tmp_path):
        brief = changed(tmp_path, ('["2k2", "4k7", "10k"]', '["10k"]'))
        assert run("report", brief, "-o", tmp_path / "review").code == 0
        page = (tmp_path / "review" / "review.html").read_text(encoding="utf-8")
        assert re.findall(r'<details open class="walk" data-walk="([\w-]+)"', page) == ["r-led", "r-be", "front"]

    def test_report_of_the_impossible(self, tmp_path):
        assert run("report", impossible(tmp_path), "-o", tmp_path / "review").code == 3

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
