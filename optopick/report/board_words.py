"""Sentences about a board that terminal and page say alike."""

from __future__ import annotations

from collections.abc import Sequence

from optopick.board import BoardGoalName
from optopick.board_answers import BoardProof, BoardResult, LinkChoice, Needed
from optopick.report.words import amount, margin_words
from optopick.result import Objective, Status

UNKNOWN = "Out of time: no board found, and none ruled out."


def hopeless_words(links: Sequence[str]) -> str:
    """That no board exists, as these links have no design even alone."""
    have = "has" if len(links) == 1 else "have"
    return (
        f"No board exists: {', '.join(links)} {have} no design even alone; optopick why gives the reasons for a brief."
    )


def board_verdict(result: BoardResult) -> str:
    """The answer in one sentence."""
    if result.hopeless:
        return hopeless_words(result.hopeless)
    if result.status is Status.INFEASIBLE:
        return f"No board holds every limit, though every link has designs alone.{_conflict_words(result.conflict)}"
    if result.status is Status.UNKNOWN:
        return UNKNOWN
    if result.status is Status.OPTIMAL:
        return _capital("; then ".join(f"least {goal.name}: {_reached(goal)}" for goal in result.goals)) + " (proved)"
    said = _capital("; then ".join(f"{goal.name}: {goal_words(goal.name, goal.value)}" for goal in result.goals))
    bounds = " and ".join(
        f"no board has {goal.name} below {goal_words(goal.name, goal.bound)}" for goal in result.goals
    )
    return f"{said} (best found in the time given; {bounds})"


def _conflict_words(conflict: Sequence[Needed]) -> str:
    """Which limits contradict each other, and what each of them would have to be."""
    if not conflict:
        return ""
    stated = [f"{limit_name(one)} {goal_words(one.name, one.limit)}" for one in conflict]
    last = stated[-1] if len(stated) == 1 else f"{', '.join(stated[:-1])} and {stated[-1]}"
    said = f" {_capital(last)} cannot be kept{' together' if len(stated) > 1 else ''}."
    return said + "".join(f" {_needed_words(one)}" for one in conflict)


def _needed_words(one: Needed) -> str:
    if one.least is None:
        none = f"No {limit_name(one)} helps" if one.proved else f"What {limit_name(one)} would do is not known"
        return f"{none} with all other limits as they are."
    least = "at least" if one.proved else "at most as found so far"
    return f"{_capital(limit_name(one))} would have to be {least} {goal_words(one.name, one.least)}."


def limit_name(one: Needed) -> str:
    """The key of a limit that contradicts others."""
    return "price" if one.name == BoardGoalName.COST else one.name


def _capital(text: str) -> str:
    return text[:1].upper() + text[1:]


def goal_words(name: str, value: float) -> str:
    """The value of a board's goal in words."""
    if name == BoardGoalName.POWER:
        return amount(value, "W")
    if name == BoardGoalName.COST:
        return f"{value:.4g}"
    return f"{amount(value, '%')} of its limit" if name == BoardGoalName.EDGE else f"{value:.0f}"


def _reached(goal: Objective) -> str:
    """The value reached, and the least there is where some of it was given for the second goal."""
    said = goal_words(goal.name, goal.value)
    given = goal.bound < goal.value * (1 - 1e-5)
    return f"{said}, {goal_words(goal.name, goal.bound)} without what is given for the second goal" if given else said


def change_words(key: str, value: str | None) -> str:
    """What a link changes in its brief."""
    return f"no {key}" if value is None else f"{key} = {value}"


def gave_words(one: LinkChoice) -> str:
    """How much more power than alone; nothing where it is the same to within the proof."""
    return "–" if one.gave < 1e-5 else margin_words(one.gave)


def board_proof_words(status: Status, proof: BoardProof, *, timed: bool = True) -> str:
    """What was proved, and how; `timed` False leaves out the seconds, which differ from run to run."""
    claim = {
        Status.OPTIMAL: "no other board does better; every link re-checked alone at every corner",
        Status.FEASIBLE: "the best found is given, not proved best; every link re-checked alone at every corner",
        Status.INFEASIBLE: "no choice of stock values and couplers holds every limit",
        Status.UNKNOWN: "not decided",
    }[status]
    size = f"{proof.columns:,} columns and {proof.rows:,} rows at the end" if proof.columns else "no model needed"
    spent = f", {proof.seconds:.2g} s" if timed else ""
    how = f"{proof.solves} solver calls, {proof.cuts} designs cut{spent}; {proof.solver}"
    return f"{claim} ({size}; {how})."
