"""What the re-check of an output stage gives, whatever its kind."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from optopick.brief import Brief
from optopick.physics.types import Array
from optopick.recheck.measured import Measured
from optopick.result import Timing


@dataclass(frozen=True)
class Times:
    """Times at every vertex [s], without guard; those that no check asks for may be left zero."""

    edge_on: Array
    edge_off: Array
    storage: Array
    delay_on: Array
    delay_off: Array
    distortion: Array


@dataclass(frozen=True)
class StageReview:
    """Checks of the output stage, its times, and the average power of the output path at every vertex [W]."""

    checks: tuple[Measured, ...]
    times: Times
    power: Array


def timing_checks(brief: Brief, times: Times) -> list[Measured]:
    """Limits on edges, delays, distortion and pulse, guard included."""
    guard, limits = brief.limits.timing_guard, brief.limits
    edge = guard * np.maximum(times.edge_on, times.edge_off)
    delay = guard * np.maximum(times.delay_on, times.delay_off)
    checks = [Measured("shortest_pulse", delay, brief.signal.shortest_pulse, "<=", "s")]
    for name, value, limit in (
        ("edge_time", edge, limits.edge_time),
        ("delay", delay, limits.delay),
        ("distortion", guard * times.distortion, limits.distortion),
    ):
        if limit is not None:
            checks.append(Measured(name, value, limit, "<=", "s"))
    return checks


def worst_times(brief: Brief, times: Times) -> Timing:
    """Each time's worst case, guard included."""
    names = ("edge_on", "edge_off", "storage", "delay_on", "delay_off", "distortion")
    return Timing(**{name: brief.limits.timing_guard * float(np.max(getattr(times, name))) for name in names})
