"""What the uses besides `pick` answer: rankings, fronts, reasons, budgets. Frozen; SI throughout."""

from __future__ import annotations

from dataclasses import dataclass

from optopick.brief import GoalName
from optopick.coupler import Assumed, Coupler
from optopick.read_couplers import SetAside
from optopick.result import Check, Objective, Rejected, Result, Review, Status

CAUSES: dict[str, tuple[str, ...]] = {
    "CTR": ("ctr",),
    "light": ("light",),
    "V_BE": ("v_be",),
    "storage": ("storage",),
    "V_F": ("v_f",),
    "age": ("age",),
    "temp": ("temperature",),
    "drive": ("drive", "drop"),
    "V_CC": ("supply",),
    "R": ("r_led", "r_load", "r_be", "r_shunt"),
}
"""What each cause is called, and the axes of the uncertainty box that it stands for."""


@dataclass(frozen=True)
class Checked:
    """A design's review, what was assumed of its coupler, and the cautions."""

    review: Review
    assumed: tuple[Assumed, ...]
    notes: tuple[str, ...]
    cautions: tuple[str, ...]


@dataclass(frozen=True)
class Nearest:
    """The nearest passing design and the places where it differs."""

    changed: tuple[str, ...]
    result: Result


@dataclass(frozen=True)
class Share:
    """One check: its margin at the worst corner, with everything nominal, and what each cause costs [1].

    cost: cause to the margin that the check would gain if that cause alone stood at its nominal value.
    """

    check: str
    worst: float
    nominal: float
    cost: dict[str, float]


@dataclass(frozen=True)
class Ranked:
    """One coupler's best design: goals, review, price and isolation."""

    coupler: Coupler
    status: Status
    objective: Objective
    second: Objective
    review: Review

    @property
    def tightest(self) -> Check:
        """The check with the least room."""
        return min(self.review.designed, key=lambda check: check.margin)


@dataclass(frozen=True)
class Ranking:
    """Couplers in the order of the goal, then of the second goal; those rejected; whether every coupler was tried."""

    ranked: tuple[Ranked, ...]
    rejected: tuple[Rejected, ...]
    complete: bool


@dataclass(frozen=True)
class Point:
    """One design that nothing in stock beats in both goals; the goals' values, guard included."""

    first: float
    second: float
    review: Review


@dataclass(frozen=True)
class Front:
    """Points in the order of the first goal. complete: every point of the front; else evenly asked ones.

    knee: index of the point farthest below the line between the ends, both goals scaled to one; None for fewer than
    three points.
    """

    goals: tuple[GoalName, GoalName]
    points: tuple[Point, ...]
    complete: bool
    knee: int | None
    out_of_time: bool = False


@dataclass(frozen=True)
class Change:
    """The least change of one limit that makes a design exist: from, to [unit], or a finer stock in words."""

    key: str
    unit: str
    now: float | str
    needed: float | str


@dataclass(frozen=True)
class Worth:
    """What a step of one limit does to the first goal: limit from, to; goal from, to (None: no design at all)."""

    key: str
    unit: str
    now: float
    stepped: float
    goal: float | None


@dataclass(frozen=True)
class Why:
    """The reasons: contradicting sets of checks, the least changes, or what binds and what each limit is worth."""

    status: Status
    conflicts: tuple[tuple[str, ...], ...]
    changes: tuple[Change, ...]
    complete: bool
    result: Result | None
    worth: tuple[Worth, ...]


@dataclass(frozen=True)
class Passing:
    """One check over all samples: how many pass, counts of the margin in equal bins from -1 to 3, the least margin."""

    check: str
    passed: int
    histogram: tuple[int, ...]
    least: float


@dataclass(frozen=True)
class Yield:
    """How many of `count` samples pass every check, and each."""

    count: int
    good: int
    checks: tuple[Passing, ...]


@dataclass(frozen=True)
class Step:
    """One stock value of the position swept: the review at the worst corners, and with everything typical."""

    ohms: float | None
    worst: Review
    typical: Review


@dataclass(frozen=True)
class Sweep:
    """A design with one position stepped through its stock; `chosen`: the value of the design itself."""

    position: str
    chosen: float | None
    steps: tuple[Step, ...]


@dataclass(frozen=True)
class FittedTime:
    """One switching time [s]: as the sheet gives it, and as the resolved constants reproduce it.

    fitted: the constants are meant to meet it, and miss it only where `Fitted.note` says why; else a comparison.
    """

    column: str
    given: float
    reproduced: float
    fitted: bool

    @property
    def residual(self) -> float:
        """Reproduced over given, less one, in per cent."""
        return 100.0 * (self.reproduced / self.given - 1.0)


@dataclass(frozen=True)
class Fitted:
    """One part and bin: its switching rows beside its constants, and why a row was not used (empty: all were).

    transit: transit time [s]; c_cb: collector-base capacitance at 0 V [F]; tau_s: storage constant [s].
    """

    part: str
    transit: float
    c_cb: float
    tau_s: float
    times: tuple[FittedTime, ...]
    note: str


@dataclass(frozen=True)
class CheckedRow:
    """A usable row of a coupler table: part and bin, its line in the file, and what rules filled in."""

    part: str
    row: int
    assumed: tuple[Assumed, ...]


@dataclass(frozen=True)
class Gap:
    """A parameter that some rows leave out: the rule that fills it, those parts, and the different values taken."""

    parameter: str
    rule: str
    parts: tuple[str, ...]
    values: tuple[str, ...]


@dataclass(frozen=True)
class TableCheck:
    """A coupler table looked at by itself: usable rows, rows set aside with the reason, gaps, the commonest first."""

    file: str
    rows: tuple[CheckedRow, ...]
    set_aside: tuple[SetAside, ...]
    gaps: tuple[Gap, ...]
