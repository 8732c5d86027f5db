"""The best design of a whole coupler table for one brief: found, proved, and checked again from physics."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from pathlib import Path

import numpy as np

from optopick.brief import Brief
from optopick.cautions import cautions
from optopick.coupler import Coupler
from optopick.model.box import Choice
from optopick.model.solver import Clock, solver_name
from optopick.read_brief import read_brief
from optopick.result import Proof, Rejected, Result, Status
from optopick.uses.engine import Entry, Progress, Staged, entries_of, objective, quiet, rechecked, staged


def pick(
    brief: Brief | Path | str,
    *,
    time_limit: float = np.inf,
    progress: Progress = quiet,
    couplers: Sequence[Coupler] | None = None,
) -> Result:
    """The best design for a brief (or the path of one), with its proof.

    time_limit [s]: past it the best design so far is given with the bound shown, status "feasible", or "unknown"
    where there is none. couplers: instead of the brief's table. Raises InputError for wrong input and
    DisagreementError where the re-check contradicts the model.
    """
    return alternatives(brief, 1, time_limit=time_limit, progress=progress, couplers=couplers)[0]


def alternatives(
    brief: Brief | Path | str,
    count: int,
    *,
    differ: str = "coupler",
    time_limit: float = np.inf,
    progress: Progress = quiet,
    couplers: Sequence[Coupler] | None = None,
) -> list[Result]:
    """The `count` best designs in order, each proved the best once those before it are ruled out.

    differ "coupler": each with another coupler; "value": each with some other value. The list ends with the first
    answer that has no design, unless it has another before it.
    """
    if not isinstance(brief, Brief):
        brief = read_brief(Path(brief))
    entries, rejected = entries_of(brief, couplers)
    results: list[Result] = []
    without: list[tuple[str, Choice]] = []
    while len(results) < count:
        clock = Clock(time_limit)
        found = staged(brief, entries, clock, progress, without)
        result = result_of(brief, entries, found, rejected, clock)
        if results and result.review is None:
            break
        results.append(result)
        if found.found.entry is None or found.found.choice is None:
            break
        entries, without = _besides(entries, without, found.found.entry, found.found.choice, differ)
    return results


def _besides(
    entries: list[Entry], without: list[tuple[str, Choice]], entry: Entry, choice: Choice, differ: str
) -> tuple[list[Entry], list[tuple[str, Choice]]]:
    """What is left once a design is taken."""
    if differ == "coupler":
        return [other for other in entries if other is not entry], without
    return entries, [*without, (entry.coupler.part, choice)]


def result_of(
    brief: Brief, entries: Collection[Entry], found: Staged, rejected: Sequence[Rejected], clock: Clock
) -> Result:
    """The answer: re-checked where there is a design, with the status that the proof supports."""
    proof = Proof(
        combinations=sum(int(np.prod(entry.model.sizes)) for entry in entries),
        solves=clock.solves,
        decided_by_ranges=clock.by_ranges,
        seconds=clock.spent,
        solver=solver_name(),
    )
    warned, last = cautions(brief), found.found
    if last.entry is None or last.choice is None or found.second is None:
        status = Status.INFEASIBLE if np.isinf(last.bound) else Status.UNKNOWN
        return Result(status, None, None, None, (), tuple(rejected), proof, warned)
    reviewed = rechecked(brief, last.entry, last.choice)
    return Result(
        status=Status.OPTIMAL if found.proved else Status.FEASIBLE,
        objective=objective(brief.goal.minimize, brief, found.first, reviewed),
        second=objective(brief.goal.then, brief, found.second, reviewed),
        review=reviewed,
        assumed=last.entry.coupler.assumed,
        rejected=tuple(rejected),
        proof=proof,
        cautions=warned,
    )
