"""Processes of this machine: the order of the answers, killed processes, work that kills who does it."""

from __future__ import annotations

import multiprocessing
import os
import pickle
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from cluster_machines import Deadly, done, first_waits, process_of
from command import ROOT, run

from optopick.errors import InputError, Mistake, WorkLostError
from optopick.read_brief import read_brief
from optopick.uses.engine import couplers_of
from optopick.uses.rank import rank
from optopick.uses.tradeoff import tradeoff
from optopick.uses.workers import AHEAD, TRIES, Here, Processes

TINY = ROOT / "tests" / "golden" / "tiny.toml"


def test_answers_come_in_order():
    assert list(Processes(3).map(abs, range(-500, 0))) == list(range(500, 0, -1))
    assert list(Processes(3).map(abs, iter([-1]))) == [1]
    assert list(Processes(3).map(abs, [])) == []


@pytest.mark.parametrize("workers", [Here(), Processes(3)])
def test_answers_as_they_are_done(workers):
    assert sorted(workers.as_done(abs, range(-500, 0))) == [(k, -k) for k in range(-500, 0)]


def test_no_answer_waits_for_a_slow_one_before_it(tmp_path):
    answers = Processes(2).as_done(first_waits, [Deadly(k, tmp_path) for k in range(90)])
    first, number = next(answers)
    assert first.number == number != 0
    (tmp_path / "go").touch()
    assert {number, *(other for _, other in answers)} == set(range(90))


def test_several_processes_work():
    assert len(set(Processes(2).map(process_of, range(200)))) == 2
    assert set(Processes(1).map(process_of, range(20))) == {os.getpid()}


def test_items_are_not_taken_long_before_their_turn():
    taken = 0

    def items():
        nonlocal taken
        for k in range(10**6):
            taken += 1
            yield k

    answers = Processes(2).map(abs, items())
    assert [next(answers) for _ in range(10)] == list(range(10))
    assert taken <= 2 * AHEAD + 10
    answers.close()


def test_work_of_a_killed_process_is_done_again(tmp_path):
    work = [Deadly(k, tmp_path, times=1 if k in (5, 6, 70) else 0) for k in range(90)]
    assert list(Processes(3).map(done, work)) == [k / 7 for k in range(90)]
    assert len(list(tmp_path.iterdir())) == 3
    work = [Deadly(k, tmp_path, times=1 if k in (95, 96, 160) else 0) for k in range(90, 180)]
    found = {one.number: answer for one, answer in Processes(3).as_done(done, work)}
    assert found == {k: k / 7 for k in range(90, 180)}
    assert len(list(tmp_path.iterdir())) == 6


def test_work_that_kills_every_process_is_named(tmp_path):
    """The answers before it have come; those beside it are not blamed."""
    work = [Deadly(k, tmp_path, times=99 if k == 37 else 0) for k in range(90)]
    answers = Processes(3).map(done, work)
    for k in range(37):
        assert next(answers) == k / 7
    with pytest.raises(WorkLostError, match=f"^work 37: .* {TRIES} times"):
        next(answers)


def test_a_ranking_survives_a_killed_process():
    brief = read_brief(ROOT / "examples" / "battery.toml")
    couplers = couplers_of(brief)[0][:8]
    killed = []

    def kill_one(_: str, done: int, total: int) -> None:
        if not killed:
            assert done < total
            killed.append(multiprocessing.active_children()[0])
            os.kill(killed[0].pid, signal.SIGKILL)

    ranking = rank(brief, couplers=couplers, workers=Processes(2), progress=kill_one)
    assert killed[0].exitcode == -signal.SIGKILL
    assert repr(ranking) == repr(rank(brief, couplers=couplers, workers=Here()))
    assert len(ranking.ranked) + len(ranking.rejected) == len(couplers)


@pytest.mark.parametrize("points", [None, 5])
def test_who_walks_the_front_does_not_change_it(points):
    brief = read_brief(TINY)
    once = tradeoff(brief, points=points, workers=Here())
    assert repr(once) == repr(tradeoff(brief, points=points, workers=Processes(2)))
    assert len(once.points) >= 2


def test_commands_give_the_same_with_any_number_of_processes():
    for command in (("rank", TINY), ("tradeoff", TINY), ("tradeoff", TINY, "--points", "4")):
        once, other = (run("-q", *command, "--json", "--workers", count) for count in ("1", "3"))
        assert once.code == 0
        assert once == other
    once, other = (run("-q", "yield", TINY, "--samples", "40000", "--json", "--workers", count) for count in ("1", "2"))
    assert once == other


def test_lost_work_is_told_without_a_traceback(monkeypatch):
    def lost(*_):
        raise WorkLostError("TINYPHOTO: given up")
        yield

    monkeypatch.setattr("optopick.uses.workers.Processes.map", lost)
    ran = run("rank", TINY, "--workers", "2")
    assert (ran.code, ran.out) == (71, "")
    assert ran.err == "optopick: work lost, no result given: TINYPHOTO: given up\n"


def test_mistakes_come_whole_from_another_process():
    error = InputError([Mistake("here", "this", "that"), Mistake("there", "these", "those")])
    assert pickle.loads(pickle.dumps(error)).mistakes == error.mistakes


def test_folders_of_deadly_work_pickle():
    work = Deadly(1, Path("x"))
    assert pickle.loads(pickle.dumps(work)) == work


PARENT = """
import sys, time
from cluster_machines import process_of
from optopick.uses.workers import Processes
answers = Processes(2).map(process_of, iter(int, 1))
print(*{next(answers) for _ in range(100)}, flush=True)
time.sleep(600)
"""


def test_processes_end_with_a_killed_parent():
    paths = os.pathsep.join((str(ROOT), str(ROOT / "tests")))
    with subprocess.Popen(
        [sys.executable, "-c", PARENT], env={**os.environ, "PYTHONPATH": paths}, stdout=subprocess.PIPE, text=True
    ) as parent:
        children = [int(text) for text in parent.stdout.readline().split()]
        assert children
        assert all(map(is_there, children))
        parent.kill()
        until = time.monotonic() + 60
        while any(map(is_there, children)) and time.monotonic() < until:
            time.sleep(0.05)
    assert not any(map(is_there, children))


def is_there(process: int) -> bool:
    """Whether a process is there and has not ended."""
    try:
        status = Path(f"/proc/{process}/stat").read_text(encoding="utf-8")
    except OSError:
        return False
    return status.rpartition(")")[2].split()[0] != "Z"
