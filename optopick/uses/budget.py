"""The margin budget of a design: how much of each check's room every uncertain quantity eats."""

from __future__ import annotations

from optopick.answers import CAUSES, Share
from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.recheck import review
from optopick.result import Design


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
