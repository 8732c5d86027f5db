"""`sweep` and `yield`: what the bench would show, of one design."""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import click

from optopick.cli.app import FAILS, NO_DESIGN, OK, brief_argument, echo, json_option, main, progress, show, show_json
from optopick.cli.hands import hands, workers_options

# Imports stand inside the commands: --help and input errors must not wait for the numerical libraries.
# ruff: noqa: PLC0415, PLR0913, PLR0917


def design_options(command: Callable[..., Any]) -> Callable[..., Any]:
    """The options that name a design; without --coupler the best design of the brief is taken."""
    options = (
        click.option("--coupler", metavar="PART", help="Part of an existing design; default: the best design."),
        click.option("--r-led", metavar="OHMS", help="Its LED series resistor."),
        click.option("--r-load", metavar="OHMS", help="Its load resistor."),
        click.option("--r-be", metavar="OHMS", help="Its base-emitter resistor, where there is one."),
        click.option("--r-shunt", metavar="OHMS", help="Its resistor across the LED, where there is one."),
    )
    for option in reversed(options):
        command = option(command)
    return command


@main.command()
@brief_argument
@design_options
@click.option("--position", default="r_load", help="What is swept: r_led, r_load (default), r_be or r_shunt.")
@click.option("--csv", "as_csv", is_flag=True, help="Print the sweep as CSV and nothing else.")
@click.option("--plot", type=click.Path(path_type=Path), default=None, help="Also draw it to a .svg or .png file.")
@json_option
def sweep(
    brief: Path,
    coupler: str | None,
    r_led: str | None,
    r_load: str | None,
    r_be: str | None,
    r_shunt: str | None,
    position: str,
    as_csv: bool,
    plot: Path | None,
    as_json: bool,
) -> None:
    """One resistor of a design over its stock values: times, margin and power of each.

    Example: optopick sweep examples/fastest.toml --position r_be
    """
    from optopick.read_brief import read_brief
    from optopick.uses.chosen import chosen_design

    read = read_brief(brief)
    texts = {"r_led": r_led, "r_load": r_load, "r_be": r_be, "r_shunt": r_shunt}
    found = chosen_design(read, coupler, texts, progress())
    if found is None:
        echo("optopick: no design to sweep: see optopick why", err=True)
        sys.exit(NO_DESIGN)
    from optopick.uses.sweep import sweep as run

    swept = run(read, *found, position)
    if plot is not None:
        from optopick.cli.files import write_picture
        from optopick.report.plots import sweep_figure

        write_picture(plot, sweep_figure(swept, read.title))
    if as_json:
        from optopick.report.as_json import sweep_object

        show_json(sweep_object(swept))
    elif as_csv:
        from optopick.report.frames import sweep_frame

        echo(sweep_frame(swept).to_csv(index=False), nl=False)
    else:
        from optopick.report.text_uses import sweep_text

        show(sweep_text(swept, read.title))


@main.command(name="yield")
@brief_argument
@design_options
@click.option("--samples", type=click.IntRange(min=1), default=1_000_000, help="Random units; default a million.")
@click.option("--normal", is_flag=True, help="Truncated normal between the extremes instead of uniform.")
@click.option("--seed", type=int, default=1, help="Of the random numbers; default 1.")
@workers_options
@json_option
def yield_(
    brief: Path,
    coupler: str | None,
    r_led: str | None,
    r_load: str | None,
    r_be: str | None,
    r_shunt: str | None,
    samples: int,
    normal: bool,
    seed: int,
    workers: int | None,
    cluster: str | None,
    as_json: bool,
) -> None:
    """The share of random units of a design that pass each check.

    Every uncertain quantity is drawn between its stated extremes. Exit code 1 where a sample fails.

    Example: optopick yield examples/battery.toml --samples 200000
    """
    from optopick.read_brief import read_brief
    from optopick.uses.chosen import chosen_design

    read = read_brief(brief)
    texts = {"r_led": r_led, "r_load": r_load, "r_be": r_be, "r_shunt": r_shunt}
    found = chosen_design(read, coupler, texts, progress())
    if found is None:
        echo("optopick: no design to sample: see optopick why", err=True)
        sys.exit(NO_DESIGN)
    from optopick.uses.samples import sample

    with hands(workers, cluster) as doing:
        drawn = sample(read, *found, count=samples, normal=normal, seed=seed, workers=doing)
    if as_json:
        from optopick.report.as_json import yield_object

        show_json(yield_object(drawn))
    else:
        from optopick.report.text_uses import yield_text

        show(yield_text(drawn, read.title))
    sys.exit(OK if drawn.good == drawn.count else FAILS)
