"""`board` against enumeration: `python -m tests.benchmarks.board_enumerated`, some minutes.

Boards of tests/benchmarks/board.py. Enumeration gets every valid design of each link for nothing, and of those that take
from the same reels and are the same coupler only the one with least power; then it tries every board there is, in large
arrays, counts reels and couplers by bits, and keeps the least power. A small board is enumerated to its end and must give
the same optimum; of a larger one a slice is timed and multiplied, and marked so.
"""

from __future__ import annotations

import os
import platform
import time
from dataclasses import dataclass, replace
from itertools import product

import numpy as np

from optopick.board import Board, reel_of
from optopick.brief import Brief, Position
from optopick.coupler import Coupler
from optopick.model.kinds import model_of
from optopick.model.solver import highs_name
from optopick.uses.board import solve_board
from optopick.uses.engine import ask_of
from tests.benchmarks.board import CASES, Case, board_of

SMALL = Case("3 links x 2 couplers, each fourth value", 3, 2, 5, 60.0, 0.0)
EVERY = 4
SLICE = 3e8
"""Boards that are tried at the most; with more the rest is extrapolated."""


@dataclass(frozen=True)
class Designs:
    """The designs of one link worth trying: reels and coupler as bits, power of all its pieces [W]."""

    reels: np.ndarray
    part: np.ndarray
    power: np.ndarray


def thinned(position: Position | None) -> Position | None:
    """Each fourth value of a position."""
    if position is None:
        return None
    columns = ("values", "tolerance", "power", "voltage", "price")
    return replace(position, **{name: getattr(position, name)[::EVERY] for name in columns})


def sparse(brief: Brief) -> Brief:
    """A brief with few values."""
    stock = brief.stock
    few = {name: thinned(getattr(stock, name)) for name in ("r_led", "r_load", "r_be", "r_shunt")}
    return replace(brief, stock=replace(stock, **few))


def designs_of(brief: Brief, count: int, couplers: list[Coupler], bits: dict[float, int]) -> Designs:
    """Every valid design of a link, the best one of each set of reels and coupler."""
    best: dict[tuple[int, int], float] = {}
    for number, coupler in enumerate(couplers):
        model, ask = model_of(brief, coupler), ask_of(brief)
        live = model.start()
        axes = np.meshgrid(*(np.flatnonzero(mask) for mask in (live.led, live.load, live.base)), indexing="ij")
        i, j, m = (axis.ravel() for axis in axes)
        for some in np.array_split(np.arange(len(i)), max(1, len(i) // 20_000)):
            a, b, c = i[some], j[some], m[some]
            sound = model.scores(a, b, c).within(ask) & model.ready_rows(ask).holds(a, b, c)
            p, q = model.power
            for k in np.flatnonzero(sound):
                r_led, _, r_shunt, r_load, r_be = model.values(int(a[k]), int(b[k]), int(c[k]))
                reels = 0
                for ohms in (r_led, r_shunt, r_load, r_be):
                    if np.isfinite(ohms):
                        reels |= 1 << bits.setdefault(reel_of(ohms), len(bits))
                key = (reels, 1 << number)
                best[key] = min(best.get(key, np.inf), count * float(p[a[k]] + q[b[k]]))
    keys = list(best)
    # more than 64 reels do not fit into one word
    words = np.array([[(reels >> (64 * w)) & (2**64 - 1) for w in range(2)] for reels, _ in keys], dtype=np.uint64)
    return Designs(words, np.array([part for _, part in keys], dtype=np.uint64), np.array([best[key] for key in keys]))


def tried(board: Board, links: list[Designs]) -> tuple[float, float, float]:
    """The least power of the boards tried [W], how many they are, and the seconds that took."""
    started = time.process_time()
    first, (near, last) = links[:-2], links[-2:]
    reels = near.reels[:, None] | last.reels[None, :]
    part, power = near.part[:, None] | last.part[None, :], near.power[:, None] + last.power[None, :]
    least, count = np.inf, 0.0
    for chosen in product(*(range(len(link.power)) for link in first)):
        kept_reels, kept_part, kept_power = reels, part, power
        for link, k in zip(first, chosen, strict=True):
            kept_reels, kept_part = kept_reels | link.reels[k], kept_part | link.part[k]
            kept_power = kept_power + link.power[k]
        sound = np.bitwise_count(kept_reels).sum(axis=-1) <= board.limits.reels
        sound &= np.bitwise_count(kept_part) <= board.limits.couplers
        least = min(least, float(np.where(sound, kept_power, np.inf).min()))
        count += kept_power.size
        if count >= SLICE:
            break
    return least, count, time.process_time() - started


def measure(case: Case, *, few: bool) -> None:
    """Solve and enumerate the board of a case, and print its line."""
    board, couplers = board_of(case)
    if few:
        board = replace(board, links=tuple(replace(link, brief=sparse(link.brief)) for link in board.links))
    started = time.process_time()
    result = solve_board(board, time_limit=case.seconds, couplers=couplers)
    solved = time.process_time() - started
    bits: dict[float, int] = {}
    links = [designs_of(link.brief, link.count, couplers, bits) for link in board.links]
    least, count, seconds = tried(board, links)
    every = float(np.prod([float(len(link.power)) for link in links]))
    if count == every:
        assert np.isclose(least, result.goals[0].value, rtol=1e-6), (least, result.goals[0].value)
    else:
        assert least >= result.goals[0].value * (1 - 1e-6)
    whole, mark = seconds * every / count, " " if count == every else "*"
    print(f"{case.name:40s} {every:9.2e} {solved:9.1f} {whole:11.3g}{mark} {whole / solved:9.3g}", flush=True)


def main() -> None:
    busy = ", ".join(f"{load:.1f}" for load in os.getloadavg())
    print(f"{os.cpu_count()} cores, load {busy}; Python {platform.python_version()}, {highs_name()}")
    print("board                                       boards   board s enumeration s     ratio")
    measure(SMALL, few=True)
    measure(replace(SMALL, name="3 links x 2 couplers"), few=False)
    measure(CASES[0], few=False)
    print("* extrapolated from a slice")


if __name__ == "__main__":
    main()
