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
from optopick.result import NOT_CHOSEN, Check, Design, Objective, Proof, Result, Review, Status
from optopick.units import format_quantity, format_resistor

TIGHT = 0.1
"""A check with less room than this is said to bind."""


def result_text(result: Result, title: str) -> RenderableType:
    """The whole answer to `pick`."""
    return Group(*_result_parts(result, title))


def _result_parts(result: Result, title: str) -> Iterator[RenderableType]:
    yield Text(title, style="bold")
    yield Text(_verdict(result), style="green" if result.review else "red")
    if result.review:
        yield Text()
        yield from review_parts(result.review)
        yield from _assumed(result.assumed)
    yield from _rejected(result)
    yield Text()
    yield Text(_proof(result))
    for caution in result.cautions:
        yield Text()
        yield Text("Caution: " + caution, style="yellow")


def _verdict(result: Result) -> str:
    if result.status is Status.INFEASIBLE:
        return "No combination in stock holds every limit at every corner."
    if result.status is Status.UNKNOWN:
        return "Out of time: no design found, and none ruled out."
    first, second = result.objective, result.second
    assert first is not None and second is not None
    said = f"Least {first.name}: {amount(first.value, first.unit)}; then least {second.name}: "
    said += amount(second.value, second.unit)
    if result.status is Status.FEASIBLE:
        return f"{said} (best found in the time given; {_bounds(first, second)})"
    return f"{said} (proved)"


def _bounds(*objectives: Objective) -> str:
    parts = [f"no design has {o.name} below {amount(o.bound, o.unit)}" for o in objectives]
    return " and ".join(parts)


def amount(value: float, unit: str) -> str:
    """A quantity as results show it, four digits."""
    return format_quantity(value, unit, 4)


def next_text(result: Result, place: int) -> RenderableType:
    """A next best design, in short."""
    if result.review is None:
        return Group(Text(), Text(f"Next best, place {place}: none", style="bold"), Text(_verdict(result)))
    title = Text(f"Next best, place {place}", style="bold")
    return Group(Text(), title, Text(_verdict(result)), _design(result.review.design))


def checked_text(checked: Checked, title: str, near: Nearest | None = None) -> RenderableType:
    """The whole answer to `check`."""
    review = checked.review
    failing = len(review.failing)
    verdict = "Every check holds." if not failing else f"{failing} of {len(review.checks)} checks fail."
    parts = [Text(title, style="bold"), Text(verdict, style="red" if failing else "green"), Text()]
    notes = [Text("Note: " + note) for note in checked.notes]
    warned = [Padding(Text("Caution: " + caution, style="yellow"), (1, 0, 0, 0)) for caution in checked.cautions]
    return Group(*parts, *review_parts(review), *_near(review, near), *notes, *_assumed(checked.assumed), *warned)


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
    binding = [check for check in review.checks if 0 <= check.margin < TIGHT]
    if binding:
        said = ", ".join(f"{check_label(c.name)} ({_margin(c)})" for c in sorted(binding, key=lambda c: c.margin))
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
            table.add_row(label, Text(count + format_resistor(ohms), style="bold"))
        elif name == "r_be":
            table.add_row(label, "none")
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
        limit = Text(f"{'≤' if check.sense == '<=' else '≥'} {amount(check.limit, check.unit)}")
        room = Text(_margin(check), style=_style(check))
        table.add_row(check_label(check.name), amount(check.value, check.unit), limit, room, check.corner)
    return table


def _margin(check: Check) -> str:
    if check.margin != check.margin:
        return "fails"
    shown = f"{100 * check.margin:.0f} %" if abs(check.margin) >= 0.1 else f"{100 * check.margin:.1f} %"
    return shown if check.passed else f"fails {shown}"


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
        table.add_row(item.parameter, item.value, item.rule)
    yield table


def _rejected(result: Result) -> Iterator[RenderableType]:
    if not result.rejected:
        return
    yield Text()
    told = [rejected for rejected in result.rejected if rejected.reason != NOT_CHOSEN]
    unsaid = len(result.rejected) - len(told)
    also = f" (and {unsaid} that the brief does not choose)" if unsaid else ""
    yield Text(f"Set aside: {len(told)} of the table's couplers{also}", style="bold")
    table = Table(box=None, show_header=False, padding=(0, 2, 0, 0))
    table.add_column(no_wrap=True)
    table.add_column()
    for rejected in told:
        table.add_row(rejected.part, rejected.reason)
    yield table


def _proof(result: Result) -> str:
    proof: Proof = result.proof
    how = f"{proof.solves} solver calls, {proof.decided_by_ranges} settled by ranges alone, {proof.seconds:.2g} s"
    claim = {
        Status.OPTIMAL: "no other does better; re-checked from the physics at every corner",
        Status.FEASIBLE: "re-checked from the physics at every corner, not proved best",
        Status.INFEASIBLE: "none holds every limit",
        Status.UNKNOWN: "not decided",
    }[result.status]
    return f"Proof: of {proof.combinations:,} combinations in stock {claim} ({how}; {proof.solver})."
