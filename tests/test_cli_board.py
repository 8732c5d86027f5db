"""`board` as a user meets it: exit codes, terminal, JSON, the bill of materials, limits that cannot be kept."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import pytest
from cli_links import CHECK, FIELDS, TINY, changed, json_of
from command import run

TWO = """\
title = "Two links"
[limits]
{limits}
[goal]
minimize = "{goal}"
[[link]]
name = "first"
brief = "{first}"
count = 3
[[link]]
name = "second"
brief = "{second}"
"""


@pytest.fixture
def board(tmp_path):
    """Writes a board of two links, the second of which is slower."""

    def write(limits: str = "", goal: str = "power", second: tuple[tuple[str, str], ...] = ()) -> Path:
        one = changed(tmp_path, name="one.toml")
        slower = (("edge_time", "#edge_time"), ("delay", "#delay"), ('["2k2", "4k7", "10k"]', '["4k7", "10k", "12k"]'))
        two = changed(tmp_path, *slower, *second, name="two.toml")
        path = tmp_path / "board.toml"
        path.write_text(TWO.format(limits=limits, goal=goal, first=one.name, second=two.name), encoding="utf-8")
        return path

    return write


def test_the_terminal(board):
    ran = run("board", board("reels = 4"))
    assert ran.code == 0, ran
    assert ran.err == ""
    for words in ("Two links", "Least power", "(proved)", "first", "3 ×", "second", "Reels", "of 4", "Caution"):
        assert words in ran.out


def test_json(board):
    found = json_of(run("board", board("reels = 4\ncouplers = 2"), "--json"))
    assert found["status"] == "optimal"
    assert [goal["name"] for goal in found["goals"]] == ["power", "reels"]
    assert set(found["goals"][0]) == FIELDS["objective"]
    assert [(link["name"], link["count"]) for link in found["links"]] == [("first", 3), ("second", 1)]
    for link in found["links"]:
        assert FIELDS["design"] <= set(link["design"])
        assert all(set(check) == CHECK and check["passed"] for check in link["checks"])
        assert link["gave"] == pytest.approx(link["power"]["worst"] / link["power_alone"] - 1)
    total = sum(link["count"] * link["power"]["worst"] for link in found["links"])
    assert found["power"] == pytest.approx(total) == pytest.approx(found["goals"][0]["value"])
    assert len(found["reels"]) <= 4
    assert found["limits"] == {"reels": 4, "couplers": 2, "packages": None, "power": None, "price": None}
    assert found["packages_placed"] == sum(one["count"] for one in found["packages"]) == 4


def test_fewer_reels_cost_power(board):
    free, few = (json_of(run("board", board(limits), "--json")) for limits in ("", "reels = 3"))
    assert len(few["reels"]) == 3 < len(free["reels"])
    assert few["power"] > free["power"]


def test_the_bill(board, tmp_path):
    path = tmp_path / "parts.csv"
    found = json_of(run("board", board(), "--json", "--csv", path))
    lines = list(csv.DictReader(path.read_text(encoding="utf-8").splitlines()))
    assert set(lines[0]) == {"quantity", "value", "tolerance", "rating", "used"}
    couplers = lines[: len(found["couplers"])]
    assert [line["value"] for line in couplers] == found["couplers"]
    assert sum(int(line["quantity"]) for line in couplers) == 4
    resistors = lines[len(found["couplers"]) :]
    assert len(resistors) == len(found["reels"])
    names = ("r_led", "r_load", "r_be", "r_shunt")
    placed = sum(link["count"] for link in found["links"] for name in names if link["design"][name] is not None)
    assert sum(int(line["quantity"]) for line in resistors) == placed
    assert all(line["tolerance"] == "1 %" for line in resistors)
    assert "first r_load" in "".join(line["used"] for line in resistors)


def test_too_few_reels(board, tmp_path):
    path = board("reels = 2")
    ran = run("board", path, "--csv", tmp_path / "parts.csv")
    assert ran.code == 3
    assert (
        "though every link has designs alone. Reels 2 cannot be kept. Reels would have to be at least 3."
        in " ".join(ran.out.split())
    )
    assert not (tmp_path / "parts.csv").exists()
    found = json_of(run("board", path, "--json"))
    assert (found["status"], found["links"], found["power"]) == ("infeasible", [], None)
    assert found["conflict"] == [{"name": "reels", "limit": 2, "least": 3.0, "proved": True}]


def test_limits_that_contradict_each_other(board):
    least = json_of(run("board", board(), "--json"))["power"]
    path = board(f"reels = 3\npower = {1.001 * least}")
    said = " ".join(run("board", path).out.split())
    assert (
        f"Reels 3 and power {1e3 * least * 1.001:.4g} mW cannot be kept together. Reels would have to be at least"
        in said
    )
    names = {one["name"]: one for one in json_of(run("board", path, "--json"))["conflict"]}
    assert set(names) == {"reels", "power"}
    enough = json_of(run("board", board(f"reels = 3\npower = {names['power']['least'] * 1.0001}"), "--json"))
    assert enough["status"] == "optimal"


def test_too_dear_names_the_price(shelf):
    said = " ".join(run("board", shelf("price = 0.9")).out.split())
    assert "Price 0.9 cannot be kept. Price would have to be at least 1.04." in said
    (needed,) = json_of(run("board", shelf("price = 0.9"), "--json"))["conflict"]
    assert (needed["name"], needed["least"]) == ("price", pytest.approx(1.04))


def test_the_front(board):
    path = board("reels = 4")
    ran = run("board", path, "--front", "reels")
    assert ran.code == 0
    for words in ("each proved", "Reels", "Power", "More than the last", "Caution"):
        assert words in ran.out
    found = json_of(run("board", path, "--front", "reels", "--json"))
    assert (found["count"], found["goal"], found["complete"]) == ("reels", "power", True)
    assert found["points"][0]["most"] == found["points"][0]["reels"] == 3
    values = [point["goal"]["value"] for point in found["points"]]
    assert values == sorted(values, reverse=True)
    assert len(values) >= 2
    assert set(found["points"][0]["designs"]) == {"first", "second"}
    alone = json_of(run("board", board("reels = 3"), "--json"))
    assert alone["power"] == pytest.approx(values[0])


def test_no_front_of_the_goal_or_with_a_bill(board, tmp_path):
    ran = run("board", board(goal="reels"), "--front", "reels")
    assert (ran.code, ran.out) == (2, "")
    assert "expected one of couplers, packages" in ran.err
    ran = run("board", board(), "--front", "reels", "--csv", tmp_path / "parts.csv")
    assert ran.code == 2
    assert "--csv: found --front beside it" in ran.err


def test_no_front_where_no_board_exists(board):
    path = board("power = 1e-3")
    ran = run("board", path, "--front", "couplers")
    assert ran.code == 3
    assert "No board holds the other limits, whatever the couplers" in ran.out
    assert json_of(run("board", path, "--front", "couplers", "--json"))["points"] == []
    path = board(second=(('power = "40 mW"', 'power = "1 mW"'),))
    assert "second has no design even alone" in run("board", path, "--front", "reels").out


def test_a_link_without_any_design(board):
    path = board(second=(('power = "40 mW"', 'power = "1 mW"'),))
    ran = run("board", path)
    assert ran.code == 3
    assert "second has no design even alone" in ran.out
    assert json_of(run("board", path, "--json"))["hopeless"] == ["second"]


def test_out_of_time(board):
    ran = run("board", board(), "--time-limit", "0")
    assert ran.code == 4
    assert "Out of time" in ran.out
    ran = run("board", board(), "--time-limit", "0", "--front", "reels")
    assert ran.code == 4
    assert "Out of time" in ran.out


@pytest.fixture
def shelf(tmp_path):
    """Writes a board whose links share grounds and take resistors with prices, of couplers with two channels."""

    def write(limits: str = "", goal: str = "cost", prices: str = "0.02") -> Path:
        table = TINY.with_name("tiny.csv").read_text(encoding="utf-8").splitlines()
        columns = table[next(k for k, line in enumerate(table) if line.startswith("part,"))].split(",")
        rows = []
        for line in table:
            cells = line.split(",")
            if len(cells) == len(columns) and cells != columns:
                cells[columns.index("channels")], cells[columns.index("price")] = "2", "0.4"
            rows.append(",".join(cells))
        (tmp_path / "tiny.csv").write_text("\n".join(rows) + "\n", encoding="utf-8")
        ohms = ("470", "680", "1k", "2k2", "4k7", "10k", "220k", "470k")
        (tmp_path / "shelf.csv").write_text(
            "value,price\n" + "".join(f"{value},{prices}\n" for value in ohms), encoding="utf-8"
        )
        text = TINY.read_text(encoding="utf-8")
        start, end = text.index("r_led ="), text.index("[couplers]")
        positions = 'r_led = { values = "shelf.csv", power = "0.25 W" }\nr_load = { values = "shelf.csv" }\n'
        positions += 'r_be = { values = "shelf.csv", absent = true }\n\n'
        (tmp_path / "one.toml").write_text(text[:start] + positions + text[end:], encoding="utf-8")
        board = TWO.format(limits=limits, goal=goal, first="one.toml", second="one.toml")
        path = tmp_path / "board.toml"
        path.write_text(
            board.replace('brief = "one.toml"', 'brief = "one.toml"\ngrounds = ["field", "logic"]'), "utf-8"
        )
        return path

    return write


def test_cost_and_packages(shelf, tmp_path):
    path = shelf("price = 5\npackages = 2")
    ran = run("board", path, "--csv", tmp_path / "parts.csv")
    assert ran.code == 0, ran
    for words in ("Least cost: 1.04", "Packages", "2 of 2", "from field to logic", "Price", "1.04 of 5"):
        assert words in ran.out
    first = next(csv.DictReader((tmp_path / "parts.csv").read_text(encoding="utf-8").splitlines()))
    assert (first["quantity"], first["used"]) == ("2", "first; second")
    found = json_of(run("board", path, "--json"))
    assert found["price"] == pytest.approx(2 * 0.4 + 4 * 3 * 0.02)
    (packages,) = found["packages"]
    assert packages["links"] == {"first": 3, "second": 1}
    assert (packages["grounds"], packages["count"], packages["channels"]) == (["field", "logic"], 2, 2)


def test_too_dear_a_board(shelf):
    assert run("board", shelf("price = 0.9")).code == 3


def test_no_price_at_all(shelf):
    ran = run("board", shelf(prices=""))
    assert ran.code == 2
    assert "link first: found no price of any resistor in stock.r_led (shelf.csv, 8 values)" in ran.err
    assert ran.out == ""


def test_shortest_edges(board):
    path = board(goal="edge")
    ran = run("board", path)
    assert ran.code == 0
    assert "of its limit" in ran.out
    found = json_of(run("board", path, "--json"))
    timing = found["links"][0]["timing"]
    assert found["goals"][0]["value"] == pytest.approx(max(timing["edge_on"], timing["edge_off"]) / 30e-6)
    assert found["edge"] == pytest.approx(found["goals"][0]["value"])


def test_what_links_change_is_told(board):
    path = board()
    text = path.read_text(encoding="utf-8").replace(
        "count = 3", 'count = 3\nset.signal.lit = 0.1\nunset = ["limits.delay"]'
    )
    path.write_text(text, encoding="utf-8")
    assert "first: signal.lit = 0.1, no limits.delay" in run("board", path).out
    found = json_of(run("board", path, "--json"))
    assert [link["changes"] for link in found["links"]] == [{"signal.lit": "0.1", "limits.delay": None}, {}]
    powers = [link["power"]["worst"] for link in found["links"]]
    assert powers[0] < powers[1] / 2


def test_least_reels_then_power(board):
    found = json_of(run("board", board(goal="reels"), "--json"))
    assert [goal["name"] for goal in found["goals"]] == ["reels", "power"]
    assert found["goals"][0]["value"] == len(found["reels"]) == 3


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (("board", "none.toml"), "none.toml"),
        (("board",), "Missing argument"),
        (("board", "none.toml", "--reels", "3"), "No such option"),
    ],
)
def test_wrong_input(arguments, said):
    ran = run(*arguments)
    assert ran.code == 2
    assert said in ran.err
    assert "Traceback" not in ran.err + ran.out


def test_a_bill_that_cannot_be_written(board, tmp_path):
    ran = run("board", board(), "--csv", tmp_path / "none" / "parts.csv")
    assert ran.code == 2
    assert "parts.csv" in ran.err
    assert ran.out == ""


class TestReview:
    """The folder of a board's design review."""

    def test_it_is_written_beside_the_answer(self, board, tmp_path):
        folder = tmp_path / "review"
        path = board("reels = 4")
        ran = run("board", path, "--output", folder, "--date", "2026-01-15", "--json")
        assert ran.code == 0, ran
        assert ran.err == f"optopick: {folder}: board.json, bom.csv, review.html\n"
        told, kept = json_of(ran), json.loads((folder / "board.json").read_text(encoding="utf-8"))
        assert told["proof"].pop("seconds") == kept["proof"].pop("seconds")
        assert told == kept
        page = (folder / "review.html").read_text(encoding="utf-8")
        assert "Design review of a board with 2 optocoupler links, 2026-01-15" in page
        run("board", path, "--csv", tmp_path / "parts.csv")
        assert (folder / "bom.csv").read_bytes() == (tmp_path / "parts.csv").read_bytes()

    def test_the_same_page_each_time(self, board, tmp_path):
        pages = []
        for name in ("one", "two"):
            assert run("board", board(), "-o", tmp_path / name, "--date", "2026-01-15").code == 0
            pages.append((tmp_path / name / "review.html").read_bytes())
        assert pages[0] == pages[1]

    def test_what_is_there_is_replaced_by_force_alone(self, board, tmp_path):
        path, folder = board(), tmp_path / "review"
        assert run("board", path, "-o", folder).code == 0
        before = (folder / "review.html").stat().st_ino
        ran = run("board", path, "-o", folder)
        assert ran.code == 2
        assert "or --force" in ran.err
        assert ran.out == ""
        assert (folder / "review.html").stat().st_ino == before
        # one that does not exist has no bill: the earlier one's goes with it
        assert run("board", board("reels = 2"), "-o", folder, "--force").code == 3
        assert sorted(one.name for one in folder.iterdir()) == ["board.json", "review.html"]
        assert "cannot be kept" in (folder / "review.html").read_text(encoding="utf-8")

    @pytest.mark.parametrize(
        ("options", "said"),
        [
            (("--front", "reels", "--output", "review"), "--output: found --front beside it"),
            (("--front", "reels", "--csv", "parts.csv"), "--csv: found --front beside it"),
            (("--force",), "--force: found no --output"),
            (("--date", "2026-01-15"), "--date: found no --output"),
        ],
    )
    def test_options_that_mean_nothing_together(self, board, options, said):
        ran = run("board", board(), *options)
        assert ran.code == 2
        assert said in ran.err
        assert ran.out == ""
