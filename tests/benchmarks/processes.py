"""A command from its start to its end: wall time, processor time, peak memory."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from dataclasses import dataclass
from statistics import median

CODE = """
import atexit, sys
def tell(pipe=int(sys.argv.pop(1))):
    peak = next(line for line in open("/proc/self/status") if line.startswith("VmHWM"))
    open(pipe, "w").write(peak.split()[1])
atexit.register(tell)
from optopick.cli import main
main()
"""
"""The command as its script runs it, and at its end the peak memory [kB] into a pipe. What the kernel tells the
parent would count the parent's own memory too."""


@dataclass(frozen=True)
class Spent:
    """Wall and processor time [s], peak resident memory [MB], exit code."""

    wall: float
    cpu: float
    memory: float
    code: int


def run(*arguments: str) -> Spent:
    """Run optopick once with its output thrown away."""
    receive, send = os.pipe()
    started = time.perf_counter()
    process = subprocess.Popen(
        [sys.executable, "-c", CODE, str(send), *arguments],
        stdin=subprocess.DEVNULL,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        pass_fds=(send,),
    )
    os.close(send)
    _, status, usage = os.wait4(process.pid, 0)
    wall = time.perf_counter() - started
    process.returncode = os.waitstatus_to_exitcode(status)
    with os.fdopen(receive) as pipe:
        peak = float(pipe.read()) / 1024
    return Spent(wall, usage.ru_utime + usage.ru_stime, peak, process.returncode)


def typical(count: int, *arguments: str) -> Spent:
    """The medians of `count` runs after one that warms the disk's cache."""
    run(*arguments)
    runs = [run(*arguments) for _ in range(count)]
    wall, cpu, memory = (median(getattr(one, name) for one in runs) for name in ("wall", "cpu", "memory"))
    return Spent(wall, cpu, memory, max(one.code for one in runs))
