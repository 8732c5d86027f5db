"""Measure `pick` against enumeration, and whole commands: `python -m tests.benchmarks.pick`. About half an hour.

See README.md beside this file for what is measured and how to read it.
"""

from __future__ import annotations

import argparse
import os
import platform
import sys
import tempfile
import time
from collections.abc import Callable
from dataclasses import dataclass
from importlib.metadata import version
from pathlib import Path
from typing import TypeVar

import numpy as np

import optopick
from optopick.brief import Brief, GoalName
from optopick.coupler import Coupler
from optopick.result import Result, Status
from optopick.uses.engine import guard_of
from tests.benchmarks.enumerations import Least, Survey, clever, plain
from tests.benchmarks.link import TABLE, brief_of, coupler_of, text_of
from tests.benchmarks.processes import Spent, typical

Answer = TypeVar("Answer")

SLICES = {"E192": 64}
QUICK_SLICES = {"E96": 8, "E192": 64}
"""Of these series enumeration takes each so-manyth LED resistor (plain) or load resistor (clever); its time is
multiplied by as much. Nothing is left out elsewhere."""

SAME = 3e-6
MARKS = {"E96": 3.0, "E192": 10.0}
"""How many times faster than plain enumeration `pick` is to be."""

EXAMPLES = TABLE.parents[1] / "examples"


@dataclass(frozen=True)
class Line:
    """One series and goal: processor seconds of each way; `every`: the slice that enumeration took."""

    series: str
    goal: GoalName
    combinations: int
    plain: float
    every: int
    clever: float
    pick: float
    result: Result

    @property
    def proved(self) -> bool:
        return self.result.status is Status.OPTIMAL


def timed(call: Callable[[], Answer]) -> tuple[float, Answer]:
    """Processor seconds of a call, the least of three where one is short, and its answer."""
    best, answer = np.inf, None
    for _ in range(3):
        started = time.process_time()
        answer = call()
        best = min(best, time.process_time() - started)
        if best > 1:
            break
    assert answer is not None
    return best, answer


def compare(series: str, every: int, time_limit: float) -> list[Line]:
    """All goals of one series. The work of plain enumeration is the same for each goal: it is done once."""
    brief = brief_of(series, GoalName.EDGE_TIME)
    coupler = coupler_of(brief)
    spent, survey = timed(lambda: plain(brief, coupler, every))
    print(f"{series}: plain enumeration of {survey.looked_at:,} combinations took {spent:.1f} s", flush=True)
    return [_line(series, goal, coupler, spent * every, every, survey, time_limit) for goal in GoalName]


def _line(
    series: str, goal: GoalName, coupler: Coupler, spent: float, every: int, survey: Survey, time_limit: float
) -> Line:
    brief = brief_of(series, goal)
    picked, result = timed(lambda: optopick.pick(brief, couplers=[coupler], time_limit=time_limit))
    cleverly, least = timed(lambda: clever(brief, coupler, every))
    for way, found in (("plain", survey.least(brief)), ("clever", least)):
        compare_optima(f"{series} {goal}", brief, result, way, found, every)
    line = Line(series, goal, result.proof.combinations, spent, every, cleverly * every, picked, result)
    print(f"{series} {goal}: pick {picked:.2f} s, clever {line.clever:.2f} s", flush=True)
    return line


def compare_optima(told: str, brief: Brief, result: Result, way: str, found: Least, every: int) -> None:
    """Stop where two ways disagree: the time of a wrong answer is worth nothing. A slice can only be worse."""
    if result.status is not Status.OPTIMAL or result.objective is None or result.second is None:
        return
    goal = brief.goal
    picked = (result.objective.bound, result.second.value)
    other = (found.first * guard_of(brief, goal.minimize), found.second * guard_of(brief, goal.then))
    same = np.allclose(picked, other, rtol=SAME, atol=0.0)
    if not (same if every == 1 else other[0] >= picked[0] * (1 - SAME)):
        sys.exit(f"{told}: {way} enumeration finds {other}, pick {picked}")


def table(lines: list[Line]) -> str:
    """The comparison, one line each."""
    head = "series  goal        in stock     plain s   clever s   pick s  plain/pick  clever/pick  proof"
    rows = [head, "-" * len(head)]
    for line in lines:
        mark = "*" if line.every > 1 else " "
        proof = f"{line.result.proof.solves} solves" if line.proved else f"NOT PROVED ({line.result.status})"
        rows.append(
            f"{line.series:7} {line.goal.value:10} {line.combinations:>11,} {line.plain:10.2f}{mark}"
            f"{line.clever:9.2f}{mark}{line.pick:8.2f} {line.plain / line.pick:10.1f}x"
            f" {line.clever / line.pick:11.2f}x  {proof}"
        )
    if any(line.every > 1 for line in lines):
        slices = ", ".join(
            f"each {n}th at {series}" for series, n in sorted({(x.series, x.every) for x in lines}) if n > 1
        )
        rows.append(f"* extrapolated from a slice of LED resistors (plain) or of load resistors (clever): {slices}")
    return "\n".join(rows)


def whole_commands() -> dict[str, Spent]:
    """Commands from start to end, their name to what they took."""
    spent = {"--help": typical(9, "--help")}
    for path in sorted(EXAMPLES.glob("*.toml")):
        spent[f"pick examples/{path.name}"] = typical(3, "pick", str(path))
    with tempfile.TemporaryDirectory() as folder:
        brief = Path(folder) / "fine.toml"
        brief.write_text(text_of("E192", GoalName.EDGE_TIME), encoding="utf-8")
        spent["pick, one coupler at E192"] = typical(1, "pick", str(brief))
    failed = [name for name, one in spent.items() if one.code]
    if failed:
        sys.exit(f"no design, or worse: {', '.join(failed)}")
    return spent


def command_table(commands: dict[str, Spent]) -> str:
    """Whole commands, one line each."""
    rows = ["command                        wall s    cpu s   peak MB", "-" * 54]
    rows += [f"{name:30} {s.wall:6.2f} {s.cpu:8.2f} {s.memory:9.0f}" for name, s in commands.items()]
    return "\n".join(rows)


def verdicts(lines: list[Line], commands: dict[str, Spent]) -> str:
    """What was to be reached, and whether it was."""
    said = []
    for series, times in MARKS.items():
        for line in (line for line in lines if line.series == series):
            reached = line.proved and line.plain / line.pick >= times
            said.append((f"{series} {line.goal}: {times:g} times faster than plain enumeration", reached))
    whole_table = commands["pick examples/fastest.toml"].wall
    said.append(
        ("examples/fastest.toml, every phototransistor of the table at E24, within 3 s, whole process", whole_table < 3)
    )
    said.append(("--help within 0.3 s, whole process", commands["--help"].wall < 0.3))
    said.append(("peak memory below 400 MB", max(s.memory for s in commands.values()) < 400))
    slower = [f"{line.series} {line.goal}" for line in lines if line.clever < line.pick]
    rows = [f"{'reached' if reached else 'MISSED '}  {mark}" for mark, reached in said]
    return "\n".join([*rows, f"clever enumeration is faster than pick at: {', '.join(slower) or 'none of these'}"])


def machine() -> str:
    """The machine and the versions measured."""
    cpu = next((x.split(":")[1].strip() for x in _lines("/proc/cpuinfo") if x.startswith("model name")), "unknown")
    load = ", ".join(f"{x:.1f}" for x in os.getloadavg())
    parts = ", ".join(f"{name} {version(name)}" for name in ("numpy", "pyomo", "highspy"))
    cores = len(os.sched_getaffinity(0))
    return f"{cpu}, {cores} cores, load {load}; Python {platform.python_version()}, {parts}"


def _lines(path: str) -> list[str]:
    return Path(path).read_text(encoding="utf-8").splitlines() if Path(path).exists() else []


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--series", default="E24,E96,E192", help="which series, with commas between")
    parser.add_argument("--time-limit", type=float, default=300.0, help="seconds a pick may search before it gives up")
    parser.add_argument("--quick", action="store_true", help="enumerate a slice at E96 too")
    options = parser.parse_args()
    slices = QUICK_SLICES if options.quick else SLICES
    print(machine(), flush=True)
    commands = whole_commands()
    print(command_table(commands), flush=True)
    optopick.pick(brief_of("E24", GoalName.DELAY))  # imports done before anything is timed
    lines: list[Line] = []
    for series in options.series.split(","):
        lines += compare(series, slices.get(series, 1), options.time_limit)
    print("\n".join(["", table(lines), "", command_table(commands), "", verdicts(lines, commands)]))


if __name__ == "__main__":
    main()
