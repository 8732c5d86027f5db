"""What people read: plain in a pipe, whole numbers at any width, colours only where they belong; CSV and pictures."""

from __future__ import annotations

import csv
import io
import re

import pytest
from cli_links import SOUND, TINY, UNSOUND, json_of
from command import ESCAPE, ROOT, run, run_at_terminal

from optopick.report.words import amount


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
            pattern = rf"{re.escape(value)}\s+[≤≥] {re.escape(limit)}\s+(> 1000|[-\d.]+) %"
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
