"""Designs worked out beforehand that a reader moves along: the data a page embeds, its sweep plots and plain tables.

The script of the page shows these texts and numbers and works nothing out.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import asdict, dataclass
from typing import Any

from markupsafe import Markup

from optopick.report.document import Level, Trace, Walk
from optopick.report.labels import POSITIONS, TIMES, check_label
from optopick.report.pictures import bar_span, cursor_share, state_of, sweep_plot
from optopick.report.placed import SYMBOLS, pieces_of, resistors_words, value_words
from optopick.report.words import amount, limit_words, room_words, standing
from optopick.result import Check, Review

CURVES = 5
"""Checks that a sweep plot shows: the tightest of those that move."""

MOVES = 0.005
"""Change of room [1] along a walk below which a check counts as not moving."""

ROOM_SHOWN = (-0.5, 1.5)
"""Room [1] that a sweep plot shows; curves leave it at the top or bottom."""


@dataclass(frozen=True)
class WalkView:
    """A walk as the page shows it: name, plot (none along a front), data for the script, rows of a plain table."""

    name: str
    identity: str
    plot: Markup | None
    table_head: tuple[str, ...]
    table_rows: tuple[tuple[str, ...], ...]
    chosen: int | None


def walk_view(walk: Walk) -> WalkView:
    """The parts of one walk that are rendered without a script."""
    head = (_point_name(walk), "Verdict", *TIMES.values(), "Average power, worst case")
    return WalkView(
        name=walk_name(walk),
        identity=walk.position.replace("_", "-"),
        plot=_plot(walk),
        table_head=head,
        table_rows=tuple(_row(walk, review) for review in walk.points),
        chosen=walk.chosen,
    )


def walk_name(walk: Walk) -> str:
    """A walk's name in words."""
    return POSITIONS.get(walk.position, "Trade-off front")


def _point_name(walk: Walk) -> str:
    return POSITIONS.get(walk.position, "Design")


def point_words(walk: Walk, review: Review) -> str:
    """What tells one point of a walk from the others."""
    if walk.position in POSITIONS:
        return value_words(getattr(review.design, walk.position), pieces_of(review.design, walk.position))
    return design_words(review)


def design_words(review: Review) -> str:
    """A design in one line."""
    return f"{review.design.coupler}, {resistors_words(review.design)}"


def _row(walk: Walk, review: Review) -> tuple[str, ...]:
    times = (amount(value, "s") for value in asdict(review.timing).values())
    return point_words(walk, review), standing(review), *times, amount(review.power.worst, "W")


# ---- the sweep plot ---------------------------------------------------------------------------------------------


def _plot(walk: Walk) -> Markup | None:
    """The room of the tightest checks over the resistor's values; an empty position has no place on it."""
    if walk.position not in POSITIONS:
        return None
    points = _with_value(walk)
    values = [value for value, _ in points]
    if len(values) < 2:
        return None
    symbol, name = SYMBOLS[walk.position], f"Room of the tightest checks over {SYMBOLS[walk.position]}"
    at = None if walk.chosen is None else getattr(walk.points[walk.chosen].design, walk.position)
    series = [Trace(check_label(check), room) for check, room in _moving([review for _, review in points])]
    return sweep_plot(
        name,
        Trace(symbol, tuple(values)),
        "ohm",
        series,
        "room to the limit",
        "%",
        levels=[Level("limit", 0.0)],
        y_span=ROOM_SHOWN,
        chosen=None if at is None else values.index(at),
    )


def _with_value(walk: Walk) -> list[tuple[float, Review]]:
    pairs = ((getattr(review.design, walk.position), review) for review in walk.points)
    return [(ohms, review) for ohms, review in pairs if ohms is not None]


def _moving(reviews: Sequence[Review]) -> list[tuple[str, tuple[float, ...]]]:
    """The checks that move along the walk, tightest first, with their room at each point."""
    names = list(dict.fromkeys(check.name for review in reviews for check in review.checks))
    rooms = {name: tuple(_room(review, name) for review in reviews) for name in names}
    moving = {name: room for name, room in rooms.items() if max(room) - min(room) > MOVES}
    return sorted(moving.items(), key=lambda item: min(item[1]))[:CURVES]


def _room(review: Review, name: str) -> float:
    found = next((check.margin for check in review.checks if check.name == name), math.nan)
    return -math.inf if math.isnan(found) else found


# ---- the data for the script ------------------------------------------------------------------------------------


class _Index:
    """Texts that occur often, each kept once and meant by its number."""

    def __init__(self) -> None:
        self.texts: dict[str, int] = {}

    def of(self, text: str) -> int:
        """The number of a text."""
        return self.texts.setdefault(text, len(self.texts))


def explorer_data(walks: Sequence[Walk]) -> dict[str, Any]:
    """What the page embeds: for each walk its points as texts, with checks as numbers of texts and bars in percent.

    A check is [name, value, limit, room, corner, state, begin, length]: the first five number `texts`.
    """
    index = _Index()
    shown = [
        {
            "id": walk.position.replace("_", "-"),
            "chosen": walk.chosen,
            "points": [_point(walk, review, index) for review in walk.points],
            "cursors": list(_cursors(walk)),
        }
        for walk in walks
    ]
    return {"times": [*TIMES.values(), "Average power, worst case"], "walks": shown, "texts": list(index.texts)}


def _point(walk: Walk, review: Review, index: _Index) -> dict[str, Any]:
    row = _row(walk, review)
    return {
        "name": row[0],
        "design": design_words(review),
        "standing": row[1],
        "holds": review.passed,
        "times": row[2:],
        "checks": [_check(check, index) for check in review.checks],
    }


def _check(check: Check, index: _Index) -> list[object]:
    begin, length = bar_span(check.margin)
    words = (
        check_label(check.name),
        amount(check.value, check.unit),
        limit_words(check),
        room_words(check),
        check.corner,
    )
    return [*(index.of(word) for word in words), state_of(check), round(100 * begin, 1), round(100 * length, 1)]


def _cursors(walk: Walk) -> Iterator[float | None]:
    """Where each point lies on the walk's plot [%]; None where it has no place there."""
    values = [value for value, _ in _with_value(walk)] if walk.position in POSITIONS else []
    for review in walk.points:
        ohms = getattr(review.design, walk.position, None)
        yield None if ohms is None or len(values) < 2 else round(100 * cursor_share(values, ohms), 2)
