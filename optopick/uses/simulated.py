"""`pick` checked by simulation: a design whose simulated times break a limit is cut, and the search goes on."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.model.box import Choice
from optopick.model.solver import Clock
from optopick.result import Result, Status
from optopick.simulate.design import Simulation, simulate_all
from optopick.uses.engine import Progress, entries_of, quiet, staged
from optopick.uses.pick import result_of

MOST_CUT = 20
"""Designs that simulation may refute before the search gives up."""


def pick_simulated(
    brief: Brief,
    *,
    time_limit: float = np.inf,
    progress: Progress = quiet,
    couplers: Sequence[Coupler] | None = None,
) -> tuple[Result, Simulation | None, int]:
    """The best design that simulation does not refute, its simulation, and how many better ones it refuted.

    The proof then speaks of the designs that are left. None for the simulation where there is no design.
    """
    entries, rejected = entries_of(brief, couplers)
    clock, without = Clock(time_limit), list[tuple[str, Choice]]()
    while True:
        found = staged(brief, entries, clock, progress, without)
        result = result_of(brief, entries, found, rejected, clock)
        entry, choice = found.found.entry, found.found.choice
        if result.design is None or entry is None or choice is None:
            return result, None, len(without)
        simulation = simulate_all(brief, entry.coupler, result.design)
        if not refuted(brief, simulation):
            return result, simulation, len(without)
        without.append((entry.coupler.part, choice))
        if len(without) > MOST_CUT:
            return replace(result, status=Status.UNKNOWN, objective=None, second=None, review=None), None, len(without)


def refuted(brief: Brief, simulation: Simulation) -> tuple[str, ...]:
    """The limits that a simulated pulse breaks at any of the corners simulated."""
    limits, pulse = brief.limits, brief.signal.shortest_pulse
    broken = set()
    for one in simulation.pulses:
        if one.times is None:
            continue
        edge = max(one.times.edge_on, one.times.edge_off)
        delay = max(one.times.delay_on, one.times.delay_off)
        for name, value, limit in (
            ("edge_time", edge, limits.edge_time),
            ("delay", delay, limits.delay),
            ("shortest_pulse", delay, pulse),
        ):
            if limit is not None and value > limit * (1 + 1e-9):
                broken.add(name)
    return tuple(sorted(broken))
