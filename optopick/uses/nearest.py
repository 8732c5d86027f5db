"""The passing design nearest to a failing one: as few positions changed as can be, then the brief's goal."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from itertools import combinations

from optopick.answers import Nearest
from optopick.brief import Brief, Position, Stock
from optopick.coupler import Coupler
from optopick.recheck.vertices import rating_of
from optopick.result import Design, Result, Review
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
        if "r_be" not in places:
            own = [coupler for coupler in own if _base_stays(brief, design, coupler)]
        result = pick(fixed, couplers=own)
        if result.review is not None:
            yield Nearest(places, result if "r_led" in places else _in_pieces(result, result.review, design))


def _base_stays(brief: Brief, design: Design, coupler: Coupler) -> bool:
    """Whether a coupler leaves the base position as the design has it, within the brief's stock."""
    if design.r_be is not None:
        return coupler.base_pin
    stock = brief.stock.r_be
    return coupler.part == design.coupler or not coupler.base_pin or stock is None or stock.absent


def _in_pieces(result: Result, review: Review, design: Design) -> Result:
    """The result with the LED resistor in the design's own pieces, which `_held` made one of."""
    own = replace(review.design, r_led=design.r_led, pieces=design.pieces)
    return replace(result, review=replace(review, design=own))


def _stock(brief: Brief, design: Design, places: Sequence[str]) -> Stock:
    """The brief's stock at the places that may change, the design's own value at the others."""
    stock = brief.stock
    held = {name: _held(brief, name, getattr(design, name), design.pieces) for name in PLACES[:4] if name not in places}
    return replace(stock, **held)  # type: ignore[arg-type]


def _held(brief: Brief, name: str, value: float | None, pieces: int) -> Position | None:
    """A position with one value, its pieces taken for one; None where the design leaves it empty."""
    if value is None:
        return None
    tolerance, power, voltage = rating_of(brief, name, value)
    n = pieces if name == "r_led" else 1
    return Position((value * n,), (tolerance,), (power * n,), (voltage * n,), (None,), False, "as designed")
