"""The best design of a whole coupler table for one brief: found, proved, and checked again from physics."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from optopick.brief import Brief, GoalName
from optopick.cautions import cautions
from optopick.coupler import Coupler, Kind
from optopick.errors import DisagreementError
from optopick.model.rows import Ask
from optopick.model.box import Choice
from optopick.model.search import STEP, Found, best, first_look
from optopick.model.solver import Clock, solver_name
from optopick.model.transistor import TransistorModel
from optopick.read_brief import read_brief
from optopick.read_couplers import read_couplers
from optopick.recheck import review
from optopick.result import NOT_CHOSEN, Design, Objective, Proof, Rejected, Result, Review, Status

Progress = Callable[[str, int, int], None]
"""Told the stage in words, and how many of how many couplers it has done."""

AGREE = 1e-6
"""Share by which the model's goal and the re-check's may differ: rounding."""


@dataclass(frozen=True)
class Entry:
    """A coupler that may serve, and its model."""

    coupler: Coupler
    model: TransistorModel


@dataclass(frozen=True)
class Best:
    """The best combination over all couplers, or none; `value` of the goal, `bound` shown."""

    entry: Entry | None
    choice: Choice | None
    value: float
    bound: float


def pick(
    brief: Brief | Path | str,
    *,
    time_limit: float = np.inf,
    progress: Progress | None = None,
    couplers: Sequence[Coupler] | None = None,
) -> Result:
    """The best design for a brief (or the path of one), with its proof.

    time_limit [s]: past it the best design so far is given with the bound shown, status "feasible", or "unknown"
    where there is none. couplers: instead of the brief's table. Raises InputError for wrong input and
    DisagreementError where the re-check contradicts the model.
    """
    if not isinstance(brief, Brief):
        brief = read_brief(Path(brief))
    entries, rejected = candidates_of(brief, couplers)
    clock, report = Clock(time_limit), progress or (lambda stage, done, total: None)
    ask = ask_of(brief)
    first = over_all(entries, brief.goal.minimize, ask, clock, report)
    second, found = None, first
    if first.choice is not None:
        relaxed = ask.limited(brief.goal.minimize, first.value * (1 + brief.goal.give) * (1 + STEP))
        second = over_all(entries, brief.goal.then, relaxed, clock, report, start=first)
        found = second
    proof = Proof(
        combinations=sum(int(np.prod(entry.model.sizes)) for entry in entries),
        solves=clock.solves,
        decided_by_ranges=clock.by_ranges,
        seconds=clock.spent,
        solver=solver_name(),
    )
    return _result(brief, first, second, found, rejected, proof)


def candidates_of(brief: Brief, couplers: Sequence[Coupler] | None = None) -> tuple[list[Entry], list[Rejected]]:
    """The couplers of the brief's table that may serve, and those that cannot, with the reason."""
    rejected: list[Rejected] = []
    if couplers is None:
        table = read_couplers(brief.couplers.table)
        couplers = table.couplers
        rejected = [Rejected(aside.part, aside.reason) for aside in table.set_aside]
    entries = []
    for coupler in couplers:
        reason = unusable(brief, coupler)
        if reason:
            rejected.append(Rejected(coupler.part, reason))
            continue
        entries.append(Entry(coupler, TransistorModel.of(brief, coupler)))
    return entries, rejected


def unusable(brief: Brief, coupler: Coupler) -> str:
    """Why a coupler cannot serve this brief whatever the resistors; empty where it may."""
    choice, needed, barrier = brief.couplers, brief.limits.isolation, coupler.barrier
    if choice.only is not None and coupler.part not in choice.only:
        return NOT_CHOSEN
    if coupler.channels < choice.at_least_channels:
        return f"{coupler.channels} channels, {choice.at_least_channels} needed"
    if coupler.kind is Kind.LOGIC:
        return "logic outputs are not supported yet"
    for name in ("withstand", "working", "creepage"):
        limit, has = getattr(needed, name), getattr(barrier, name)
        if limit is not None and (has is None or has < limit):
            return f"{name}: the table has no figure" if has is None else f"{name} {has:g} below {limit:g}"
    return ""


def ask_of(brief: Brief) -> Ask:
    """The brief's limits as the model asks them: guard taken out, the shortest pulse a limit on the delays."""
    limits, guard = brief.limits, brief.limits.timing_guard
    return Ask(
        edge=_or_none(limits.edge_time) / guard,
        delay=min(_or_none(limits.delay), brief.signal.shortest_pulse) / guard,
        distortion=_or_none(limits.distortion) / guard,
        power=_or_none(limits.power),
    )


def _or_none(limit: float | None) -> float:
    return np.inf if limit is None else limit


def over_all(
    entries: Sequence[Entry], goal: GoalName, ask: Ask, clock: Clock, report: Progress, start: Best | None = None
) -> Best:
    """The least goal over all couplers: a first look at each for a good design, then a proof for each."""
    found = _carried(start, goal)
    for entry in entries:
        look = first_look(entry.model, goal, ask)
        if look is not None and look[1] < found.value:
            found = Best(entry, look[0], look[1], 0.0)
    bound = np.inf
    for done, entry in enumerate(entries):
        report(f"least {goal.value}", done, len(entries))
        better: Found = best(entry.model, goal, ask, clock, found.value)
        bound = min(bound, better.bound)
        if better.choice is not None:
            found = Best(entry, better.choice, better.value, 0.0)
    report(f"least {goal.value}", len(entries), len(entries))
    return replace(found, bound=min(bound, found.value) if entries else np.inf)


def _carried(start: Best | None, goal: GoalName) -> Best:
    """The design of the stage before, valued by this stage's goal."""
    if start is None or start.entry is None or start.choice is None:
        return Best(None, None, np.inf, np.inf)
    index = tuple(np.array([k]) for k in start.choice)
    return replace(start, value=float(start.entry.model.scores(*index).of(goal)[0]))


def design_of(entry: Entry, choice: Choice) -> Design:
    """A combination as a design, in ohms."""
    x = entry.model.candidates
    i, j, m = choice
    shunt, base = float(x.led.r_shunt[i]), float(x.base.r_be[m])
    return Design(
        coupler=entry.coupler.part,
        r_led=float(x.led.r_led[i]),
        r_load=float(x.load.r_load[j]),
        r_be=base if np.isfinite(base) else None,
        r_shunt=shunt if np.isfinite(shunt) else None,
    )


def _result(
    brief: Brief, first: Best, second: Best | None, found: Best, rejected: list[Rejected], proof: Proof
) -> Result:
    warned = cautions(brief)
    if found.entry is None or found.choice is None:
        status = Status.INFEASIBLE if np.isinf(found.bound) else Status.UNKNOWN
        return Result(status, None, None, None, (), tuple(rejected), proof, warned)
    reviewed = rechecked(brief, found.entry, found.choice)
    objectives = [
        _objective(goal, brief, stage, reviewed)
        for goal, stage in ((brief.goal.minimize, first), (brief.goal.then, second))
        if stage is not None
    ]
    proved = all(objective.gap <= 4 * STEP + brief.goal.give for objective in objectives)
    proved = proved and all(stage.bound >= stage.value * (1 - 4 * STEP) for stage in (first, second) if stage)
    status = Status.OPTIMAL if proved else Status.FEASIBLE
    assumed = found.entry.coupler.assumed
    return Result(status, objectives[0], objectives[1], reviewed, assumed, tuple(rejected), proof, warned)


def _objective(goal: GoalName, brief: Brief, stage: Best, reviewed: Review) -> Objective:
    guard = 1.0 if goal is GoalName.POWER else brief.limits.timing_guard
    return Objective(goal.value, goal_of(reviewed, goal), stage.bound * guard, "W" if goal is GoalName.POWER else "s")


def goal_of(reviewed: Review, goal: GoalName) -> float:
    """A goal's value in a review, guard included."""
    timing = reviewed.timing
    return {
        GoalName.EDGE_TIME: max(timing.edge_on, timing.edge_off),
        GoalName.DELAY: max(timing.delay_on, timing.delay_off),
        GoalName.DISTORTION: timing.distortion,
        GoalName.POWER: reviewed.power.worst,
    }[goal]


def rechecked(brief: Brief, entry: Entry, choice: Choice) -> Review:
    """The review of a combination the model found; raises DisagreementError where it contradicts the model."""
    reviewed = review(brief, entry.coupler, design_of(entry, choice))
    if not reviewed.passed:
        names = ", ".join(f"{c.name} {c.value:.9g} against {c.limit:.9g} ({c.corner})" for c in reviewed.failing)
        raise DisagreementError(f"{reviewed.design}: the model accepts what the re-check refuses: {names}")
    scores = entry.model.scores(*(np.array([k]) for k in choice))
    for goal in GoalName:
        guard = 1.0 if goal is GoalName.POWER else brief.limits.timing_guard
        modelled, checked = float(scores.of(goal)[0]) * guard, goal_of(reviewed, goal)
        if not np.isclose(modelled, checked, rtol=AGREE, atol=0.0):
            told = f"{goal.value} is {modelled:.9g} in the model, {checked:.9g} again"
            raise DisagreementError(f"{reviewed.design}: {told}")
    return reviewed
