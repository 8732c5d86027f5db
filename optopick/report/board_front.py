"""The front of a board for people at a terminal and as JSON."""

from __future__ import annotations

from dataclasses import asdict

from rich.console import Group, RenderableType
from rich.table import Table
from rich.text import Text

from optopick.board import BoardGoalName
from optopick.board_answers import BoardFront, FrontPoint
from optopick.report.as_json import objective_object
from optopick.report.board_words import UNKNOWN, goal_words, hopeless_words
from optopick.report.words import margin_words, ohms_words
from optopick.result import Status

SAME = 1e-5
"""Share of a value below which a difference is not told."""


def front_text(front: BoardFront, title: str) -> RenderableType:
    """The whole answer to `board --front`."""
    parts: list[RenderableType] = [Text(title, style="bold"), Text(_verdict(front))]
    if front.points:
        parts += [Text(), _table(front)]
        parts += [Text(), *(Text(f"Caution: {caution}") for caution in front.points[0].result.cautions)]
    return Group(*parts)


def _verdict(front: BoardFront) -> str:
    if front.hopeless:
        return hopeless_words(front.hopeless)
    if front.status is Status.INFEASIBLE:
        return f"No board holds the other limits, whatever the {front.count}; without --front the reasons are given."
    if front.status is Status.UNKNOWN:
        return UNKNOWN
    proof = "each proved" if front.complete else "out of time before each was proved"
    return f"Least {front.goal} for each number of {front.count}, from the fewest to where more gain nothing ({proof})"


def _table(front: BoardFront) -> RenderableType:
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold")
    table.add_column(front.count.capitalize(), justify="right", no_wrap=True)
    headings = (front.goal.capitalize(), "At least", "More than the last")
    for heading in headings:
        table.add_column(heading, justify="right", no_wrap=True)
    others = [name for name in ("reels", "couplers", "packages") if name != front.count]
    table.add_column(others[0].capitalize(), justify="right", no_wrap=True)
    table.add_column("Which")
    last = front.points[-1].goal.value
    for point in front.points:
        goal = point.goal
        more = goal.value / last - 1.0 if last else 0.0
        bound = goal_words(front.goal, goal.bound) if goal.bound < goal.value * (1 - SAME) else "–"
        counted = _counts(point)
        table.add_row(
            str(point.count),
            goal_words(front.goal, goal.value),
            bound,
            margin_words(more) if more > SAME else "–",
            str(counted[others[0]]),
            _which(point, front.count),
        )
    return table


def _counts(point: FrontPoint) -> dict[str, int]:
    result = point.result
    return {"reels": len(result.reels), "couplers": len(result.couplers), "packages": result.placed}


def _which(point: FrontPoint, count: str) -> str:
    """What is counted, by name."""
    if count == BoardGoalName.REELS:
        # lines break between values and not within
        return ", ".join(ohms_words(ohms).replace(" ", "\u00a0") for ohms in point.result.reels)
    return ", ".join(point.result.couplers)


def front_object(front: BoardFront, title: str) -> dict[str, object]:
    """The object that `board --front --json` prints."""
    return {
        "title": title,
        "count": front.count,
        "goal": front.goal,
        "status": front.status.value,
        "complete": front.complete,
        "points": [_point_object(point) for point in front.points],
        "hopeless": list(front.hopeless),
    }


def _point_object(point: FrontPoint) -> dict[str, object]:
    result = point.result
    designs = {one.link.name: asdict(one.review.design) for one in result.links}
    return {
        "most": point.count,
        "goal": objective_object(point.goal),
        **_counts(point),
        "reel_values": list(result.reels),
        "parts": list(result.couplers),
        "power": result.power,
        "price": result.price,
        "edge": result.edge,
        "designs": designs,
    }
