"""The brief of the benchmark for a series and a goal, as text and read."""

from __future__ import annotations

from pathlib import Path

from optopick.brief import Brief, GoalName
from optopick.coupler import Coupler
from optopick.read_brief import brief_from_text
from optopick.read_couplers import read_couplers

FOLDER = Path(__file__).parent
TABLE = FOLDER.parents[1] / "catalogs" / "demo.csv"


def text_of(series: str, goal: GoalName) -> str:
    """The brief as a file would have it."""
    then = GoalName.EDGE_TIME if goal is GoalName.POWER else GoalName.POWER
    text = (FOLDER / "link.toml").read_text(encoding="utf-8")
    for word, value in (("SERIES", series), ("GOAL", goal.value), ("THEN", then.value), ("TABLE", str(TABLE))):
        text = text.replace(word, value)
    return text


def brief_of(series: str, goal: GoalName) -> Brief:
    """The brief, read."""
    return brief_from_text(text_of(series, goal), FOLDER / "link.toml")


def coupler_of(brief: Brief) -> Coupler:
    """The one coupler the brief names."""
    assert brief.couplers.only is not None
    return next(c for c in read_couplers(brief.couplers.table).couplers if c.part in brief.couplers.only)
