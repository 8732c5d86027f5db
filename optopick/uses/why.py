"""Why a brief has no design: which limits contradict each other, and the least that each must give.

For a brief that has a design: what binds, and what a step of each limit would buy.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from optopick.answers import Change, Why, Worth
from optopick.brief import Brief, GoalName
from optopick.coupler import Coupler
from optopick.model.search import exists
from optopick.model.solver import Clock
from optopick.result import Result, Status
from optopick.uses.conflict import minimal_conflict
from optopick.uses.engine import BARRIER, Entry, Progress, ask_of, entries_of, guard_of, over_all, quiet
from optopick.uses.limits import Limit, finer_stock, movable_limits
from optopick.uses.pick import pick

MOST_SETS = 6
"""How many contradicting sets are looked for at the most."""

STEP_SHARE = 0.1
"""The step of a limit whose worth is told for a brief that has a design."""

GOAL_OF = {
    "edge_time": GoalName.EDGE_TIME,
    "delay": GoalName.DELAY,
    "distortion": GoalName.DISTORTION,
    "power": GoalName.POWER,
}

HALVINGS, NEAR = 40, 0.01
"""Halvings at the most of the way to the least change of a limit, where no goal gives it exactly, and the share of that
change at which they end."""

ROOM = 1e-6
"""Share that a limit is set above the least value of its goal, for rounding."""

ALWAYS = ("led_current", "led_power", "led_dark", "output_low", "output_high", "shortest_pulse")
BY_KIND = (
    "led_current_low",
    "led_current_high",
    "deliverable_current",
    "collector_current",
    "collector_voltage",
    "output_power",
    "total_power",
    "r_led_power",
    "r_led_voltage",
    "r_load_power",
    "r_load_voltage",
    "switching_current",
    "sink_current",
    "supply_low",
    "supply_high",
)


def why(
    brief: Brief, *, couplers: Sequence[Coupler] | None = None, time_limit: float = np.inf, progress: Progress = quiet
) -> Why:
    """Explain a brief. Conflict sets are minimal: no part of one contradicts itself; every change is solved again."""
    clock = Clock(time_limit)
    world = _World(couplers, clock)
    if world.feasible(brief):
        result = pick(brief, couplers=couplers, time_limit=clock.left)
        return Why(result.status, (), (), True, result, tuple(_worths(brief, couplers, result, clock, progress)))
    if clock.out:
        return Why(Status.UNKNOWN, (), (), False, None, ())
    conflicts = _conflicts(world, brief, progress)
    changes = tuple(_changes(world, brief, progress))
    return Why(Status.INFEASIBLE, tuple(conflicts), changes, not clock.out and len(conflicts) < MOST_SETS, None, ())


class _World:
    """Whether a design exists, for briefs and for limits left out."""

    def __init__(self, couplers: Sequence[Coupler] | None, clock: Clock) -> None:
        self.couplers, self.clock = couplers, clock
        self.lucky: str = ""

    def entries(self, brief: Brief, dropped: frozenset[str]) -> list[Entry]:
        """The couplers that may serve; the one that served last comes first."""
        found = entries_of(brief, self.couplers, dropped)[0]
        return sorted(found, key=lambda entry: entry.coupler.part != self.lucky)

    def feasible(self, brief: Brief, dropped: frozenset[str] = frozenset(), entries: Sequence[Entry] = ()) -> bool:
        """Whether any coupler has a design. Out of time counts as having one, so that no conflict is claimed."""
        ask = ask_of(brief, dropped)
        for entry in entries or self.entries(brief, dropped):
            if self.clock.out:
                return True
            if exists(entry.model, ask, self.clock) is not False:
                self.lucky = entry.coupler.part
                return True
        return False


def limits_of(brief: Brief) -> list[str]:
    """The names of all checks that may take part in a conflict for this brief."""
    limits, drive = brief.limits, brief.drive
    stated = [name for name in ("ctr_margin", *GOAL_OF) if getattr(limits, name) is not None]
    stated += ["driver_current"] * (drive.max_current is not None)
    stated += ["input_current"] * (drive.on_current_min > 0)
    stated += ["reverse_voltage"] * (drive.reverse > 0)
    stated += ["r_shunt_power"] * (brief.stock.r_shunt is not None)
    stated += ["r_be_power"] * (brief.stock.r_be is not None)
    stated += [check for check, name in BARRIER.items() if getattr(limits.isolation, name) is not None]
    return [*stated, *ALWAYS, *BY_KIND]


def _conflicts(world: _World, brief: Brief, progress: Progress) -> list[tuple[str, ...]]:
    """Minimal contradicting sets of limits, the next sought with a limit of each one left out."""
    names = limits_of(brief)
    found: list[tuple[str, ...]] = []
    waiting: list[frozenset[str]] = [frozenset()]
    seen: set[frozenset[str]] = set()
    while waiting and len(found) < MOST_SETS and not world.clock.out:
        out = waiting.pop(0)
        if out in seen:
            continue
        seen.add(out)
        progress("limits that contradict each other", len(found), MOST_SETS)
        known = next((one for one in found if not out & set(one)), None)
        conflict = known or _filtered(world, brief, names, out)
        if conflict is None:
            continue
        if conflict not in found:
            found.append(conflict)
        waiting.extend(out | {name} for name in conflict)
    return sorted(found, key=len)


def _filtered(world: _World, brief: Brief, names: Sequence[str], out: frozenset[str]) -> tuple[str, ...] | None:
    """A minimal contradicting set among the limits not in `out`; None where there is none, or no time."""
    found = minimal_conflict(names, out, lambda dropped: not world.feasible(brief, dropped))
    return None if world.clock.out else found


def _changes(world: _World, brief: Brief, progress: Progress) -> Iterator[Change]:
    """The least change of each limit alone that makes a design exist, verified by solving again."""
    movable = movable_limits(brief)
    for done, limit in enumerate(movable):
        progress("least change of each limit", done, len(movable))
        if world.clock.out:
            return
        needed = _by_goal(world, brief, limit) if limit.check in GOAL_OF else _by_halving(world, brief, limit)
        if needed is not None and world.feasible(limit.moved(brief, needed)):
            yield Change(limit.key, limit.unit, limit.value, needed)
    for name in ("r_led", "r_load", "r_be", "r_shunt"):
        for series, finer in finer_stock(brief, name):
            if world.feasible(finer):
                yield Change(f"stock.{name}", "", getattr(brief.stock, name).described.split(",")[0], series)
                break


def _by_goal(world: _World, brief: Brief, limit: Limit) -> float | None:
    """The least value of a goal with its own limit left out: exactly what the limit must become."""
    goal, dropped = GOAL_OF[limit.check], frozenset({limit.check})
    best = over_all(world.entries(brief, dropped), goal, ask_of(brief, dropped), world.clock)
    return None if best.choice is None else best.value * guard_of(brief, goal) * (1 + ROOM)


def _by_halving(world: _World, brief: Brief, limit: Limit) -> float | None:
    """The value nearest to the present one at which a design exists, to a hundredth of the way; None if none does."""
    if not world.feasible(limit.moved(brief, limit.far)):
        return None
    fails, holds = limit.value, limit.far
    for _ in range(HALVINGS):
        if abs(holds - fails) <= NEAR * abs(holds - limit.value):
            break
        middle = _between(fails, holds)
        if world.feasible(limit.moved(brief, middle)):
            holds = middle
        else:
            fails = middle
    return holds


def _between(a: float, b: float) -> float:
    """Half way: by ratio where both are positive and far apart, else by difference."""
    return float(np.sqrt(a * b)) if min(a, b) > 0 and max(a, b) > 2 * min(a, b) else (a + b) / 2


def _worths(
    brief: Brief, couplers: Sequence[Coupler] | None, found: Result, clock: Clock, progress: Progress
) -> Iterator[Worth]:
    """What each limit, made easier by a tenth, does to the first goal."""
    movable = movable_limits(brief)
    for done, limit in enumerate(movable):
        progress("worth of each limit", done, len(movable))
        if clock.out or found.objective is None:
            return
        stepped = _eased(limit)
        result = pick(limit.moved(brief, stepped), couplers=couplers, time_limit=clock.left)
        if result.objective and result.objective.value < found.objective.value * (1 - 1e-5):
            yield Worth(limit.key, limit.unit, limit.value, stepped, result.objective.value)


def _eased(limit: Limit) -> float:
    """The limit a tenth easier; a temperature ten kelvin."""
    if limit.unit == "degC":
        return limit.value + (10.0 if limit.easier_up else -10.0)
    return limit.value * (1 + STEP_SHARE if limit.easier_up else 1 - STEP_SHARE)
