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


@dataclass(frozen=True)
class BoardLink:
    """One link: its name on the board, what it must do, and how many of it there are."""

    name: str
    brief: Brief
    count: int


@dataclass(frozen=True)
class BoardLimits:
    """Upper limits over the board; None where none is stated.

    reels: distinct resistances. couplers: distinct parts. power: worst average of all links together [W].
    """

    reels: int | None = None
    couplers: int | None = None
    power: float | None = None


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


def reel_of(ohms: float) -> float:
    """The reel that a resistance comes from, named by its value [ohm]."""
    return float(f"{ohms:.{DIGITS - 1}e}")
