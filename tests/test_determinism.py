"""The same brief gives the same answer: again, and in another process with other hashes."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from dataclasses import replace

import pytest
from command import ROOT, run
from fine_link import fine_link
from test_enumeration import case

from optopick.result import Proof, Status
from optopick.uses.pick import pick

CASES = ("examples/shortlist.toml", "examples/battery.toml", "tests/golden/tiny.toml")


def steady(text: str) -> object:
    """A JSON answer without the seconds it took."""
    found = json.loads(text)
    del found["proof"]["seconds"]
    return found


def in_another_process(seed: str, *arguments: str) -> str:
    ran = subprocess.run(
        [sys.executable, "-c", "from optopick.cli import main; main()", *arguments],
        env={**os.environ, "PYTHONHASHSEED": seed},
        cwd=ROOT,
        capture_output=True,
        text=True,
        stdin=subprocess.DEVNULL,
        check=True,
    )
    return ran.stdout


@pytest.mark.parametrize("brief", CASES)
def test_again_and_elsewhere(brief):
    first = steady(run("pick", ROOT / brief, "--json").out)
    assert steady(run("pick", ROOT / brief, "--json").out) == first
    assert steady(in_another_process("1", "pick", brief, "--json")) == first


def test_on_a_fine_series(tmp_path):
    brief = str(fine_link(tmp_path, "distortion"))
    first = steady(run("pick", brief, "--json").out)
    assert first["status"] == "optimal"
    assert steady(in_another_process("7", "pick", brief, "--json")) == first


@pytest.mark.parametrize("seed", [42, 43, 56, 59])
def test_when_the_solver_decides(seed):
    """Links that ranges alone do not settle."""
    brief, couplers = case(seed)
    one, other = (pick(brief, couplers=couplers) for _ in range(2))
    assert one.status is Status.OPTIMAL
    assert one.proof.solves > 0
    assert replace(one, proof=clockless(one.proof)) == replace(other, proof=clockless(other.proof))


def clockless(proof: Proof) -> Proof:
    return replace(proof, seconds=0.0)


@pytest.mark.parametrize("workers", ["1", "2"])
def test_ranking_does_not_depend_on_who_works(workers):
    one = json.loads(run("rank", ROOT / CASES[0], "--json", "--workers", workers).out)
    assert one == json.loads(run("rank", ROOT / CASES[0], "--json", "--workers", "1").out)
