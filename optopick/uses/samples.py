"""How many units pass: random lots, tolerances, temperatures and ages of one design, every check on every sample."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from scipy.stats import truncnorm

from optopick.answers import Passing, Yield
from optopick.brief import Brief, Span
from optopick.corners import resistor_span
from optopick.coupler import Coupler
from optopick.physics.types import Array
from optopick.recheck.measured import Measured
from optopick.recheck.review import evaluate
from optopick.recheck.vertices import RESISTORS, Vertices, rating_of
from optopick.result import Design
from optopick.uses.workers import Here, Processes, Workers

CHUNK = 1 << 14
"""Samples evaluated at once: few enough to stay in the processor's cache."""

WORTH_SHARING = 8
"""Chunks from which on other processes take their part."""

SIGMAS = 3.0
"""A truncated normal reaches the stated extremes at this many standard deviations."""

BINS = 40

Draw = Callable[[Span, int], Array]


def sample(
    brief: Brief,
    coupler: Coupler,
    design: Design,
    *,
    count: int = 1_000_000,
    normal: bool = False,
    seed: int = 1,
    workers: Workers | None = None,
) -> Yield:
    """The share of `count` random units that pass each check, and all of them.

    Every uncertain quantity is drawn between its stated extremes, independently: uniform, or a normal truncated there
    at three standard deviations; CTR and light by their logarithms. The wear of "end of life" is that of the hardest
    driven sample, as in the checks. The same seed gives the same answer whoever does the work; who is not told takes
    the processes of this machine, where that is worth it.
    """
    starts = range(0, count, CHUNK)
    chunks = [_Chunk(brief, coupler, design, normal, min(CHUNK, count - start), seed + start) for start in starts]
    hands: Workers = workers or (Processes() if len(chunks) >= WORTH_SHARING else Here())
    return _together(list(hands.map(_counted, chunks)), count)


@dataclass(frozen=True)
class _Chunk:
    """Samples to draw and evaluate at once."""

    brief: Brief
    coupler: Coupler
    design: Design
    normal: bool
    count: int
    seed: int

    def __str__(self) -> str:
        return f"{self.count} samples drawn from seed {self.seed}"


def _counted(chunk: _Chunk) -> tuple[int, list[Passing]]:
    return _chunk(chunk.brief, chunk.coupler, chunk.design, chunk.normal, chunk.count, chunk.seed)


def _chunk(
    brief: Brief, coupler: Coupler, design: Design, normal: bool, count: int, seed: int
) -> tuple[int, list[Passing]]:
    rng = np.random.default_rng(seed)
    box = _box(brief, coupler, design, count, _drawer(rng, normal))
    with np.errstate(all="ignore"):
        found = evaluate(brief, coupler, design, box, checks_only=True)
    checks = list(found.checks)
    if brief.limits.power is not None:
        checks.append(Measured("power", found.led_power + found.output_power, brief.limits.power, "<=", "W"))
    good = np.ones(count, dtype=bool)
    passing = []
    for measured in checks:
        margin = np.broadcast_to(measured.margin, (count,))
        holds = margin >= -1e-9
        good &= holds
        passing.append(Passing(measured.name, int(holds.sum()), _histogram(margin), float(margin.min())))
    return int(good.sum()), passing


def _histogram(margin: Array) -> tuple[int, ...]:
    """Counts of the margin over equal bins from -1 to 3, the ends open."""
    at = np.multiply(margin, BINS / 4.0)
    at += BINS / 4.0
    np.clip(at, 0.0, BINS - 1e-9, out=at)
    return tuple(np.bincount(at.astype(np.intp), minlength=BINS).tolist())


def _together(parts: list[tuple[int, list[Passing]]], count: int) -> Yield:
    checks = []
    for column in zip(*(passing for _, passing in parts), strict=True):
        histogram = tuple(int(n) for n in np.sum([one.histogram for one in column], axis=0))
        passed, least = sum(one.passed for one in column), min(one.least for one in column)
        checks.append(Passing(column[0].check, passed, histogram, least))
    return Yield(count, sum(good for good, _ in parts), tuple(checks))


def _drawer(rng: np.random.Generator, normal: bool) -> Draw:
    """Draws between two ends."""

    def uniform(span: Span, count: int) -> Array:
        return rng.uniform(span.low, span.high, count)

    def bell(span: Span, count: int) -> Array:
        half = (span.high - span.low) / 2
        drawn = truncnorm.rvs(-SIGMAS, SIGMAS, size=count, random_state=rng)
        return np.asarray(span.middle + half / SIGMAS * drawn)

    return bell if normal else uniform


def _box(brief: Brief, coupler: Coupler, design: Design, count: int, draw: Draw) -> Vertices:
    """Samples in place of vertices: every quantity an array (count,)."""
    transfer, transistor, led = coupler.transfer, coupler.transistor, coupler.led
    one = np.ones(count)

    def by_ratio(low: float, high: float) -> Array:
        return np.exp(draw(Span(np.log(low), np.log(high)), count))

    spread, off, longer = 1.0, 0.0, 1.0
    if transistor:
        spread, off, longer = transistor.light_spread, transistor.v_be_spread, transistor.tau_s_spread
    t = draw(brief.environment.temperature, count)
    return Vertices(
        t=t,
        age=draw(Span(0.0, 1.0), count),
        ctr=by_ratio(transfer.ctr_min, transfer.ctr_max) if transfer else one,
        light=by_ratio(1 / spread, spread),
        v_be=draw(Span(-off, off), count),
        storage=by_ratio(1 / longer, longer),
        v_f=draw(Span(led.v_f_min, led.v_f_max), count),
        drive=draw(brief.drive.supply, count),
        drop=draw(brief.drive.drop, count),
        v_cc=draw(brief.output.supply, count),
        **dict(zip(RESISTORS, _resistors(brief, design, t, draw), strict=True)),
        words=(),
    )


def _resistors(brief: Brief, design: Design, t: Array, draw: Draw) -> Iterator[Array]:
    for name in RESISTORS:
        value = getattr(design, name)
        if value is None:
            yield np.full_like(t, np.inf)
            continue
        whole = value * design.pieces if name == "r_led" else value
        low, high = resistor_span(whole, rating_of(brief, name, value)[0], brief.stock.drift, t)
        yield low + (high - low) * draw(Span(0.0, 1.0), t.size)
