"""The plots of a report, as SVG with text as text. They take plain data; nothing is worked out here."""

from __future__ import annotations

import math
from collections.abc import Sequence

from markupsafe import Markup

from optopick.report.axes import Scale, scale_over
from optopick.report.document import Budget, Front, Level, Trace, Waveform
from optopick.report.plot import Frame, series_class
from optopick.report.svg import Point, element, percent, text
from optopick.report.words import TIGHT, amount
from optopick.result import Check

MOST_POINTS = 1200
"""Points of a curve beyond which neighbours are drawn as their lowest and highest."""

BAR_LOW, BAR_HIGH = -0.25, 1.0
"""Room that a margin bar can show [1]; what lies beyond ends at its edge."""


def state_of(check: Check) -> str:
    """ "holds", "tight" where little room is left, or "fails"."""
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


def budget_bar(value: float, budget: Budget) -> Markup:
    """One value of a margin budget as a bar from zero, the check's limit across it; hidden like `margin_bar`."""
    highest = max((budget.typical, budget.check.limit, *(step.value for step in budget.steps)), key=abs)
    share = min(abs(value / highest), 1.0) if highest and math.isfinite(value) else 1.0
    at = percent(abs(budget.check.limit / highest)) if highest else "0"
    bar = element("rect", x="0", y="4", width=percent(share), height="8", class_="part-bar")
    limit = element("line", x1=at, x2=at, y1="0", y2="16", class_="limit")
    return element("svg", bar, limit, width="100%", height="16", class_="margin", aria_hidden="true")


def front_plot(front: Front) -> Markup:
    """A trade-off front: each design a mark, steps between them, the document's own design ringed."""
    points = [(point.x, point.y) for point in front.points]
    x = scale_over((at for at, _ in points), front.x_unit, room=0.08)
    y = scale_over((at for _, at in points), front.y_unit, room=0.08)
    frame = Frame(x, f"{front.x_name} →", y, f"↑ {front.y_name}")
    marks = [frame.mark(*point, "dot") for point in points]
    if front.chosen is not None:
        at = points[front.chosen]
        marks += [frame.mark(*at, "ring", 9.0), _beside(frame, at, "this design")]
    told = f"{len(points)} designs from {amount(points[0][0], front.x_unit)} to {amount(points[-1][0], front.x_unit)}."
    return frame.drawn(
        f"{front.y_name} against {front.x_name}", told, frame.line(_steps(points), series_class(0)), *marks
    )


def _steps(points: Sequence[Point]) -> list[Point]:
    """The front as stairs: between two designs nothing better is known than the first."""
    stairs = list(points[:1])
    for before, after in zip(points, points[1:], strict=False):
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
    """Voltages over time, the bits that were sent above them."""
    across = Scale(wave.time[0], wave.time[-1], "s")
    values = [value for trace in wave.traces for value in trace.values] + [level.value for level in wave.levels]
    frame = Frame(across, "time →", scale_over(values, "V", room=0.12), "↑ voltage")
    drawn = [frame.level(level.name, level.value) for level in wave.levels]
    drawn += [frame.line(thinned(wave.time, trace.values), series_class(k)) for k, trace in enumerate(wave.traces)]
    drawn += _bits(frame, wave)
    told = f"{', '.join(trace.name for trace in wave.traces)} over {amount(wave.time[-1] - wave.time[0], 's')}."
    return frame.drawn(wave.title, told, *drawn, key=[trace.name for trace in wave.traces])


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
