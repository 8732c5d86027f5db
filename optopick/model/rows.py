"""Checks as linear rows: with one value chosen in every position, a[i] + b[j] + c[m] >= 0."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from optopick.brief import GoalName
from optopick.physics.types import Array

EASE = 1e-9
"""What a scaled row may miss by before its combination counts as failing: rounding, not physics."""


@dataclass(frozen=True)
class Rows:
    """R rows over the three positions: a (R, n_led), b (R, n_load), c (R, n_base), scaled to about one. names: (R,)."""

    names: tuple[str, ...]
    a: Array
    b: Array
    c: Array

    def __len__(self) -> int:
        return len(self.names)

    def pick(self, keep: np.ndarray) -> Rows:
        """The rows where `keep` (R,) is true."""
        names = tuple(name for name, k in zip(self.names, keep, strict=True) if k)
        return Rows(names, self.a[keep], self.b[keep], self.c[keep])

    def take(self, i: np.ndarray, j: np.ndarray, m: np.ndarray) -> Rows:
        """The same rows over some of the values."""
        return Rows(self.names, self.a[:, i], self.b[:, j], self.c[:, m])

    def holds(self, i: np.ndarray, j: np.ndarray, m: np.ndarray) -> np.ndarray:
        """Whether combinations (i, j, m), (K,) each, hold every row: (K,)."""
        return np.asarray((self.a[:, i] + self.b[:, j] + self.c[:, m] >= -EASE).all(axis=0))


@dataclass(frozen=True)
class Ask:
    """What a design must do: upper limits on times [s] (guard taken out) and power [W], infinite where none is asked.

    dropped: names of checks left out, for those who ask which limits contradict each other.
    """

    edge: float = np.inf
    delay: float = np.inf
    distortion: float = np.inf
    power: float = np.inf
    dropped: frozenset[str] = frozenset()

    def limit(self, goal: GoalName) -> float:
        """The limit on what a goal makes least."""
        return float(getattr(self, FIELD[goal]))

    @property
    def slowest(self) -> float:
        """The limit on the longer delay where the other may be anything [s]."""
        return min(self.delay, self.distortion)

    @property
    def has_delays(self) -> bool:
        """Whether a limit on a sum of logarithms is asked, which rows only bound."""
        return bool(np.isfinite(self.delay) or np.isfinite(self.distortion))

    def limited(self, goal: GoalName, limit: float) -> Ask:
        """The same with what a goal makes least held to `limit` as well."""
        parts = {name: getattr(self, name) for name in FIELD.values()}
        return Ask(**{**parts, FIELD[goal]: min(limit, self.limit(goal))}, dropped=self.dropped)


FIELD = {
    GoalName.EDGE_TIME: "edge",
    GoalName.DELAY: "delay",
    GoalName.DISTORTION: "distortion",
    GoalName.POWER: "power",
}


@dataclass(frozen=True)
class Scores:
    """Worst-case goals of K designs: times [s] (guard taken out), power [W]; (K,) each."""

    edge: Array
    delay: Array
    distortion: Array
    power: Array

    def of(self, goal: GoalName) -> Array:
        """The scores that a goal makes least."""
        return np.asarray(getattr(self, FIELD[goal]))

    def within(self, ask: Ask) -> np.ndarray:
        """Which designs keep every limit asked, (K,)."""
        limits = (
            (self.edge, ask.edge),
            (self.delay, ask.delay),
            (self.distortion, ask.distortion),
            (self.power, ask.power),
        )
        return np.asarray(np.all([score <= limit * (1 + EASE) for score, limit in limits], axis=0))


def scaled(name: str, a: Array, b: Array, c: Array) -> Rows:
    """Rows of one check from its parts (R, n) each, every row divided by the middle of what is finite in it.

    Infinite entries stay: they say that a value can never hold the row. The middle is the geometric mean of the
    largest and the smallest magnitude.
    """
    a, b, c = (np.atleast_2d(np.asarray(part, dtype=float)) for part in (a, b, c))
    count = max(len(a), len(b), len(c))
    parts = [np.broadcast_to(part, (count, part.shape[1])) for part in (a, b, c)]
    together = np.abs(np.concatenate(parts, axis=1))
    sound = np.isfinite(together) & (together > 0)
    largest = np.where(sound, together, 0.0).max(axis=1)
    smallest = np.where(sound, together, np.inf).min(axis=1)
    scale = np.sqrt(np.where(largest > 0, largest * np.where(np.isfinite(smallest), smallest, 1.0), 1.0)).reshape(-1, 1)
    return Rows((name,) * count, *(part / scale for part in parts))


def all_but(choice: tuple[int, int, int], sizes: tuple[int, int, int]) -> Rows:
    """A row that forbids one combination and no other."""
    parts = []
    for k, n in zip(choice, sizes, strict=True):
        part = np.ones(n)
        part[k] = -0.3
        parts.append(part[None, :])
    return Rows(("one_combination",), *parts)


def stack(blocks: Iterable[Rows], sizes: Sequence[int]) -> Rows:
    """All blocks as one; `sizes` where there is none."""
    found = list(blocks)
    if not found:
        return Rows((), *(np.zeros((0, n)) for n in sizes))
    names = tuple(name for block in found for name in block.names)
    return Rows(names, *(np.concatenate([getattr(block, part) for block in found]) for part in ("a", "b", "c")))
