"""The bill of materials of one link as CSV."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator

from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.report.placed import Placed, placed_resistors
from optopick.report.words import amount, ohms_words
from optopick.result import Design

COLUMNS = ("quantity", "value", "tolerance", "rating", "positions", "price")
"""price: per piece, in the currency of the stock list and the coupler table; empty where they do not say."""


def bill_csv(brief: Brief, coupler: Coupler, design: Design) -> str:
    """The coupler and the resistors, one row for each kind of part, in the order of the positions."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(COLUMNS)
    writer.writerow((1, coupler.part, "", "", "coupler", _price(coupler.price)))
    writer.writerows(_rows(_alike(placed_resistors(brief, design))))
    if design.reverse_diode:
        writer.writerow((1, "diode", "", "", "reverse_diode", ""))
    return out.getvalue()


def _alike(placed: Iterable[Placed]) -> list[list[Placed]]:
    """Resistors that can come from one reel, together."""
    reels: dict[tuple[object, ...], list[Placed]] = {}
    for one in placed:
        key = (ohms_words(one.ohms), one.tolerance, one.power, one.voltage, one.price)
        reels.setdefault(key, []).append(one)
    return list(reels.values())


def _rows(reels: Iterable[list[Placed]]) -> Iterator[tuple[object, ...]]:
    for reel in reels:
        one = reel[0]
        positions = " ".join(part.position for part in reel)
        yield (
            sum(part.pieces for part in reel),
            ohms_words(one.ohms),
            _tolerance(one),
            _rating(one),
            positions,
            _price(one.price),
        )


def _tolerance(one: Placed) -> str:
    return "" if one.tolerance is None else amount(one.tolerance, "%")


def _rating(one: Placed) -> str:
    if one.power is None or one.voltage is None:
        return ""
    return f"{amount(one.power, 'W')}, {amount(one.voltage, 'V')}"


def _price(price: float | None) -> str:
    return "" if price is None else f"{price:g}"
