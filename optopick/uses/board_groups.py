"""Links of a board that have one brief, with the couplers that may serve them and, where they count, the prices."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import cache, partial
from typing import Any

from optopick.board import Board, BoardGoalName, BoardLink
from optopick.brief import Brief, Position, Stock
from optopick.coupler import Coupler
from optopick.errors import InputError, Mistake
from optopick.model.board_packages import Counts
from optopick.model.board_seats import Prices, prices_of
from optopick.model.kinds import LinkModel, model_of
from optopick.units import format_resistor
from optopick.uses.engine import Entry, couplers_of

POSITIONS = ("r_led", "r_shunt", "r_load", "r_be")
COLUMNS = ("values", "tolerance", "power", "voltage", "price")
MOST_NAMED = 6
MOST_KEPT = 200
"""Models that are kept: one takes some megabytes, and some hundredths of a second to make again."""


@dataclass(frozen=True)
class Group:
    """Links with one brief, which get one design: so the board is built, and where no price counts nothing is lost.

    (Give each of them the design that takes least power among theirs, and the board takes from no further reel, has no
    further part, no longer edge and takes no more power.)

    models: makes the model of each coupler; they are large, so only those of small boards are kept. prices: of each
    coupler's stock, None where no price counts; unpriced: what was left out for want of one.
    """

    brief: Brief
    links: tuple[BoardLink, ...]
    couplers: tuple[Coupler, ...]
    models: tuple[Callable[[], LinkModel], ...]
    prices: tuple[Prices, ...] | None = None
    unpriced: tuple[str, ...] = ()

    def entry(self, k: int) -> Entry:
        """Coupler number k with its model."""
        return Entry(self.couplers[k], self.models[k]())

    @property
    def entries(self) -> list[Entry]:
        """Every coupler with its model."""
        return [self.entry(k) for k in range(len(self.couplers))]

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
    usable = {brief: tuple(couplers_of(brief, couplers)[0]) for brief in by_brief}
    keep = sum(map(len, usable.values())) <= MOST_KEPT
    plain = [_group(brief, tuple(links), usable[brief], keep) for brief, links in by_brief.items()]
    if board.limits.price is None and BoardGoalName.COST not in board.goals:
        return plain
    mistakes: list[Mistake] = []
    groups = [_priced(group, f"{board.path or 'board'}: link {group.links[0].name}", mistakes, keep) for group in plain]
    if mistakes:
        raise InputError(mistakes)
    return groups


def _group(brief: Brief, links: tuple[BoardLink, ...], couplers: tuple[Coupler, ...], keep: bool) -> Group:
    made = [partial(model_of, brief, coupler) for coupler in couplers]
    return Group(brief, links, couplers, tuple(cache(make) if keep else make for make in made))


def _priced(group: Group, where: str, mistakes: list[Mistake], keep: bool) -> Group:
    """Links with the couplers and values that have a price; a position or link left with none is a mistake."""
    usable = group.couplers
    left = tuple(coupler for coupler in usable if coupler.price is not None)
    if usable and not left:
        found = f"no price of any coupler that may serve: {_listed([coupler.part for coupler in usable])}"
        mistakes.append(Mistake(where, found, "prices in the coupler table where cost is limited or a goal"))
    stock, unpriced = _priced_stock(group.brief.stock, where, mistakes)
    priced = _group(replace(group.brief, stock=stock), group.links, left, keep)
    missing = [coupler.part for coupler in usable if coupler.price is None]
    prices = () if mistakes else tuple(prices_of(make(), _position_prices(stock)) for make in priced.models)
    named = [f"{group.links[0].name} {name}" for name in unpriced]
    return replace(priced, prices=prices, unpriced=(*missing, *named))


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
