"""The plots of a report, as SVG with text as text. They take plain data; nothing is worked out here."""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise

from markupsafe import Markup

from optopick.answers import Front, Share
from optopick.brief import GoalName
from optopick.report.axes import Scale, scale_over
from optopick.report.document import Level, Trace, Waveform
from optopick.report.plot import Frame, series_class
from optopick.report.svg import Point, element, percent, text
from optopick.report.words import TIGHT, amount
from optopick.result import Check

MOST_POINTS = 1200
"""Points of a curve beyond which neighbours are drawn as their lowest and highest."""

WIDE = 8.0
"""Largest over smallest value from which on a front's scale is logarithmic."""

BAR_LOW, BAR_HIGH = -0.25, 1.0
"""Room that a margin bar can show [1]; what lies beyond ends at its edge."""


def state_of(check: Check) -> str:
    """Whether a check "holds", is "tight" because little room is left, or "fails"."""
    if not check.passed:
        return "fails"
    return "tight" if check.margin < TIGHT else "holds"


def bar_span(margin: float) -> tuple[float, float]:
    """Where a margin's bar begins and how long it is, as shares of the bar's room [1]."""
    shown = BAR_LOW if math.isnan(margin) else min(max(margin, BAR_LOW), BAR_HIGH)
    begin, end = sorted((0.0, shown))
    return (begin - BAR_LOW) / (BAR_HIGH - BAR_LOW), (end - begin) / (BAR_HIGH - BAR_LOW)


def margin_bar(check: Check) -> Markup:
    """The room of one check as a bar: to the right of the limit where it holds, to the left where it fails.

    Hidden from those who listen: the text beside it says the same.
    """
    begin, length = bar_span(check.margin)
    zero = percent(-BAR_LOW / (BAR_HIGH - BAR_LOW))
    track = element("rect", x=zero, y="4", width=percent(BAR_HIGH / (BAR_HIGH - BAR_LOW)), height="8", class_="track")
    bar = element("rect", x=percent(begin), y="4", width=percent(length), height="8", class_=f"bar {state_of(check)}")
    limit = element("line", x1=zero, x2=zero, y1="0", y2="16", class_="limit")
    return element("svg", track, bar, limit, width="100%", height="16", class_="margin", aria_hidden="true")


def room_bar(share: Share) -> Markup:
    """The room of a check in a margin budget, hidden like `margin_bar`.

    Filled as far as it reaches at the worst corner, framed as far as it would with everything nominal.
    """
    begin, length = bar_span(share.worst)
    nominal = sum(bar_span(share.nominal))
    zero = -BAR_LOW / (BAR_HIGH - BAR_LOW)
    frame = element("rect", x=percent(zero), y="4", width=percent(max(nominal - zero, 0)), height="8", class_="track")
    kind = "fails" if share.worst < 0 or math.isnan(share.worst) else "part-bar"
    bar = element("rect", x=percent(begin), y="4", width=percent(length), height="8", class_=kind)
    limit = element("line", x1=percent(zero), x2=percent(zero), y1="0", y2="16", class_="limit")
    return element("svg", bar, frame, limit, width="100%", height="16", class_="margin", aria_hidden="true")


def goal_unit(goal: GoalName) -> str:
    """The unit of a goal."""
    return "W" if goal is GoalName.POWER else "s"


def front_plot(front: Front, here: Point | None) -> Markup:
    """A trade-off front: a mark for each design, a ring at the goals `here` of the document's own; less is to the left.

    Stairs join the designs where the front is complete: between two of them nothing better is in stock than the first.
    """
    units = [goal_unit(goal) for goal in front.goals]
    points = [(point.first, point.second) for point in front.points]
    shown = [*points, *([here] if here else [])]
    x, y = (_goal_scale([at[k] for at in shown], units[k]) for k in (0, 1))
    names = [f"{goal.value}, worst case" for goal in front.goals]
    frame = Frame(x, f"{names[0]} →", y, f"↑ {names[1]}")
    drawn = [frame.line(_steps(points), series_class(0))] if front.complete else []
    drawn += [frame.mark(*point, "dot") for point in points]
    if here is not None:
        drawn += [frame.mark(*here, "ring", 9.0), _beside(frame, here, "this design")]
    told = f"{len(points)} designs from {amount(points[0][0], units[0])} to {amount(points[-1][0], units[0])}."
    return frame.drawn(f"{names[1]} against {names[0]}", told, *drawn)


def _goal_scale(values: Sequence[float], unit: str) -> Scale:
    """A scale for one goal of a front, logarithmic where the values lie far apart."""
    return scale_over(values, unit, log=max(values) > WIDE * min(values) > 0, room=0.08)


def _steps(points: Sequence[Point]) -> list[Point]:
    """The front as stairs."""
    stairs = list(points[:1])
    for before, after in pairwise(points):
        stairs += [(after[0], before[1]), after]
    return stairs


def _beside(frame: Frame, at: Point, words: str) -> Markup:
    """A word beside a mark, on the side where there is room and off the stairs, which leave it to the right."""
    right = frame.x.share(at[0]) < 0.6
    label = text(frame.at(*at), words, "halo", "start" if right else "end")
    return element("g", label, transform=f"translate({14 if right else -14} {22 if right else -10})")


def sweep_plot(  # noqa: PLR0913 - a plot's data, each with its name and unit
    name: str,
    x: Trace,
    x_unit: str,
    series: Sequence[Trace],
    y_name: str,
    y_unit: str,
    *,
    levels: Sequence[Level] = (),
    y_span: tuple[float, float] | None = None,
    chosen: int | None = None,
) -> Markup:
    """Curves over a resistor's values, logarithmic; `y_span` cuts what lies beyond; `chosen`: index of the design."""
    across = scale_over(x.values, x_unit, log=True, room=0.02)
    values = [value for curve in series for value in curve.values] + [level.value for level in levels]
    up = Scale(*y_span, y_unit) if y_span else scale_over(values, y_unit)
    frame = Frame(across, f"{x.name} →", up, f"↑ {y_name}")
    drawn = [frame.level(level.name, level.value) for level in levels]
    if chosen is not None:
        drawn.append(_cursor(frame, x.values[chosen]))
    drawn += [frame.line(zip(x.values, curve.values, strict=True), series_class(k)) for k, curve in enumerate(series)]
    told = f"{y_name} of {', '.join(curve.name for curve in series)}, over {x.name}."
    return frame.drawn(name, told, *drawn, key=[curve.name for curve in series], class_="sweep")


def _cursor(frame: Frame, x: float) -> Markup:
    """The line at the design's value; a script may move it to another."""
    at = percent(frame.x.share(x))
    return element("line", x1=at, x2=at, y1="0", y2="100%", class_="cursor")


def cursor_share(values: Sequence[float], x: float) -> float:
    """Where `x` lies on a sweep plot over these values [1]."""
    return scale_over(values, "ohm", log=True, room=0.02).share(x)


def waveform_plot(wave: Waveform) -> Markup:
    """Voltages over time, when the LED is lit, and the bits that were sent."""
    across = Scale(wave.time[0], wave.time[-1], "s")
    values = [value for trace in wave.traces for value in trace.values] + [level.value for level in wave.levels]
    up = scale_over(values, "V", room=0.12)
    # further down there is the band that tells when the LED is lit
    below = 0.2 * (up.high - up.low) if wave.lit else 0.0
    frame = Frame(across, "time →", Scale(up.low - below, up.high, "V"), "↑ voltage")
    drawn = [frame.level(level.name, level.value) for level in wave.levels]
    drawn += [frame.line(thinned(wave.time, trace.values), series_class(k)) for k, trace in enumerate(wave.traces)]
    drawn += _lit(frame, wave) + _bits(frame, wave)
    told = f"{', '.join(trace.name for trace in wave.traces)} over {amount(wave.time[-1] - wave.time[0], 's')}."
    key = [trace.name for trace in wave.traces] if len(wave.traces) > 1 else ()
    return frame.drawn(wave.title, told, *drawn, key=key)


def _lit(frame: Frame, wave: Waveform) -> list[Markup]:
    """A band along the bottom wherever the LED is lit."""
    spans = [(frame.x.share(begin), frame.x.share(end)) for begin, end in wave.lit]
    bands = [
        element("rect", x=percent(begin), width=percent(end - begin), y=frame.height - 7, height="7", class_="lit")
        for begin, end in spans
    ]
    name = text((percent(spans[0][0]), frame.height - 13), "LED lit", "halo") if spans else Markup("")
    return [*bands, name]


def _bits(frame: Frame, wave: Waveform) -> list[Markup]:
    shares = [frame.x.share(k * wave.bit_time) for k in range(len(wave.bits))]
    centres = [frame.x.share((k + 0.5) * wave.bit_time) for k in range(len(wave.bits))]
    rules = [element("line", x1=percent(at), x2=percent(at), y1="0", y2="100%", class_="bit") for at in shares]
    told = [
        text((percent(at), 14), bit, "halo bit-word", "middle")
        for at, bit in zip(centres, wave.bits, strict=True)
        if 0 <= at <= 1
    ]
    return rules + told


def thinned(x: Sequence[float], y: Sequence[float], most: int = MOST_POINTS) -> list[Point]:
    """A curve with no more than about `most` points: of each bucket the first, the lowest and the highest."""
    if len(x) <= most:
        return list(zip(x, y, strict=True))
    size = math.ceil(3 * len(x) / most)
    kept: list[Point] = []
    for start in range(0, len(x), size):
        bucket = range(start, min(start + size, len(x)))
        ends = {start, min(bucket, key=lambda k: y[k]), max(bucket, key=lambda k: y[k])}
        kept += [(x[k], y[k]) for k in sorted(ends)]
    return [*kept, (x[-1], y[-1])]
