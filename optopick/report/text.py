"""Results for people at a terminal, as rich renderables; plain when piped."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import asdict

from rich.console import Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from optopick.answers import Checked, Nearest
from optopick.coupler import Assumed
from optopick.report.labels import POSITIONS, TIMES, check_label
from optopick.report.words import (
    TIGHT,
    amount,
    binding,
    holding,
    limit_words,
    ohms_words,
    proof_words,
    room_words,
    rule_words,
    set_aside,
    verdict,
)
from optopick.result import Check, Design, Result, Review, Status


def result_text(result: Result, title: str) -> RenderableType:
    """The whole answer to `pick`."""
    return Group(*_result_parts(result, title))


def _result_parts(result: Result, title: str) -> Iterator[RenderableType]:
    yield Text(title, style="bold")
    yield Text(_verdict(result), style="green" if result.review else "red")
    if result.status is Status.INFEASIBLE:
        yield Text("optopick why tells which limits stand in the way, and how far each would have to move.")
    if result.review:
        yield Text()
        yield from review_parts(result.review)
        yield from _assumed(result.assumed)
    yield from _rejected(result)
    yield Text()
    said = proof_words(result.status, result.proof)
    yield Text(f"Proof: {said[:1].lower()}{said[1:]}")
    for caution in result.cautions:
        yield Text()
        yield Text("Caution: " + caution, style="yellow")


def _verdict(result: Result) -> str:
    objectives = [objective for objective in (result.objective, result.second) if objective]
    return verdict(result.status, objectives, result.review)


def next_text(result: Result, place: int) -> RenderableType:
    """A next best design, in short."""
    if result.review is None:
        return Group(Text(), Text(f"Next best, place {place}: none", style="bold"), Text(_verdict(result)))
    title = Text(f"Next best, place {place}", style="bold")
    return Group(Text(), title, Text(_verdict(result)), _design(result.review.design))


def checked_text(checked: Checked, title: str, near: Nearest | None = None) -> RenderableType:
    """The whole answer to `check`."""
    review = checked.review
    said = holding(review)
    style = "green" if review.passed else "red"
    parts = [Text(title, style="bold"), Text(f"{said[:1].upper()}{said[1:]}.", style=style), Text()]
    notes = [Text("Note: " + note) for note in checked.notes]
    warned = [Padding(Text("Caution: " + caution, style="yellow"), (1, 0, 0, 0)) for caution in checked.cautions]
    return Group(*parts, *review_parts(review), *notes, *_near(review, near), *_assumed(checked.assumed), *warned)


def _near(review: Review, near: Nearest | None) -> Iterator[RenderableType]:
    """The nearest passing design of a failing one."""
    if review.passed:
        return
    yield Text()
    if near is None or near.result.design is None:
        yield Text("No design in this stock passes: see `optopick why`.")
        return
    changed = ", ".join(POSITIONS.get(place, place) for place in near.changed)
    yield Text(f"Nearest design that passes: change {changed}", style="bold")
    yield _design(near.result.design)


def review_parts(review: Review) -> Iterator[RenderableType]:
    """Values, checks, what binds, timing and power of one design."""
    yield _design(review.design)
    yield Text()
    yield _checks(review.checks)
    if said := ", ".join(f"{check_label(check.name)} ({room_words(check)})" for check in binding(review)):
        yield Padding(Text("Tightest: " + said), (1, 0, 0, 0))
    yield Text()
    yield _timing(review)


def _design(design: Design) -> RenderableType:
    table = Table(box=None, show_header=False, padding=(0, 2, 0, 0))
    table.add_row("Coupler", Text(design.coupler, style="bold"))
    for name, label in POSITIONS.items():
        ohms = getattr(design, name)
        if ohms is not None:
            count = f"{design.pieces} × " if name == "r_led" and design.pieces > 1 else ""
            table.add_row(label, Text(count + ohms_words(ohms), style="bold"))
        elif name == "r_be":
            table.add_row(label, ohms_words(None))
    if design.reverse_diode:
        table.add_row("Reverse diode", "antiparallel to the LED")
    return table


def _checks(checks: tuple[Check, ...]) -> RenderableType:
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold")
    table.add_column("Check", no_wrap=False, ratio=3)
    for heading in ("Value", "Limit", "Room"):
        table.add_column(heading, justify="right", no_wrap=True)
    table.add_column("At", ratio=4)
    for check in checks:
        room = Text(room_words(check), style=_style(check))
        value = amount(check.value, check.unit)
        table.add_row(check_label(check.name), value, limit_words(check), room, check.corner)
    return table


def _style(check: Check) -> str:
    if not check.passed:
        return "red bold"
    return "yellow" if check.margin < TIGHT else "green"


def _timing(review: Review) -> RenderableType:
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold")
    table.add_column("Worst case over all corners")
    table.add_column("", justify="right", no_wrap=True)
    for name, value in asdict(review.timing).items():
        table.add_row(TIMES[name], amount(value, "s"))
    table.add_row("Average power, worst case", amount(review.power.worst, "W"))
    table.add_row("Average power, typical parts", amount(review.power.nominal, "W"))
    return table


def _assumed(assumed: tuple[Assumed, ...]) -> Iterator[RenderableType]:
    if not assumed:
        return
    yield Text()
    yield Text("Assumed, because the coupler table does not say", style="bold")
    table = Table(box=None, show_header=False, padding=(0, 2, 0, 0))
    table.add_column(no_wrap=True)
    table.add_column(no_wrap=True)
    table.add_column()
    for item in assumed:
        table.add_row(item.parameter, item.value, rule_words(item))
    yield table


def _rejected(result: Result) -> Iterator[RenderableType]:
    if not result.rejected:
        return
    yield Text()
    told, unsaid = set_aside(result.rejected)
    also = f" (and {unsaid} that the brief does not choose)" if unsaid else ""
    yield Text(f"Set aside: {len(told)} of the table's couplers{also}", style="bold")
    table = Table(box=None, show_header=False, padding=(0, 2, 0, 0))
    table.add_column(no_wrap=True)
    table.add_column()
    for rejected in told:
        table.add_row(rejected.part, rejected.reason)
    yield table
