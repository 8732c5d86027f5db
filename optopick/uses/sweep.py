"""What each stock value of one position does: the bench's trying of resistors, at once."""

from __future__ import annotations

from dataclasses import replace

from optopick.answers import Step, Sweep
from optopick.brief import Brief, Position
from optopick.coupler import Coupler
from optopick.errors import InputError, Mistake
from optopick.recheck import review
from optopick.recheck.vertices import ORDER
from optopick.result import Design

POSITIONS = ("r_led", "r_load", "r_be", "r_shunt")


def sweep(brief: Brief, coupler: Coupler, design: Design, position: str) -> Sweep:
    """The design with `position` at every value of its stock (and empty, where it may be: that is the last step).

    Raises InputError for a position that the brief has no stock for, or whose pin the coupler lacks.
    """
    stock = _stock(brief, coupler, position)
    values = [*stock.values, *([None] if stock.absent else [])]
    steps = []
    for ohms in values:
        changed = replace(design, **{position: ohms})  # type: ignore[arg-type]
        worst = review(brief, coupler, changed)
        steps.append(Step(ohms, worst, review(brief, coupler, changed, nominal=ORDER)))
    return Sweep(position, getattr(design, position), tuple(steps))


def _stock(brief: Brief, coupler: Coupler, position: str) -> Position:
    known = [name for name in POSITIONS if getattr(brief.stock, name) is not None]
    if position == "r_be" and not coupler.base_pin:
        raise InputError(
            [Mistake("--position", f"r_be of {coupler.part}, whose base is not brought out", "another position")]
        )
    if position not in known:
        raise InputError([Mistake("--position", f'"{position}"', f"a position with stock: {', '.join(known)}")])
    found: Position = getattr(brief.stock, position)
    return found
