"""What a board's designs come to, counted from the designs and the re-check alone: nothing here knows the model."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from optopick.board import BoardGoalName, Grounds
from optopick.board_answers import BoardResult, LinkChoice, Packages
from optopick.coupler import Coupler
from optopick.report.placed import placed_resistors
from optopick.result import Design

NEAR = 1e-9


def resistances(design: Design) -> tuple[float, ...]:
    """The resistances that a design places [ohm]; equal ones in series count as one."""
    placed = (design.r_led, design.r_shunt, design.r_load, design.r_be)
    return tuple(ohms for ohms in placed if ohms is not None)


def heat_share(one: LinkChoice) -> float:
    """The most that a link's heat is of what its package may take, over all corners [1]."""
    return max(check.value / check.limit for check in one.review.checks if check.name == "total_power")


def packages_placed(links: Sequence[LinkChoice], parts: Mapping[str, Coupler]) -> tuple[Packages, ...]:
    """The packages of a board: those that links on the same grounds share, and those of one link alone.

    Shared are packages of several channels, by links whose heat leaves each channel an equal share of the package.
    """
    shared: dict[tuple[str, Grounds], list[tuple[str, int]]] = {}
    found = []
    for one in links:
        part, link = parts[one.review.design.coupler], one.link
        alone = link.grounds is None or part.channels == 1
        if alone or heat_share(one) > (1 + NEAR) / part.channels:
            found.append(Packages(part.part, part.channels, link.count, ((link.name, link.count),), None))
        elif link.grounds is not None:
            shared.setdefault((part.part, link.grounds), []).append((link.name, link.count))
    for (name, grounds), inside in shared.items():
        channels, filled = parts[name].channels, sum(count for _, count in inside)
        found.append(Packages(name, channels, -(-filled // channels), tuple(inside), grounds))
    return tuple(sorted(found, key=lambda packages: (packages.part, packages.grounds or ("", ""))))


def price_of(links: Sequence[LinkChoice], packages: Sequence[Packages], parts: Mapping[str, Coupler]) -> float | None:
    """The price of all couplers and resistors; None without a design, or where a price is not known."""
    prices: list[tuple[int, float | None]] = [(one.count, parts[one.part].price) for one in packages]
    for one in links:
        placed = placed_resistors(one.link.brief, one.review.design)
        prices += [(one.link.count * each.pieces, each.price) for each in placed]
    if not prices or any(price is None for _, price in prices):
        return None
    return sum(count * (price or 0.0) for count, price in prices)


def worst_edge(links: Sequence[LinkChoice]) -> float | None:
    """The longest edge, each against its link's limit [1]; None where no link has one."""
    shares = []
    for one in links:
        limit, timing = one.link.brief.limits.edge_time, one.review.timing
        if limit is not None:
            shares.append(max(timing.edge_on, timing.edge_off) / limit)
    return max(shares, default=None)


def totals_of(result: BoardResult) -> dict[BoardGoalName, float | None]:
    """What a board comes to in each goal."""
    return {
        BoardGoalName.POWER: result.power,
        BoardGoalName.REELS: float(len(result.reels)),
        BoardGoalName.COUPLERS: float(len(result.couplers)),
        BoardGoalName.PACKAGES: float(result.placed),
        BoardGoalName.COST: result.price,
        BoardGoalName.EDGE: result.edge,
    }
