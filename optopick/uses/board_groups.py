"""Links of a board that have one brief, with the couplers that may serve them and, where they count, the prices."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

from optopick.board import Board, BoardGoalName, BoardLink
from optopick.brief import Brief, Position, Stock
from optopick.coupler import Coupler
from optopick.errors import InputError, Mistake
from optopick.model.board_packages import Counts
from optopick.model.board_seats import Prices, prices_of
from optopick.units import format_resistor
from optopick.uses.engine import Entry, entries_of

POSITIONS = ("r_led", "r_shunt", "r_load", "r_be")
COLUMNS = ("values", "tolerance", "power", "voltage", "price")
MOST_NAMED = 6


@dataclass(frozen=True)
class Group:
    """Links with one brief, which get one design: so the board is built, and where no price counts nothing is lost.

    (Give each of them the design that takes least power among theirs, and the board takes from no further reel, has no
    further part, no longer edge and takes no more power.)

    prices: of each entry's stock, None where no price counts; unpriced: what was left out for want of one.
    """

    brief: Brief
    links: tuple[BoardLink, ...]
    entries: tuple[Entry, ...]
    prices: tuple[Prices, ...] | None = None
    unpriced: tuple[str, ...] = ()

    @property
    def counts(self) -> Counts:
        """How many there are on each pair of grounds."""
        found: dict[tuple[str, str] | None, int] = {}
        for link in self.links:
            found[link.grounds] = found.get(link.grounds, 0) + link.count
        return found


def groups_of(board: Board, couplers: Sequence[Coupler] | None) -> list[Group]:
    """The links of a board by their brief. Raises InputError where prices count and there are none to choose from."""
    by_brief: dict[Brief, list[BoardLink]] = {}
    for link in board.links:
        by_brief.setdefault(link.brief, []).append(link)
    if board.limits.price is None and BoardGoalName.COST not in board.goals:
        return [Group(brief, tuple(links), tuple(entries_of(brief, couplers)[0])) for brief, links in by_brief.items()]
    mistakes: list[Mistake] = []
    groups = [_priced(board, brief, tuple(links), couplers, mistakes) for brief, links in by_brief.items()]
    if mistakes:
        raise InputError(mistakes)
    return groups


def _priced(
    board: Board,
    brief: Brief,
    links: tuple[BoardLink, ...],
    couplers: Sequence[Coupler] | None,
    mistakes: list[Mistake],
) -> Group:
    """Links with the couplers and values that have a price; a position or link left with none is a mistake."""
    where = f"{board.path or 'board'}: link {links[0].name}"
    usable = entries_of(brief, couplers)[0]
    entries = [entry for entry in usable if entry.coupler.price is not None]
    if usable and not entries:
        found = f"no price of any coupler that may serve: {_listed([entry.coupler.part for entry in usable])}"
        mistakes.append(Mistake(where, found, "prices in the coupler table where cost is limited or a goal"))
    stock, unpriced = _priced_stock(brief.stock, where, mistakes)
    if stock == brief.stock:
        left = entries
    else:
        brief = replace(brief, stock=stock)
        left = entries_of(brief, [entry.coupler for entry in entries])[0]
    missing = [entry.coupler.part for entry in usable if entry.coupler.price is None]
    prices = () if mistakes else tuple(prices_of(entry.model, _position_prices(stock)) for entry in left)
    return Group(brief, links, tuple(left), prices, (*missing, *(f"{links[0].name} {name}" for name in unpriced)))


def _priced_stock(stock: Stock, where: str, mistakes: list[Mistake]) -> tuple[Stock, list[str]]:
    """The stock less the values without a price, and those values."""
    kept, unpriced = stock, list[str]()
    for name in POSITIONS:
        position: Position | None = getattr(stock, name)
        if position is None or None not in position.price:
            continue
        priced = [k for k, price in enumerate(position.price) if price is not None]
        if not priced:
            found = f"no price of any resistor in stock.{name} ({position.described})"
            expected = "a shelf list with the column price where cost is limited or a goal"
            mistakes.append(Mistake(where, found, expected))
            continue
        missing = [ohms for ohms, price in zip(position.values, position.price, strict=True) if price is None]
        unpriced.append(f"{name} {_listed([format_resistor(ohms) for ohms in missing])}")
        columns: dict[str, Any] = {column: tuple(getattr(position, column)[k] for k in priced) for column in COLUMNS}
        changed: dict[str, Any] = {name: replace(position, **columns)}
        kept = replace(kept, **changed)
    return kept, unpriced


def _position_prices(stock: Stock) -> list[dict[float, float]]:
    """The price of each value of each position, in the order in which `prices_of` wants them."""
    found: list[dict[float, float]] = []
    for name in POSITIONS:
        position: Position | None = getattr(stock, name)
        priced = zip(position.values, position.price, strict=True) if position else ()
        found.append({ohms: price for ohms, price in priced if price is not None})
    return found


def _listed(names: Sequence[str]) -> str:
    more = f" and {len(names) - MOST_NAMED} more" if len(names) > MOST_NAMED else ""
    return ", ".join(names[:MOST_NAMED]) + more
