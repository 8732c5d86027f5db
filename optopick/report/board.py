"""A board for people at a terminal and as JSON."""

from __future__ import annotations

from dataclasses import asdict

from rich.console import Group, RenderableType
from rich.table import Table
from rich.text import Text

from optopick.board import BoardLimits
from optopick.board_answers import BoardResult, LinkChoice, Packages
from optopick.report.as_json import objective_object, review_object
from optopick.report.board_words import board_proof_words, board_verdict, change_words, gave_words, limit_name
from optopick.report.text_uses import values_text
from optopick.report.words import amount, ohms_words


def board_text(result: BoardResult, title: str, limits: BoardLimits) -> RenderableType:
    """The whole answer to `board`."""
    parts: list[RenderableType] = [Text(title, style="bold"), Text(board_verdict(result))]
    if not result.links:
        return Group(*parts, Text(), Text(f"Proof: {board_proof_words(result.status, result.proof)}"))
    parts += [Text(), _links_table(result), *_changes(result), Text(), _totals(result, limits), Text()]
    parts.append(Text(f"Proof: {board_proof_words(result.status, result.proof)}"))
    parts += [Text(), Text(f"Left out, no price: {'; '.join(result.unpriced)}.")] if result.unpriced else []
    return Group(*parts, Text(), *(Text(f"Caution: {caution}") for caution in result.cautions))


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
        powers = (amount(one.power, "W"), amount(one.alone, "W"), gave_words(one))
        table.add_row(Text(one.link.name), f"{one.link.count} ×", design.coupler, values_text(design), *powers)
    return table


def _changes(result: BoardResult) -> list[Text]:
    """What links change in their briefs, one line for each that does."""
    changed = [one.link for one in result.links if one.link.changes]
    lines = [f"{link.name}: {', '.join(change_words(*one) for one in link.changes)}" for link in changed]
    return [Text(), Text("Changed in their briefs:"), *map(Text, lines)] if lines else []


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
        "conflict": [asdict(one) | {"name": limit_name(one)} for one in result.conflict],
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
