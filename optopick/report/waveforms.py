"""Simulated runs as plain waveforms for the page: the output's voltage, and when the LED is lit."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

from optopick.brief import Brief
from optopick.corners import thresholds
from optopick.report.document import Level, Trace, Waveform
from optopick.report.labels import TIMES

if TYPE_CHECKING:
    from optopick.simulate import Pattern, Simulated, Simulation
    from optopick.simulate.transient import Run


@dataclass(frozen=True)
class TimeRow:
    """One time at one corner: by the formula with the guard, and simulated [s]."""

    name: str
    formula: float
    simulated: float

    @property
    def beyond(self) -> bool:
        """Whether the simulation is slower than the formula with its guard."""
        return self.simulated > self.formula * (1 + 1e-9)


@dataclass(frozen=True)
class PulseView:
    """One simulated pulse: its corner in words, the waveform and its times, or why there are none."""

    corner: str
    wave: Waveform | None
    times: tuple[TimeRow, ...]
    reason: str


def pulse_views(brief: Brief, simulation: Simulation) -> tuple[PulseView, ...]:
    """Every pulse of a simulation."""
    return tuple(_pulse(brief, simulation.guard, pulse) for pulse in simulation.pulses)


def _pulse(brief: Brief, guard: float, pulse: Simulated) -> PulseView:
    words = pulse.corner.words or "the same at every corner"
    if pulse.run is None or pulse.times is None:
        return PulseView(words, None, (), pulse.reason)
    rows = tuple(
        TimeRow(TIMES[name], guard * getattr(pulse.by_formula, name), getattr(pulse.times, name))
        for name in pulse.worst_for or tuple(vars(pulse.times))
    )
    return PulseView(words, _wave(brief, words, pulse.run), rows, "")


def pattern_wave(brief: Brief, pattern: Pattern) -> Waveform:
    """A bit pattern."""
    return _wave(brief, pattern.corner.words, pattern.run, pattern.bits, pattern.bit)


def _wave(brief: Brief, title: str, run: Run, bits: str = "", bit_time: float = 0.0) -> Waveform:
    time, volts = zip(*_points(run), strict=True)
    output = brief.output
    levels = tuple(
        Level(name, float(thresholds(span, output.supply, run.circuit.v_cc)))
        for name, span in (("V_IH", output.v_ih), ("V_IL", output.v_il))
    )
    return Waveform(title, time, (Trace("output", volts),), levels, tuple(_lit(run)), bits, bit_time)


def _points(run: Run) -> Iterator[tuple[float, float]]:
    """Time and output voltage, stretch after stretch."""
    for stretch in run.stretches:
        volts = run.output(stretch.states[:, 1])
        yield from zip((float(t) for t in stretch.t), (float(v) for v in volts), strict=True)


def _lit(run: Run) -> Iterator[tuple[float, float]]:
    """From when to when the LED is on: where its current is above that before the run."""
    for stretch in run.stretches:
        if stretch.i_f > run.before:
            yield float(stretch.t[0]), float(stretch.t[-1])
