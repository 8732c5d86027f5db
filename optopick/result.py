"""What optopick answers: designs, checks, timing, power, proof. Frozen; SI throughout."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

from optopick.brief import GoalName
from optopick.coupler import Assumed

NOT_CHOSEN = "not among the brief's couplers"
"""Reason of a coupler that the brief leaves out by name."""


class Status(StrEnum):
    """What is known about the answer."""

    OPTIMAL = "optimal"
    FEASIBLE = "feasible"
    INFEASIBLE = "infeasible"
    UNKNOWN = "unknown"


@dataclass(frozen=True)
class Design:
    """A coupler and resistor values [ohm]; None where a position stays empty.

    pieces: how many equal resistors of `r_led` stand in series. reverse_diode: a diode antiparallel to the LED.
    """

    coupler: str
    r_led: float
    r_load: float
    r_be: float | None
    r_shunt: float | None
    pieces: int = 1
    reverse_diode: bool = False


OF_THE_PART = frozenset({"withstand", "working_voltage", "creepage"})
"""Checks that the coupler alone decides."""


@dataclass(frozen=True)
class Check:
    """One requirement at its worst corner; `sense` is "<=" or ">="."""

    name: str
    value: float
    limit: float
    sense: str
    unit: str
    corner: str

    @property
    def margin(self) -> float:
        """Room left over the limit, negative where the check fails [1]; the plain difference where the limit is 0."""
        room = self.limit - self.value if self.sense == "<=" else self.value - self.limit
        return room / abs(self.limit) if self.limit else room

    @property
    def passed(self) -> bool:
        """Whether the requirement holds, to within rounding; a value that is not a number does not."""
        return self.margin >= -1e-9


@dataclass(frozen=True)
class Timing:
    """Worst-case times [s], guard included."""

    edge_on: float
    edge_off: float
    storage: float
    delay_on: float
    delay_off: float
    distortion: float


@dataclass(frozen=True)
class Power:
    """Average power of the link [W], typical parts at mid supplies and at the worst corner."""

    nominal: float
    worst: float


@dataclass(frozen=True)
class Review:
    """Every check of one design, from physics alone."""

    design: Design
    checks: tuple[Check, ...]
    timing: Timing
    power: Power

    @property
    def passed(self) -> bool:
        """Whether every check holds."""
        return all(check.passed for check in self.checks)

    @property
    def designed(self) -> tuple[Check, ...]:
        """The checks that the resistors have a say in, and whatever fails."""
        return tuple(check for check in self.checks if check.name not in OF_THE_PART or not check.passed)

    @property
    def failing(self) -> tuple[Check, ...]:
        """The checks that do not hold."""
        return tuple(check for check in self.checks if not check.passed)


def goal_of(reviewed: Review, goal: GoalName) -> float:
    """A goal's value in a review, guard included."""
    timing = reviewed.timing
    return {
        GoalName.EDGE_TIME: max(timing.edge_on, timing.edge_off),
        GoalName.DELAY: max(timing.delay_on, timing.delay_off),
        GoalName.DISTORTION: timing.distortion,
        GoalName.POWER: reviewed.power.worst,
    }[goal]


@dataclass(frozen=True)
class Objective:
    """What was made least: its value at the design, and the bound below which no design exists."""

    name: str
    value: float
    bound: float
    unit: str

    @property
    def gap(self) -> float:
        """(value - bound)/value [1]."""
        return (self.value - self.bound) / self.value if self.value else 0.0


@dataclass(frozen=True)
class Proof:
    """How the answer was established: combinations in stock, solver calls, couplers decided without one, seconds."""

    combinations: int
    solves: int
    decided_by_ranges: int
    seconds: float
    solver: str


@dataclass(frozen=True)
class Rejected:
    """A coupler that cannot serve, and why."""

    part: str
    reason: str


@dataclass(frozen=True)
class Result:
    """The answer to a brief."""

    status: Status
    objective: Objective | None
    second: Objective | None
    review: Review | None
    assumed: tuple[Assumed, ...]
    rejected: tuple[Rejected, ...]
    proof: Proof
    cautions: tuple[str, ...]

    @property
    def design(self) -> Design | None:
        """The design found, if any."""
        return self.review.design if self.review else None
