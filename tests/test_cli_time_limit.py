"""Out of time: nothing is claimed that was not shown."""

from __future__ import annotations

from pathlib import Path

import pytest
from cli_links import TINY, changed, json_of
from command import run
from fine_link import fine_link

import optopick
from optopick.result import Status


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


def test_out_of_time(hard):
    ran = run("pick", hard, "--time-limit", "0")
    assert ran.code == 4
    assert "Out of time" in ran.out
    assert "proved" not in ran.out


def test_out_of_time_is_no_design_given_time(hard):
    assert run("pick", hard).code == 3


def test_unknown_in_json(hard):
    found = json_of(run("pick", hard, "--time-limit", "0", "--json"))
    assert found["status"] == "unknown"
    assert found["design"] is None
    assert found["objective"] is None


def test_the_best_so_far_with_its_bound(tmp_path, least_distortion):
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
def test_no_claim_beyond_what_is_shown(tmp_path, goal):
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


def test_not_a_number_of_seconds():
    ran = run("pick", TINY, "--time-limit", "soon")
    assert ran.code == 2
    assert "soon" in ran.err
