"""The design-review document: one HTML page that needs nothing else, not even a network."""

from __future__ import annotations

import json
import math
from base64 import b64encode
from collections.abc import Iterator
from dataclasses import asdict, dataclass, replace
from functools import cache
from hashlib import sha256
from typing import Any

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from optopick.answers import Front, Share
from optopick.coupler import Coupler
from optopick.report.brief_words import requirement_parts
from optopick.report.document import Document, InputFile, Walk
from optopick.report.explorer import explorer_data, walk_view
from optopick.report.formulas import formulas_for
from optopick.report.labels import TIMES, check_label
from optopick.report.pictures import front_plot, goal_unit, margin_bar, room_bar, state_of, waveform_plot
from optopick.report.placed import placed_resistors, resistors_words
from optopick.report.schematic import schematic_svg
from optopick.report.styles import page_styles, template_text
from optopick.report.svg import element
from optopick.report.timing_picture import swing_of, timing_pictures
from optopick.report.waveforms import pattern_wave, pulse_views
from optopick.report.words import (
    amount,
    limit_words,
    ohms_words,
    proof_words,
    room_words,
    rule_words,
    set_aside,
    standing,
    verdict,
)
from optopick.result import Check, Review, goal_of

LEAST_EATEN = 5e-4
"""Room [1] below which a cause goes unsaid."""

QUOTED_MOST = 1_000_000
"""Characters of an input file up to which it is quoted in full; of a longer table the heading and the line used."""


@dataclass(frozen=True)
class Section:
    """A section of the page: its anchor, also the name of its template, and its heading."""

    identity: str
    name: str


def page(document: Document) -> str:
    """The page of a design review; the same document gives the same text."""
    context = _always(document)
    if document.review and document.coupler:
        context |= _of_design(document, document.review, document.coupler)
    context |= _optional(document)
    return environment().get_template("page.html.jinja").render(context)


@cache
def environment() -> Environment:
    """The templates, and the helpers that they may call."""
    made = Environment(
        loader=PackageLoader("optopick.report", "templates"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    made.globals |= {
        "amount": amount,
        "number": _number,
        "state": _state,
        "check_label": check_label,
        "limit_words": limit_words,
        "room_bar": room_bar,
        "eaten_words": _eaten_words,
        "room_share": _share_words,
        "waveform_plot": waveform_plot,
        "margin_bar": margin_bar,
        "ohms_words": ohms_words,
        "resistors_words": resistors_words,
        "rule_words": rule_words,
        "time_label": TIMES.__getitem__,
    }
    return made


def _number(value: float, unit: str) -> Markup:
    """A value for people that carries its exact figure in SI for programs."""
    return element("data", amount(value, unit), value=repr(float(value)))


def _state(check: Check) -> Markup:
    return element("span", room_words(check), class_=f"state {state_of(check)}")


def _share_words(share: float) -> str:
    """A room [1] as a percentage; a dash where it is no number."""
    if math.isnan(share):
        return "–"
    return "0 %" if abs(share) < LEAST_EATEN else amount(round(share, 3), "%")


def _eaten_words(share: Share) -> str:
    """What eats a check's room, the hungriest first."""
    costs = sorted(share.cost.items(), key=lambda item: -item[1] if math.isfinite(item[1]) else 0.0)
    said = (f"{cause} {_share_words(cost)}" for cause, cost in costs if cost > LEAST_EATEN)
    return ", ".join(words.replace(" ", "\u00a0") for words in said)


def _always(document: Document) -> dict[str, Any]:
    """What every page shows."""
    told, not_chosen = set_aside(document.ranking.rejected if document.ranking else document.rejected)
    return {
        "document": document,
        "styles": Markup(page_styles()),
        "sections": tuple(_sections(document)),
        "verdict": verdict(document.status, document.objectives, document.review),
        "requirement": requirement_parts(document.brief),
        "rejected": told,
        "not_chosen": not_chosen,
        "files": _files(document),
        "script": None,
    }


def _sections(document: Document) -> Iterator[Section]:
    """The sections that there is something for, in order."""
    designed = document.review is not None
    wanted: tuple[tuple[str, str, object], ...] = (
        ("requirement", "Requirement", True),
        ("design", "Design", designed),
        ("checks", "Checks", designed),
        ("timing", "Timing and power", designed),
        ("why", "What contradicts", document.why),
        ("budget", "Margin budget", document.budget),
        ("waveforms", "Simulated", document.simulation or document.pattern),
        ("explorer", "Neighbouring values", document.walks),
        ("tradeoff", "Trade-off", document.front and document.front.points),
        ("couplers", "Couplers", document.ranking or document.rejected),
        ("assumptions", "Assumed", designed),
        ("formulas", "Formulas", designed),
        ("proof", "Proof", document.proof),
        ("inputs", "Inputs", True),
    )
    return (Section(identity, name) for identity, name, there in wanted if there)


def _of_design(document: Document, review: Review, coupler: Coupler) -> dict[str, Any]:
    """What a page shows of a design."""
    said = standing(review)
    return {
        "placed": placed_resistors(document.brief, review.design),
        "schematic": Markup(schematic_svg(document.brief, coupler, review.design)),
        "standing": said[:1].upper() + said[1:],
        "timing_pictures": timing_pictures(review.timing, swing_of(document.brief, coupler)),
        "times": tuple(asdict(review.timing).items()),
        "formulas": formulas_for(coupler, review.design),
    }


def _optional(document: Document) -> dict[str, Any]:
    """What a page shows where it is given."""
    parts: dict[str, Any] = {}
    if document.proof and document.status:
        parts["proof"] = proof_words(document.status, document.proof, timed=False)
        parts["goal_words"] = _goal_words(document)
    if document.simulation or document.pattern:
        parts |= _waveforms(document)
    if document.front and document.front.points:
        parts |= _front(document, document.front)
    if document.walks:
        parts |= _explorer(document)
    return parts


def _waveforms(document: Document) -> dict[str, Any]:
    pulses = pulse_views(document.brief, document.simulation) if document.simulation else ()
    pattern = pattern_wave(document.brief, document.pattern) if document.pattern else None
    return {"pulses": pulses, "pattern_plot": waveform_plot(pattern) if pattern else None}


def _front(document: Document, front: Front) -> dict[str, Any]:
    designs = [point.review.design for point in front.points]
    review = document.review
    chosen = designs.index(review.design) if review and review.design in designs else None
    here = (goal_of(review, front.goals[0]), goal_of(review, front.goals[1])) if review else None
    units = [goal_unit(goal) for goal in front.goals]
    return {"front_plot": front_plot(front, here), "front_chosen": chosen, "front_units": units}


def _goal_words(document: Document) -> str:
    goal = document.brief.goal
    return (
        f"First the least {goal.minimize.value}; then, giving up to {amount(goal.give, '%')} of it, the least "
        f"{goal.then.value}. A bound lower than the design by less than that is what the second goal was bought with."
    )


def _explorer(document: Document) -> dict[str, Any]:
    script = template_text("explorer.js").strip()
    walks = tuple(_found(walk, document.review) for walk in document.walks)
    data = json.dumps(explorer_data(walks), ensure_ascii=False, separators=(",", ":"), allow_nan=False)
    # inside a script element only these could end it or begin a comment
    data = data.replace("<", "\\u003c").replace(">", "\\u003e").replace("&", "\\u0026")
    return {
        "walks": tuple(walk_view(walk) for walk in walks),
        "explorer_json": Markup(data),
        "script": Markup(script),
        "script_checksum": f"sha256-{b64encode(sha256(script.encode()).digest()).decode()}",
    }


def _found(walk: Walk, review: Review | None) -> Walk:
    """A walk that says where the document's design is, if it is there and the walk does not say."""
    designs = [point.design for point in walk.points]
    if walk.chosen is not None or review is None or review.design not in designs:
        return walk
    return replace(walk, chosen=designs.index(review.design))


def _files(document: Document) -> tuple[tuple[InputFile, str, bool, str], ...]:
    """Each input file: what is quoted of it, whether on paper too, and what it is."""
    row = document.coupler.row if document.coupler else None
    return (
        (document.brief_file, quoted(document.brief_file, None), True, "Brief"),
        (document.table_file, quoted(document.table_file, row), False, "Coupler table"),
    )


def quoted(file: InputFile, row: int | None) -> str:
    """A file's text; of one too long to carry along the first lines, and the line that was used."""
    text = file.text
    if len(text) <= QUOTED_MOST:
        return text
    lines = text.splitlines()
    heading = next((k for k, line in enumerate(lines) if line.strip() and not line.startswith("#")), 0)
    used = [lines[row - 1]] if row else []
    left_out = f"[{len(lines)} lines, too long to quote; the heading and the line used:]"
    return "\n".join((left_out, lines[heading], *used))[:QUOTED_MOST]
