"""One corner as plain numbers: which unit, how hot, how old, which supplies and resistors; the corners worth a look."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace

import numpy as np

from optopick.brief import Brief
from optopick.corners import thresholds
from optopick.coupler import Coupler
from optopick.physics.led import branch_current, forward_voltage
from optopick.physics.types import Array
from optopick.recheck.led_side import LedBranch, led_branch
from optopick.recheck.transistor import stage, times
from optopick.recheck.vertices import ORDER, Vertices, vertices
from optopick.result import Design

TIMES = ("edge_on", "edge_off", "storage", "delay_on", "delay_off")
"""The times that are both computed and simulated."""

SLOWED_BY_REST = ("edge_off", "storage", "delay_off")
"""Times that dark current and light left in the dark LED make longer. The others they make shorter, as they have the
base half charged beforehand."""

TYPICAL = "typical parts, 25 °C"


@dataclass(frozen=True)
class Corner:
    """One assignment of everything uncertain.

    words: for people. t [degC]; age: 0 new, 1 end of life; ctr: at the test current and 25 degC [1]; light: relative
    to a typical LED [1]; v_be: base-emitter voltage less that of a typical unit [V]; storage: storage constant over
    that of a typical unit [1]; left: share of the light that ageing has left [1]; v_f: forward voltage at the LED's
    test current and 25 degC [V]; drive, drop, v_cc [V]; resistors [ohm], infinite where absent; i_f, i_off: LED
    current on and off [A].
    dark: share of the table's largest dark current that flows [1].
    """

    words: str
    t: float
    age: float
    ctr: float
    light: float
    v_be: float
    storage: float
    left: float
    v_f: float
    drive: float
    drop: float
    v_cc: float
    r_led: float
    r_load: float
    r_be: float
    r_shunt: float
    i_f: float
    i_off: float
    dark: float


@dataclass(frozen=True)
class PulseTimes:
    """Times of one pulse [s]; infinite where the output never gets there.

    edge_on, edge_off: 10 to 90 % of the swing as the LED lights and goes dark. storage: LED dark until the output has
    given back 10 % of the swing. delay_on, delay_off: LED to the receiver's threshold.
    """

    edge_on: float
    edge_off: float
    storage: float
    delay_on: float
    delay_off: float


def closed_form(brief: Brief, coupler: Coupler, corner: Corner) -> PulseTimes:
    """The times by the formulas that designs are chosen and checked with, at one corner, without guard."""
    box, branch = _as_vertex(coupler, corner)
    # a supply below the output's own voltage has no times: not a number there, endless here
    with np.errstate(invalid="ignore"):
        found = times(brief, coupler, box, stage(brief, coupler, box, branch, corner.dark))
    return PulseTimes(**{name: float(np.nan_to_num(getattr(found, name), nan=np.inf, posinf=np.inf)) for name in TIMES})


def threshold_pair(brief: Brief, corner: Corner) -> tuple[float, float]:
    """The receiver's v_il and v_ih at the corner's supply [V]."""
    output = brief.output
    low, high = (thresholds(span, output.supply, corner.v_cc) for span in (output.v_il, output.v_ih))
    return float(low), float(high)


def typical_corner(brief: Brief, coupler: Coupler, design: Design) -> Corner:
    """Typical parts, new, 25 degC, mid supplies, nominal resistors; neither dark current nor light when off."""
    box = vertices(brief, coupler, design, ORDER)
    return replace(_corner_at(box, led_branch(brief, coupler, box), np.zeros(box.t.shape), 0.0), words=TYPICAL)


def worst_corners(brief: Brief, coupler: Coupler, design: Design) -> dict[str, Corner]:
    """For each of TIMES the corner at which the formulas find it longest, of all vertices of the uncertainty box.

    Dark current and light left in the dark LED are at the end that makes the time longer.
    """
    box = vertices(brief, coupler, design)
    branch = led_branch(brief, coupler, box)
    found = times(brief, coupler, box, stage(brief, coupler, box, branch))
    return {name: _corner_at(box, branch, getattr(found, name), float(name in SLOWED_BY_REST)) for name in TIMES}


def _corner_at(box: Vertices, branch: LedBranch, value: Array, dark: float) -> Corner:
    """The vertex with the largest value; dark: share of the largest dark and LED off current that flows [1]."""
    flat = int(np.argmax(value))
    index = np.unravel_index(flat, value.shape)

    def at(array: Array) -> float:
        return float(array[tuple(0 if size == 1 else k for k, size in zip(index, array.shape, strict=True))])

    # an axis that the value does not depend on has length one there: its first end stands for it
    names = [f.name for f in fields(Vertices) if f.name != "words"]
    with np.errstate(invalid="ignore"):
        words = box.corner(value, flat)
    numbers = {name: at(getattr(box, name)) for name in names}
    left, i_f, i_off = at(branch.light), at(branch.i_f), dark * at(branch.i_off)
    return Corner(words=words, **numbers, left=left, i_f=i_f, i_off=i_off, dark=dark)


def _as_vertex(coupler: Coupler, corner: Corner) -> tuple[Vertices, LedBranch]:
    """A corner as a box of a single vertex, for the arrays of the re-check."""
    names = [f.name for f in fields(Vertices) if f.name != "words"]
    box = Vertices(**{name: np.asarray(getattr(corner, name)) for name in names}, words=())
    v_f = forward_voltage(coupler.led, corner.v_f, corner.i_f, corner.t)
    current = branch_current(corner.i_f, v_f, corner.r_shunt)
    return box, LedBranch(np.asarray(corner.i_f), np.asarray(corner.i_off), v_f, current, np.asarray(corner.left))
