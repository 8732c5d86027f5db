"""The best proved design of every coupler of the table, in order; the rejected ones each with the reason."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from optopick.answers import Ranked, Ranking
from optopick.brief import Brief, GoalName
from optopick.coupler import Coupler
from optopick.model.kinds import model_of
from optopick.model.search import best, exists, first_look, refuted
from optopick.model.solver import Clock
from optopick.recheck import review
from optopick.report.labels import check_label
from optopick.result import NOT_CHOSEN, Check, Rejected, Status
from optopick.uses.conflict import Contradicts, minimal_conflict
from optopick.uses.engine import (
    Entry,
    Progress,
    ask_of,
    couplers_of,
    design_of,
    objective,
    quiet,
    rechecked,
    staged,
)
from optopick.uses.why import GOAL_OF, limits_of
from optopick.uses.workers import Processes, Workers

MOST_TOGETHER, MOST_WAYS = 2, 3
"""Limits that are named as rejecting a coupler together, and ways to let it in, at the most."""

NEAREST_BY = {**GOAL_OF, "shortest_pulse": GoalName.DELAY}
"""What the best try without a limit makes least."""


def rank(
    brief: Brief,
    *,
    couplers: Sequence[Coupler] | None = None,
    workers: Workers | None = None,
    progress: Progress = quiet,
    time_limit: float = np.inf,
) -> Ranking:
    """Rank a table. An interrupt (KeyboardInterrupt) ends it early with what is finished, `complete` False.

    time_limit [s] holds for each coupler.
    """
    tasks, rejected = tasks_of(brief, couplers, time_limit)
    return ranking_of((workers or Processes()).map(rank_one, tasks), len(tasks), rejected, progress)


def tasks_of(
    brief: Brief, couplers: Sequence[Coupler] | None = None, time_limit: float = np.inf
) -> tuple[list[Task], list[Rejected]]:
    """What there is to rank, and the couplers that cannot serve whatever the resistors."""
    usable, rejected = couplers_of(brief, couplers)
    return [Task(brief, coupler, time_limit) for coupler in usable], rejected


def ranking_of(
    answers: Iterator[Ranked | Rejected], count: int, rejected: Sequence[Rejected], progress: Progress = quiet
) -> Ranking:
    """The ranking that the answers to `count` tasks make; an interrupt as in `rank`."""
    ranked, others, complete = [], list(rejected), True
    try:
        for done, answer in enumerate(answers):
            progress("couplers ranked", done + 1, count)
            if isinstance(answer, Ranked):
                ranked.append(answer)
            else:
                others.append(answer)
    except KeyboardInterrupt:
        complete = False
    ranked.sort(key=order)
    return Ranking(tuple(ranked), tuple(r for r in others if r.reason != NOT_CHOSEN), complete)


def order(one: Ranked) -> tuple[float, float, str]:
    """What couplers are ranked by."""
    return one.objective.value, one.second.value, one.coupler.part


@dataclass(frozen=True)
class Task:
    """One coupler to rank."""

    brief: Brief
    coupler: Coupler
    time_limit: float

    def __str__(self) -> str:
        return self.coupler.part


def rank_one(task: Task) -> Ranked | Rejected:
    """The best design of one coupler, or why there is none."""
    brief, coupler = task.brief, task.coupler
    entry, clock = Entry(coupler, model_of(brief, coupler)), Clock(task.time_limit)
    found = staged(brief, [entry], clock)
    choice = found.found.choice
    if choice is None or found.second is None:
        if np.isfinite(found.first.bound):
            return Rejected(coupler.part, "out of time: neither found nor ruled out")
        return Rejected(coupler.part, rejection(brief, entry))
    reviewed = rechecked(brief, entry, choice)
    first = objective(brief.goal.minimize, brief, found.first, reviewed)
    second = objective(brief.goal.then, brief, found.second, reviewed)
    return Ranked(coupler, Status.OPTIMAL if found.proved else Status.FEASIBLE, first, second, reviewed)


def rejection(brief: Brief, entry: Entry) -> str:
    """The limits that reject a coupler, and by how much.

    Each limit that alone stands in the way, or two together, by how far the best try without them misses. Where more
    stand in the way: limits that contradict each other whatever the others say, and how far one is then missed.
    """
    names, ruled_out = limits_of(brief), _judge(brief, entry)
    sets: list[tuple[str, ...]] = []
    while len(sets) < MOST_TOGETHER:
        dropped = [found[0] for found in sets]
        found = minimal_conflict(names, frozenset(dropped), ruled_out)
        if found is None:
            break
        alone = [said for name in found if (said := _without(brief, entry, [*dropped, name]))]
        if alone:
            return "; or ".join(alone[:MOST_WAYS])
        sets.append(found)
    return _at_least(brief, entry, sets[0]) + ", and more"


def _at_least(brief: Brief, entry: Entry, conflict: Sequence[str]) -> str:
    """How far a limit is missed where only those that it contradicts are kept beside it."""
    kept = " and ".join(check_label(name) for name in conflict[1:])
    dropped = frozenset(limits_of(brief)) - frozenset(conflict[1:])
    goal, ask = NEAREST_BY.get(conflict[0], brief.goal.minimize), ask_of(brief, dropped)
    look = first_look(entry.model, goal, ask)
    if look.choice is None and not np.isinf(look.bound):
        look = best(entry.model, goal, ask, Clock())
    if look.choice is None:
        missed = check_label(conflict[0]) + ("" if kept else " never met")
    else:
        reviewed = review(brief, entry.coupler, design_of(brief, entry, look.choice))
        missed = _miss(next(check for check in reviewed.checks if check.name == conflict[0]))
    return f"{missed} with {kept} kept" if kept else missed


def _judge(brief: Brief, entry: Entry) -> Contradicts:
    """Whether a coupler has no design without some limits: by ranges, or by the solver where ranges do not tell.

    That it has none with all of them is known: it would not be rejected.
    """
    if refuted(entry.model, ask_of(brief)):
        return lambda dropped: not dropped or refuted(entry.model, ask_of(brief, dropped))
    return lambda dropped: not dropped or exists(entry.model, ask_of(brief, dropped), Clock()) is False


def _without(brief: Brief, entry: Entry, names: Sequence[str]) -> str:
    """How far the best try without some limits misses them; empty where none is found without them either."""
    goal = NEAREST_BY.get(names[-1], brief.goal.minimize)
    look = first_look(entry.model, goal, ask_of(brief, frozenset(names)))
    if look.choice is None:
        return ""
    reviewed = review(brief, entry.coupler, design_of(brief, entry, look.choice))
    return " and ".join(_miss(check) for check in reviewed.failing)


def _miss(check: Check) -> str:
    if not np.isfinite(check.margin):
        return f"{check_label(check.name)} never met"
    return f"{check_label(check.name)} {-100 * check.margin:.0f} % {'over' if check.sense == '<=' else 'short'}"
