"""The timing of a link as two pictures to one scale: the output as the LED lights, and as it goes dark."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from markupsafe import Markup

from optopick.brief import Brief, OutputCircuit
from optopick.corners import thresholds
from optopick.coupler import Coupler
from optopick.report.axes import Scale
from optopick.report.labels import TIMES
from optopick.report.plot import SQUARE, plot_picture, stretched
from optopick.report.svg import Point, element, percent, polyline, text
from optopick.report.words import amount
from optopick.result import Timing

LEFT = 58.0
LED_TOP, LED_BOTTOM = 8.0, 34.0
OUT_TOP, OUT_BOTTOM = 66.0, 176.0
FIRST_ROW, ROW = 208.0, 36.0
BEFORE = 0.16
"""Time shown before the LED changes, as a share of the time after."""


@dataclass(frozen=True)
class Swing:
    """How the output moves: whether it falls as the LED lights.

    on, off: the share of its swing [1] at which the receiver takes it as changed, as the LED lights and goes dark.
    """

    falls: bool
    on: float
    off: float


@dataclass(frozen=True)
class _Turn:
    """One change of the LED: what it is called, the output's course as (time, share of the change), dimensions."""

    name: str
    lights: bool
    course: tuple[Point, ...]
    threshold: float
    threshold_name: str
    dimensions: tuple[tuple[str, float, float], ...]


def swing_of(brief: Brief, coupler: Coupler) -> Swing:
    """The output's swing at the middle of its supply."""
    output = brief.output
    v_cc = output.supply.middle
    v_on = coupler.transistor.v_ce_sat if coupler.transistor else coupler.logic.v_ol if coupler.logic else 0.0
    v_il, v_ih = (float(thresholds(span, output.supply, np.array(v_cc))) for span in (output.v_il, output.v_ih))
    swing = v_cc - v_on
    if output.circuit is OutputCircuit.PULL_UP:
        return Swing(True, _share((v_cc - v_il) / swing), _share((v_ih - v_on) / swing))
    return Swing(False, _share(v_ih / swing), _share(1 - v_il / swing))


def _share(value: float) -> float:
    return min(max(value, 0.02), 0.98)


def timing_pictures(timing: Timing, swing: Swing) -> tuple[Markup, Markup]:
    """The output as the LED lights and as it goes dark, each time drawn where it is worst."""
    turns = (_lights(timing, swing), _goes_dark(timing, swing))
    ends = [t for turn in turns for t, _ in turn.course] + [end for turn in turns for _, _, end in turn.dimensions]
    if not all(math.isfinite(end) for end in ends):
        return _stuck(turns[0]), _stuck(turns[1])
    after = 1.08 * max(ends) or 1.0
    scale = Scale(-BEFORE * after, after, "s")
    rows = max(len(turn.dimensions) for turn in turns)
    return _drawn(turns[0], swing, scale, rows), _drawn(turns[1], swing, scale, rows)


def _lights(timing: Timing, swing: Swing) -> _Turn:
    whole, at = timing.edge_on / 0.8, timing.delay_on
    begin = max(at - swing.on * whole, 0.0)
    course = ((begin, 0.0), (at, swing.on), (at + (1 - swing.on) * whole, 1.0))
    edge = at + (0.1 - swing.on) * whole
    dimensions = ((TIMES["delay_on"], 0.0, at), (TIMES["edge_on"], edge, edge + timing.edge_on))
    return _Turn("The LED lights", True, course, swing.on, _threshold_name(swing.falls), dimensions)


def _goes_dark(timing: Timing, swing: Swing) -> _Turn:
    whole, at = timing.edge_off / 0.8, timing.delay_off
    begin = max(at - swing.off * whole, 0.0)
    course = ((begin, 0.0), (at, swing.off), (at + (1 - swing.off) * whole, 1.0))
    edge = at + (0.1 - swing.off) * whole
    dimensions = (
        (TIMES["delay_off"], 0.0, at),
        (TIMES["edge_off"], edge, edge + timing.edge_off),
        (TIMES["storage"], 0.0, timing.storage),
    )
    return _Turn("The LED goes dark", False, course, swing.off, _threshold_name(not swing.falls), dimensions)


def _threshold_name(falling: bool) -> str:
    return "V_IL" if falling else "V_IH"


def _stuck(turn: _Turn) -> Markup:
    words = text((0, 24), f"{turn.name}: no finite time at the worst corner.")
    return plot_picture(turn.name, "No finite time.", words, height=40.0, class_="timing")


def _drawn(turn: _Turn, swing: Swing, scale: Scale, rows: int) -> Markup:
    falling = swing.falls == turn.lights
    bottom = FIRST_ROW + ROW * rows
    drawn = (
        _levels(turn, falling),
        _curves(turn, falling, scale),
        *_drops(turn, scale, bottom),
        *(_dimension(one, scale, FIRST_ROW + ROW * k) for k, one in enumerate(turn.dimensions)),
        *_ticks(scale, bottom),
    )
    lanes = text((-LEFT, LED_BOTTOM - 8), "LED", "axis-name")
    lanes += text((-LEFT, (OUT_TOP + OUT_BOTTOM) / 2), "output", "axis-name")
    told = "; ".join(f"{name} {amount(end - begin, 's')}" for name, begin, end in turn.dimensions)
    return plot_picture(turn.name, told, lanes, *drawn, height=bottom + 26, gutter=LEFT, class_="timing")


def _height(share: float, falling: bool) -> float:
    """Where the output is drawn once it has made a share of its change [px]."""
    up = 1 - share if falling else share
    return OUT_BOTTOM - up * (OUT_BOTTOM - OUT_TOP)


def _curves(turn: _Turn, falling: bool, scale: Scale) -> Markup:
    """The LED's step and the output's course, stretched to the width there is."""
    bottom = OUT_BOTTOM + 4
    before, after = (LED_BOTTOM, LED_TOP) if turn.lights else (LED_TOP, LED_BOTTOM)
    led = ((scale.low, before), (0.0, before), (0.0, after), (scale.high, after))
    course = [(scale.low, 0.0), *turn.course, (scale.high, 1.0)]
    output = [(t, _height(share, falling)) for t, share in course]
    drawn = (
        polyline(((SQUARE * scale.share(t), SQUARE * y / bottom) for t, y in points), f"curve {class_}")
        for points, class_ in ((led, "series-2"), (output, "series-1"))
    )
    return element("svg", stretched(*drawn), width="100%", height=bottom)


def _levels(turn: _Turn, falling: bool) -> Markup:
    """The receiver's threshold, and the ends of the swing."""
    ends = (
        element("line", x1="0", x2="100%", y1=_height(share, falling), y2=_height(share, falling), class_="grid")
        for share in (0.0, 0.1, 0.9, 1.0)
    )
    y = _height(turn.threshold, falling)
    rule = element("line", x1="0", x2="100%", y1=y, y2=y, class_="level")
    name = element("g", text(("100%", y), turn.threshold_name, "halo", "end"), transform="translate(-4 -5)")
    marks = (
        text((-8, _height(share, False) + 4), words, "tick", "end") for share, words in ((0.1, "10 %"), (0.9, "90 %"))
    )
    return Markup("").join((*ends, rule, name, *marks))


def _drops(turn: _Turn, scale: Scale, bottom: float) -> list[Markup]:
    """Thin verticals: the LED's change, and the instant at which the receiver takes the output as changed."""
    at = turn.course[-2][0]
    return [
        element("line", x1=percent(scale.share(t)), x2=percent(scale.share(t)), y1="0", y2=end, class_="drop")
        for t, end in ((0.0, bottom), (at, FIRST_ROW + 14))
    ]


def _dimension(one: tuple[str, float, float], scale: Scale, y: float) -> Markup:
    """A measured stretch: the words above, the stretch with its two ends below."""
    name, begin, end = one
    left, right = scale.share(begin), scale.share(end)
    words = f"{name}: {amount(end - begin, 's')}"
    label = (
        text((percent(max(left, 0.0)), y), words, "halo") if left < 0.35 else text(("100%", y), words, "halo", "end")
    )
    span = element("line", x1=percent(left), x2=percent(right), y1=y + 10, y2=y + 10, class_="dimension")
    stops = (
        element("line", x1=percent(at), x2=percent(at), y1=y + 5, y2=y + 15, class_="dimension") for at in (left, right)
    )
    return label + span + Markup("").join(stops)


def _ticks(scale: Scale, y: float) -> list[Markup]:
    ticks = [tick for tick in scale.ticks(5) if tick >= 0]
    rule = element("line", x1="0", x2="100%", y1=y, y2=y, class_="axis")
    return [
        rule,
        *(
            text((percent(scale.share(tick)), y + 18), scale.words(tick), "tick", _tick_anchor(scale.share(tick)))
            for tick in ticks
        ),
    ]


def _tick_anchor(share: float) -> str:
    return "end" if share > 0.92 else "middle"
