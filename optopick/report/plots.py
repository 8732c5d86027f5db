"""Plots for files, by matplotlib: the trade-off front, and a resistor over its stock."""

from __future__ import annotations

from collections.abc import Iterable
from io import BytesIO

import numpy as np
from matplotlib import rc_context
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.ticker import FixedLocator, NullLocator

from optopick.answers import Front, Sweep
from optopick.report.axes import scale_over

INK, MARK, LINE = "#1d2b36", "#b3400f", "#2a6f8f"

TITLE_SIZE, TITLE_FITS = 12.0, 72
"""Size of a title [pt], and the characters of it that the picture is wide enough for; a longer one is set smaller."""

TICKS = 7
"""Ticks of an axis at the most."""


def front_figure(front: Front, title: str) -> Figure:
    """The front: both goals by their logarithms, every point, the knee named."""
    figure, axes = _empty(title)
    first, second = [p.first for p in front.points], [p.second for p in front.points]
    axes.plot(first, second, "o-", color=LINE, ms=4, lw=1)
    if front.knee is not None:
        _name_knee(axes, front, front.knee)
    for name, values, goal in (("x", first, front.goals[0]), ("y", second, front.goals[1])):
        _scaled(axes, name, values, "W" if goal == "power" else "s")
        axes.set(**{f"{name}label": f"worst-case {goal.value}"})
    return figure


def _name_knee(axes: Axes, front: Front, at: int) -> None:
    knee = front.points[at]
    axes.plot([knee.first], [knee.second], "D", color=MARK, ms=8)
    words, place = f"knee: {knee.review.design.coupler}", (knee.first, knee.second)
    axes.annotate(words, place, (10, 10), textcoords="offset points", color=MARK)


def sweep_figure(sweep: Sweep, title: str) -> Figure:
    """Worst-case edges and delays over the stock values, typical ones dashed; chosen and failing values marked."""
    figure, axes = _empty(title)
    steps = [step for step in sweep.steps if step.ohms is not None]
    ohms = np.array([step.ohms for step in steps], dtype=float)
    shown: list[float] = []
    for name, color in (("edge_on", LINE), ("edge_off", MARK), ("delay_on", "#4b7a2b"), ("delay_off", "#6a4a9c")):
        worst = [getattr(step.worst.timing, name) for step in steps]
        typical = [getattr(step.typical.timing, name) for step in steps]
        axes.plot(ohms, worst, color=color, label=name.replace("_", " "))
        axes.plot(ohms, typical, color=color, ls="--", lw=0.8)
        shown += [*worst, *typical]
    failing = ohms[[not step.worst.passed for step in steps]]
    foot = axes.get_xaxis_transform()  # stock values across, shares of the height upward
    axes.plot(failing, np.full(failing.shape, 0.025), "x", color=INK, ms=4, transform=foot, label="fails a check")
    if sweep.chosen is not None:
        axes.axvline(sweep.chosen, color=INK, lw=1, ls=":")
        place = (sweep.chosen, 0.06)
        axes.annotate("chosen", place, (4, 0), xycoords=("data", "axes fraction"), textcoords="offset points")
    _scaled(axes, "x", ohms, "ohm")
    _scaled(axes, "y", shown, "s")
    axes.set_xlabel(sweep.position)
    axes.set_ylabel("time; dashed: typical")
    axes.legend(fontsize=8)
    return figure


def _empty(title: str) -> tuple[Figure, Axes]:
    """A figure without content. Its margins are fixed: to lay it out anew takes longer than to draw it."""
    figure = Figure(figsize=(7.0, 4.6))
    FigureCanvasAgg(figure)
    figure.subplots_adjust(left=0.125, right=0.97, bottom=0.12, top=0.93)
    axes = figure.add_subplot()
    size = TITLE_SIZE * min(1.0, TITLE_FITS / max(len(title), 1))
    axes.set_title(title, color=INK, loc="left", fontsize=size)
    axes.grid(True, alpha=0.3)
    return figure, axes


def _scaled(axes: Axes, name: str, values: Iterable[float], unit: str) -> None:
    """A logarithmic axis, "x" or "y", over the values, with a few round ticks."""
    scale = scale_over(values, unit, log=True)
    axes.set(**{f"{name}scale": "log", f"{name}lim": (scale.low, scale.high)})
    axis = axes.xaxis if name == "x" else axes.yaxis
    axis.set_major_locator(FixedLocator(scale.ticks(TICKS)))
    axis.set_minor_locator(NullLocator())
    axis.set_major_formatter(lambda value, _: scale.words(value))


def figure_bytes(figure: Figure, kind: str) -> bytes:
    """A figure as the bytes of an SVG (text as text, no date) or PNG file."""
    buffer = BytesIO()
    with rc_context({"svg.fonttype": "none", "svg.hashsalt": "optopick"}):
        figure.savefig(buffer, format=kind, dpi=150, metadata={"Date": None} if kind == "svg" else None)
    return buffer.getvalue()
