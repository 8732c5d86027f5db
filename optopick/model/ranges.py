"""Throws out stock values that no choice in the other positions can save, until nothing changes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from optopick.model.rows import EASE, Rows


@dataclass(frozen=True)
class Live:
    """Which values of each position are still in question: masks (n_led,), (n_load,), (n_base,)."""

    led: np.ndarray
    load: np.ndarray
    base: np.ndarray

    @property
    def empty(self) -> bool:
        """Whether some position has nothing left: no design exists."""
        return not (self.led.any() and self.load.any() and self.base.any())

    @property
    def combinations(self) -> int:
        """Combinations still in question."""
        return int(self.led.sum()) * int(self.load.sum()) * int(self.base.sum())

    @property
    def indices(self) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """The values still in question, (n,) each."""
        return np.flatnonzero(self.led), np.flatnonzero(self.load), np.flatnonzero(self.base)


def holding(keeps: Sequence[Mapping[str, np.ndarray]], sizes: Sequence[int], dropped: frozenset[str]) -> Live:
    """The values of each position that hold every limit on them alone, but for the limits dropped."""
    masks = []
    for keep, n in zip(keeps, sizes, strict=True):
        held = [mask for name, mask in keep.items() if name not in dropped]
        masks.append(np.all([np.ones(n, dtype=bool), *held], axis=0))
    return Live(*masks)


def everything(sizes: tuple[int, int, int]) -> Live:
    """All values in question."""
    return Live(*(np.ones(n, dtype=bool) for n in sizes))


def tighten(rows: Rows, live: Live) -> tuple[Live, Rows]:
    """The values that survive, and the rows that can still fail among them."""
    masks = [live.led.copy(), live.load.copy(), live.base.copy()]
    parts = [rows.a, rows.b, rows.c]
    changed = True
    while changed and all(mask.any() for mask in masks):
        changed = False
        best = [
            part[:, mask].max(axis=1) if len(part) else np.zeros(0) for part, mask in zip(parts, masks, strict=True)
        ]
        for k in range(3):
            others = sum(best[n] for n in range(3) if n != k)
            kept = masks[k] & (parts[k] + np.reshape(others, (-1, 1)) >= -EASE).all(axis=0)
            if kept.sum() < masks[k].sum():
                masks[k], changed = kept, True
                if not kept.any():
                    break
                best[k] = parts[k][:, kept].max(axis=1)
    left = Live(*masks)
    return left, rows if left.empty else rows.pick(_may_fail(parts, masks))


def _may_fail(parts: list[np.ndarray], masks: list[np.ndarray]) -> np.ndarray:
    """Rows that some combination of live values fails."""
    least = sum(part[:, mask].min(axis=1) for part, mask in zip(parts, masks, strict=True))
    return np.asarray(least < -EASE)


def undominated(rows: Rows, most: int = 400) -> Rows:
    """Rows without those that another row implies; left alone where there are more than `most`."""
    if len(rows) > most:
        return rows
    parts = np.concatenate([rows.a, rows.b, rows.c], axis=1)
    keep = np.ones(len(rows), dtype=bool)
    for k in range(len(rows)):
        stricter = (parts[keep] <= parts[k] + 1e-15).all(axis=1)
        others = np.flatnonzero(keep)[stricter]
        if (others != k).any():
            keep[k] = False
    return rows.pick(keep)
