"""Netlist and simulation of a design at a corner named on the command line."""

from __future__ import annotations

from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.errors import InputError, Mistake
from optopick.report.netlist import netlist
from optopick.result import Design
from optopick.simulate.corner import typical_corner, worst_corners
from optopick.simulate.errors import NotSimulatedError


def netlist_at(brief: Brief, coupler: Coupler, design: Design, at: str) -> str:
    """The circuit at "typical" or at the worst corner of one time; raises InputError for another name or kind."""
    try:
        if at == "typical":
            return netlist(brief, coupler, design, typical_corner(brief, coupler, design))
        corners = worst_corners(brief, coupler, design)
        if at not in corners:
            raise InputError([Mistake("--at", f'"{at}"', f"typical, or the worst of {', '.join(corners)}")])
        return netlist(brief, coupler, design, corners[at])
    except NotSimulatedError as error:
        raise InputError([Mistake("--coupler", str(error), "a coupler with a transistor output")]) from error
