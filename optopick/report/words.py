"""Sentences about a result that every kind of report says alike."""

from __future__ import annotations

import math
from collections.abc import Sequence
from functools import lru_cache

from optopick.coupler import Assumed
from optopick.report.labels import check_label
from optopick.result import NOT_CHOSEN, Check, Objective, Proof, Rejected, Review, Status
from optopick.units import format_quantity, format_resistor

TIGHT = 0.1
"""A check with less room than this is said to bind."""

AMPLE = 10.0
"""More room than this is not told in figures, nor so much less than none."""


# a page says the same few thousand values many times over, and each costs a tenth of a millisecond
@lru_cache(maxsize=1 << 15)
def amount(value: float, unit: str) -> str:
    """A value with four digits and its unit."""
    return format_quantity(value, unit, 4)


def limit_words(check: Check) -> str:
    """The limit with its sense."""
    return f"{'≤' if check.sense == '<=' else '≥'} {amount(check.limit, check.unit)}"


def room_words(check: Check) -> str:
    """The room left over the limit, or that the check fails and by how much."""
    if math.isnan(check.margin) or check.margin == -math.inf:
        return "fails"
    shown = margin_words(check.margin)
    return shown if check.passed else f"fails {shown}"


def margin_words(margin: float, digits: int | None = None) -> str:
    """A room [1] as a percentage, a dash where there is none at all; digits: after the point, else one if tight."""
    if math.isnan(margin) or margin == -math.inf:
        return "–"
    if margin == math.inf:
        return "∞ %"
    if abs(margin) >= AMPLE:
        return f"{'> ' if margin > 0 else '< −'}{100 * AMPLE:.0f} %"
    places = (0 if abs(margin) >= TIGHT else 1) if digits is None else digits
    return f"{round(100 * margin, places) + 0.0:.{places}f} %"  # plus zero: no "-0.0"


def binding(review: Review) -> tuple[Check, ...]:
    """The checks that hold with little room, the tightest first."""
    tight = (check for check in review.designed if check.passed and check.margin < TIGHT)
    return tuple(sorted(tight, key=lambda check: check.margin))


def ohms_words(ohms: float | None) -> str:
    """A resistor value, or that the position stays empty."""
    return "none" if ohms is None else _resistor(ohms)


_resistor = lru_cache(maxsize=1 << 12)(format_resistor)


def verdict(status: Status | None, objectives: Sequence[Objective], review: Review | None) -> str:
    """The answer in one sentence."""
    if status is Status.INFEASIBLE:
        return "No combination in stock holds every limit at every corner."
    if status is Status.UNKNOWN:
        return "Out of time: no design found, and none ruled out."
    if status is None:
        return f"The given design: {holding(review)}."
    said = "; then ".join(f"least {goal.name}: {amount(goal.value, goal.unit)}" for goal in objectives)
    said = said[:1].upper() + said[1:]
    if status is Status.FEASIBLE:
        shown = [f"no design has {o.name} below {amount(o.bound, o.unit)}" for o in objectives if o.bound > 0]
        return f"{said} (best found in the time given; {' and '.join(shown) or 'no bound shown in it'})"
    return f"{said} (proved)"


def holding(review: Review | None) -> str:
    """Whether the checks hold."""
    return "every check holds" if review is None or review.passed else _failing(review)


def _failing(review: Review) -> str:
    failing = len(review.failing)
    return f"{failing} of {len(review.checks)} checks {'fails' if failing == 1 else 'fail'}"


def proof_words(status: Status, proof: Proof, *, timed: bool = True) -> str:
    """What was proved, and how; `timed` False leaves out the seconds, which differ from run to run."""
    how = f"{proof.solves} solver calls, {proof.decided_by_ranges} settled by ranges alone"
    how += f", {proof.seconds:.2g} s" if timed else ""
    claim = {
        Status.OPTIMAL: "no other does better; re-checked from the physics at every corner",
        Status.FEASIBLE: "the best found is given, not proved best; re-checked from the physics at every corner",
        Status.INFEASIBLE: "none holds every limit",
        Status.UNKNOWN: "not decided",
    }[status]
    return f"Of {proof.combinations:,} combinations in stock {claim} ({how}; {proof.solver})."


def tightest(review: Review) -> Check:
    """The check with the least room; one whose margin is not a number counts as having none."""
    return min(review.designed, key=lambda check: -math.inf if math.isnan(check.margin) else check.margin)


def standing(review: Review) -> str:
    """How a design stands: whether all checks hold, and which is tightest."""
    least = tightest(review)
    told = f"{check_label(least.name)} {room_words(least)}"
    if review.passed:
        return f"all checks hold; tightest: {told}"
    return f"{_failing(review)}; worst: {told}"


def rule_words(item: Assumed) -> str:
    """The rule that filled a gap, without the value where it begins with that: it stands beside it."""
    said = item.rule.removeprefix(f"{item.value} (")
    return said if said == item.rule else said.removesuffix(")")


def set_aside(rejected: Sequence[Rejected]) -> tuple[tuple[Rejected, ...], int]:
    """The couplers rejected for a reason worth telling, and how many the brief simply does not choose."""
    told = tuple(one for one in rejected if one.reason != NOT_CHOSEN)
    return told, len(rejected) - len(told)
