"""What the design-review document is made from: the answer, what it was asked, and the parts that may be there or not."""

from __future__ import annotations

from dataclasses import dataclass, field
from hashlib import sha256

from optopick.brief import Brief
from optopick.coupler import Assumed, Coupler
from optopick.result import Check, Design, Objective, Proof, Rejected, Result, Review, Status


@dataclass(frozen=True)
class InputFile:
    """A file as it was read, to be quoted with its checksum."""

    name: str
    content: bytes

    @property
    def checksum(self) -> str:
        """SHA-256 of the bytes, in hexadecimal."""
        return sha256(self.content).hexdigest()

    @property
    def text(self) -> str:
        """The content as text; bytes that are no UTF-8 show as replacement characters."""
        return self.content.decode("utf-8", errors="replace").removeprefix("\ufeff")


@dataclass(frozen=True)
class Trace:
    """One curve: its name and a value for each instant or position."""

    name: str
    values: tuple[float, ...]


@dataclass(frozen=True)
class Level:
    """A horizontal line across a plot: a threshold, a limit."""

    name: str
    value: float


@dataclass(frozen=True)
class Waveform:
    """Voltages over time [s, V], ascending in time; `bits` with `bit_time` [s] where a pattern was sent from t = 0."""

    title: str
    explained: str
    time: tuple[float, ...]
    traces: tuple[Trace, ...]
    levels: tuple[Level, ...] = ()
    bits: str = ""
    bit_time: float = 0.0


@dataclass(frozen=True)
class BudgetStep:
    """One cause moved to the end that hurts, and the check's value from then on."""

    cause: str
    value: float


@dataclass(frozen=True)
class Budget:
    """How a check comes from its typical value to its worst one, cause by cause."""

    check: Check
    typical: float
    steps: tuple[BudgetStep, ...]


@dataclass(frozen=True)
class FrontPoint:
    """A design that is best in one goal for what it gives in the other."""

    x: float
    y: float
    design: Design


@dataclass(frozen=True)
class Front:
    """A trade-off front, ascending in x; units as in Objective. `chosen`: index of the document's design, if on it."""

    x_name: str
    x_unit: str
    y_name: str
    y_unit: str
    points: tuple[FrontPoint, ...]
    chosen: int | None = None


@dataclass(frozen=True)
class Ranked:
    """The best design of one coupler: its goals, in the order of the brief."""

    design: Design
    objectives: tuple[Objective, ...]


@dataclass(frozen=True)
class Walk:
    """Designs the reader can move along, each reviewed beforehand.

    position: the resistor that changes ("r_load"), or "front" for the designs of a trade-off front. `chosen`: index of
    the document's design.
    """

    position: str
    points: tuple[Review, ...]
    chosen: int


@dataclass(frozen=True)
class Document:
    """One design review. Optional parts are shown only where they are given.

    coupler: the table row of the design, None where there is no design. status: None for a design that was given and
    not sought. date: as it is to be printed, so that the same input gives the same page.
    """

    brief: Brief
    brief_file: InputFile
    table_file: InputFile
    version: str
    date: str
    review: Review | None
    coupler: Coupler | None
    status: Status | None = None
    objectives: tuple[Objective, ...] = ()
    proof: Proof | None = None
    assumed: tuple[Assumed, ...] = ()
    rejected: tuple[Rejected, ...] = ()
    notes: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    ranking: tuple[Ranked, ...] = ()
    front: Front | None = None
    walks: tuple[Walk, ...] = ()
    waveforms: tuple[Waveform, ...] = ()
    budgets: tuple[Budget, ...] = field(default=())

    def __post_init__(self) -> None:
        if (self.review is None) != (self.coupler is None):
            raise ValueError("a review and its coupler go together")
        if self.review and self.coupler and self.review.design.coupler != self.coupler.part:
            raise ValueError(f"the design has {self.review.design.coupler}, the coupler given is {self.coupler.part}")


def document_of(
    brief: Brief,
    result: Result,
    coupler: Coupler | None,
    *,
    brief_file: InputFile,
    table_file: InputFile,
    version: str,
    date: str,
) -> Document:
    """The document of an answer to `pick`; add the optional parts with dataclasses.replace."""
    return Document(
        brief=brief,
        brief_file=brief_file,
        table_file=table_file,
        version=version,
        date=date,
        review=result.review,
        coupler=coupler,
        status=result.status,
        objectives=tuple(objective for objective in (result.objective, result.second) if objective),
        proof=result.proof,
        assumed=result.assumed,
        rejected=result.rejected,
        cautions=result.cautions,
    )
