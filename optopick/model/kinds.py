"""The model of each kind of coupler: the place to add a kind."""

from __future__ import annotations

from collections.abc import Callable
from typing import Protocol, Self

import numpy as np

from optopick.brief import Brief
from optopick.coupler import Coupler, Kind
from optopick.model.logic import LogicModel
from optopick.model.ranges import Live
from optopick.model.rows import Ask, Rows, Scores
from optopick.model.transistor import TransistorModel
from optopick.physics.types import Array


class LinkModel(Protocol):
    """What the search asks of a coupler's model over the positions LED branch i, load resistor j, base resistor m."""

    sizes: tuple[int, int, int]

    @property
    def power(self) -> tuple[Array, Array]:
        """Worst average power of each LED branch and of each load resistor [W]."""

    @property
    def heat(self) -> tuple[Array, Array, Array]:
        """Heat of each LED branch (T, n), of the output with each load (T, n), and of the package at most (T,) [W]."""

    def take(self, i: np.ndarray, j: np.ndarray, m: np.ndarray) -> Self:
        """The model over some of the values."""

    def values(self, i: int, j: int, m: int) -> tuple[float, int, float, float, float]:
        """Resistors of a combination: r_led, pieces, r_shunt, r_load, r_be [ohm], infinite where absent."""

    def start(self, dropped: frozenset[str] = frozenset()) -> Live:
        """The values that hold the limits on one value alone."""

    def ready_rows(self, ask: Ask) -> Rows:
        """The linear rows of what is asked that take no computing: the others then have fewer values to look at."""

    def rows(self, ask: Ask) -> Rows:
        """Every linear row of what is asked."""

    def scores(self, i: np.ndarray, j: np.ndarray, m: np.ndarray) -> Scores:
        """Worst-case goals of combinations, exactly."""

    def cuts(self, ask: Ask, i: int, j: int, m: int) -> Rows:
        """Rows that forbid a combination which the rows pass and the scores refuse."""


MODELS: dict[Kind, Callable[[Brief, Coupler], LinkModel]] = {
    Kind.PHOTOTRANSISTOR: TransistorModel.of,
    Kind.DARLINGTON: TransistorModel.of,
    Kind.LOGIC: LogicModel.of,
}


def model_of(brief: Brief, coupler: Coupler) -> LinkModel:
    """The model of a coupler over all that the brief stocks."""
    return MODELS[coupler.kind](brief, coupler)
