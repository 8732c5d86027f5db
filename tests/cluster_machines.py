"""A real Dask cluster of a few processes on this machine, and work that kills who does it."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from command import ROOT

PATIENCE = 60.0
"""Seconds in which the scheduler must be there: shared machines are slow now and then."""


@dataclass(frozen=True)
class Machines:
    """The scheduler's address, its process, and those of the workers."""

    address: str
    scheduler: subprocess.Popen[bytes]
    workers: tuple[subprocess.Popen[bytes], ...]


@dataclass(frozen=True)
class Deadly:
    """Work that kills the process that does it: `times` times, counted by files in a folder."""

    number: int
    folder: Path
    times: int = 0

    def __str__(self) -> str:
        return f"work {self.number}"


def done(work: Deadly) -> float:
    """A number with all its bits, unless the worker dies of it."""
    died = len(list(work.folder.glob(f"{work.number}-*")))
    if died < work.times:
        (work.folder / f"{work.number}-{died}").touch()
        os.kill(os.getpid(), signal.SIGKILL)
    return work.number / 7


def first_waits(work: Deadly) -> int:
    """The number of the work; the first one is done only once its folder holds `go`."""
    until = time.monotonic() + PATIENCE
    while work.number == 0 and not (work.folder / "go").exists():
        assert time.monotonic() < until
        time.sleep(0.01)
    return work.number


def process_of(_: int) -> int:
    """The process that does the work."""
    return os.getpid()


@contextmanager
def machines(folder: Path, count: int = 3, **environment: str) -> Iterator[Machines]:
    """A scheduler and its workers, on ports that are free, one thread each, nobody who restarts them."""
    told = folder / "scheduler.json"
    paths = {"PYTHONPATH": os.pathsep.join((str(ROOT), str(ROOT / "tests")))}
    settings = {**os.environ, **paths, **environment}
    where = ("--scheduler-file", str(told), "--no-dashboard")
    scheduler = _started(("scheduler", "--host", "127.0.0.1", "--port", "0", *where), folder, settings)
    workers: list[subprocess.Popen[bytes]] = []
    try:
        address = _address(told, scheduler)
        for _ in range(count):
            workers.append(_started(("worker", "--no-nanny", "--nthreads", "1", *where), folder, settings))
        yield Machines(address, scheduler, tuple(workers))
    finally:
        for process in (*workers, scheduler):
            process.kill()
            process.wait()


def _started(arguments: tuple[str, ...], folder: Path, settings: dict[str, str]) -> subprocess.Popen[bytes]:
    with (folder / f"{arguments[0]}.log").open("ab") as log:
        return subprocess.Popen(
            [sys.executable, "-m", "dask", *arguments],
            cwd=folder,
            env=settings,
            stdin=subprocess.DEVNULL,
            stdout=log,
            stderr=log,
        )


def _address(told: Path, scheduler: subprocess.Popen[bytes]) -> str:
    until = time.monotonic() + PATIENCE
    while time.monotonic() < until:
        assert scheduler.poll() is None, told.with_name("scheduler.log").read_text(encoding="utf-8")
        try:
            return str(json.loads(told.read_text(encoding="utf-8"))["address"])
        except (OSError, ValueError):
            time.sleep(0.1)
    raise AssertionError("no scheduler")
