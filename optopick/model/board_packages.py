"""Packages of several channels: which links share them, and how many a board takes.

Links on the same grounds share packages, unless a link's heat is more than an equal share of what the package may take:
then whatever stands beside it could be too much, and it has packages of its own.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from enum import Enum, auto

from optopick.board import BoardGoalName, Grounds
from optopick.model.board_seats import Seat, Taken
from optopick.model.rows import EASE

Counts = Mapping[Grounds | None, int]
"""How many there are of one link on each pair of grounds; None: of those that share no package."""


class Sharing(Enum):
    """Whether a seat's links share packages."""

    NEVER = auto()
    ALWAYS = auto()
    BY_VALUES = auto()


def on_grounds(counts: Counts) -> int:
    """How many of a link have grounds."""
    return sum(count for grounds, count in counts.items() if grounds is not None)


def sharing_of(seat: Seat, counts: Counts) -> Sharing:
    """Whether the links of a seat share packages whatever the values, or never, or as the values chosen decide."""
    if seat.coupler.channels == 1 or not on_grounds(counts):
        return Sharing.NEVER
    led, load, share = seat.heat
    if (led.max(axis=1) + load.max(axis=1) <= share[:, 0] * (1 + EASE)).all():
        return Sharing.ALWAYS
    return Sharing.BY_VALUES if (led.min(axis=1) + load.min(axis=1) <= share[:, 0]).all() else Sharing.NEVER


def packages_of(taken: Sequence[Taken], counts: Sequence[Counts]) -> dict[str, int]:
    """How many packages of each part a board takes."""
    found: dict[str, int] = {}
    together: dict[tuple[str, Grounds], tuple[int, int]] = {}
    for one, of_link in zip(taken, counts, strict=True):
        part, channels = one.seat.coupler.part, one.seat.coupler.channels
        for grounds, count in of_link.items():
            if grounds is None or channels == 1 or not one.shares:
                found[part] = found.get(part, 0) + count
            else:
                before = together.get((part, grounds), (0, channels))[0]
                together[part, grounds] = (before + count, channels)
    for (part, _), (count, channels) in together.items():
        found[part] = found.get(part, 0) + -(-count // channels)
    return found


def cost_of(taken: Sequence[Taken], counts: Sequence[Counts]) -> float:
    """What the packages and the resistors of a board cost."""
    resistors = sum(sum(of.values()) * one.adds(BoardGoalName.COST) for one, of in zip(taken, counts, strict=True))
    prices = {one.seat.coupler.part: one.seat.coupler.price or 0.0 for one in taken}
    return float(resistors + sum(n * prices[part] for part, n in packages_of(taken, counts).items()))
