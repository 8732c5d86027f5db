"""The plots: marks lie where their numbers say, scales have round ticks, nothing is lost by thinning."""

from __future__ import annotations

import math
import re
from dataclasses import asdict, replace
from itertools import pairwise
from xml.etree import ElementTree

import numpy as np
import pytest
import report_samples as samples

from optopick.answers import Share
from optopick.brief import OutputCircuit
from optopick.report.axes import Scale, scale_over
from optopick.report.document import Level, Trace, Waveform
from optopick.report.pictures import (
    bar_span,
    cursor_share,
    front_plot,
    margin_bar,
    room_bar,
    state_of,
    sweep_plot,
    thinned,
    waveform_plot,
)
from optopick.report.plot import finite_parts
from optopick.report.timing_picture import Swing, swing_of, timing_pictures
from optopick.report.waveforms import pattern_wave, pulse_views
from optopick.result import Check, Timing

SVG = "{http://www.w3.org/2000/svg}"


def tree(picture: str) -> ElementTree.Element:
    return ElementTree.fromstring(f'<g xmlns="http://www.w3.org/2000/svg">{picture}</g>')


def nodes(picture: str, name: str, class_: str) -> list[ElementTree.Element]:
    """Elements of a class, or of it among others."""
    return [node for node in tree(picture).iter(f"{SVG}{name}") if class_ in (node.get("class") or "").split()]


def share(text: str) -> float:
    assert text.endswith("%")
    return float(text[:-1]) / 100


def words(picture: str) -> list[str]:
    return ["".join(node.itertext()) for node in tree(picture).iter(f"{SVG}text")]


# ---- scales -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("scale", "expected"),
    [
        (Scale(0.0, 10.0, "V"), (0, 2, 4, 6, 8, 10)),
        (Scale(-0.5, 1.5, "%"), (-0.5, 0, 0.5, 1, 1.5)),
        (Scale(0.9e-6, 3.3e-6, "s"), (1e-6, 1.5e-6, 2e-6, 2.5e-6, 3e-6)),
        (Scale(95.0, 10.5e3, "ohm", log=True), (100, 300, 1000, 3000, 10000)),
        (Scale(95.0, 1050.0, "ohm", log=True), (100, 200, 300, 500, 700, 1000)),
    ],
)
def test_ticks_are_round(scale, expected):
    assert scale.ticks(6) == pytest.approx(expected)
    assert all(0 <= scale.share(tick) <= 1 for tick in scale.ticks(6))


@pytest.mark.parametrize("log", [True, False])
def test_any_scale_has_a_few_ticks(log):
    rng = np.random.default_rng(3)
    for _ in range(500):
        low = float(10 ** rng.uniform(-12, 6))
        scale = Scale(low, low * float(10 ** rng.uniform(0.01, 6)), "ohm", log)
        assert 1 <= len(scale.ticks(5)) <= 6
        assert all(-1e-6 <= scale.share(tick) <= 1 + 1e-6 for tick in scale.ticks(5))


def test_scale_over_values():
    """Every value lies within, with room; values that are none do not stretch it; one value has a span around it."""
    scale = scale_over([2.0, math.inf, 8.0, math.nan], "V", room=0.1)
    assert (scale.low, scale.high) == pytest.approx((1.4, 8.6))
    log = scale_over([10.0, 1000.0], "ohm", log=True, room=0.5)
    assert (log.low, log.high) == pytest.approx((1.0, 10_000.0))
    assert scale_over([5.0], "V").share(5.0) == pytest.approx(0.5)
    assert scale_over([5.0], "V", log=True).share(5.0) == pytest.approx(0.5)
    assert scale_over([0.0], "V").share(0.0) == pytest.approx(0.5)
    assert scale_over([], "V").ticks()


# ---- margins ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("margin", "begin", "length"),
    [
        (0.5, 0.2, 0.4),
        (1.0, 0.2, 0.8),
        (7.9, 0.2, 0.8),
        (0.0, 0.2, 0.0),
        (-0.125, 0.1, 0.1),
        (-3, 0, 0.2),
        (math.nan, 0, 0.2),
    ],
)
def test_bar(margin, begin, length):
    """The limit stands at a fifth: room to its right, up to 100 %, what is missing to its left, up to 25 %."""
    assert bar_span(margin) == pytest.approx((begin, length))


def test_margin_bar_is_drawn_as_it_stands():
    for value, state in ((0.5, "holds"), (0.95, "tight"), (1.1, "fails")):
        check = Check("delay", value, 1.0, "<=", "s", "")
        assert state_of(check) == state
        (bar,) = nodes(margin_bar(check), "rect", state)
        assert (share(bar.attrib["x"]), share(bar.attrib["width"])) == pytest.approx(bar_span(check.margin))
        (track,), (limit,) = nodes(margin_bar(check), "rect", "track"), nodes(margin_bar(check), "line", "limit")
        assert (share(track.attrib["x"]), share(track.attrib["width"])) == pytest.approx((0.2, 0.8))
        assert share(limit.attrib["x1"]) == pytest.approx(0.2)


def test_room_bar():
    """Filled to the worst corner's room, framed to that of nominal parts."""
    picture = room_bar(Share("delay", 0.25, 0.5, {}))
    (bar,), (frame,) = nodes(picture, "rect", "part-bar"), nodes(picture, "rect", "track")
    assert (share(bar.attrib["x"]), share(bar.attrib["width"])) == pytest.approx((0.2, 0.2))
    assert (share(frame.attrib["x"]), share(frame.attrib["width"])) == pytest.approx((0.2, 0.4))
    assert nodes(room_bar(Share("delay", -0.1, 0.5, {})), "rect", "fails")


# ---- timing -----------------------------------------------------------------------------------------------------

DRAWN = 180.0
"""Height [px] that a timing picture's curves are stretched over."""

TIMING = Timing(edge_on=2e-6, edge_off=8e-6, storage=5e-6, delay_on=3e-6, delay_off=11e-6, distortion=9e-6)


def dimensions(picture: str) -> dict[str, float]:
    """Each dimension's name and words' value, with its drawn length as a share of the picture's width."""
    spans = [node for node in nodes(picture, "line", "dimension") if node.attrib["y1"] == node.attrib["y2"]]
    named = [word for word in words(picture) if ": " in word]
    return {word: share(span.attrib["x2"]) - share(span.attrib["x1"]) for word, span in zip(named, spans, strict=True)}


def test_times_are_drawn_to_scale():
    """All dimensions of both pictures have one scale, and their words say the worst times."""
    lights, dark = timing_pictures(TIMING, Swing(falls=True, on=0.7, off=0.5))
    drawn = dimensions(lights) | dimensions(dark)
    expected = {
        "Delay, LED lights: 3 µs": 3e-6,
        "Edge, LED lights: 2 µs": 2e-6,
        "Delay, LED goes dark: 11 µs": 11e-6,
        "Edge, LED goes dark: 8 µs": 8e-6,
        "Storage: 5 µs": 5e-6,
    }
    assert set(drawn) == set(expected)
    scales = [drawn[name] / seconds for name, seconds in expected.items()]
    assert scales == pytest.approx([scales[0]] * 5, rel=2e-3)


def curve(picture: str, class_: str) -> list[tuple[float, float]]:
    (line,) = nodes(picture, "polyline", class_)
    return [tuple(map(float, pair.split(","))) for pair in line.attrib["points"].split()]


@pytest.mark.parametrize("falls", [True, False])
def test_output_crosses_the_threshold_at_the_delay(falls):
    swing = Swing(falls=falls, on=0.7, off=0.5)
    for picture, at, delay in zip(timing_pictures(TIMING, swing), (swing.on, swing.off), (3e-6, 11e-6), strict=True):
        points = curve(picture, "series-1")
        led = curve(picture, "series-2")
        x_zero = led[1][0]
        (level,) = nodes(picture, "line", "level")
        crossing = points[-3]
        end = next(word for word in dimensions(picture) if word.startswith("Delay"))
        assert (crossing[0] - x_zero) / 1000 == pytest.approx(dimensions(picture)[end], abs=2e-3), delay
        top, bottom = sorted((points[0][1], points[-1][1]))
        assert (crossing[1] - points[0][1]) / (points[-1][1] - points[0][1]) == pytest.approx(at, abs=1e-3)
        assert top < crossing[1] < bottom
        assert float(level.attrib["y1"]) == pytest.approx(crossing[1] * DRAWN / 1000, abs=0.05)


@pytest.mark.parametrize("falls", [True, False])
def test_edges_span_10_to_90_percent(falls):
    """An edge's dimension begins and ends where the drawn output has made 10 and 90 % of its way."""
    for picture in timing_pictures(TIMING, Swing(falls, 0.7, 0.5)):
        spans = [node for node in nodes(picture, "line", "dimension") if node.attrib["y1"] == node.attrib["y2"]]
        points = curve(picture, "series-1")
        across, made = (
            [x / 1000 for x, _ in points],
            [(y - points[0][1]) / (points[-1][1] - points[0][1]) for _, y in points],
        )
        for end, way in (("x1", 0.1), ("x2", 0.9)):
            assert np.interp(share(spans[1].attrib[end]), across, made) == pytest.approx(way, abs=3e-3)


@pytest.mark.parametrize("falls", [True, False])
def test_output_moves_the_way_the_circuit_does(falls):
    lights, dark = timing_pictures(TIMING, Swing(falls=falls, on=0.7, off=0.5))
    down_on = curve(lights, "series-1")[-1][1] > curve(lights, "series-1")[0][1]
    down_off = curve(dark, "series-1")[-1][1] > curve(dark, "series-1")[0][1]
    assert (down_on, down_off) == (falls, not falls)
    assert ("V_IL" in words(lights)) == falls
    assert ("V_IH" in words(dark)) == falls
    led = curve(lights, "series-2")
    assert led[-1][1] < led[0][1]


def test_curves_never_run_backwards():
    rng = np.random.default_rng(7)
    for _ in range(200):
        timing = Timing(*(float(10 ** rng.uniform(-7, -4)) for _ in range(6)))
        swing = Swing(bool(rng.random() < 0.5), float(rng.uniform(0.02, 0.98)), float(rng.uniform(0.02, 0.98)))
        for picture in timing_pictures(timing, swing):
            across = [x for x, _ in curve(picture, "series-1")]
            assert across == sorted(across)
            assert all(0 <= x <= 1000 for x in across)


def test_endless_and_no_times():
    swing = Swing(falls=True, on=0.7, off=0.5)
    for picture in timing_pictures(replace(TIMING, edge_on=math.inf), swing):
        assert "no finite time" in picture
    assert len(timing_pictures(Timing(*(0.0,) * 6), swing)) == 2


def test_swing_of_a_brief():
    """Pull-up: on down to v_il, off up to v_ih; emitter load: on up to v_ih, off down to v_il, of the swing."""
    brief, coupler, _ = samples.link()
    v_cc, v_on = brief.output.supply.middle, coupler.transistor.v_ce_sat
    v_il, v_ih = brief.output.v_il.middle, brief.output.v_ih.middle
    found = swing_of(brief, coupler)
    assert found.falls
    assert (found.on, found.off) == pytest.approx(((v_cc - v_il) / (v_cc - v_on), (v_ih - v_on) / (v_cc - v_on)))
    emitter = replace(brief, output=replace(brief.output, circuit=OutputCircuit.EMITTER_LOAD))
    found = swing_of(emitter, coupler)
    assert not found.falls
    assert (found.on, found.off) == pytest.approx((v_ih / (v_cc - v_on), 1 - v_il / (v_cc - v_on)))


# ---- curves -----------------------------------------------------------------------------------------------------


def test_thinning_keeps_ends_and_extremes():
    x = np.linspace(0, 1, 50_000)
    y = np.sin(40 * x)
    y[31_337], y[12_345] = 7.0, -7.0
    kept = thinned(tuple(x), tuple(y), 900)
    assert len(kept) <= 950
    assert kept[0] == (x[0], y[0])
    assert kept[-1] == (x[-1], y[-1])
    assert max(kept, key=lambda at: at[1]) == (x[31_337], 7.0)
    assert min(kept, key=lambda at: at[1]) == (x[12_345], -7.0)
    assert [at for at, _ in kept] == sorted(at for at, _ in kept)
    assert thinned((1.0, 2.0), (3.0, 4.0)) == [(1.0, 3.0), (2.0, 4.0)]


def test_gaps_where_there_is_no_number():
    points = [(0.0, 1.0), (1.0, math.inf), (2.0, 2.0), (3.0, 3.0), (4.0, math.nan)]
    assert list(finite_parts(points)) == [[(0.0, 1.0)], [(2.0, 2.0), (3.0, 3.0)]]


def test_sweep():
    """Curves lie on a logarithmic axis; the cursor at the chosen value; a level at its own."""
    ohms = (100.0, 1000.0, 10_000.0)
    picture = sweep_plot(
        "Room",
        Trace("R_LED", ohms),
        "ohm",
        [Trace("Delay", (0.0, 0.5, 1.0)), Trace("CTR margin", (1.0, math.nan, 0.0))],
        "room",
        "%",
        levels=[Level("limit", 0.25)],
        y_span=(0.0, 1.0),
        chosen=1,
    )
    first, middle, last = curve(picture, "series-1")
    assert middle == pytest.approx((500, 500))
    assert first[1] == pytest.approx(1000)
    assert last[1] == pytest.approx(0)
    assert first[0] + last[0] == pytest.approx(1000)
    assert len(nodes(picture, "polyline", "series-2")) == 2
    (cursor,) = nodes(picture, "line", "cursor")
    assert share(cursor.attrib["x1"]) == pytest.approx(0.5)
    assert cursor_share(ohms, 1000.0) == pytest.approx(0.5)
    (level,) = nodes(picture, "line", "level")
    assert share(level.attrib["y1"]) == pytest.approx(0.75)
    assert {"Delay", "CTR margin", "limit", "R_LED →"} <= set(words(picture))


def test_front():
    """A mark for each design, lower where the second goal is less; stairs only where the front is complete."""
    front = samples.front()
    own = front.points[1]
    picture = front_plot(front, (own.first, own.second))
    dots = nodes(picture, "circle", "dot")
    assert len(dots) == len(front.points)
    across, down = ([share(dot.attrib[key]) for dot in dots] for key in ("cx", "cy"))
    assert across == sorted(across)
    assert down == sorted(down)
    (ring,) = nodes(picture, "circle", "ring")
    assert (ring.attrib["cx"], ring.attrib["cy"]) == (dots[1].attrib["cx"], dots[1].attrib["cy"])
    stairs = curve(picture, "series-1")
    assert all(a[0] == b[0] or a[1] == b[1] for a, b in pairwise(stairs))
    assert stairs[1][1] == stairs[0][1], "to the right of a design nothing better is known until the next"
    assert not nodes(front_plot(replace(front, complete=False), None), "polyline", "series-1")
    assert not nodes(front_plot(front, None), "circle", "ring")
    # a design that gave a little of its first goal is no point of the front, and has its place all the same
    between = ((front.points[0].first + own.first) / 2, (front.points[0].second + own.second) / 2)
    (ring,) = nodes(front_plot(front, between), "circle", "ring")
    assert share(dots[0].attrib["cx"]) < share(ring.attrib["cx"]) < share(dots[1].attrib["cx"])


def test_front_far_apart_is_logarithmic():
    """Designs a fixed factor apart lie a fixed distance apart."""
    front = samples.front()
    wide = replace(front, points=tuple(replace(p, first=1e-6 * 10**k) for k, p in enumerate(front.points)))
    at = [share(dot.attrib["cx"]) for dot in nodes(front_plot(wide, None), "circle", "dot")]
    assert at[1] - at[0] == pytest.approx(at[2] - at[1], abs=1e-3)


def test_waveform():
    wave = Waveform(
        "A pulse", (0.0, 1.0, 2.0), (Trace("output", (3.0, 0.0, 3.0)),), (Level("V_IH", 2.0),), ((0.5, 1.5),)
    )
    picture = waveform_plot(wave)
    points = curve(picture, "series-1")
    assert [x for x, _ in points] == pytest.approx([0, 500, 1000])
    assert points[0][1] < points[1][1]
    (band,) = nodes(picture, "rect", "lit")
    assert (share(band.attrib["x"]), share(band.attrib["width"])) == pytest.approx((0.25, 0.5))
    (level,) = nodes(picture, "line", "level")
    low, high = points[1][1] / 1000, points[0][1] / 1000
    assert share(level.attrib["y1"]) == pytest.approx(low + 2 / 3 * (high - low), abs=1e-3)


def test_bits_stand_over_their_time():
    wave = Waveform("Bits", (0.0, 4.0), (Trace("output", (0.0, 1.0)),), bits="10", bit_time=1.0)
    picture = waveform_plot(wave)
    shown = [(node.text, share(node.attrib["x"])) for node in nodes(picture, "text", "bit-word")]
    assert shown == [("1", pytest.approx(0.125)), ("0", pytest.approx(0.375))]


def test_simulated_pulses():
    """Formula times carry the guard; the waveform is the run's, from lit to dark."""
    document = samples.full()
    simulation = document.simulation
    for view, pulse in zip(pulse_views(document.brief, simulation), simulation.pulses, strict=True):
        assert view.wave
        names = pulse.worst_for or tuple(asdict(pulse.times))
        for row, name in zip(view.times, names, strict=True):
            assert row.formula == simulation.guard * getattr(pulse.by_formula, name)
            assert row.simulated == getattr(pulse.times, name)
            assert row.beyond == (row.simulated > row.formula)
        assert view.wave.lit == ((0.0, float(pulse.run.stretches[1].t[0])),)
        assert view.wave.traces[0].values[0] == pytest.approx(
            float(pulse.run.output(pulse.run.stretches[0].states[0, 1]))
        )
        assert list(view.wave.time) == sorted(view.wave.time)
    refused = replace(simulation.pulses[0], run=None, times=None, reason="no")
    (view,) = pulse_views(document.brief, replace(simulation, pulses=(refused,)))
    assert (view.wave, view.times, view.reason) == (None, (), "no")


def test_simulated_pattern():
    document = samples.full()
    wave = pattern_wave(document.brief, document.pattern)
    assert (wave.bits, wave.bit_time) == ("0101100", document.brief.signal.shortest_pulse)
    starts = [begin / wave.bit_time for begin, _ in wave.lit]
    assert starts == pytest.approx([1.0, 3.0])
    assert re.fullmatch(".+", wave.title)
