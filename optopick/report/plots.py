"""Plots for files, by matplotlib: the trade-off front."""

from __future__ import annotations

from io import BytesIO

import numpy as np
from matplotlib import rc_context
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.ticker import EngFormatter

from optopick.answers import Front, Sweep

INK, MARK, LINE = "#1d2b36", "#b3400f", "#2a6f8f"


def front_figure(front: Front, title: str) -> Figure:
    """The front: both goals by their logarithms, every point, the knee named."""
    figure = Figure(figsize=(7.0, 4.6), layout="constrained")
    FigureCanvasAgg(figure)
    axes = figure.add_subplot()
    axes.plot([p.first for p in front.points], [p.second for p in front.points], "o-", color=LINE, ms=4, lw=1)
    if front.knee is not None:
        knee = front.points[front.knee]
        axes.plot([knee.first], [knee.second], "D", color=MARK, ms=8)
        axes.annotate(
            f"knee: {knee.review.design.coupler}",
            (knee.first, knee.second),
            (10, 10),
            textcoords="offset points",
            color=MARK,
        )
    if front.points:
        axes.set_xscale("log")
        axes.set_yscale("log")
    for axis, goal in ((axes.xaxis, front.goals[0]), (axes.yaxis, front.goals[1])):
        unit = "W" if goal == "power" else "s"
        axis.set_major_formatter(EngFormatter(unit))
        axis.set_minor_formatter(EngFormatter(unit))
        axis.get_label().set_text(f"worst-case {goal.value}")
    axes.set_title(title, color=INK, loc="left")
    axes.grid(True, which="both", alpha=0.3)
    return figure


def sweep_figure(sweep: Sweep, title: str) -> Figure:
    """Worst-case edges and delays over the stock values, typical ones dashed; chosen and failing values marked."""
    figure = Figure(figsize=(7.0, 4.6), layout="constrained")
    FigureCanvasAgg(figure)
    axes = figure.add_subplot()
    steps = [step for step in sweep.steps if step.ohms is not None]
    ohms = np.array([step.ohms for step in steps], dtype=float)
    for name, color in (("edge_on", LINE), ("edge_off", MARK), ("delay_on", "#4b7a2b"), ("delay_off", "#6a4a9c")):
        axes.plot(ohms, [getattr(step.worst.timing, name) for step in steps], color=color, label=name.replace("_", " "))
        axes.plot(ohms, [getattr(step.typical.timing, name) for step in steps], color=color, ls="--", lw=0.8)
    failing = ohms[[not step.worst.passed for step in steps]]
    least = min((step.typical.timing.edge_on for step in steps), default=1e-6)
    axes.plot(failing, np.full(failing.shape, least / 3), "x", color=MARK, ms=4, label="fails a check")
    if sweep.chosen is not None:
        axes.axvline(sweep.chosen, color=INK, lw=1, ls=":")
        axes.annotate(
            "chosen", (sweep.chosen, 0.02), (4, 0), xycoords=("data", "axes fraction"), textcoords="offset points"
        )
    axes.set_xscale("log")
    axes.set_yscale("log")
    axes.xaxis.set_major_formatter(EngFormatter("Ω"))
    axes.yaxis.set_major_formatter(EngFormatter("s"))
    axes.set_xlabel(sweep.position)
    axes.set_ylabel("time; dashed: typical")
    axes.set_title(title, color=INK, loc="left")
    axes.grid(True, which="both", alpha=0.3)
    axes.legend(fontsize=8)
    return figure


def figure_bytes(figure: Figure, kind: str) -> bytes:
    """A figure as the bytes of an SVG (text as text, no date) or PNG file."""
    buffer = BytesIO()
    with rc_context({"svg.fonttype": "none", "svg.hashsalt": "optopick"}):
        figure.savefig(buffer, format=kind, dpi=150, metadata={"Date": None} if kind == "svg" else None)
    return buffer.getvalue()
