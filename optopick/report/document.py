"""What the design-review document is made from: the answer, what was asked, and the parts that may be there or not."""

from __future__ import annotations

from dataclasses import dataclass
from hashlib import sha256
from typing import TYPE_CHECKING

from optopick.answers import Checked, Front, Ranking, Share, Why
from optopick.brief import Brief
from optopick.coupler import Assumed, Coupler
from optopick.result import Objective, Proof, Rejected, Result, Review, Status

if TYPE_CHECKING:
    from optopick.simulate import Pattern, Simulation


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
        """The content as text; bytes that are no UTF-8 show as replacement characters, other files by their size."""
        if b"\0" in self.content:  # a spreadsheet or Parquet table
            return f"A file of {len(self.content)} bytes that are not text."
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
    """Voltages over time [s, V], ascending in time.

    lit: from when to when the LED is on [s]. bits, bit_time [s]: a pattern that was sent from t = 0.
    """

    title: str
    time: tuple[float, ...]
    traces: tuple[Trace, ...]
    levels: tuple[Level, ...] = ()
    lit: tuple[tuple[float, float], ...] = ()
    bits: str = ""
    bit_time: float = 0.0


@dataclass(frozen=True)
class Walk:
    """Designs the reader can move along, each reviewed beforehand.

    position: the resistor that changes ("r_load"), or "front" for the designs of a trade-off front. chosen: index of
    the document's design, None where it is not among them.
    """

    position: str
    points: tuple[Review, ...]
    chosen: int | None


@dataclass(frozen=True)
class Document:
    """One design review. Optional parts are shown only where they are given.

    coupler: the table row of the design, None where there is no design. status: None for a design that was given and
    not sought. date: as it is to be printed, so that the same input gives the same page. budget: a margin budget.
    why: which limits contradict each other, where there is no design.
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
    ranking: Ranking | None = None
    front: Front | None = None
    why: Why | None = None
    walks: tuple[Walk, ...] = ()
    budget: tuple[Share, ...] = ()
    simulation: Simulation | None = None
    pattern: Pattern | None = None

    def __post_init__(self) -> None:
        if (self.review is None) != (self.coupler is None):
            raise ValueError("a review and its coupler go together")
        if self.review and self.coupler and self.review.design.coupler != self.coupler.part:
            raise ValueError(f"the design has {self.review.design.coupler}, the coupler given is {self.coupler.part}")


def document_of(
    brief: Brief, result: Result, coupler: Coupler | None, files: tuple[InputFile, InputFile], version: str, date: str
) -> Document:
    """The document of an answer to `pick`; add the optional parts with dataclasses.replace. files: brief and table."""
    return Document(
        brief=brief,
        brief_file=files[0],
        table_file=files[1],
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


def document_of_checked(
    brief: Brief, checked: Checked, coupler: Coupler, files: tuple[InputFile, InputFile], version: str, date: str
) -> Document:
    """The document of a design that was given to `check`. files: brief and table."""
    return Document(
        brief=brief,
        brief_file=files[0],
        table_file=files[1],
        version=version,
        date=date,
        review=checked.review,
        coupler=coupler,
        assumed=checked.assumed,
        notes=checked.notes,
        cautions=checked.cautions,
    )
