"""optopick: choose an optocoupler and the stock resistors around it, and prove the choice.

`optopick.pick(brief)` gives a `Result`, see optopick.uses.pick; `optopick.solve_board(path)` a `BoardResult`, see
optopick.uses.board. Names load on first use: the solver and the numerical libraries take their time to import.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from optopick.read_board import read_board as load_board
    from optopick.read_brief import read_brief as load_brief
    from optopick.read_couplers import read_couplers as load_couplers
    from optopick.recheck import review
    from optopick.report.frames import front_frame, ranking_frame, sweep_frame
    from optopick.uses.board import solve_board
    from optopick.uses.board_front import board_front
    from optopick.uses.pick import alternatives, pick
    from optopick.uses.rank import rank
    from optopick.uses.tradeoff import tradeoff
    from optopick.uses.why import why

_HOMES = {
    "alternatives": ("optopick.uses.pick", "alternatives"),
    "board_front": ("optopick.uses.board_front", "board_front"),
    "front_frame": ("optopick.report.frames", "front_frame"),
    "load_board": ("optopick.read_board", "read_board"),
    "load_brief": ("optopick.read_brief", "read_brief"),
    "load_couplers": ("optopick.read_couplers", "read_couplers"),
    "pick": ("optopick.uses.pick", "pick"),
    "rank": ("optopick.uses.rank", "rank"),
    "ranking_frame": ("optopick.report.frames", "ranking_frame"),
    "review": ("optopick.recheck", "review"),
    "solve_board": ("optopick.uses.board", "solve_board"),
    "sweep_frame": ("optopick.report.frames", "sweep_frame"),
    "tradeoff": ("optopick.uses.tradeoff", "tradeoff"),
    "why": ("optopick.uses.why", "why"),
}
"""Each name of the package, and the module and name where it lives."""

__all__ = [
    "alternatives",
    "board_front",
    "front_frame",
    "load_board",
    "load_brief",
    "load_couplers",
    "pick",
    "rank",
    "ranking_frame",
    "review",
    "solve_board",
    "sweep_frame",
    "tradeoff",
    "why",
]


def __getattr__(name: str) -> Any:  # noqa: ANN401 - whatever the name stands for
    if name not in _HOMES:
        raise AttributeError(f"module 'optopick' has no attribute {name!r}")
    module, own = _HOMES[name]
    return getattr(import_module(module), own)
