"""Full enumeration over couplers of every kind: `enumeration` for transistor outputs, `oracle_logic` for the others."""

from __future__ import annotations

from collections.abc import Sequence

from enumeration import Best, Grid, best_of, survey
from oracle_logic import survey_logic

from optopick.brief import Brief, OutputCircuit
from optopick.coupler import Coupler, Kind


def admitted(brief: Brief, coupler: Coupler) -> bool:
    """Whether the brief admits the coupler whatever the resistors, isolation aside: a logic output pulls low only."""
    choice = brief.couplers
    named = choice.only is None or coupler.part in choice.only
    fits = coupler.kind is not Kind.LOGIC or brief.output.circuit is OutputCircuit.PULL_UP
    return (
        named
        and fits
        and (choice.kinds is None or coupler.kind.value in choice.kinds)
        and coupler.channels >= choice.at_least_channels
    )


def grid_of(brief: Brief, coupler: Coupler, failing: bool = False, every_vertex: bool = False) -> Grid:
    """One coupler's combinations; with `failing` those that fail too, with `every_vertex` all at every vertex."""
    if coupler.kind is Kind.LOGIC:
        return survey_logic(brief, coupler, every_vertex)
    return survey(brief, coupler, every_vertex, failing)


def grids_of(brief: Brief, couplers: Sequence[Coupler], failing: bool = False) -> list[Grid]:
    """One grid for each coupler that the brief admits."""
    return [grid_of(brief, coupler, failing) for coupler in couplers if admitted(brief, coupler)]


def best_of_all(brief: Brief, couplers: Sequence[Coupler]) -> Best:
    """The optimum over couplers of every kind."""
    return best_of(brief, grids_of(brief, couplers))
