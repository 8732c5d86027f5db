"""A part of the stock still in question, narrowed by what is asked of it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from optopick.model.kinds import LinkModel
from optopick.model.ranges import everything, tighten
from optopick.model.rows import Ask, Rows, stack

SMALL = 200
"""Shaving pays above so many combinations."""

BLOCKS = 8
"""Blocks of one position that shaving tries alone."""

ENOUGH = 0.7
"""A round of shaving that leaves more than this share of the combinations is the last."""

Choice = tuple[int, int, int]
Indices = tuple[np.ndarray, np.ndarray, np.ndarray]


@dataclass(frozen=True)
class Box:
    """The values in question: their model, their indices in the whole stock, the cuts, and the rows that can fail."""

    model: LinkModel
    indices: Indices
    cuts: Rows
    rows: Rows

    @property
    def combinations(self) -> int:
        """Combinations in question."""
        return int(np.prod(self.model.sizes))

    def take(self, i: np.ndarray, j: np.ndarray, m: np.ndarray) -> Box:
        """The same with only some of its values, in ascending order."""
        if all(len(kept) == n for kept, n in zip((i, j, m), self.model.sizes, strict=True)):
            return self
        indices = tuple(own[kept] for own, kept in zip(self.indices, (i, j, m), strict=True))
        rows = self.rows.take(i, j, m)
        return Box(self.model.take(i, j, m), indices, self.cuts.take(i, j, m), rows)

    def with_cuts(self, cuts: Rows) -> Box:
        """The same with more cuts."""
        sizes = self.model.sizes
        return Box(self.model, self.indices, stack([self.cuts, cuts], sizes), stack([self.rows, cuts], sizes))

    def whole(self, choice: Choice) -> Choice:
        """A combination of this box as indices in the whole stock."""
        i, j, m = (int(own[k]) for own, k in zip(self.indices, choice, strict=True))
        return i, j, m


def whole_box(model: LinkModel, ask: Ask, cuts: Rows) -> Box | None:
    """All values that hold the limits on one value alone, under `cuts`; None where a position has none."""
    start = model.start(ask.dropped)
    none = stack([], model.sizes)
    box = Box(model, tuple(np.arange(n) for n in model.sizes), cuts, none)  # type: ignore[arg-type]
    return None if start.empty else box.take(*start.indices)


def narrowed(box: Box, ask: Ask) -> Box | None:
    """The box less all that what is asked rules out; None where nothing is left, which proves that no design exists."""
    found = tightened(box, ask)
    while found is not None and found.combinations > SMALL and ask.has_delays:
        before = found.combinations
        found = _shaved(found, ask)
        if found is None or found.combinations > ENOUGH * before:
            break
    return found


def tightened(box: Box, ask: Ask) -> Box | None:
    """The box with its ranges tightened until nothing changes; the delays' rows sharpen as it shrinks."""
    live, _ = tighten(stack([box.model.ready_rows(ask), box.cuts], box.model.sizes), everything(box.model.sizes))
    if live.empty:
        return None
    box = box.take(*live.indices)
    while True:
        rows = stack([box.model.rows(ask), box.cuts], box.model.sizes)
        live, rows = tighten(rows, everything(box.model.sizes))
        if live.empty:
            return None
        shrunk = live.combinations < box.combinations
        box = Box(box.model, box.indices, box.cuts, rows)
        if not shrunk:
            return box
        box = box.take(*live.indices)


def _shaved(box: Box, ask: Ask) -> Box | None:
    """What survives of each block of base resistors and of LED branches when it is tightened alone.

    Within a block the parts of a delay bound each other closely, so that whole blocks fall.
    """
    for axis in (2, 0):
        survivors = [left for left in (tightened(block, ask) for block in _blocks(box, axis)) if left is not None]
        if not survivors:
            return None
        kept = [np.unique(np.concatenate([left.indices[n] for left in survivors])) for n in range(3)]
        box = box.take(*(np.searchsorted(own, k) for own, k in zip(box.indices, kept, strict=True)))
    return tightened(box, ask)


def _blocks(box: Box, axis: int, count: int = BLOCKS) -> list[Box]:
    """The box cut along one position; indices stay ascending."""
    sizes = box.model.sizes
    blocks = []
    for part in np.array_split(np.arange(sizes[axis]), min(count, sizes[axis])):
        blocks.append(box.take(*(part if n == axis else np.arange(sizes[n]) for n in range(3))))
    return blocks


def halves(box: Box) -> list[Box]:
    """The box in two, along the base resistors or the LED branches, whichever are more."""
    led, _, base = box.model.sizes
    return _blocks(box, 2 if base >= led else 0, 2)
