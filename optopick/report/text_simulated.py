"""A simulation beside the formulas, for people at a terminal."""

from __future__ import annotations

from collections.abc import Iterator

from rich.console import Group, RenderableType
from rich.table import Table
from rich.text import Text

from optopick.report.labels import TIMES
from optopick.report.words import amount
from optopick.simulate.design import Simulated, Simulation


def simulation_text(simulation: Simulation, cut: int) -> RenderableType:
    """Times of the formulas, guard included, beside the simulated ones, at the corners where each is longest."""
    parts: list[RenderableType] = [Text(), Text("Simulated", style="bold")]
    if simulation.reason:
        return Group(*parts, Text(simulation.reason))
    if cut:
        parts.append(Text(f"{cut} better designs were refuted by simulation and left out."))
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold")
    table.add_column("Time")
    for heading in ("Formula", "Simulated", "On the safe side by"):
        table.add_column(heading, justify="right", no_wrap=True)
    table.add_column("At", ratio=1)
    for pulse in simulation.pulses:
        for row in _rows(pulse, simulation.guard):
            table.add_row(*row)
    return Group(*parts, table)


def _rows(pulse: Simulated, guard: float) -> Iterator[tuple[str, str, str, str, str]]:
    for name in pulse.worst_for:
        formula = guard * getattr(pulse.by_formula, name)
        if pulse.times is None:
            yield TIMES[name], amount(formula, "s"), "–", "–", pulse.reason
            continue
        simulated = getattr(pulse.times, name)
        safe = f"{100 * (formula / simulated - 1):.0f} %" if simulated else "–"
        yield TIMES[name], amount(formula, "s"), amount(simulated, "s"), safe, pulse.corner.words
