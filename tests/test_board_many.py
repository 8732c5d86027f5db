"""Several boards at once: the answers that they have alone, in order, whoever does the work."""

from __future__ import annotations

import json
from dataclasses import replace

import board_samples as samples
import pytest
from cli_links import json_of
from cluster_machines import machines
from command import run

from optopick.board_answers import BoardResult
from optopick.read_board import read_board
from optopick.uses.board import solve_board
from optopick.uses.board_many import solve_boards
from optopick.uses.cluster import Cluster
from optopick.uses.workers import Here, Processes

LIMITS = ("reels = 5\npackages = 5", "reels = 2", "reels = 4")
"""The second one cannot be kept."""


@pytest.fixture
def paths(tmp_path):
    """Three boards, each in a folder of its own."""
    folders = [tmp_path / name for name in ("a", "b", "c")]
    for folder in folders:
        folder.mkdir()
    return [samples.written(folder, limits) for folder, limits in zip(folders, LIMITS, strict=True)]


def timeless(result: BoardResult) -> BoardResult:
    return replace(result, proof=replace(result.proof, seconds=0.0))


@pytest.fixture
def boards(paths):
    return [read_board(path) for path in paths]


def test_the_answers_do_not_depend_on_who_does_the_work(boards):
    alone = [timeless(solve_board(board)) for board in boards]
    assert [one.status.value for one in alone] == ["optimal", "infeasible", "optimal"]
    assert alone[0] != alone[2]
    told = []
    for workers in (Here(), Processes(1), Processes(2), Processes(3)):
        found = solve_boards(boards, workers=workers, progress=lambda *said: told.append(said))
        assert [timeless(one) for one in found] == alone
    assert told[:3] == [("boards", 1, 3), ("boards", 2, 3), ("boards", 3, 3)]


def test_a_cluster_answers_the_same(boards, tmp_path):
    pytest.importorskip("distributed", reason="Dask is not installed (pip install distributed)")
    with machines(tmp_path, 2) as there, Cluster(there.address) as cluster:
        found = solve_boards(boards, workers=cluster)
    assert [timeless(one) for one in found] == [timeless(solve_board(board)) for board in boards]


def test_json_is_a_list_and_the_code_the_worst(paths):
    ran = run("board", *paths, "--json", "--workers", "2")
    assert ran.code == 3
    found = json.loads(ran.out)
    assert [one["status"] for one in found] == ["optimal", "infeasible", "optimal"]
    assert [one["limits"]["reels"] for one in found] == [5, 2, 4]
    one = json_of(run("board", paths[0], "--json", "--workers", "2"))
    assert one["proof"].pop("seconds") >= 0
    found[0]["proof"].pop("seconds")
    assert one == found[0]


def test_at_the_terminal_one_after_the_other(paths):
    ran = run("board", paths[0], paths[2], "--workers", "2")
    assert ran.code == 0
    assert ran.out.count("Two <links> & more") == 2
    assert ran.out.index("of 5") < ran.out.index("of 4")
    assert run("board", paths[0], paths[1], "--time-limit", "0", "--workers", "1").code == 4


def test_mistakes_of_all_boards_at_once(paths):
    for path in paths[:2]:
        path.write_text(path.read_text(encoding="utf-8").replace("[limits]", "[limits]\nreel = 3"), encoding="utf-8")
    ran = run("board", *paths)
    assert ran.code == 2
    told = [line.split(" line 3, limits.reel: ")[0] for line in ran.err.splitlines()]
    assert told == [f"optopick: {path}" for path in paths[:2]]
    assert ran.out == ""


@pytest.mark.parametrize("option", ["--csv", "--output", "--front"])
def test_what_is_of_one_board_alone(paths, tmp_path, option):
    ran = run("board", *paths, option, "reels" if option == "--front" else tmp_path / "there")
    assert ran.code == 2
    assert f"{option}: found 3 boards beside it; expected one board" in ran.err
    assert not (tmp_path / "there").exists()


@pytest.mark.parametrize("doing", [("--workers", "2"), ("--cluster", "tcp://192.0.2.7:8786")])
def test_a_front_is_found_here(paths, doing):
    ran = run("board", paths[0], "--front", "reels", *doing)
    assert ran.code == 2
    assert f"{doing[0]}: found --front beside it" in ran.err
