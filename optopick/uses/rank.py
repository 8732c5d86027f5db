"""The best proved design of every coupler of the table, in order; the rejected ones each with the reason."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from optopick.answers import Ranked, Ranking
from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.model.kinds import LinkModel, model_of
from optopick.model.search import exists, first_look
from optopick.model.solver import Clock
from optopick.recheck import review
from optopick.report.labels import check_label
from optopick.result import NOT_CHOSEN, Check, Rejected, Status
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
from optopick.uses.why import limits_of
from optopick.uses.workers import Processes, Workers


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
    usable, rejected = couplers_of(brief, couplers)
    ranked: list[Ranked] = []
    complete = True
    tasks = [Task(brief, coupler, time_limit) for coupler in usable]
    try:
        for done, answer in enumerate((workers or Processes()).map(rank_one, tasks)):
            progress("couplers ranked", done + 1, len(tasks))
            if isinstance(answer, Ranked):
                ranked.append(answer)
            else:
                rejected.append(answer)
    except KeyboardInterrupt:
        complete = False
    ranked.sort(key=lambda one: (one.objective.value, one.second.value, one.coupler.part))
    return Ranking(tuple(ranked), tuple(r for r in rejected if r.reason != NOT_CHOSEN), complete)


@dataclass(frozen=True)
class Task:
    """One coupler to rank."""

    brief: Brief
    coupler: Coupler
    time_limit: float


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
    """The limits that reject a coupler, and by how much: each that alone stands in the way, else the first pair."""
    alone = [said for name in limits_of(brief) if (said := _without(brief, entry, frozenset({name})))]
    if alone:
        return "; or ".join(alone)
    named = [check_label(name) for name in _standing(brief, entry)]
    return named[0] if len(named) == 1 else "no single limit: " + ", ".join(named) + " together"


def _without(brief: Brief, entry: Entry, names: frozenset[str]) -> str:
    """How far the best try without a limit misses it; empty where the coupler fails without it too."""
    ask = ask_of(brief, names)
    look = first_look(entry.model, brief.goal.minimize, ask)
    if look.choice is None:
        return ""
    reviewed = review(brief, entry.coupler, design_of(brief, entry, look.choice))
    return "; ".join(_miss(check) for check in reviewed.failing)


def _miss(check: Check) -> str:
    return f"{check_label(check.name)} {-100 * check.margin:.0f} % {'over' if check.sense == '<=' else 'short'}"


def _standing(brief: Brief, entry: Entry) -> Iterator[str]:
    """A minimal set of limits that reject the coupler together (deletion filter by ranges)."""
    dropped: frozenset[str] = frozenset()
    names = limits_of(brief)
    for name in names:
        if _ruled_out(entry.model, brief, dropped | {name}):
            dropped = dropped | {name}
    return (name for name in names if name not in dropped)


def _ruled_out(model: LinkModel, brief: Brief, dropped: frozenset[str]) -> bool:
    return exists(model, ask_of(brief, dropped), Clock()) is False
