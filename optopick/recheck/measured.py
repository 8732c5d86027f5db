"""A check before its worst corner is sought: value and limit wherever they were evaluated."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from optopick.physics.types import Array


@dataclass(frozen=True)
class Measured:
    """A check's value and limit, arrays that broadcast; `sense` "<=" or ">="."""

    name: str
    value: Array | float
    limit: Array | float
    sense: str
    unit: str

    @property
    def margin(self) -> Array:
        """Room left relative to the limit, the plain difference where that is zero; minus infinity for not a number."""
        value, limit = np.asarray(self.value, dtype=float), np.asarray(self.limit, dtype=float)
        room = limit - value if self.sense == "<=" else value - limit
        with np.errstate(invalid="ignore", divide="ignore"):
            share = np.where(limit != 0, room / np.abs(limit), room)
        return np.asarray(np.fmax(share, -np.inf))
