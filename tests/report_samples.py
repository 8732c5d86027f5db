"""One invented link with everything a report can show, worked out once; and a reader of the pages made from it."""

from __future__ import annotations

import re
from dataclasses import dataclass, field, replace
from functools import cache
from html.parser import HTMLParser

import numpy as np
import random_links

from optopick.answers import Checked, Front, Point, Ranked, Ranking
from optopick.brief import Brief, Drive, DriveCircuit, GoalName, OutputCircuit, Span
from optopick.coupler import Assumed, Coupler
from optopick.recheck import review
from optopick.report.document import Document, InputFile, Walk, document_of, document_of_checked
from optopick.result import Design, Objective, Proof, Rejected, Result, Review, Status
from optopick.simulate import simulate_all, simulate_pattern, worst_corners
from optopick.uses.budget import budget

VOID = {"meta", "link", "br", "input", "hr", "img"}


@cache
def link() -> tuple[Brief, Coupler, Design]:
    """A source drive with a shunt, a pull-up with a base resistor."""
    coupler = replace(random_links.coupler(np.random.default_rng(5)), part="INV-7", base_pin=True, maker="Invented")
    brief = random_links.brief(np.random.default_rng(5), circuit=OutputCircuit.PULL_UP)
    brief = replace(
        brief,
        title="Invented link",
        limits=replace(brief.limits, timing_guard=1.25),
        drive=Drive(DriveCircuit.SOURCE, Span(4.75, 5.25), Span(0.1, 0.4), 20e-3, 100e-6),
        stock=replace(
            brief.stock,
            r_led=random_links.position("E12", 100, 2200),
            r_load=random_links.position("E6", 1000, 47e3),
            r_be=random_links.position("E6", 68e3, 680e3, absent=True),
            r_shunt=random_links.position("E6", 1000, 10e3, absent=True),
        ),
    )
    return brief, coupler, Design(coupler.part, 470.0, 10e3, 220e3, 4700.0)


@cache
def reviewed(position: str = "", ohms: float | None = None) -> Review:
    """The design reviewed, one of its resistors changed if told."""
    brief, coupler, design = link()
    return review(brief, coupler, replace(design, **{position: ohms}) if position else design)


def result(found: Review | None, status: Status = Status.OPTIMAL) -> Result:
    objectives = (Objective("delay", 31.4e-6, 31.3e-6, "s"), Objective("power", 7.5e-3, 7.4e-3, "W"))
    first, second = objectives if found else (None, None)
    assumed = (Assumed("INV-7", "beta_r", "5", "5 (from memory)"),)
    rejected = (Rejected("INV-8", "working 300 below 600"), Rejected("INV-9", "not among the brief's couplers"))
    proof = Proof(12_345, 17, 3, 0.25, "a solver")
    return Result(status, first, second, found, assumed if found else (), rejected, proof, ("Take care.",))


FILES = (
    InputFile("link.toml", b"title = 'Invented link'\n"),
    InputFile("table.csv", b"part,kind\nINV-7," + b"x" * 200 + b"\n"),
)


@cache
def plain() -> Document:
    """What `pick` alone gives."""
    brief, coupler, _ = link()
    return document_of(brief, result(reviewed()), coupler, FILES, "1.2.3", "2026-01-15")


@cache
def nothing_found() -> Document:
    return document_of(link()[0], result(None, Status.INFEASIBLE), None, FILES, "1.2.3", "2026-01-15")


@cache
def given() -> Document:
    """A design that was checked, one whose checks do not all hold."""
    brief, coupler, _ = link()
    checked = Checked(reviewed("r_load", 1000.0), (), ("r_led is not in the stock (E12)",), ("Take care.",))
    return document_of_checked(brief, checked, coupler, FILES, "1.2.3", "2026-01-15")


@cache
def full() -> Document:
    """Every optional part."""
    brief, coupler, design = link()
    loads = (4700.0, 6800.0, 10e3, 15e3, 22e3)
    walks = (
        Walk("r_load", tuple(reviewed("r_load", ohms) for ohms in loads), 2),
        Walk("r_be", tuple(reviewed("r_be", ohms) for ohms in (150e3, 220e3, 330e3, None)), 1),
        Walk("front", (reviewed("r_load", 4700.0), reviewed("r_load", 22e3)), None),
    )
    corner = worst_corners(brief, coupler, design)["delay_off"]
    return replace(
        plain(),
        ranking=ranking(),
        front=front(),
        walks=walks,
        budget=budget(brief, coupler, design),
        simulation=simulate_all(brief, coupler, design),
        pattern=simulate_pattern(brief, coupler, corner, "0101100"),
    )


def front() -> Front:
    points = tuple(
        Point(20e-6 * 1.5**k, 9e-3 / 1.4**k, found)
        for k, found in enumerate((reviewed("r_load", 4700.0), reviewed(), reviewed("r_load", 22e3)))
    )
    return Front((GoalName.DELAY, GoalName.POWER), points, complete=True, knee=1)


def ranking() -> Ranking:
    _, coupler, _ = link()
    first, second = result(reviewed()).objective, result(reviewed()).second
    assert first
    assert second
    ranked = Ranked(coupler, Status.OPTIMAL, first, second, reviewed())
    return Ranking((ranked,), (Rejected("INV-8", "working 300 below 600"),), complete=True)


@dataclass
class Node:
    """An element of a page."""

    name: str
    attributes: dict[str, str | None]
    parent: Node | None
    children: list[Node | str] = field(default_factory=list)

    @property
    def text(self) -> str:
        return re.sub(r"\s+", " ", "".join(one if isinstance(one, str) else one.text for one in self.children)).strip()

    def all(self, name: str = "", **attributes: str) -> list[Node]:
        """Every element below with this name and these attributes, underscores for hyphens."""
        wanted = {key.rstrip("_").replace("_", "-"): value for key, value in attributes.items()}
        found = []
        for one in self.children:
            if isinstance(one, Node):
                fits = all(one.attributes.get(key) == value for key, value in wanted.items())
                found += [one] if fits and name in ("", one.name) else []
                found += one.all(name, **attributes)
        return found

    def one(self, name: str = "", **attributes: str) -> Node:
        found = self.all(name, **attributes)
        assert len(found) == 1, (name, attributes, len(found))
        return found[0]


class Reader(HTMLParser):
    """Reads a page into nodes; an element that is closed wrongly is an error."""

    def __init__(self, html: str) -> None:
        super().__init__(convert_charrefs=True)
        self.root = Node("", {}, None)
        self.at = self.root
        self.feed(html)
        self.close()
        assert self.at is self.root, f"<{self.at.name}> is not closed"

    def handle_starttag(self, tag, attrs):
        node = Node(tag, dict(attrs), self.at)
        assert len(node.attributes) == len(attrs), f"<{tag}> has an attribute twice"
        self.at.children.append(node)
        if tag not in VOID:
            self.at = node

    def handle_startendtag(self, tag, attrs):
        self.at.children.append(Node(tag, dict(attrs), self.at))

    def handle_endtag(self, tag):
        assert tag == self.at.name, f"</{tag}> closes <{self.at.name}>"
        assert self.at.parent is not None
        self.at = self.at.parent

    def handle_data(self, data):
        self.at.children.append(data)


def read(html: str) -> Node:
    return Reader(html).root
