"""The margin budget of a design: how much of each check's room every uncertain quantity eats."""

from __future__ import annotations

from dataclasses import dataclass

from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.recheck import review
from optopick.result import Design

CAUSES: dict[str, tuple[str, ...]] = {
    "CTR bin": ("ctr",),
    "LED light spread": ("light",),
    "LED forward voltage": ("v_f",),
    "ageing": ("age",),
    "temperature": ("temperature",),
    "drive supply and drop": ("drive", "drop"),
    "output supply": ("supply",),
    "resistors": ("r_led", "r_load", "r_be", "r_shunt"),
}
"""What each cause is called, and the axes of the uncertainty box that it stands for."""


@dataclass(frozen=True)
class Share:
    """One check: its margin at the worst corner, with everything nominal, and what each cause costs [1].

    cost: cause to the margin that the check would gain if that cause alone stood at its nominal value.
    """

    check: str
    worst: float
    nominal: float
    cost: dict[str, float]


def budget(brief: Brief, coupler: Coupler, design: Design) -> tuple[Share, ...]:
    """The margin budget of every check, in the order of the review."""
    worst = review(brief, coupler, design)
    everything = frozenset(axis for axes in CAUSES.values() for axis in axes)
    nominal = _margins(brief, coupler, design, everything)
    eased = {cause: _margins(brief, coupler, design, frozenset(axes)) for cause, axes in CAUSES.items()}
    return tuple(
        Share(
            check=check.name,
            worst=check.margin,
            nominal=nominal[check.name],
            cost={cause: margins[check.name] - check.margin for cause, margins in eased.items()},
        )
        for check in worst.checks
    )


def _margins(brief: Brief, coupler: Coupler, design: Design, nominal: frozenset[str]) -> dict[str, float]:
    return {check.name: check.margin for check in review(brief, coupler, design, nominal).checks}
