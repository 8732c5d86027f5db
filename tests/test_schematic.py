"""The schematic: that it draws the circuit as configured, read back from its lines, and says the chosen values."""

from __future__ import annotations

import re
import subprocess
import sys
from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from itertools import product
from xml.etree import ElementTree

import numpy as np
import pytest
import report_samples as samples

from optopick.brief import DriveCircuit, OutputCircuit
from optopick.coupler import Kind, Logic
from optopick.report.schematic import schematic_svg
from optopick.report.styles import standalone
from optopick.result import Design

Point = tuple[float, float]
NEAR = 0.7
"""Pixels within which two ends meet."""

SVG = "{http://www.w3.org/2000/svg}"
LOGIC = Logic(1e-3, 1e-4, 0.4, 13e-3, 1e-5, 5e-3, 4.5, 20, 5e-7, 6e-7, 5e-8, 4e-8, 350.0, 15e-12, 8e-12)


@dataclass
class Circuit:
    """Nets and parts read from the lines of a schematic: straight lines conduct, everything else is a part."""

    wires: list[tuple[Point, Point]] = field(default_factory=list)
    resistors: list[tuple[Point, Point]] = field(default_factory=list)
    diodes: list[tuple[Point, Point]] = field(default_factory=list)
    grounds: list[Point] = field(default_factory=list)

    def net(self, start: Point) -> frozenset[int]:
        """The wires that hang together at a point, by number; not empty where the point is wired."""
        reached = {k for k, wire in enumerate(self.wires) if on(start, wire)}
        while True:
            more = {
                k
                for k, wire in enumerate(self.wires)
                if k not in reached and any(touch(wire, self.wires[other]) for other in reached)
            }
            if not more:
                return frozenset(reached)
            reached |= more

    def between(self, part: tuple[Point, Point], one: Point, other: Point) -> bool:
        """Whether a part lies between two nets, either way round."""
        nets, ends = {self.net(one), self.net(other)}, {self.net(end) for end in part}
        return nets == ends and frozenset() not in nets


def near(one: Point, other: Point) -> bool:
    return abs(one[0] - other[0]) < NEAR and abs(one[1] - other[1]) < NEAR


def on(point: Point, wire: tuple[Point, Point]) -> bool:
    """Whether a point lies on a wire."""
    a, b = (np.asarray(end) for end in wire)
    along = b - a
    share = np.clip(np.dot(np.asarray(point) - a, along) / max(float(np.dot(along, along)), 1e-9), 0, 1)
    return near(point, tuple(a + share * along))


def touch(one: tuple[Point, Point], other: tuple[Point, Point]) -> bool:
    """An end of one on the other; wires that only cross do not meet."""
    return any(on(end, other) for end in one) or any(on(end, one) for end in other)


def subpaths(d: str) -> list[list[Point]]:
    return [
        [tuple(map(float, pair.split(","))) for pair in re.findall(r"-?[\d.]+,-?[\d.]+", part)]
        for part in d.split("M")
        if part.strip()
    ]


def straight(points: list[Point]) -> bool:
    a, *middle, b = points
    return all(on(point, (a, b)) for point in middle)


def circuit_of(svg: str) -> Circuit:
    circuit = Circuit()
    for node in ElementTree.fromstring(svg).iter(f"{SVG}path"):
        if node.get("class") != "outline":
            continue
        parts = subpaths(node.attrib["d"])
        if len(parts) == 2 and len(parts[0]) == 7:
            circuit.resistors.append((parts[0][0], parts[1][-1]))
        elif len(parts) == 3 and all(len(part) == 2 for part in parts):
            circuit.diodes.append((parts[0][0], parts[2][-1]))
        elif len(parts[0]) >= 4:
            circuit.grounds.append(parts[0][0])
        elif straight(parts[0]):
            circuit.wires.append((parts[0][0], parts[0][-1]))
    # an end of a part is a wire of no length, so that parts may meet without another wire between them
    ends = [end for part in (*circuit.resistors, *circuit.diodes) for end in part]
    circuit.wires += [(end, end) for end in (*ends, *circuit.grounds)]
    return circuit


def cases() -> Iterator[tuple[DriveCircuit, OutputCircuit, Kind, bool, bool, int, bool]]:
    for drive, (output, kind), base, shunt in product(
        DriveCircuit,
        (
            (OutputCircuit.PULL_UP, Kind.PHOTOTRANSISTOR),
            (OutputCircuit.EMITTER_LOAD, Kind.DARLINGTON),
            (OutputCircuit.EMITTER_LOAD, Kind.PHOTOTRANSISTOR),
            (OutputCircuit.PULL_UP, Kind.LOGIC),
        ),
        (True, False),
        (True, False),
    ):
        if not (kind is Kind.LOGIC and base):
            yield drive, output, kind, base, shunt, 1, False
    for pieces, diode, shunt in ((2, False, False), (3, True, True), (5, True, False)):
        yield DriveCircuit.FIELD, OutputCircuit.PULL_UP, Kind.PHOTOTRANSISTOR, True, shunt, pieces, diode


def draw(drive, output, kind, base, shunt, pieces, diode) -> tuple[str, Design]:
    brief, coupler, design = samples.link()
    off = 5.0 if drive is DriveCircuit.FIELD else None
    brief = replace(
        brief,
        drive=replace(brief.drive, circuit=drive, off_voltage=off),
        output=replace(brief.output, circuit=output),
    )
    coupler = replace(coupler, kind=kind, base_pin=kind is not Kind.LOGIC, logic=LOGIC if kind is Kind.LOGIC else None)
    design = replace(
        design,
        r_be=design.r_be if base else None,
        r_shunt=design.r_shunt if shunt else None,
        pieces=pieces,
        reverse_diode=diode,
    )
    return schematic_svg(brief, coupler, design), design


PIN, RETURN, OUT_OF_RANGE, RECEIVER = (66.0, 74.0), (66.0, 346.0), 252.0, 510.0


@pytest.mark.parametrize("case", list(cases()), ids=lambda case: "-".join(str(part) for part in case))
def test_circuit_as_configured(case):
    drive, output, kind, base, shunt, pieces, diode = case
    svg, _ = draw(*case)
    c = circuit_of(svg)
    anode, cathode = c.diodes[0]
    _input_side(c, drive, anode, cathode, pieces, shunt, diode)
    _output_side(c, output, kind, base)
    for wire in c.wires:
        assert (wire[0][0] < OUT_OF_RANGE) == (wire[1][0] < OUT_OF_RANGE), "a wire crosses the barrier"


def _input_side(c: Circuit, drive, anode: Point, cathode: Point, pieces: int, shunt: bool, diode: bool) -> None:
    """From the drive through every series resistor into the anode; the cathode's way back; what lies across."""
    inputs = [part for part in c.resistors if part[0][0] < OUT_OF_RANGE]
    series = [part for part in inputs if c.net(part[1]) != c.net(cathode)]
    assert len(series) == min(pieces, 3)
    at = c.net(PIN)
    left = list(series)
    while left:
        following = next(part for part in left if at in (c.net(part[0]), c.net(part[1])))
        at = next(c.net(end) for end in following if c.net(end) != at)
        left.remove(following)
    assert at == c.net(anode)
    across = [part for part in inputs if part not in series]
    assert len(across) == shunt
    assert all(c.between(part, anode, cathode) for part in across)
    returned = {DriveCircuit.SOURCE: c.grounds[0]}.get(drive, RETURN)
    assert c.net(cathode) == c.net(returned)
    assert c.net(cathode)
    assert len(c.diodes) == 1 + diode
    if diode:
        assert c.net(c.diodes[1][0]) == c.net(cathode)
        assert c.net(c.diodes[1][1]) == c.net(anode)


def _output_side(c: Circuit, output, kind, base: bool) -> None:
    """The load at the supply or at the ground, the receiver at the output, the base resistor from base to emitter."""
    resistors = [part for part in c.resistors if part[0][0] > OUT_OF_RANGE]
    ground = c.grounds[-1]
    receiver = max((end for wire in c.wires for end in wire if end[0] < RECEIVER), key=lambda end: end[0])
    supply = min((end for wire in c.wires for end in wire if end[0] > OUT_OF_RANGE), key=lambda end: end[1])
    assert len(resistors) == 1 + base
    far = supply if output is OutputCircuit.PULL_UP else ground
    assert any(c.between(part, far, receiver) for part in resistors)
    assert len({c.net(supply), c.net(ground), c.net(receiver)}) == 3
    if kind is Kind.LOGIC:
        return
    collector, emitter, first_base = (388.0, 186.0), (388.0, 286.0), (292.0, 296.0)
    assert c.net(collector) == c.net(receiver if output is OutputCircuit.PULL_UP else supply)
    assert c.net(emitter) == c.net(ground if output is OutputCircuit.PULL_UP else receiver)
    assert c.net(first_base) not in (c.net(collector), c.net(emitter), frozenset())
    if base:
        assert any(c.between(part, first_base, emitter) for part in resistors)


@pytest.mark.parametrize("case", list(cases()), ids=lambda case: "-".join(str(part) for part in case))
def test_values_and_bounds(case):
    """Every chosen value is said and none else; nothing lies outside the picture."""
    svg, design = draw(*case)
    root = ElementTree.fromstring(svg)
    words = ["".join(node.itertext()) for node in root.iter(f"{SVG}text")]
    said = [word for word in words if word.endswith("Ω")]
    expected = ["470 Ω" if design.pieces == 1 else f"{design.pieces} × 470 Ω", "10 kΩ"]
    expected += ["220 kΩ"] * (design.r_be is not None) + ["4.7 kΩ"] * (design.r_shunt is not None)
    assert sorted(said) == sorted(expected)
    names = [word for word in words if re.fullmatch("R(LED|load|BE|shunt)", word)]
    assert len(names) == len(expected)
    left, top, width, height = map(float, root.attrib["viewBox"].split())
    for x, y in _places(root):
        assert left <= x <= left + width
        assert top <= y <= top + height


def _places(root: ElementTree.Element) -> Iterator[Point]:
    """Ends of every line, and of every text as wide as a wide typeface makes it."""
    for node in root.iter():
        if node.tag == f"{SVG}path":
            yield from (point for part in subpaths(node.attrib["d"].replace(" ", ",")) for point in part)
        if node.tag == f"{SVG}text":
            x, y, text = float(node.attrib["x"]), float(node.attrib["y"]), "".join(node.itertext())
            length = 0.56 * 15 * len(text)
            begin = x - {"start": 0.0, "middle": length / 2, "end": length}[node.attrib["text-anchor"]]
            yield from ((begin, y), (begin + length, y), (begin, y - 12))


def test_what_lights_the_led_is_said():
    for drive, words in (
        (DriveCircuit.SOURCE, "high lights"),
        (DriveCircuit.SINK, "low lights"),
        (DriveCircuit.FIELD, "lit at"),
    ):
        svg, _ = draw(drive, OutputCircuit.PULL_UP, Kind.PHOTOTRANSISTOR, True, False, 1, False)
        assert words in svg
    assert "dark below 5 V" in svg


def test_barrier_between_led_and_output():
    svg, _ = draw(*next(cases()))
    root = ElementTree.fromstring(svg)
    (barrier,) = (node for node in root.iter(f"{SVG}line") if node.get("class") == "barrier")
    c = circuit_of(svg)
    assert barrier.attrib["x1"] == barrier.attrib["x2"]
    assert c.diodes[0][0][0] < float(barrier.attrib["x1"]) < 292.0
    assert "5 kV withstand" in svg


def test_text_is_text_and_escaped():
    brief, coupler, design = samples.link()
    hostile = '<script>&"'
    svg = schematic_svg(brief, replace(coupler, part=hostile), design)
    words = ["".join(node.itertext()) for node in ElementTree.fromstring(svg).iter(f"{SVG}text")]
    assert hostile in words
    assert "<script" not in svg


def test_colours_are_left_to_the_page():
    """No colour and no width in the drawing itself: classes, so that light and dark differ."""
    svg, _ = draw(*next(cases()))
    assert not re.search(r"stroke[:=]|fill[:=]|#[0-9a-f]{3}|rgb|black", svg)


def test_a_file_of_its_own():
    """With the styles in it the drawing is the same, and the colours are those of the palette."""
    svg, _ = draw(*next(cases()))
    alone = ElementTree.fromstring(standalone(svg))
    (style,) = alone.iter(f"{SVG}style")
    assert "--series-2: #" in style.text
    assert ".schematic .outline { fill: none" in style.text
    alone.remove(style)
    assert ElementTree.tostring(alone) == ElementTree.tostring(ElementTree.fromstring(svg))


def test_described():
    brief, coupler, design = samples.link()
    root = ElementTree.fromstring(schematic_svg(brief, coupler, design))
    assert root.attrib["role"] == "img"
    told = root.find(f"{SVG}desc").text
    assert told.startswith(
        "INV-7, phototransistor: a driver pin that is high lights the LED; a pull-up load; LED resistor 470 Ω"
    )


def test_drawing_does_not_load_matplotlib():
    """It would cost seconds; whoever has loaded it keeps it."""
    code = """
import sys
{before}
from optopick.report import sheet
sheet.schemdraw()
assert ("matplotlib" in sys.modules) is {kept}, sys.modules.get("matplotlib")
import matplotlib
"""
    for before, kept in (("", False), ("import matplotlib", True)):
        run = subprocess.run(
            [sys.executable, "-c", code.format(before=before, kept=kept)], capture_output=True, text=True, check=False
        )
        assert run.returncode == 0, run.stderr


def test_the_reader_of_circuits_sees_a_gap_and_a_crossing():
    """The test's own eyes: a gap of two pixels is no contact, and lines that cross without an end do not meet."""
    wires = [
        ((0.0, 0.0), (10.0, 0.0)),
        ((12.0, 0.0), (20.0, 0.0)),
        ((5.0, -5.0), (5.0, 5.0)),
        ((10.0, 0.0), (10.0, 9.0)),
    ]
    c = Circuit(wires=wires)
    assert c.net((0.0, 0.0)) == {0, 3}
    assert c.net((5.0, 5.0)) == {2}
