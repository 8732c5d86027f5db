"""What a whole board must do: its links, and what they share; validated and frozen. SI throughout.

`read_board` makes these from a TOML file; everything behind it takes them as given.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from pathlib import Path

from optopick.brief import Brief

DIGITS = 9
"""Resistances that agree in so many digits come from one reel."""


class BoardGoalName(StrEnum):
    """What can be made least over a board."""

    POWER = "power"
    REELS = "reels"
    COUPLERS = "couplers"
    PACKAGES = "packages"
    COST = "cost"
    EDGE = "edge"


Grounds = tuple[str, str]
"""The names of the grounds on the LED's side and on the output's side of a link."""


@dataclass(frozen=True)
class BoardLink:
    """One link: its name on the board, what it must do, and how many of it there are.

    changes: the keys that the board changes in the link's brief file, in words; None where it takes one out.
    grounds: links that have the same ones may share packages; None where the link's packages are its own.
    """

    name: str
    brief: Brief
    count: int
    grounds: Grounds | None = None
    changes: tuple[tuple[str, str | None], ...] = ()


@dataclass(frozen=True)
class BoardLimits:
    """Upper limits over the board; None where none is stated.

    reels: distinct resistances. couplers: distinct parts. packages: coupler packages placed. power: worst average of
    all links together [W]. price: of all couplers and resistors, in the currency of the tables.
    """

    reels: int | None = None
    couplers: int | None = None
    packages: int | None = None
    power: float | None = None
    price: float | None = None

    def of(self, goal: BoardGoalName) -> float | None:
        """The limit on what a goal makes least; on edges there is none over the board."""
        stated = {
            BoardGoalName.REELS: self.reels,
            BoardGoalName.COUPLERS: self.couplers,
            BoardGoalName.PACKAGES: self.packages,
            BoardGoalName.POWER: self.power,
            BoardGoalName.COST: self.price,
        }
        return stated.get(goal)


@dataclass(frozen=True)
class BoardGoal:
    """What to make least, then what, within `give` [1] of the first."""

    minimize: BoardGoalName
    then: BoardGoalName
    give: float


@dataclass(frozen=True)
class Board:
    """A board, complete: at least one link, no name twice."""

    title: str
    limits: BoardLimits
    goal: BoardGoal
    links: tuple[BoardLink, ...]
    path: Path | None = None

    @property
    def goals(self) -> tuple[BoardGoalName, BoardGoalName]:
        """What to make least, and then."""
        return self.goal.minimize, self.goal.then


def reel_of(ohms: float) -> float:
    """The reel that a resistance comes from, named by its value [ohm]."""
    return float(f"{ohms:.{DIGITS - 1}e}")
