"""A command from its start to its end: wall time, processor time, peak memory."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from dataclasses import dataclass
from statistics import median

COMMAND = (sys.executable, "-c", "from optopick.cli import main; main()")


@dataclass(frozen=True)
class Spent:
    """Wall and processor time [s], peak resident memory [MB], exit code."""

    wall: float
    cpu: float
    memory: float
    code: int


def run(*arguments: str) -> Spent:
    """Run optopick once with its output thrown away."""
    started = time.perf_counter()
    process = subprocess.Popen(
        [*COMMAND, *arguments], stdin=subprocess.DEVNULL, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL
    )
    _, status, usage = os.wait4(process.pid, 0)
    process.returncode = os.waitstatus_to_exitcode(status)
    wall = time.perf_counter() - started
    return Spent(wall, usage.ru_utime + usage.ru_stime, usage.ru_maxrss / 1024, process.returncode)


def typical(count: int, *arguments: str) -> Spent:
    """The medians of `count` runs after one that warms the disk's cache."""
    run(*arguments)
    runs = [run(*arguments) for _ in range(count)]
    wall, cpu, memory = (median(getattr(one, name) for one in runs) for name in ("wall", "cpu", "memory"))
    return Spent(wall, cpu, memory, max(one.code for one in runs))
