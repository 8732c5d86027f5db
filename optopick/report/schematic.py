"""The circuit of a design as it is configured, drawn to be read in light and dark, on paper and on a telephone.

Places are in the drawing's own units, which are CSS pixels. Resistors are the rectangles of IEC 60617.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from itertools import pairwise
from typing import Any

from markupsafe import Markup

from optopick.brief import Brief, DriveCircuit, OutputCircuit, Span
from optopick.coupler import Coupler, Kind
from optopick.report.placed import Placed, placed_resistors
from optopick.report.sheet import Sheet, pixels
from optopick.report.svg import Point, element, picture, text
from optopick.report.words import amount
from optopick.result import Design

WIDTH, HEIGHT = 560.0, 452.0
SHUNT_ROOM, DIODE_ROOM = 24.0, 66.0
"""Room at the left for the words of a resistor across the LED, and for a diode beside that."""

MOST_DRAWN = 3
"""Resistors in series that are drawn one by one; the words always say how many there are."""

LED_X, BARRIER_X, BASE_X, OUT_X = 172.0, 252.0, 292.0, 388.0
INNER_TOP, INNER_BOTTOM, MIDDLE = 186.0, 286.0, 236.0
RAIL, RETURN = 74.0, 346.0
PACKAGE = (128.0, 188.0, 276.0, 96.0)
"""Left, top, width and height of the coupler's outline."""


def schematic_svg(brief: Brief, coupler: Coupler, design: Design) -> str:
    """The circuit with the chosen values: drive, LED side, barrier, output side, as this brief configures them."""
    sheet = Sheet()
    placed = {one.position: one for one in placed_resistors(brief, design)}
    _DRIVES[brief.drive.circuit](sheet, brief)
    _led_side(sheet, placed, design)
    if coupler.kind is Kind.LOGIC:
        _logic_side(sheet, brief, placed)
    else:
        _transistor(sheet, coupler)
        side = _pulled_up if brief.output.circuit is OutputCircuit.PULL_UP else _emitter_load
        side(sheet, brief, placed)
    left = (SHUNT_ROOM + DIODE_ROOM * design.reverse_diode) if "r_shunt" in placed else 0.0
    shapes = sheet.shapes()
    return picture(
        "Schematic",
        _described(brief, coupler, placed),
        *_barrier(brief, coupler),
        element("g", shapes, class_="wires"),
        element("g", *sheet.words),
        viewBox=f"{-left:g} 0 {WIDTH + left:g} {HEIGHT:g}",
        class_="schematic",
    )


def _name(symbol: str) -> Markup:
    """A symbol with its index lowered: R_LED."""
    stem, _, index = symbol.partition("_")
    return Markup("").join((stem, element("tspan", index, class_="index", dy=4)))


def _value_lines(one: Placed) -> tuple[Markup, str, str]:
    """Name, value, and what the stock says of it."""
    rated = [
        amount(one.tolerance, "%") if one.tolerance is not None else "",
        amount(one.power, "W") if one.power else "",
    ]
    return _name(one.symbol), one.words, ", ".join(part for part in rated if part)


def _resistor_words(sheet: Sheet, at: Point, one: Placed, anchor: str = "start") -> None:
    name, value, rated = _value_lines(one)
    sheet.say(at, name, class_="name", anchor=anchor)
    sheet.say((at[0], at[1] + 20), value, class_="value", anchor=anchor)
    sheet.say((at[0], at[1] + 38), rated, class_="small", anchor=anchor)


def _span_words(span: Span, unit: str) -> str:
    """Both ends of a span, the unit said once where it is the same."""
    low, high = amount(span.low, unit), amount(span.high, unit)
    if span.low == span.high:
        return low
    same = low.partition(" ")[2] == high.partition(" ")[2]
    return f"{low.partition(' ')[0] if same else low} to {high}"


# ---- the drive --------------------------------------------------------------------------------------------------


def _source(sheet: Sheet, brief: Brief) -> None:
    _driver_pin(sheet, (66.0, RAIL))
    sheet.say((8, RAIL - 46), "driver pin,", "high lights the LED", class_="small")
    sheet.say((8, RAIL + 34), _span_words(brief.drive.supply, "V"), class_="small")
    sheet.wire((LED_X, INNER_BOTTOM), (LED_X, RETURN))
    sheet.put(sheet.symbols.Ground(), (LED_X, RETURN))


def _sink(sheet: Sheet, brief: Brief) -> None:
    sheet.put(sheet.symbols.Vdd(), (66.0, RAIL))
    sheet.say((8, RAIL - 50), "drive supply", _span_words(brief.drive.supply, "V"), class_="small")
    sheet.wire((LED_X, INNER_BOTTOM), (LED_X, RETURN), (66.0, RETURN))
    _driver_pin(sheet, (66.0, RETURN))
    sheet.say((8, RETURN + 34), "driver pin,", "low lights the LED", class_="small")


def _field(sheet: Sheet, brief: Brief) -> None:
    for y, sign in ((RAIL, "+"), (RETURN, "−")):
        sheet.put(sheet.symbols.Dot(open=True, radius=0.13), (66.0, y))
        sheet.say((44, y + 6), sign, class_="name", anchor="middle")
    sheet.say((8, RAIL - 46), "field input, lit at", _span_words(brief.drive.supply, "V"), class_="small")
    if brief.drive.off_voltage is not None:
        sheet.say((8, RETURN + 34), f"dark below {amount(brief.drive.off_voltage, 'V')}", class_="small")
    sheet.wire((LED_X, INNER_BOTTOM), (LED_X, RETURN), (66.0, RETURN))


def _driver_pin(sheet: Sheet, at: Point) -> None:
    """A driver as a triangle whose tip is the pin."""
    x, y = at
    sheet.triangle(at, 30, 17)
    sheet.wire((x - 44, y), (x - 30, y))


_DRIVES: dict[DriveCircuit, Callable[[Sheet, Brief], None]] = {
    DriveCircuit.SOURCE: _source,
    DriveCircuit.SINK: _sink,
    DriveCircuit.FIELD: _field,
}


def _led_side(sheet: Sheet, placed: dict[str, Placed], design: Design) -> None:
    """The LED and its resistors: further ones in series lie in the wire from the drive."""
    further = min(design.pieces, MOST_DRAWN) - 1
    joints = [66.0 + k * (LED_X - 66.0) / max(further, 1) for k in range(max(further, 1) + 1)]
    for begin, end in pairwise(joints):
        (sheet.resistor if further else sheet.wire)((begin, RAIL), (end, RAIL))
    sheet.resistor((LED_X, RAIL), (LED_X, 152.0))
    _resistor_words(sheet, (LED_X + 18, 98.0), placed["r_led"])
    sheet.wire((LED_X, 152.0), (LED_X, INNER_TOP))
    sheet.part(sheet.symbols.LED().scale(1.35), (LED_X, INNER_TOP), (LED_X, INNER_BOTTOM))
    if "r_shunt" in placed:
        _across(sheet, 108.0, sheet.symbols.ResistorIEC().scale(1.2))
        _resistor_words(sheet, (92.0, MIDDLE - 16), placed["r_shunt"], "end")
    if design.reverse_diode:
        x = -26.0 if "r_shunt" in placed else 108.0
        _across(sheet, x, sheet.symbols.Diode().scale(1.2), upward=True)
        sheet.say(
            (x - 16, MIDDLE - 6),
            *(("diode",) if "r_shunt" in placed else ("reverse", "diode")),
            class_="small",
            anchor="end",
        )


def _across(sheet: Sheet, x: float, symbol: Any, *, upward: bool = False) -> None:  # noqa: ANN401 - schemdraw's own element
    """A part from one end of the LED to the other."""
    top, bottom = INNER_TOP - 24, INNER_BOTTOM + 24
    sheet.wire((LED_X, top), (x, top))
    sheet.part(symbol, *(((x, bottom), (x, top)) if upward else ((x, top), (x, bottom))))
    sheet.wire((x, bottom), (LED_X, bottom))
    sheet.joint((LED_X, top), (LED_X, bottom))


# ---- the barrier ------------------------------------------------------------------------------------------------


def _barrier(brief: Brief, coupler: Coupler) -> Iterator[Markup]:
    """The outline of the coupler, its name, and the line that nothing but light crosses."""
    x, y, width, height = PACKAGE
    yield element("rect", x=x, y=y, width=width, height=height, rx=10, class_="package")
    yield element("line", x1=BARRIER_X, x2=BARRIER_X, y1=150, y2=HEIGHT - 44, class_="barrier")
    yield text((BARRIER_X, HEIGHT - 26), "isolation barrier", "small halo", "middle")
    withstand = coupler.barrier.withstand
    if withstand is not None:
        yield text((BARRIER_X, HEIGHT - 8), f"{amount(withstand, 'V')} withstand", "small halo", "middle")
    # a long part number is drawn smaller rather than over the collector's wire
    size = min(16.0, 16.0 * 18 / max(len(coupler.part), 1))
    middle = (LED_X + OUT_X) / 2
    style = f"font-size:{size:.3g}px"
    yield element("text", coupler.part, x=middle, y=y - 9, class_="name halo", text_anchor="middle", style=style)


# ---- the output -------------------------------------------------------------------------------------------------


def _transistor(sheet: Sheet, coupler: Coupler) -> None:
    """A transistor, or two with their collectors joined; the base's wire only where it is brought out."""
    scale = 1.3
    if coupler.kind is Kind.DARLINGTON:
        first = sheet.put(sheet.symbols.BjtNpn().scale(0.95), (BASE_X + 12, MIDDLE - 16))
        second = sheet.put(sheet.symbols.BjtNpn().scale(scale), (OUT_X - 35.2, MIDDLE + 8))
        base, inner = pixels(first.emitter), pixels(second.base)
        sheet.wire(base, (base[0], inner[1]), inner)
        sheet.wire(pixels(first.collector), (pixels(first.collector)[0], INNER_TOP + 10), (OUT_X, INNER_TOP + 10))
        sheet.joint((OUT_X, INNER_TOP + 10))
        start = pixels(first.base)
    else:
        second = sheet.put(sheet.symbols.BjtNpn().scale(scale), (OUT_X - 35.2, MIDDLE))
        start = pixels(second.base)
    sheet.wire(pixels(second.collector), (OUT_X, INNER_TOP))
    sheet.wire(pixels(second.emitter), (OUT_X, INNER_BOTTOM))
    if coupler.base_pin:
        sheet.wire(start, (BASE_X, start[1]), (BASE_X, INNER_BOTTOM + 10))


def _supply(sheet: Sheet, brief: Brief, at: Point, side: int = 1) -> None:
    """The output's supply, its words to the right (1) or to the left (-1)."""
    anchor = "start" if side > 0 else "end"
    sheet.put(sheet.symbols.Vdd(), at)
    sheet.say((at[0] + 16 * side, at[1] - 14), _name("V_CC"), class_="name", anchor=anchor)
    sheet.say((at[0] + 16 * side, at[1] + 6), _span_words(brief.output.supply, "V"), class_="small", anchor=anchor)


def _receiver(sheet: Sheet, brief: Brief, at: Point) -> None:
    """The wire to the receiver, and its thresholds."""
    x, y = WIDTH - 52, at[1]
    sheet.joint(at)
    sheet.wire(at, (x, y))
    sheet.triangle((x + 30, y), 30, 17)
    sheet.wire((x + 30, y), (x + 44, y))
    for k, (name, span) in enumerate((("V_IH", brief.output.v_ih), ("V_IL", brief.output.v_il))):
        sheet.say((OUT_X + 24, y + 36 + 20 * k), _name(name), class_="small")
        sheet.say((OUT_X + 52, y + 36 + 20 * k), _threshold_words(span), class_="small")


def _threshold_words(span: Span) -> str:
    """A threshold, or both ends where it follows the supply."""
    low, high = f"{span.low:.3g}", f"{span.high:.3g}"
    return f"{low} V" if low == high else f"{low} to {high} V"


def _base_resistor(sheet: Sheet, placed: dict[str, Placed], y: float) -> None:
    if "r_be" not in placed:
        return
    sheet.wire((BASE_X, INNER_BOTTOM + 10), (BASE_X, y))
    sheet.resistor((BASE_X, y), (OUT_X, y))
    sheet.joint((OUT_X, y))
    _resistor_words(sheet, (OUT_X - 18, y + 26), placed["r_be"], "end")


def _pulled_up(sheet: Sheet, brief: Brief, placed: dict[str, Placed]) -> None:
    _supply(sheet, brief, (OUT_X, 46.0))
    sheet.resistor((OUT_X, 46.0), (OUT_X, 146.0))
    _resistor_words(sheet, (OUT_X + 18, 86.0), placed["r_load"])
    sheet.wire((OUT_X, 146.0), (OUT_X, INNER_TOP))
    _receiver(sheet, brief, (OUT_X, 158.0))
    sheet.wire((OUT_X, INNER_BOTTOM), (OUT_X, RETURN))
    _base_resistor(sheet, placed, 318.0)
    sheet.put(sheet.symbols.GroundSignal(), (OUT_X, RETURN))


def _emitter_load(sheet: Sheet, brief: Brief, placed: dict[str, Placed]) -> None:
    _supply(sheet, brief, (OUT_X, 118.0))
    sheet.wire((OUT_X, 118.0), (OUT_X, INNER_TOP))
    sheet.wire((OUT_X, INNER_BOTTOM), (OUT_X, 332.0))
    _base_resistor(sheet, placed, 306.0)
    _receiver(sheet, brief, (OUT_X, 306.0))
    sheet.resistor((OUT_X, 332.0), (OUT_X, 412.0))
    _resistor_words(sheet, (OUT_X + 18, 390.0), placed["r_load"])
    sheet.put(sheet.symbols.GroundSignal(), (OUT_X, 412.0))


def _logic_side(sheet: Sheet, brief: Brief, placed: dict[str, Placed]) -> None:
    """A logic output with an open collector: amplifier, supply pin, pull-up, receiver."""
    left, right, x = BASE_X + 20, BASE_X + 74, OUT_X + 36
    sheet.triangle((right, MIDDLE), right - left, 28)
    sheet.wire((right, MIDDLE), (x, MIDDLE))
    middle = (left + right) / 2
    _supply(sheet, brief, (x, 46.0), -1)
    sheet.wire((middle, MIDDLE - 14), (middle, RAIL), (x, RAIL))
    sheet.wire((x, 46.0), (x, RAIL))
    sheet.resistor((x, RAIL), (x, 196.0))
    sheet.wire((x, 196.0), (x, MIDDLE))
    sheet.joint((x, RAIL))
    _resistor_words(sheet, (x + 18, 122.0), placed["r_load"])
    sheet.wire((middle, MIDDLE + 14), (middle, RETURN))
    sheet.put(sheet.symbols.GroundSignal(), (middle, RETURN))
    sheet.say((middle + 10, INNER_BOTTOM + 26), "open collector", class_="small")
    _receiver(sheet, brief, (x, MIDDLE))


def _described(brief: Brief, coupler: Coupler, placed: dict[str, Placed]) -> str:
    """The circuit in words, for those who do not see it."""
    values = ", ".join(f"{one.label} {one.words}" for one in placed.values())
    lit = {
        DriveCircuit.SOURCE: "a driver pin that is high lights the LED",
        DriveCircuit.SINK: "a driver pin that is low lights the LED",
        DriveCircuit.FIELD: "a voltage from the field lights the LED",
    }[brief.drive.circuit]
    load = {OutputCircuit.PULL_UP: "a pull-up load", OutputCircuit.EMITTER_LOAD: "a load at the emitter"}
    return f"{coupler.part}, {coupler.kind.value}: {lit}; {load[brief.output.circuit]}; {values}."
