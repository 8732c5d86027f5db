"""What every use is made of: the couplers that may serve, the best over them in two goals, and the re-check."""

from __future__ import annotations

from collections.abc import Callable, Collection, Sequence
from dataclasses import dataclass, replace

import numpy as np

from optopick.brief import Brief, GoalName, OutputCircuit
from optopick.coupler import Coupler, Kind
from optopick.errors import DisagreementError
from optopick.model.box import Choice
from optopick.model.kinds import LinkModel, model_of
from optopick.model.rows import Ask
from optopick.model.search import STEP, Search, shown
from optopick.model.solver import Clock
from optopick.read_couplers import read_couplers
from optopick.recheck import review
from optopick.result import NOT_CHOSEN, Design, Objective, Rejected, Review, goal_of
from optopick.units import format_quantity

Progress = Callable[[str, int, int], None]
"""Told the stage in words, and how many of how many it has done."""

AGREE = 1e-6
"""Share by which the model's goal and the re-check's may differ: rounding."""

BARRIER = {"withstand": "withstand", "working_voltage": "working", "creepage": "creepage"}
"""Isolation checks and the fields of Barrier and Isolation that they compare."""


@dataclass(frozen=True)
class Entry:
    """A coupler that may serve, and its model."""

    coupler: Coupler
    model: LinkModel


@dataclass(frozen=True)
class Best:
    """The best combination over all couplers, or none; `value` of the goal, `bound` shown."""

    entry: Entry | None
    choice: Choice | None
    value: float
    bound: float


@dataclass(frozen=True)
class Staged:
    """The least first goal, and the least second goal within `give` of it (None where there is no design)."""

    first: Best
    second: Best | None

    @property
    def found(self) -> Best:
        """The design to give."""
        return self.second or self.first

    @property
    def proved(self) -> bool:
        """Whether both goals are proved least."""
        stages = [self.first, *([self.second] if self.second else [])]
        return all(stage.bound >= stage.value * (1 - 4 * STEP) for stage in stages)


def quiet(stage: str, done: int, total: int) -> None:
    """Progress that nobody asked for."""


def entries_of(
    brief: Brief, couplers: Sequence[Coupler] | None = None, dropped: Collection[str] = ()
) -> tuple[list[Entry], list[Rejected]]:
    """The couplers of the brief's table (or those given) that may serve, and the others with the reason."""
    usable, rejected = couplers_of(brief, couplers, dropped)
    return [Entry(coupler, model_of(brief, coupler)) for coupler in usable], rejected


def couplers_of(
    brief: Brief, couplers: Sequence[Coupler] | None = None, dropped: Collection[str] = ()
) -> tuple[list[Coupler], list[Rejected]]:
    """The same without their models."""
    rejected: list[Rejected] = []
    if couplers is None:
        table = read_couplers(brief.couplers.table)
        couplers = table.couplers
        rejected = [Rejected(aside.part, aside.reason) for aside in table.set_aside]
    usable = []
    for coupler in couplers:
        reason = unusable(brief, coupler, dropped)
        if reason:
            rejected.append(Rejected(coupler.part, reason))
        else:
            usable.append(coupler)
    return usable, rejected


def unusable(brief: Brief, coupler: Coupler, dropped: Collection[str] = ()) -> str:
    """Why a coupler cannot serve this brief whatever the resistors; empty where it may."""
    choice = brief.couplers
    if choice.only is not None and coupler.part not in choice.only:
        return NOT_CHOSEN
    if choice.kinds is not None and coupler.kind.value not in choice.kinds:
        return NOT_CHOSEN
    if coupler.channels < choice.at_least_channels:
        return f"{coupler.channels} channels, {choice.at_least_channels} needed"
    if coupler.kind is Kind.LOGIC and brief.output.circuit is OutputCircuit.EMITTER_LOAD:
        return "a logic output pulls low only: it needs a pull-up"
    return _too_thin(brief, coupler, dropped) or _out_of_curve(brief, coupler)


def _too_thin(brief: Brief, coupler: Coupler, dropped: Collection[str]) -> str:
    """What the coupler's barrier lacks."""
    for check, name in BARRIER.items():
        limit, has = getattr(brief.limits.isolation, name), getattr(coupler.barrier, name)
        if check in dropped or limit is None:
            continue
        if has is None:
            return f"{name}: the table has no figure"
        unit = "m" if check == "creepage" else "V"
        if has < limit:
            return f"{name} {format_quantity(has, unit)} below {format_quantity(limit, unit)}"
    return ""


def _out_of_curve(brief: Brief, coupler: Coupler) -> str:
    """Whether the brief's temperatures leave the coupler's CTR curve, which is not extrapolated."""
    span, transfer = brief.environment.temperature, coupler.transfer
    if transfer is None or (transfer.curve_t[0] <= span.low and span.high <= transfer.curve_t[-1]):
        return ""
    return f"its CTR is known from {transfer.curve_t[0]:g} to {transfer.curve_t[-1]:g} °C only"


def ask_of(brief: Brief, dropped: Collection[str] = ()) -> Ask:
    """The brief's limits as the model asks them: guard taken out, the shortest pulse a limit on the delays."""
    limits, guard = brief.limits, brief.limits.timing_guard

    def limit(name: str, value: float | None) -> float:
        return np.inf if value is None or name in dropped else value

    return Ask(
        edge=limit("edge_time", limits.edge_time) / guard,
        delay=min(limit("delay", limits.delay), limit("shortest_pulse", brief.signal.shortest_pulse)) / guard,
        distortion=limit("distortion", limits.distortion) / guard,
        power=limit("power", limits.power),
        dropped=frozenset(dropped),
    )


def guard_of(brief: Brief, goal: GoalName) -> float:
    """What the model's figure of a goal is multiplied by to give the reported one."""
    return 1.0 if goal is GoalName.POWER else brief.limits.timing_guard


def staged(
    brief: Brief,
    entries: Sequence[Entry],
    clock: Clock,
    report: Progress = quiet,
    without: Collection[tuple[str, Choice]] = (),
) -> Staged:
    """The least first goal over all couplers, then the least second goal within `give` of it."""
    goal, ask = brief.goal, ask_of(brief)
    floors: dict[str, float] = {}
    first = over_all(entries, goal.minimize, ask, clock, report, without=without, floors=floors)
    if first.choice is None:
        return Staged(first, None)
    relaxed = ask.limited(goal.minimize, first.value * (1 + goal.give) * (1 + STEP))
    left = [entry for entry in entries if np.isfinite(floors.get(entry.coupler.part, 0.0))]
    return Staged(first, over_all(left, goal.then, relaxed, clock, report, start=first, without=without))


def over_all(
    entries: Sequence[Entry],
    goal: GoalName,
    ask: Ask,
    clock: Clock,
    report: Progress = quiet,
    start: Best | None = None,
    without: Collection[tuple[str, Choice]] = (),
    floors: dict[str, float] | None = None,
) -> Best:
    """The least goal over all couplers: a first look at each for a good design, then a proof for each.

    floors: the goal below which each part is known to have no design, for who asks again within tighter limits; kept
    up to date. Couplers that cannot beat the best so far are passed over.
    """
    floors = {} if floors is None else floors
    found = _carried(start, goal)
    searches: dict[str, Search] = {}

    def search_of(entry: Entry) -> Search:
        part = entry.coupler.part
        if part not in searches:
            left_out = [choice for named, choice in without if named == part]
            searches[part] = Search(entry.model, goal, ask, clock, left_out)
        return searches[part]

    for entry in sorted(entries, key=lambda entry: floors.get(entry.coupler.part, 0.0)):
        if floors.get(entry.coupler.part, 0.0) >= found.value * (1 - STEP):
            continue
        if clock.out and found.choice is not None:
            break
        look = search_of(entry).look(found.value)
        floors[entry.coupler.part] = max(floors.get(entry.coupler.part, 0.0), look.bound)
        if look.choice is not None:
            found = Best(entry, look.choice, look.value, 0.0)
    bound, unfinished = np.inf, {}
    for done, entry in enumerate(entries):
        part = entry.coupler.part
        report(f"least {goal.value}", done, len(entries))
        if floors.get(part, 0.0) >= found.value * (1 - STEP):
            bound = min(bound, floors[part])
            clock.by_ranges += 1
            continue
        search = search_of(entry)
        better = search.run(found.value)
        if search.unfinished:
            unfinished[part] = search
        else:
            floors[part] = max(floors.get(part, 0.0), better.bound)
            bound = min(bound, better.bound)
        if better.choice is not None:
            found = Best(entry, better.choice, better.value, 0.0)
    report(f"least {goal.value}", len(entries), len(entries))
    if unfinished:
        least = shown(list(unfinished.values()), found.value, clock)
        floors |= {part: max(floors.get(part, 0.0), least) for part in unfinished}
        bound = min(bound, *(floors[part] for part in unfinished))
    return replace(found, bound=min(bound, found.value) if entries else np.inf)


def _carried(start: Best | None, goal: GoalName) -> Best:
    """The design of the stage before, valued by this stage's goal."""
    if start is None or start.entry is None or start.choice is None:
        return Best(None, None, np.inf, np.inf)
    return replace(start, value=float(scores_of(start.entry, start.choice, goal)))


def scores_of(entry: Entry, choice: Choice, goal: GoalName) -> float:
    """The model's figure of a goal for one combination, guard taken out."""
    return float(entry.model.scores(*(np.array([k]) for k in choice)).of(goal)[0])


def design_of(brief: Brief, entry: Entry, choice: Choice) -> Design:
    """A combination as a design, in ohms."""
    r_led, pieces, shunt, r_load, base = entry.model.values(*choice)
    return Design(
        coupler=entry.coupler.part,
        r_led=r_led,
        r_load=r_load,
        r_be=base if np.isfinite(base) else None,
        r_shunt=shunt if np.isfinite(shunt) else None,
        pieces=pieces,
        reverse_diode=brief.drive.reverse_diode and brief.drive.reverse > entry.coupler.led.v_r_max,
    )


def objective(goal: GoalName, brief: Brief, stage: Best, reviewed: Review) -> Objective:
    """A goal's value from the re-check, and the bound that the search showed."""
    unit = "W" if goal is GoalName.POWER else "s"
    return Objective(goal.value, goal_of(reviewed, goal), stage.bound * guard_of(brief, goal), unit)


def rechecked(brief: Brief, entry: Entry, choice: Choice) -> Review:
    """The review of a combination the model found; raises DisagreementError where it contradicts the model."""
    reviewed = review(brief, entry.coupler, design_of(brief, entry, choice))
    if not reviewed.passed:
        names = ", ".join(f"{c.name} {c.value:.9g} against {c.limit:.9g} ({c.corner})" for c in reviewed.failing)
        raise DisagreementError(f"{reviewed.design}: the model accepts what the re-check refuses: {names}")
    for goal in GoalName:
        modelled, checked = scores_of(entry, choice, goal) * guard_of(brief, goal), goal_of(reviewed, goal)
        if not np.isclose(modelled, checked, rtol=AGREE, atol=0.0):
            told = f"{goal.value} is {modelled:.9g} in the model, {checked:.9g} again"
            raise DisagreementError(f"{reviewed.design}: {told}")
    return reviewed
