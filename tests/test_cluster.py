"""A real Dask cluster: the same answers bit for bit, a worker killed or not; what is told where it cannot be used."""

from __future__ import annotations

import os
import signal
import socket
import sys

import pytest
from cli_links import TINY
from cluster_machines import Deadly, done, first_waits, machines
from command import ROOT, run

from optopick.errors import InputError, WorkLostError
from optopick.read_brief import read_brief
from optopick.uses.cluster import Cluster, _Call, versions
from optopick.uses.engine import couplers_of
from optopick.uses.rank import rank
from optopick.uses.workers import AHEAD, Here

PATIENCE = 60.0


def test_a_killed_worker_changes_no_bit(tmp_path):
    brief = read_brief(ROOT / "examples" / "battery.toml")
    couplers = couplers_of(brief)[0][:10]
    with machines(tmp_path, 3) as there, Cluster(there.address, PATIENCE) as cluster:
        cluster.client.wait_for_workers(3, timeout=PATIENCE)
        killed = []

        def kill_one(_: str, done: int, total: int) -> None:
            if not killed:
                assert done < total
                killed.append(there.workers[0])
                os.kill(killed[0].pid, signal.SIGKILL)

        ranking = rank(brief, couplers=couplers, workers=cluster, progress=kill_one)
        assert killed[0].wait(PATIENCE) == -signal.SIGKILL
        assert repr(ranking) == repr(rank(brief, couplers=couplers, workers=Here()))
        assert len(ranking.ranked) + len(ranking.rejected) == len(couplers)

        # one of the two left dies of its work, which the other then does
        work = [Deadly(k, tmp_path, times=int(k == 20)) for k in range(60)]
        assert list(cluster.map(done, work)) == [k / 7 for k in range(60)]
        assert len(list(tmp_path.glob("20-*"))) == 1
        assert len(cluster.client.nthreads()) == 1


def test_commands_answer_as_without(tmp_path):
    commands = (
        ("rank", TINY),
        ("tradeoff", TINY),
        ("tradeoff", TINY, "--points", "3"),
        ("yield", TINY, "--samples", "40000"),
    )
    with machines(tmp_path, 1) as there:
        for command in commands:
            here = run("-q", *command, "--json", "--workers", "1")
            assert here.code == 0
            assert run("-q", *command, "--json", "--cluster", there.address) == here
        streamed = ("-q", "rank", TINY, "--json", "--results")
        here = run(*streamed, tmp_path / "here.jsonl", "--workers", "1")
        assert here.code == 0
        assert run(*streamed, tmp_path / "there.jsonl", "--cluster", there.address) == here


def test_work_that_kills_its_workers_is_named(tmp_path):
    """Dask itself is told to blame work for the first worker that dies of it."""
    settings = {"DASK_DISTRIBUTED__SCHEDULER__ALLOWED_FAILURES": "0"}
    with machines(tmp_path, 3, **settings) as there, Cluster(there.address, PATIENCE) as cluster:
        cluster.client.wait_for_workers(3, timeout=PATIENCE)
        answers = cluster.map(done, [Deadly(k, tmp_path, times=99 * (k == 3)) for k in range(9)])
        assert [next(answers) for _ in range(3)] == [0.0, 1 / 7, 2 / 7]
        with pytest.raises(WorkLostError, match=r"^work 3: given up"):
            next(answers)
        assert len(cluster.client.nthreads()) == 1


def test_the_end_of_a_cluster_is_told(tmp_path, monkeypatch):
    """Its workers gone, and then its scheduler."""
    monkeypatch.setattr("optopick.uses.cluster.DESERTED", 1.0)
    with machines(tmp_path, 1) as there, Cluster(there.address, PATIENCE) as cluster:
        answers, others = (cluster.map(done, [Deadly(k, tmp_path) for k in range(1000)]) for _ in range(2))
        assert (next(answers), next(others)) == (0.0, 0.0)
        there.workers[0].kill()
        with pytest.raises(WorkLostError, match="has no worker left"):
            list(answers)
        there.scheduler.kill()
        for gone in (others, cluster.map(done, [Deadly(0, tmp_path)])):
            with pytest.raises(WorkLostError, match="its scheduler no longer answers"):
                list(gone)


def test_a_cluster_without_workers(tmp_path):
    with machines(tmp_path, 0) as there:
        with pytest.raises(InputError, match="a scheduler without a worker") as refusal:
            Cluster(there.address, 1.0)
        assert there.address in refusal.value.mistakes[0].where


@pytest.mark.parametrize("address", ["", "scheduler", "tcp://no-such-host.invalid:8786", "tcp://127.0.0.1:no"])
def test_an_address_of_nobody(address):
    ran = run("rank", TINY, "--cluster", address)
    assert (ran.code, ran.out) == (2, "")
    assert ran.err.startswith(f"optopick: --cluster {address}: found no answer; expected the address of a scheduler")
    assert len(ran.err.splitlines()) == 1


def test_a_port_where_nobody_listens():
    with socket.socket() as closed:
        closed.bind(("127.0.0.1", 0))
        ran = run("yield", TINY, "--samples", "100", "--cluster", f"tcp://127.0.0.1:{closed.getsockname()[1]}")
    assert ran.code == 2
    assert "found no answer" in ran.err


def test_without_the_extra(monkeypatch):
    monkeypatch.setitem(sys.modules, "distributed", None)
    ran = run("tradeoff", TINY, "--cluster", "tcp://127.0.0.1:8786")
    assert (ran.code, ran.out) == (2, "")
    assert "pip install 'optopick[cluster]'" in ran.err
    assert "Traceback" not in ran.err


def test_processes_or_a_cluster():
    ran = run("rank", TINY, "--cluster", "tcp://127.0.0.1:8786", "--workers", "2")
    assert ran.code == 2
    assert "--workers: found 2, beside --cluster" in ran.err


def test_a_worker_with_other_versions_is_refused():
    other = (versions()[0], "optopick 9.9", *versions()[2:])
    with pytest.raises(InputError, match=r"optopick \d.* on a worker, optopick 9.9 here"):
        _Call(abs, other)(-1)
    assert _Call(abs, versions())(-1) == 1


def test_no_more_work_than_the_workers_need(tmp_path):
    taken = 0

    def items():
        nonlocal taken
        for k in range(10**6):
            taken += 1
            yield Deadly(k, tmp_path)

    with machines(tmp_path, 1) as there, Cluster(there.address, PATIENCE) as cluster:
        answers = cluster.map(done, items())
        assert [next(answers) for _ in range(5)] == [k / 7 for k in range(5)]
        assert taken <= AHEAD + 5
        answers.close()


def test_no_answer_waits_for_a_slow_one_before_it(tmp_path):
    with machines(tmp_path, 2) as there, Cluster(there.address, PATIENCE) as cluster:
        cluster.client.wait_for_workers(2, timeout=PATIENCE)
        answers = cluster.as_done(first_waits, [Deadly(k, tmp_path) for k in range(9)])
        first, number = next(answers)
        assert first.number == number != 0
        (tmp_path / "go").touch()
        assert {number, *(other for _, other in answers)} == set(range(9))
