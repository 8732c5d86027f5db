"""`report` and `netlist`: what leaves the engineer's desk."""

from __future__ import annotations

import sys
from datetime import UTC, datetime
from pathlib import Path

import click

from optopick.cli.app import NO_DESIGN, brief_argument, echo, exit_code, main, progress

# Imports stand inside the commands: --help and input errors must not wait for the numerical libraries.
# ruff: noqa: PLC0415


@main.command()
@brief_argument
@click.option("-o", "--output", required=True, type=click.Path(path_type=Path), help="Folder to make.")
@click.option("--force", is_flag=True, help="Replace a folder that holds an earlier report.")
@click.option("--date", default=None, help="Date to print on it; default: today.")
def report(brief: Path, output: Path, force: bool, date: str | None) -> None:
    """Write the design review of BRIEF's best design: page, JSON, bill of materials, netlist, pictures.

    Example: optopick report examples/fastest.toml -o fan-review
    """
    from optopick.read_brief import read_brief
    from optopick.report.folder import refuse_occupied, write_folder

    read = read_brief(brief)
    refuse_occupied(output, force)

    from optopick.uses.documents import review_files

    result, files = review_files(read, date or datetime.now(UTC).date().isoformat(), progress())
    write_folder(output, files, force)
    echo(f"{output}: {', '.join(sorted(files))}")
    sys.exit(exit_code(result.status))


@main.command()
@brief_argument
@click.option("--coupler", metavar="PART", help="Part of an existing design; default: the best design.")
@click.option("--r-led", metavar="OHMS", help="Its LED series resistor.")
@click.option("--r-load", metavar="OHMS", help="Its load resistor.")
@click.option("--r-be", metavar="OHMS", help="Its base-emitter resistor, where there is one.")
@click.option("--r-shunt", metavar="OHMS", help="Its resistor across the LED, where there is one.")
@click.option("--at", default="typical", help="Corner: typical (default), or the worst of one time such as delay_off.")
def netlist(
    brief: Path,
    coupler: str | None,
    r_led: str | None,
    r_load: str | None,
    r_be: str | None,
    r_shunt: str | None,
    at: str,
) -> None:
    """Print a SPICE circuit of a design, with device models from the table and measurements as statements.

    Example: optopick netlist examples/fastest.toml > link.cir
    """
    from optopick.read_brief import read_brief
    from optopick.uses.chosen import chosen_design
    from optopick.uses.corner_named import netlist_at

    read = read_brief(brief)
    texts = {"r_led": r_led, "r_load": r_load, "r_be": r_be, "r_shunt": r_shunt}
    found = chosen_design(read, coupler, texts, progress())
    if found is None:
        echo("optopick: no design to write: see optopick why", err=True)
        sys.exit(NO_DESIGN)
    echo(netlist_at(read, *found, at), nl=False)
