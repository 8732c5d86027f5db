"""Measure `board` on generated boards: `python -m tests.benchmarks.board`, about a quarter of an hour.

Least power, at most 10 reels (6 on the smallest board) and 3 coupler parts. A case ends when its time is up, or all is
proved. Printed: what is known then, the gap of the power found to the bound shown, the size of the last model, seconds by
the clock and of the processor, and the most memory that the process has held. `--plain` leaves out what goes before the
solver: the narrowing of every link to what may still be of use.

Links and boards are invented: six kinds of link as in examples/plant, each time with other supplies, pulses, thresholds
and temperatures, drawn from a fixed seed. No two links are equal.
"""

from __future__ import annotations

import argparse
import os
import platform
import resource
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager, nullcontext
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from optopick.board import Board, BoardGoal, BoardGoalName, BoardLimits, BoardLink
from optopick.board_answers import BoardResult
from optopick.brief import Brief, Span
from optopick.coupler import Coupler
from optopick.model import board_seats
from optopick.model.box import Box
from optopick.model.rows import Ask, stack
from optopick.model.solver import highs_name
from optopick.read_brief import read_brief
from optopick.read_couplers import read_couplers
from optopick.uses.board import solve_board

ROOT = Path(__file__).parents[2]
PLANT = ROOT / "examples" / "plant"
KINDS = ("contact", "command", "serial", "speed", "tacho", "wake")
PARTS = (
    *("BRIM40-B", "BRIM44-2", "KESTRO11-S", "PYRA60-H", "TALLO3S-G"),
    *("QUIL12-E", "BRIM70-M", "QUIL35", "KESTRO15", "QUIL14-M"),
)
SEED = 20


@dataclass(frozen=True)
class Case:
    """A board to measure: links, couplers, most reels, seconds it may take, and the gap [1] that it is to reach."""

    name: str
    links: int
    couplers: int
    reels: int
    seconds: float
    gap: float


CASES = (
    Case("4 links x 4 couplers", 4, 4, 6, 60.0, 0.0),
    Case("16 links x 10 couplers", 16, 10, 10, 60.0, 0.01),
    Case("64 links x 10 couplers", 64, 10, 10, 600.0, 0.03),
)


def moved(rng: np.random.Generator, span: Span, share: float) -> Span:
    """A span with both ends multiplied by one factor within `share` of 1."""
    factor = float(rng.uniform(1 - share, 1 + share))
    return Span(span.low * factor, span.high * factor)


def link(rng: np.random.Generator, kind: Brief, number: int) -> Brief:
    """A link of a kind, its figures drawn anew."""
    stretch = float(np.exp(rng.uniform(np.log(0.8), np.log(3.0))))

    def stretched(limit: float | None) -> float | None:
        return None if limit is None else limit * stretch

    limits = replace(
        kind.limits,
        ctr_margin=float(rng.uniform(1.1, 1.5)),
        delay=stretched(kind.limits.delay),
        distortion=stretched(kind.limits.distortion),
        power=None,
    )
    return replace(
        kind,
        title=f"{kind.title} {number}",
        signal=replace(
            kind.signal, shortest_pulse=kind.signal.shortest_pulse * stretch, lit=float(rng.uniform(0.05, 0.6))
        ),
        drive=replace(kind.drive, supply=moved(rng, kind.drive.supply, 0.1)),
        output=replace(kind.output, capacitance=kind.output.capacitance * float(rng.uniform(0.5, 2.0))),
        environment=replace(kind.environment, temperature=Span(-20.0, float(rng.choice([50.0, 60.0, 70.0])))),
        limits=limits,
        couplers=replace(kind.couplers, only=None),
    )


def board_of(case: Case) -> tuple[Board, list[Coupler]]:
    """The board of a case and the couplers it may use."""
    rng = np.random.default_rng(SEED)
    kinds = [read_brief(PLANT / f"{name}.toml") for name in KINDS]
    table = {coupler.part: coupler for coupler in read_couplers(ROOT / "catalogs" / "demo.csv").couplers}
    links = tuple(
        BoardLink(f"link {k}", link(rng, kinds[k % len(kinds)], k), int(rng.integers(1, 9))) for k in range(case.links)
    )
    goal = BoardGoal(BoardGoalName.POWER, BoardGoalName.REELS, 0.0)
    board = Board(case.name, BoardLimits(reels=case.reels, couplers=3), goal, links)
    return board, [table[part] for part in PARTS[: case.couplers]]


def as_it_is(box: Box, ask: Ask) -> Box | None:
    """In place of `narrowed`: the rows as they are; only what can never hold them is left out."""
    rows = stack([box.model.rows(ask), box.cuts], box.model.sizes)
    live = [~np.isneginf(part).any(axis=0) for part in (rows.a, rows.b, rows.c)]
    if not all(mask.any() for mask in live):
        return None
    box = box.take(*(np.flatnonzero(mask) for mask in live))
    return Box(box.model, box.indices, box.cuts, stack([box.model.rows(ask), box.cuts], box.model.sizes))


@contextmanager
def plain() -> Iterator[None]:
    """The model without what goes before it: no narrowing, no look at small seats."""
    kept = board_seats.narrowed, board_seats.SMALL
    board_seats.narrowed, board_seats.SMALL = as_it_is, 0  # type: ignore[assignment]
    try:
        yield
    finally:
        board_seats.narrowed, board_seats.SMALL = kept


def peak_megabytes() -> float:
    """The most memory that this process has held [MB]."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def told(case: Case, result: BoardResult, wall: float, processor: float) -> str:
    """One line of the table."""
    gap = max((goal.gap for goal in result.goals[:1]), default=float("nan"))
    proof = result.proof
    return (
        f"{case.name:24s} {result.status.value:10s} {100 * gap:7.3f} % {proof.columns:8,d} {proof.rows:7,d} "
        f"{proof.solves:4d} {wall:7.1f} {processor:7.1f} {peak_megabytes():7.0f}"
    )


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--case", type=int, help="only that one, from 1")
    parser.add_argument("--plain", action="store_true", help="without narrowing")
    parser.add_argument("-v", action="store_true", help="progress on standard error")
    given = parser.parse_args()
    busy = ", ".join(f"{load:.1f}" for load in os.getloadavg())
    print(f"{os.cpu_count()} cores, load {busy}; Python {platform.python_version()}, {highs_name()}")
    print("board                    status      gap (power) columns   rows solves wall s  proc. s  peak MB", flush=True)
    for number, case in enumerate(CASES, 1):
        if given.case in (None, number):
            measure(case, plainly=given.plain, loud=given.v)


def measure(case: Case, *, plainly: bool, loud: bool) -> None:
    """Solve the board of a case and print its line."""
    board, couplers = board_of(case)
    wall, processor = time.monotonic(), time.process_time()

    def report(stage: str, done: int, total: int) -> None:
        if loud:
            print(f"{time.monotonic() - wall:6.1f} {stage} {done} {total}", file=sys.stderr)

    with plain() if plainly else nullcontext():
        result = solve_board(board, time_limit=case.seconds, couplers=couplers, progress=report)
    print(told(case, result, time.monotonic() - wall, time.process_time() - processor), flush=True)


if __name__ == "__main__":
    main()
