"""What a brief asks, in rows of words."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from optopick.brief import Brief, Drive, DriveCircuit, Limits, Output, OutputCircuit, Position, Span
from optopick.report.labels import POSITIONS
from optopick.report.words import amount

_DRIVES = {
    DriveCircuit.SOURCE: "a driver pin that is high lights the LED",
    DriveCircuit.SINK: "a driver pin that is low lights the LED",
    DriveCircuit.FIELD: "a voltage from outside the equipment lights the LED",
}
_OUTPUTS = {
    OutputCircuit.PULL_UP: "load resistor to the supply (low while lit)",
    OutputCircuit.EMITTER_LOAD: "load resistor at the emitter (high while lit)",
}

Rows = tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class Part:
    """One section of the brief: its name, and what it asks as term and words."""

    name: str
    rows: Rows


def span_words(span: Span, unit: str) -> str:
    """Both ends of a span, or the one value."""
    low = amount(span.low, unit)
    return low if span.low == span.high else f"{low} to {amount(span.high, unit)}"


def requirement_parts(brief: Brief) -> tuple[Part, ...]:
    """Every requirement of a brief, section by section."""
    signal, environment, goal = brief.signal, brief.environment, brief.goal
    given = f"up to {amount(goal.give, '%')} of the least {goal.minimize.value}"
    return (
        Part(
            "Signal",
            (
                ("Shortest pulse", amount(signal.shortest_pulse, "s")),
                ("LED lit", f"{amount(signal.lit, '%')} of the time"),
            ),
        ),
        Part("Drive", tuple(_drive(brief.drive))),
        Part("Output", tuple(_output(brief.output))),
        Part(
            "Environment",
            (("Ambient", span_words(environment.temperature, "degC")), ("Service life", amount(environment.life, "h"))),
        ),
        Part("Limits", tuple(_limits(brief.limits))),
        Part("Stock", tuple(_stock(brief))),
        Part("Goal", (("Least", goal.minimize.value), ("Then least", goal.then.value), ("Given up for it", given))),
    )


def _drive(drive: Drive) -> Iterator[tuple[str, str]]:
    yield "LED lit by", _DRIVES[drive.circuit]
    yield "Drive voltage", span_words(drive.supply, "V")
    yield "Lost in the driver", span_words(drive.drop, "V")
    if drive.max_current is not None:
        yield "Driver gives at most", amount(drive.max_current, "A")
    yield "Driver leaks when off", amount(drive.off_leakage, "A")
    if drive.off_voltage is not None:
        yield "Must be dark below", f"{amount(drive.off_voltage, 'V')}, and at {amount(drive.off_current, 'A')}"
    if drive.on_current_min > 0:
        yield "Input draws at least", amount(drive.on_current_min, "A")
    if drive.reverse > 0:
        yield "Reverse voltage", amount(drive.reverse, "V")


def _output(output: Output) -> Iterator[tuple[str, str]]:
    yield "Circuit", _OUTPUTS[output.circuit]
    yield "Supply", span_words(output.supply, "V")
    yield "Receiver reads low up to", span_words(output.v_il, "V")
    yield "Receiver reads high from", span_words(output.v_ih, "V")
    yield "Noise margin", amount(output.noise_margin, "V")
    yield "Input leakage", amount(output.input_leakage, "A")
    yield "Input current while low", amount(output.input_current_low, "A")
    yield "Capacitance", amount(output.capacitance, "F")


def _limits(limits: Limits) -> Iterator[tuple[str, str]]:
    isolation = limits.isolation
    asked = (
        ("CTR margin", "≥", limits.ctr_margin, "1"),
        ("Edge time", "≤", limits.edge_time, "s"),
        ("Delay", "≤", limits.delay, "s"),
        ("Pulse distortion", "≤", limits.distortion, "s"),
        ("Average power", "≤", limits.power, "W"),
        ("Withstand voltage", "≥", isolation.withstand, "V"),
        ("Working voltage", "≥", isolation.working, "V"),
        ("Creepage", "≥", isolation.creepage, "m"),
    )
    for name, sense, value, unit in asked:
        if value is not None:
            yield name, f"{sense} {amount(value, unit)}"
    yield "Guard on computed times", f"× {amount(limits.timing_guard, '1')}"


def _stock(brief: Brief) -> Iterator[tuple[str, str]]:
    for name, label in POSITIONS.items():
        position: Position | None = getattr(brief.stock, name)
        if position is not None:
            yield label, position.described + (", may stay empty" if position.absent else "")
    yield "Drift", amount(brief.stock.drift, "1/K")
