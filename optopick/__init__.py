"""optopick: choose an optocoupler and the stock resistors around it, and prove the choice.

`optopick.pick(brief)` gives a `Result`; see optopick.uses.pick. Names load on first use: the solver and the numerical
libraries take their time to import.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from optopick.read_brief import read_brief
    from optopick.read_couplers import read_couplers
    from optopick.recheck import review
    from optopick.uses.pick import pick

_HOMES = {
    "pick": "optopick.uses.pick",
    "read_brief": "optopick.read_brief",
    "read_couplers": "optopick.read_couplers",
    "review": "optopick.recheck",
}

__all__ = ["pick", "read_brief", "read_couplers", "review"]


def __getattr__(name: str) -> Any:  # noqa: ANN401 - whatever the name stands for
    if name not in _HOMES:
        raise AttributeError(f"module 'optopick' has no attribute {name!r}")
    return getattr(import_module(_HOMES[name]), name)
