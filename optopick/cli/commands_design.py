"""`pick`, `check` and `why`: one link, one design."""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any, NoReturn

import click

from optopick.cli.app import (
    FAILS,
    NO_DESIGN,
    OK,
    OUT_OF_TIME,
    brief_argument,
    exit_code,
    json_option,
    main,
    progress,
    show,
    show_json,
    time_option,
)

if TYPE_CHECKING:
    from optopick.brief import Brief

# Imports stand inside the commands: --help and input errors must not wait for the numerical libraries.
# ruff: noqa: PLC0415


@main.command()
@brief_argument
@json_option
@time_option
@click.option("--next", "count", type=click.IntRange(min=0), default=0, metavar="N", help="Also the N next best.")
@click.option(
    "--differ",
    type=click.Choice(["coupler", "value"]),
    default="coupler",
    help="What the next best must differ in: another coupler (default), or any value.",
)
@click.option("--simulate", is_flag=True, help="Simulate the design too; one that breaks a limit is cut.")
def pick(brief: Path, as_json: bool, time_limit: float, count: int, differ: str, simulate: bool) -> None:
    """Find the best design for BRIEF, prove it, and check it again.

    Example: optopick pick examples/fastest.toml --next 2
    """
    from optopick.read_brief import read_brief

    read = read_brief(brief)

    if simulate:
        _pick_simulated(read, as_json, time_limit)

    from optopick.uses.pick import alternatives

    results = alternatives(read, count + 1, differ=differ, time_limit=time_limit, progress=progress())
    if as_json:
        from optopick.report.as_json import result_object, results_object

        show_json(results_object(results) if count else result_object(results[0]))
    else:
        from optopick.report.text import next_text, result_text

        show(result_text(results[0], read.title))
        for place, result in enumerate(results[1:], 2):
            show(next_text(result, place))
    sys.exit(exit_code(results[0].status))


def _pick_simulated(read: Brief, as_json: bool, time_limit: float) -> NoReturn:
    """`pick --simulate`, to its end."""
    from optopick.uses.simulated import pick_simulated

    result, simulation, cut = pick_simulated(read, time_limit=time_limit, progress=progress())
    if as_json:
        from optopick.report.as_json import result_object, simulation_object

        show_json(result_object(result) | {"simulation": simulation_object(simulation, cut)})
    else:
        from optopick.report.text import result_text
        from optopick.report.text_simulated import simulation_text

        show(result_text(result, read.title))
        if simulation is not None:
            show(simulation_text(simulation, cut))
    sys.exit(exit_code(result.status))


def _resistor(name: str, text: str) -> Callable[[Any], Any]:
    return click.option(f"--{name}", metavar="OHMS", help=text)


@main.command()
@brief_argument
@click.option("--coupler", metavar="PART", help="Part as the coupler table names it; needed.")
@_resistor("r-led", "LED series resistor, such as 330 or 2k2; 2x2k2 for two in series; needed.")
@_resistor("r-load", "Load resistor; needed.")
@_resistor("r-be", "Base-emitter resistor; leave out where there is none.")
@_resistor("r-shunt", "Resistor across the LED; leave out where there is none.")
@click.option("--budget", is_flag=True, help="Also how much of each margin every uncertain quantity eats.")
@json_option
def check(
    brief: Path,
    coupler: str | None,
    r_led: str | None,
    r_load: str | None,
    r_be: str | None,
    r_shunt: str | None,
    budget: bool,
    as_json: bool,
) -> None:
    """Evaluate every check of an existing design against BRIEF.

    For a failing design also the nearest one that passes.

    Example: optopick check examples/fastest.toml --coupler BRIM44-2 --r-led 390 --r-load 2k2 --r-be 100k
    """
    from optopick.read_brief import read_brief
    from optopick.uses.check import check_design, coupler_named, design_from_text

    read = read_brief(brief)
    design = design_from_text(coupler, {"r_led": r_led, "r_load": r_load, "r_be": r_be, "r_shunt": r_shunt})
    checked = check_design(read, design)
    near = None
    if not checked.review.passed:
        from optopick.read_couplers import read_couplers
        from optopick.uses.nearest import nearest

        near = nearest(read, design, read_couplers(read.couplers.table).couplers)
    from optopick.uses.budget import budget as budget_of

    shares = budget_of(read, coupler_named(read, design.coupler), design) if budget else ()
    if as_json:
        from optopick.report.as_json import checked_object

        show_json(checked_object(checked, near, shares))
    else:
        from optopick.report.text import checked_text
        from optopick.report.text_uses import budget_text

        show(checked_text(checked, read.title, near))
        if shares:
            show(budget_text(shares))
    sys.exit(OK if checked.review.passed else FAILS)


@main.command()
@brief_argument
@json_option
@time_option
def why(brief: Path, as_json: bool, time_limit: float) -> None:
    """Explain BRIEF: which limits contradict each other, and the least change of each that would do.

    For a brief that has a design: what a step of each limit would buy.

    Example: optopick why examples/shortlist.toml
    """
    from optopick.read_brief import read_brief

    read = read_brief(brief)

    from optopick.uses.why import why as run

    reasons = run(read, time_limit=time_limit, progress=progress())
    if as_json:
        from optopick.report.as_json import why_object

        show_json(why_object(reasons))
    else:
        from optopick.report.text_uses import why_text

        show(why_text(reasons, read.title))
    sys.exit({"infeasible": NO_DESIGN, "unknown": OUT_OF_TIME}.get(reasons.status.value, OK))
