"""Measure `rank` over generated couplers: `python -m tests.benchmarks.rank`. About a minute.

1,000 couplers of all kinds drawn at random, one brief with E24 values in every position, one process a core, two cores.
The aim is 60 s. Wall time depends on what else the machine does: its load is told before and after.
"""

from __future__ import annotations

import argparse
import os
import platform
import sys
import time
from collections.abc import Callable, Iterable, Iterator
from dataclasses import replace
from functools import partial
from importlib.metadata import version
from pathlib import Path
from typing import TypeVar

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

import random_links  # beside the tests, which are no package

from optopick.answers import Ranking
from optopick.brief import Brief, GoalName, OutputCircuit
from optopick.coupler import Coupler, Kind
from optopick.uses.rank import rank
from optopick.uses.workers import Processes

Item = TypeVar("Item")
Answer = TypeVar("Answer")

AIM = 60.0
"""Seconds for 1,000 couplers on two cores."""

KINDS = {
    Kind.PHOTOTRANSISTOR: (random_links.coupler, 6),
    Kind.DARLINGTON: (random_links.darlington, 2),
    Kind.LOGIC: (random_links.logic, 2),
}
"""Of ten couplers, how many of each kind."""


def table(count: int, seed: int) -> list[Coupler]:
    """Generated couplers, kinds in turn."""
    rng = np.random.default_rng(seed)
    turn = [make for make, share in KINDS.values() for _ in range(share)]
    return [turn[k % len(turn)](rng, f"RND-{k:04d}") for k in range(count)]


def link(seed: int) -> Brief:
    """A brief with a pull-up that every kind may serve, E24 in every position, timing limits and a base resistor."""
    rng = np.random.default_rng(seed)
    drawn = random_links.brief(rng, "E24", OutputCircuit.PULL_UP)
    stock = replace(
        drawn.stock,
        r_led=random_links.position("E24", 100, 10e3),
        r_load=random_links.position("E24", 330, 33e3),
        r_be=random_links.position("E24", 47e3, 1e6, absent=True),
        r_shunt=None,
    )
    five = {"supply": replace(drawn.output.supply, low=4.75, high=5.25)}
    five |= {
        name: replace(drawn.output.v_il, low=0.95 * v, high=1.05 * v) for name, v in (("v_il", 1.5), ("v_ih", 3.5))
    }
    return replace(
        drawn,
        signal=replace(drawn.signal, shortest_pulse=1e-3, lit=0.5),
        drive=replace(drawn.drive, supply=five["supply"], max_current=20e-3, off_leakage=1e-6),
        output=replace(drawn.output, **five, noise_margin=0.1, input_current_low=0.0),
        limits=replace(drawn.limits, ctr_margin=1.2, edge_time=None, delay=300e-6, distortion=None, power=None),
        stock=stock,
        goal=replace(drawn.goal, minimize=GoalName.POWER, then=GoalName.EDGE_TIME, give=0.02),
    )


class Timed:
    """Processes that also tell how much processor time their work took [s]: what the machine's load does not change."""

    def __init__(self, cores: int) -> None:
        self.cores, self.each = cores, []

    def map(self, function: Callable[[Item], Answer], items: Iterable[Item]) -> Iterator[Answer]:
        """The answers in order, each one's processor time noted."""
        for answer, seconds in Processes(self.cores).map(partial(timed, function), items):
            self.each.append(seconds)
            yield answer


def timed(function: Callable[[Item], Answer], item: Item) -> tuple[Answer, float]:
    """An answer and the processor time it took [s]."""
    started = time.process_time()
    return function(item), time.process_time() - started


def measured(brief: Brief, couplers: list[Coupler], cores: int) -> tuple[Ranking, float, list[float]]:
    """The ranking, wall time, and processor time of each coupler [s]."""
    workers, started = Timed(cores), time.perf_counter()
    ranking = rank(brief, couplers=couplers, workers=workers)
    return ranking, time.perf_counter() - started, workers.each


def tell_load(when: str) -> None:
    print(f"load {when}: {' '.join(f'{x:.2f}' for x in os.getloadavg())} on {os.cpu_count()} cores")


def main() -> int:
    """Measure and tell; exit 1 where the aim is missed."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--couplers", type=int, default=1000)
    parser.add_argument("--cores", type=int, default=2)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--goal", choices=[goal.value for goal in GoalName], default=GoalName.POWER.value)
    told = parser.parse_args()
    brief, couplers = link(told.seed), table(told.couplers, told.seed)
    first = GoalName(told.goal)
    then = GoalName.EDGE_TIME if first is GoalName.POWER else GoalName.POWER
    brief = replace(brief, goal=replace(brief.goal, minimize=first, then=then))
    print(f"Python {platform.python_version()}, numpy {version('numpy')}, {told.cores} processes, goal {first.value}")
    tell_load("before")
    ranking, wall, each = measured(brief, couplers, told.cores)
    tell_load("after")
    print(f"{len(couplers)} couplers: {len(ranking.ranked)} with a design, {len(ranking.rejected)} rejected")
    print(f"{wall:.1f} s wall, {len(couplers) / wall:.1f} couplers per second")
    print(f"{sum(each):.1f} s of processors, a coupler {np.median(each):.3f} s (median), {max(each):.2f} s (most)")
    print(
        f"the aim, {AIM * len(couplers) / 1000:.0f} s, is {'kept' if wall <= AIM * len(couplers) / 1000 else 'missed'}"
    )
    return int(wall > AIM * len(couplers) / 1000)


if __name__ == "__main__":
    sys.exit(main())
