"""Plots for files, by matplotlib: the trade-off front."""

from __future__ import annotations

from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.ticker import EngFormatter

from optopick.answers import Front

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
