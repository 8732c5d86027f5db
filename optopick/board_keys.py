"""The keys of a board file, in the terms in which `optopick.keys` states those of a brief."""

from __future__ import annotations

from dataclasses import replace

from optopick.board import BoardGoalName
from optopick.keys import Bound, Key

GOALS = tuple(goal.value for goal in BoardGoalName)

LINK, SET = "link", "set"

_PLAIN = Key(
    section="",
    name="",
    kind="",
    meaning="",
    example="",
    unit="1",
    required=False,
    default=None,
    default_rule="",
    default_from="",
    least=None,
    most=None,
    above=None,
    choices=(),
    names_in="",
    circuits=(),
    only_in=(),
    single="both ends",
)

_ONE, _MANY = Bound("1", 1.0), Bound("10000", 10000.0)
_COUNT = replace(_PLAIN, kind="number", least=_ONE)

TOP = (replace(_PLAIN, name="title", kind="text", meaning="What the board is called.", example="Frost fan controller"),)

_LIMIT = replace(_COUNT, section="limits")
LIMITS = (
    replace(_LIMIT, name="reels", meaning="The most distinct resistances over the board.", example=10),
    replace(_LIMIT, name="couplers", meaning="The most distinct coupler parts over the board.", example=3),
    replace(_LIMIT, name="packages", meaning="The most coupler packages on the board.", example=12),
    replace(
        _PLAIN,
        section="limits",
        name="price",
        kind="quantity",
        meaning="The most that all couplers and resistors may cost, in the currency of the tables.",
        example=4.5,
        above=Bound("0", 0.0),
    ),
    replace(
        _PLAIN,
        section="limits",
        name="power",
        kind="quantity",
        meaning="The most worst-case average power of all links together.",
        example="2 W",
        unit="W",
        above=Bound("0 W", 0.0),
    ),
)

_GOAL = replace(_PLAIN, section="goal", kind="choice", choices=GOALS)
GOAL = (
    replace(_GOAL, name="minimize", meaning="What to make least.", example="power", required=True),
    replace(_GOAL, name="then", meaning="What to make least after that.", example="reels"),
    replace(
        _PLAIN,
        section="goal",
        name="give",
        kind="quantity",
        meaning="How much of the first goal may be given for the second.",
        example="5 %",
        default=0.0,
        least=Bound("0 %", 0.0),
        most=Bound("100 %", 1.0),
    ),
)

_LINK = replace(_PLAIN, section=LINK, required=True)
LINKS = (
    replace(_LINK, name="name", kind="text", meaning="What the link is called on the board.", example="motor on"),
    replace(_LINK, name="brief", kind="file", meaning="Its brief, relative to the board file.", example="motor.toml"),
    replace(_COUNT, section=LINK, name="count", meaning="How many of it there are.", example=8, default=1, most=_MANY),
    replace(
        _PLAIN,
        section=LINK,
        name="unset",
        kind="texts",
        meaning="Keys of its brief to leave out.",
        example=["limits.delay"],
        default=(),
    ),
    replace(
        _PLAIN,
        section=LINK,
        name="grounds",
        kind="texts",
        meaning="The ground on the LED's side and the one on the output's.",
        example=["field", "logic"],
    ),
)

SECTIONS = {"limits": LIMITS, "goal": GOAL}
"""Tables of single keys; the keys of each table `[[link]]` are `LINKS`."""
