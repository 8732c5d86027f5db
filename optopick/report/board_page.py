"""The design review of a whole board: one HTML page that needs nothing else, not even a network."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Any

from markupsafe import Markup

from optopick.board import Board, BoardGoalName, reel_of
from optopick.board_answers import BoardResult, LinkChoice, Needed, Packages
from optopick.coupler import Assumed, Coupler
from optopick.report.board_bill import BillLine, bill_lines
from optopick.report.board_words import (
    board_proof_words,
    board_verdict,
    change_words,
    gave_words,
    goal_words,
    limit_name,
)
from optopick.report.document import InputFile
from optopick.report.page import Section, environment, quoted
from optopick.report.placed import SYMBOLS, placed_resistors
from optopick.report.styles import page_styles, template_text
from optopick.report.svg import element
from optopick.report.words import amount, standing, tightest
from optopick.result import Check, Objective, Review

NOUNS = {
    BoardGoalName.REELS: "Distinct resistances",
    BoardGoalName.COUPLERS: "Distinct coupler parts",
    BoardGoalName.PACKAGES: "Coupler packages placed",
    BoardGoalName.POWER: "Power of all links, worst case",
    BoardGoalName.COST: "Price of couplers and resistors",
    BoardGoalName.EDGE: "Longest edge, of its link's limit",
}

SHOWN_CHECKS = 3
"""The tightest checks of a design that stand on the page before all of them."""


@dataclass(frozen=True)
class BoardInput:
    """A file that the board was made from: what it is ("Brief"), the file, and the lines of a table that are used."""

    told: str
    file: InputFile
    row: int | None = None


@dataclass(frozen=True)
class BoardDocument:
    """The design review of a board. couplers: those chosen, as in their tables. date: as it is to be printed."""

    board: Board
    result: BoardResult
    couplers: tuple[Coupler, ...]
    files: tuple[BoardInput, ...]
    version: str
    date: str


@dataclass(frozen=True)
class Total:
    """What the board comes to in one respect, in words and exact, its limit in words, and whether that is reached."""

    noun: str
    reached: Markup
    limit: str
    full: bool


@dataclass(frozen=True)
class Alike:
    """Links that got one design from one brief: their checks are the same."""

    links: tuple[LinkChoice, ...]

    @property
    def review(self) -> Review:
        """The re-check of the design."""
        return self.links[0].review

    @property
    def names(self) -> str:
        """The links' names with their counts."""
        return "; ".join(f"{one.link.name} ({one.link.count})" for one in self.links)

    @property
    def stands(self) -> str:
        """How the design stands, in one sentence."""
        said = standing(self.review)
        return said[:1].upper() + said[1:]

    @property
    def tight(self) -> tuple[Check, ...]:
        """The tightest checks, the tightest first."""
        first = tightest(self.review)
        others = sorted((one for one in self.review.designed if one is not first), key=lambda one: one.margin)
        return (first, *others)[:SHOWN_CHECKS]


@dataclass(frozen=True)
class Reel:
    """One reel: its value, how many pieces are placed of it, and where, one line for each position."""

    ohms: float
    pieces: int
    used: tuple[tuple[str, str], ...]


def board_page(document: BoardDocument) -> str:
    """The page of a board's design review; the same document gives the same text."""
    result = document.result
    context: dict[str, Any] = {
        "document": document,
        "board": document.board,
        "result": result,
        "styles": Markup(f"{page_styles()}\n{template_text('board.css')}"),
        "sections": tuple(_sections(document)),
        "verdict": board_verdict(result),
        "totals": tuple(_totals(document)),
        "aims": _aims(document.board),
        "alike": alike(result),
        "reels": reels(result),
        "packages": tuple(_by_part(result)),
        "bill": tuple(map(_bill_row, bill_lines(result))),
        "assumed": _assumed(document.couplers),
        "proof": board_proof_words(result.status, result.proof, timed=False),
        "files": tuple((one.told, one.file, quoted(one.file, one.row)) for one in document.files),
        "change_words": change_words,
        "gave_words": gave_words,
        "goal_data": _goal_data,
        "needed": tuple(map(_needed, result.conflict)),
    }
    return environment().get_template("board.html.jinja").render(context)


def _sections(document: BoardDocument) -> Iterator[Section]:
    """The sections that there is something for, in order."""
    result = document.result
    designed = bool(result.links)
    wanted: tuple[tuple[str, str, object], ...] = (
        ("goals", "Limits and goals", True),
        ("conflict", "What contradicts", result.conflict or result.hopeless),
        ("links", "Links", True),
        ("reels", "Reels", designed),
        ("packages", "Couplers and packages", designed),
        ("bill", "Bill of materials", designed),
        ("checks", "Checks", designed),
        ("assumptions", "Assumed", designed),
        ("proof", "Proof", True),
        ("inputs", "Inputs", True),
    )
    return (Section(identity, name) for identity, name, there in wanted if there)


def _exact(words: str, value: float) -> Markup:
    """Words for people that carry the exact value for programs."""
    return element("data", words, value=repr(float(value)))


def _goal_data(goal: Objective, value: float) -> Markup:
    return _exact(goal_words(goal.name, value), value)


def _totals(document: BoardDocument) -> Iterator[Total]:
    """What the board comes to, against its limits; what has neither a value nor a limit is left out."""
    result, limits = document.result, document.board.limits
    reached: dict[BoardGoalName, float | None] = dict.fromkeys(NOUNS)
    if result.links:
        reached = {
            BoardGoalName.REELS: len(result.reels),
            BoardGoalName.COUPLERS: len(result.couplers),
            BoardGoalName.PACKAGES: result.placed,
            BoardGoalName.POWER: result.power,
            BoardGoalName.COST: result.price,
            BoardGoalName.EDGE: result.edge,
        }
    for goal, value in reached.items():
        limit = limits.of(goal)
        if value is None and limit is None:
            continue
        said = Markup("–") if value is None else _exact(goal_words(goal.value, value), value)
        stated = "none" if limit is None else f"≤ {goal_words(goal.value, limit)}"
        yield Total(NOUNS[goal], said, stated, full=value is not None and value == limit)


def _aims(board: Board) -> str:
    """What was asked for, in a sentence."""
    goal = board.goal
    given = f", giving up to {amount(goal.give, '%')} of it" if goal.give else ""
    return (
        f"First the least {goal.minimize.value}; then{given}, the least {goal.then.value}. Of boards that are equal in "
        "both, the one that takes least power."
    )


def _needed(one: Needed) -> tuple[str, str, str]:
    """A limit that contradicts others: its key, what it is, and what it would have to be."""
    if one.least is None:
        least = "no value helps" if one.proved else "not known"
    else:
        least = f"{'at least' if one.proved else 'at most, as found so far,'} {goal_words(one.name, one.least)}"
    return limit_name(one), goal_words(one.name, one.limit), least


def alike(result: BoardResult) -> tuple[Alike, ...]:
    """The links by brief and design, in the board's order."""
    found: dict[tuple[object, object], list[LinkChoice]] = {}
    for one in result.links:
        found.setdefault((one.link.brief, one.review.design), []).append(one)
    return tuple(Alike(tuple(links)) for links in found.values())


def reels(result: BoardResult) -> tuple[Reel, ...]:
    """The reels by value, each with the positions that take from it and the links whose they are."""
    used: dict[float, dict[str, list[str]]] = {ohms: {} for ohms in result.reels}
    pieces = dict.fromkeys(result.reels, 0)
    for one in result.links:
        for placed in placed_resistors(one.link.brief, one.review.design):
            ohms, each = reel_of(placed.ohms), f" × {placed.pieces}" if placed.pieces > 1 else ""
            pieces[ohms] += placed.pieces * one.link.count
            used[ohms].setdefault(SYMBOLS[placed.position], []).append(f"{one.link.name} ({one.link.count}{each})")
    return tuple(
        Reel(ohms, pieces[ohms], tuple((symbol, "; ".join(names)) for symbol, names in used[ohms].items()))
        for ohms in result.reels
    )


def _by_part(result: BoardResult) -> Iterator[Packages]:
    """The packages placed, those of one part that nothing shares together; shared ones as they are."""
    for part in result.couplers:
        of_part = [one for one in result.packages if one.part == part]
        own = [one for one in of_part if one.grounds is None]
        if own:
            links = tuple(link for one in own for link in one.links)
            yield replace(own[0], count=sum(one.count for one in own), links=links)
        yield from (one for one in of_part if one.grounds is not None)


def _bill_row(line: BillLine) -> tuple[str, ...]:
    """The cells of a line of the bill of materials, as in bom.csv."""
    return tuple(map(str, line.cells))


def _assumed(couplers: tuple[Coupler, ...]) -> tuple[Assumed, ...]:
    return tuple(one for coupler in couplers for one in coupler.assumed)
