"""The passing design nearest to a failing one: as few positions changed as can be, then the brief's goal."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from itertools import combinations

from optopick.answers import Nearest
from optopick.brief import Brief, Position, Stock
from optopick.coupler import Coupler
from optopick.recheck.vertices import rating_of
from optopick.result import Design
from optopick.uses.pick import pick

PLACES = ("r_led", "r_load", "r_be", "r_shunt", "coupler")


def nearest(brief: Brief, design: Design, couplers: Sequence[Coupler]) -> Nearest | None:
    """The best design among those that change the fewest places; None where none passes at all.

    `couplers`: those of the brief's table. Places that the brief has no stock for cannot change.
    """
    for count in range(1, len(PLACES) + 1):
        found = list(_changed(brief, design, couplers, count))
        if found:
            return min(found, key=lambda one: one.result.objective.value if one.result.objective else float("inf"))
    return None


def _changed(brief: Brief, design: Design, couplers: Sequence[Coupler], count: int) -> Iterator[Nearest]:
    """The best design for each choice of `count` places that may change."""
    for places in combinations(PLACES, count):
        if any(place != "coupler" and getattr(brief.stock, place) is None for place in places):
            continue
        fixed = replace(brief, stock=_stock(brief, design, places))
        own = [coupler for coupler in couplers if ("coupler" in places) != (coupler.part == design.coupler)]
        result = pick(fixed, couplers=own)
        if result.review is not None:
            yield Nearest(places, result)


def _stock(brief: Brief, design: Design, places: Sequence[str]) -> Stock:
    """The brief's stock at the places that may change, the design's own value at the others."""
    stock = brief.stock
    held = {name: _held(brief, name, getattr(design, name), design.pieces) for name in PLACES[:4] if name not in places}
    return replace(stock, **held)  # type: ignore[arg-type]


def _held(brief: Brief, name: str, value: float | None, pieces: int) -> Position | None:
    """A position with one value; None where the design leaves it empty."""
    if value is None:
        return None
    tolerance, power, voltage = rating_of(brief, name, value)
    count = pieces if name == "r_led" else 1
    return Position((value,), (tolerance,), (power,), (voltage,), (None,), False, "as designed", count)
