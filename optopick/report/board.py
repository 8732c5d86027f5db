"""A board for people at a terminal, as JSON, and as a bill of materials."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from dataclasses import asdict, dataclass, field

from rich.console import Group, RenderableType
from rich.table import Table
from rich.text import Text

from optopick.board import BoardGoalName, BoardLimits, reel_of
from optopick.board_answers import BoardProof, BoardResult, LinkChoice, Needed, Packages
from optopick.report.as_json import objective_object, review_object
from optopick.report.placed import Placed, placed_resistors
from optopick.report.text_uses import values_text
from optopick.report.words import amount, margin_words, ohms_words
from optopick.result import Objective, Status

BILL_COLUMNS = ("quantity", "value", "tolerance", "rating", "used")


def board_text(result: BoardResult, title: str, limits: BoardLimits) -> RenderableType:
    """The whole answer to `board`."""
    parts: list[RenderableType] = [Text(title, style="bold"), Text(_verdict(result))]
    if not result.links:
        return Group(*parts, Text(), Text(f"Proof: {_proof_words(result.status, result.proof)}"))
    parts += [Text(), _links_table(result), *_changes(result), Text(), _totals(result, limits), Text()]
    parts.append(Text(f"Proof: {_proof_words(result.status, result.proof)}"))
    parts += [Text(), Text(f"Left out, no price: {'; '.join(result.unpriced)}.")] if result.unpriced else []
    return Group(*parts, Text(), *(Text(f"Caution: {caution}") for caution in result.cautions))


def _verdict(result: BoardResult) -> str:
    if result.hopeless:
        names = ", ".join(result.hopeless)
        have = "has" if len(result.hopeless) == 1 else "have"
        return f"No board exists: {names} {have} no design even alone; optopick why gives the reasons for a brief."
    if result.status is Status.INFEASIBLE:
        return f"No board holds every limit, though every link has designs alone.{_conflict_words(result.conflict)}"
    if result.status is Status.UNKNOWN:
        return "Out of time: no board found, and none ruled out."
    if result.status is Status.OPTIMAL:
        return _capital("; then ".join(f"least {goal.name}: {_reached(goal)}" for goal in result.goals)) + " (proved)"
    said = _capital("; then ".join(f"{goal.name}: {_goal_amount(goal, goal.value)}" for goal in result.goals))
    bounds = " and ".join(f"no board has {goal.name} below {_goal_amount(goal, goal.bound)}" for goal in result.goals)
    return f"{said} (best found in the time given; {bounds})"


def _conflict_words(conflict: Sequence[Needed]) -> str:
    """Which limits contradict each other, and what each of them would have to be."""
    if not conflict:
        return ""
    stated = [f"{_limit_name(one)} {goal_words(one.name, one.limit)}" for one in conflict]
    last = stated[-1] if len(stated) == 1 else f"{', '.join(stated[:-1])} and {stated[-1]}"
    said = f" {_capital(last)} cannot be kept{' together' if len(stated) > 1 else ''}."
    return said + "".join(f" {_needed_words(one)}" for one in conflict)


def _needed_words(one: Needed) -> str:
    if one.least is None:
        none = f"No {_limit_name(one)} helps" if one.proved else f"What {_limit_name(one)} would do is not known"
        return f"{none} with all other limits as they are."
    least = "at least" if one.proved else "at most as found so far"
    return f"{_capital(_limit_name(one))} would have to be {least} {goal_words(one.name, one.least)}."


def _limit_name(one: Needed) -> str:
    return "price" if one.name == BoardGoalName.COST else one.name


def _capital(text: str) -> str:
    return text[:1].upper() + text[1:]


def goal_words(name: str, value: float) -> str:
    """The value of a board's goal in words."""
    if name == BoardGoalName.POWER:
        return amount(value, "W")
    if name == BoardGoalName.COST:
        return f"{value:.4g}"
    return f"{amount(value, '%')} of its limit" if name == BoardGoalName.EDGE else f"{value:.0f}"


def _goal_amount(goal: Objective, value: float) -> str:
    return goal_words(goal.name, value)


def _reached(goal: Objective) -> str:
    """The value reached, and the least there is where some of it was given for the second goal."""
    said = _goal_amount(goal, goal.value)
    given = goal.bound < goal.value * (1 - 1e-5)
    return f"{said}, {_goal_amount(goal, goal.bound)} without what is given for the second goal" if given else said


def _links_table(result: BoardResult) -> RenderableType:
    table = Table(box=None, padding=(0, 1, 0, 0), header_style="bold")
    table.add_column("Link")
    table.add_column("", justify="right", no_wrap=True)
    table.add_column("Coupler", no_wrap=True)
    table.add_column("R_LED / R_load / R_BE / shunt")
    for heading in ("Power", "Alone", "Gave up"):
        table.add_column(heading, justify="right", no_wrap=True)
    for one in result.links:
        design = one.review.design
        powers = (amount(one.power, "W"), amount(one.alone, "W"), _gave(one))
        table.add_row(Text(one.link.name), f"{one.link.count} ×", design.coupler, values_text(design), *powers)
    return table


def _changes(result: BoardResult) -> list[Text]:
    """What links change in their briefs, one line for each that does."""
    changed = [one.link for one in result.links if one.link.changes]
    lines = [f"{link.name}: {', '.join(_change(*one) for one in link.changes)}" for link in changed]
    return [Text(), Text("Changed in their briefs:"), *map(Text, lines)] if lines else []


def _change(key: str, value: str | None) -> str:
    return f"no {key}" if value is None else f"{key} = {value}"


def _gave(one: LinkChoice) -> str:
    """How much more power than alone; nothing where it is the same to within the proof."""
    return "–" if one.gave < 1e-5 else margin_words(one.gave)


def _totals(result: BoardResult, limits: BoardLimits) -> RenderableType:
    """What the links share, against the limits."""
    table = Table.grid(padding=(0, 2, 0, 0))
    reels = ", ".join(ohms_words(ohms) for ohms in result.reels)
    table.add_row("Reels", _of(len(result.reels), limits.reels), reels)
    table.add_row("Couplers", _of(len(result.couplers), limits.couplers), ", ".join(result.couplers))
    table.add_row("Packages", _of(result.placed, limits.packages), _shared(result))
    limit = "" if limits.power is None else f" of {amount(limits.power, 'W')}"
    alone = f"{amount(result.alone, 'W')} if every link had its own best"
    table.add_row("Power", f"{amount(result.power, 'W')}{limit}", alone)
    if result.price is not None:
        limit = "" if limits.price is None else f" of {limits.price:.4g}"
        table.add_row("Price", f"{result.price:.4g}{limit}", "couplers and resistors")
    if result.edge is not None:
        table.add_row("Edge", amount(result.edge, "%"), "of its limit, where it is longest")
    return table


def _shared(result: BoardResult) -> str:
    """The packages that several links or several of one link share."""
    shared = [one for one in result.packages if one.grounds is not None]
    return "; ".join(
        f"{one.count} × {one.part} from {one.grounds[0]} to {one.grounds[1]}" for one in shared if one.grounds
    )


def _of(count: int, limit: int | None) -> str:
    return f"{count}" if limit is None else f"{count} of {limit}"


def _proof_words(status: Status, proof: BoardProof) -> str:
    claim = {
        Status.OPTIMAL: "no other board does better; every link re-checked alone at every corner",
        Status.FEASIBLE: "the best found is given, not proved best; every link re-checked alone at every corner",
        Status.INFEASIBLE: "no choice of stock values and couplers holds every limit",
        Status.UNKNOWN: "not decided",
    }[status]
    size = f"{proof.columns:,} columns and {proof.rows:,} rows at the end" if proof.columns else "no model needed"
    how = f"{proof.solves} solver calls, {proof.cuts} designs cut, {proof.seconds:.2g} s; {proof.solver}"
    return f"{claim} ({size}; {how})."


def board_object(result: BoardResult, title: str, limits: BoardLimits) -> dict[str, object]:
    """The object that `board --json` prints."""
    return {
        "title": title,
        "status": result.status.value,
        "goals": [objective_object(goal) for goal in result.goals],
        "limits": asdict(limits),
        "links": [_link_object(one) for one in result.links],
        "reels": list(result.reels),
        "couplers": list(result.couplers),
        "packages": [_packages_object(one) for one in result.packages],
        "packages_placed": result.placed,
        "price": result.price,
        "edge": result.edge,
        "unpriced": list(result.unpriced),
        "power": result.power if result.links else None,
        "power_alone": result.alone if result.links else None,
        "hopeless": list(result.hopeless),
        "conflict": [asdict(one) | {"name": _limit_name(one)} for one in result.conflict],
        "proof": asdict(result.proof),
        "cautions": list(result.cautions),
    }


def _packages_object(one: Packages) -> dict[str, object]:
    return asdict(one) | {"links": dict(one.links), "grounds": list(one.grounds) if one.grounds else None}


def _link_object(one: LinkChoice) -> dict[str, object]:
    brief = one.link.brief
    named = {"name": one.link.name, "count": one.link.count, "brief": str(brief.path) if brief.path else None}
    named["grounds"] = list(one.link.grounds) if one.link.grounds else None
    named["changes"] = dict(one.link.changes)
    # the power of one of it stands in the review, under the same name as in the answer to pick
    return named | review_object(one.review) | {"power_alone": one.alone, "gave": one.gave}


@dataclass
class _Line:
    """One kind of part: how many, where it is used, and for resistors what the stocks say of it."""

    value: str
    quantity: int = 0
    used: list[str] = field(default_factory=list)
    placed: list[Placed] = field(default_factory=list)

    def add(self, quantity: int, where: str) -> None:
        self.quantity += quantity
        self.used.append(where)

    @property
    def cells(self) -> tuple[object, ...]:
        """The line as BILL_COLUMNS say: the tightest tolerance and the highest ratings, which serve everywhere."""
        tolerances = [one.tolerance for one in self.placed if one.tolerance is not None]
        powers = [one.power for one in self.placed if one.power is not None]
        voltages = [one.voltage for one in self.placed if one.voltage is not None]
        tolerance = amount(min(tolerances), "%") if tolerances else ""
        rating = f"{amount(max(powers), 'W')}, {amount(max(voltages), 'V')}" if powers and voltages else ""
        return self.quantity, self.value, tolerance, rating, "; ".join(self.used)


def board_bill(result: BoardResult) -> str:
    """Couplers, then resistors by value, then diodes, as CSV: one line for each reel."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(BILL_COLUMNS)
    for line in (*_coupler_lines(result), *_resistor_lines(result), *_diode_lines(result)):
        writer.writerow(line.cells)
    return out.getvalue()


def _coupler_lines(result: BoardResult) -> list[_Line]:
    """Packages, with the links whose channels are in them."""
    lines = {part: _Line(part) for part in result.couplers}
    for one in result.packages:
        lines[one.part].quantity += one.count
        lines[one.part].used += [name for name, _ in one.links]
    return list(lines.values())


def _resistor_lines(result: BoardResult) -> list[_Line]:
    lines: dict[float, _Line] = {}
    for one in result.links:
        for placed in placed_resistors(one.link.brief, one.review.design):
            line = lines.setdefault(reel_of(placed.ohms), _Line(ohms_words(placed.ohms)))
            line.placed.append(placed)
            line.add(placed.pieces * one.link.count, f"{one.link.name} {placed.position}")
    return [lines[ohms] for ohms in sorted(lines)]


def _diode_lines(result: BoardResult) -> list[_Line]:
    line = _Line("diode")
    for one in result.links:
        if one.review.design.reverse_diode:
            line.add(one.link.count, f"{one.link.name} reverse_diode")
    return [line] if line.quantity else []
