"""What `board` answers: a design for every link, what they share, and how far that is proved. Frozen; SI throughout."""

from __future__ import annotations

from dataclasses import dataclass

from optopick.board import BoardLink, Grounds
from optopick.result import Objective, Review, Status


@dataclass(frozen=True)
class LinkChoice:
    """A link with its design, checked again, and the least power that it could have alone on a board [W]."""

    link: BoardLink
    review: Review
    alone: float

    @property
    def power(self) -> float:
        """Worst average power of one of it [W]."""
        return self.review.power.worst

    @property
    def gave(self) -> float:
        """What it gave up: how much more power than alone [1]."""
        return self.power / self.alone - 1.0


@dataclass(frozen=True)
class Packages:
    """Packages of one part: how many, and which links are in them with how many channels each.

    grounds: those that the links share; None where the packages are one link's own.
    """

    part: str
    channels: int
    count: int
    links: tuple[tuple[str, int], ...]
    grounds: Grounds | None


@dataclass(frozen=True)
class Needed:
    """A limit over a board that contradicts others: the least that it would have to be, all others as they are.

    limit, least: [W] for power. least None: no value of it helps. proved: whether no less would do.
    """

    name: str
    limit: float
    least: float | None
    proved: bool


@dataclass(frozen=True)
class FrontPoint:
    """The least first goal of a board with so many reels (or parts, or packages) at most, and that board."""

    count: int
    result: BoardResult

    @property
    def goal(self) -> Objective:
        """The first goal: its value and what is shown of it."""
        return self.result.goals[0]


@dataclass(frozen=True)
class BoardFront:
    """How a board's first goal falls as it may have more of what is counted.

    count: what is counted. points: from the fewest up, those alone that gain something; none where no board holds the
    other limits. complete: whether each is proved, and none is left out.
    """

    count: str
    goal: str
    status: Status
    points: tuple[FrontPoint, ...]
    complete: bool
    hopeless: tuple[str, ...]


@dataclass(frozen=True)
class BoardProof:
    """How the answer was established: size of the last model, cuts, solver calls, seconds, the solver."""

    columns: int
    rows: int
    cuts: int
    solves: int
    seconds: float
    solver: str


@dataclass(frozen=True)
class BoardResult:
    """The answer for a board.

    goals: the first and the second, empty where there is no design. reels: the distinct resistances [ohm], ascending;
    couplers: the distinct parts. packages: the coupler packages placed. price: of all couplers and resistors, None
    where a price is not known. edge: the worst edge time, each against its link's limit [1], None without any limit.
    unpriced: what was left out since it has no price. hopeless: links that have no design even alone.
    conflict: limits of which no part contradicts itself, where no board holds all limits over it.
    """

    status: Status
    goals: tuple[Objective, ...]
    links: tuple[LinkChoice, ...]
    reels: tuple[float, ...]
    couplers: tuple[str, ...]
    packages: tuple[Packages, ...]
    price: float | None
    edge: float | None
    unpriced: tuple[str, ...]
    hopeless: tuple[str, ...]
    conflict: tuple[Needed, ...]
    proof: BoardProof
    cautions: tuple[str, ...]

    @property
    def power(self) -> float:
        """Worst average power of all links together [W]."""
        return sum(one.link.count * one.power for one in self.links)

    @property
    def alone(self) -> float:
        """The same with every link as if it were alone [W]."""
        return sum(one.link.count * one.alone for one in self.links)

    @property
    def placed(self) -> int:
        """How many packages are placed."""
        return sum(one.count for one in self.packages)
