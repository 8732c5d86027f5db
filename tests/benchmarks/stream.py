"""Measure `rank --results` over a generated table: `python -m tests.benchmarks.stream`. A few minutes.

Rows of all kinds drawn at random, written to a file and ranked from there with `--top-only`, or `--every` row solved; E24
values in every position. Told are rows and seconds, what it takes to run again with every outcome there, and the peak
memory of the command and of its largest process, for a short table and a long one: it must not grow with the rows.
"""

from __future__ import annotations

import argparse
import json
import os
import subprocess
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path
from typing import Any

sys.path.insert(0, str(Path(__file__).parents[1]))

from command import ROOT  # beside the tests, which are no package
from many_rows import link

CODE = """
import atexit, resource, sys
def tell(file=sys.argv.pop(1)):
    own = next(line for line in open("/proc/self/status") if line.startswith("VmHWM"))
    children = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss
    open(file, "w").write(f"{own.split()[1]} {children}")
atexit.register(tell)
from optopick.cli import main
main()
"""
"""The command as its script runs it, and at its end the peak memory [kB] of it and of the largest of its processes."""

GROWTH = 1.25
"""How much more memory the long table may take than the short one."""


@dataclass(frozen=True)
class Spent:
    """Wall and processor time [s], peak memory of the command and of its largest process [MB], what it printed."""

    wall: float
    cpu: float
    memory: float
    largest: float
    told: dict[str, Any]


def run(folder: Path, *arguments: str) -> Spent:
    """Run optopick once."""
    memory, out = folder / "memory", folder / "out.json"
    started = time.perf_counter()
    with out.open("wb") as file:
        process = subprocess.Popen(
            [sys.executable, "-c", CODE, str(memory), "-q", *arguments],
            cwd=ROOT,
            env={**os.environ, "PYTHONPATH": str(ROOT)},
            stdin=subprocess.DEVNULL,
            stdout=file,
        )
        _, status, usage = os.wait4(process.pid, 0)
    process.returncode = os.waitstatus_to_exitcode(status)
    assert process.returncode == 0, process.returncode
    own, children = (float(text) / 1024 for text in memory.read_text(encoding="utf-8").split())
    told = json.loads(out.read_text(encoding="utf-8"))
    return Spent(time.perf_counter() - started, usage.ru_utime + usage.ru_stime, own, children, told)


def measured(rows: int, workers: int, every: bool) -> Spent:
    """Rank a table of so many rows, and once more with its outcomes there."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        brief, results = link(folder, rows, series="E24"), folder / "results.jsonl"
        over = () if every else ("--top-only",)
        arguments = ("rank", str(brief), "--results", str(results), "--json", "--workers", str(workers), *over)
        first = run(folder, *arguments)
        tell(f"{rows:,} rows", first)
        size = results.stat().st_size / 1e6
        again = run(folder, *arguments)
        tell(f"{rows:,} rows again, {size:.1f} MB of results", again)
        assert again.told["ranked"] == first.told["ranked"]
        assert again.told["now"] == 0
    return first


def tell(what: str, spent: Spent) -> None:
    told = spent.told
    rejected = sum(one["count"] for one in told["rejected_for"])
    print(
        f"{what}: {told['now']:,} settled now, {told['before']:,} before; {told['designed']:,} with a design, "
        f"{rejected:,} rejected, {told['passed_over']:,} passed over"
    )
    print(
        f"    {spent.wall:.1f} s wall, {spent.cpu:.1f} s of processors, {told['rows'] / spent.wall:.0f} rows/s, "
        f"{1e3 * spent.cpu / told['rows']:.2f} ms of processors a row",
    )
    print(f"    peak memory {spent.memory:.0f} MB, of the largest process {spent.largest:.0f} MB", flush=True)


def main() -> int:
    """Measure and tell; exit 1 where memory grows with the rows."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--rows", type=int, default=10_000)
    parser.add_argument("--against", type=int, default=1_000)
    parser.add_argument("--workers", type=int, default=2)
    parser.add_argument("--every", action="store_true", help="solve every row: no --top-only")
    told = parser.parse_args()
    print(f"load before: {' '.join(f'{x:.2f}' for x in os.getloadavg())} on {os.cpu_count()} cores")
    short, long = (measured(rows, told.workers, told.every) for rows in (told.against, told.rows))
    growth = max(long.memory / short.memory, long.largest / short.largest)
    print(f"memory grows {growth:.2f} fold, at most {GROWTH} is meant")
    return int(growth > GROWTH)


if __name__ == "__main__":
    sys.exit(main())
