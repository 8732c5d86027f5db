"""`new`, `table` and `schema`: from nothing to a link and a table of one's own."""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from optopick.cli.app import FAILS, OK, json_option, main, show, show_json
from optopick.errors import InputError, Mistake

if TYPE_CHECKING:
    from optopick.uses.new_brief import Start

# Imports stand inside the commands: --help and input errors must not wait for the numerical libraries.
# ruff: noqa: PLC0415

KINDS = ("serial", "field", "battery", "current-loop")
"""The usual links, as data/new_briefs.toml has them: --help must not wait for that file."""

_VALUES = (
    ("--title", "TEXT", "What the link is called."),
    ("--rate", "RATE", 'Bit rate, such as "19.2 kbit/s".'),
    ("--pulse", "TIME", 'Shortest pulse, such as "52 us", in place of a rate.'),
    ("--lit", "RATIO", 'Fraction of the time the LED is lit, such as "50 %".'),
    ("--field-type", "NAME", 'Named field input, such as "IEC 61131-2 type 3".'),
    ("--drive-supply", "RANGE", 'Supply of the LED, such as "3.0 V to 3.6 V".'),
    ("--max-current", "CURRENT", 'The most the driver can give, such as "8 mA".'),
    ("--off-leakage", "CURRENT", 'What the driver gives when off, such as "10 uA".'),
    ("--output-supply", "RANGE", 'Supply of the load, such as "4.75 V to 5.25 V".'),
    ("--logic", "NAME", 'Named receiver levels, such as "LVCMOS 3.3 V".'),
    ("--temperature", "RANGE", 'Ambient, such as "-20 degC to 70 degC".'),
    ("--life", "TIME", 'Service life, such as "10 years".'),
    ("--delay", "TIME", 'Longest propagation delay, such as "25 us".'),
    ("--withstand", "VOLTAGE", 'Least withstand voltage, such as "3.75 kV".'),
    ("--minimize", "GOAL", '"edge time", "delay", "distortion" or "power".'),
)


def _value_options(command: Callable[..., Any]) -> Callable[..., Any]:
    """The options that give a main value of the brief; the values are read as the brief itself reads them."""
    for name, metavar, text in reversed(_VALUES):
        command = click.option(name, metavar=metavar, help=text)(command)
    return command


@main.command()
@click.argument("brief", type=click.Path(path_type=Path))
@click.option("--kind", type=click.Choice(KINDS), help="The usual link to start from; asked for at a terminal.")
@click.option(
    "--table", type=click.Path(path_type=Path), help="Your coupler table; without it couplers.csv of BRIEF's folder."
)
@_value_options
@click.option("--force", is_flag=True, help="Replace BRIEF where it is there already.")
def new(brief: Path, kind: str | None, table: Path | None, force: bool, **values: str | None) -> None:
    """Write a commented starting BRIEF (TOML) for a usual link; it runs at once.

    At a terminal and without --kind it asks for the main values. Where there is neither --table nor a couplers.csv
    beside BRIEF, a table of invented parts is put there to try it with.

    Example: optopick new link.toml --kind serial --rate "19.2 kbit/s"
    """
    from optopick.cli.files import refuse_existing, write_text
    from optopick.uses.new_brief import new_brief, start_of, with_answers

    _refuse_other_names(brief)
    refuse_existing(brief, force)
    given = {f"--{name.replace('_', '-')}": value for name, value in values.items() if value is not None}
    ask = kind is None and sys.stdin.isatty()
    start = with_answers(start_of(_kind(kind, ask)), given)
    if ask:
        start, table = _asked(start, given), table or _asked_table()
    made = new_brief(start, brief, table)
    if made.demo is not None:
        write_text(made.table, made.demo)
        click.echo(f"{made.table}: written, a table of invented parts to try it with")
    write_text(brief, made.text)
    click.echo(f"{brief}: written; next: optopick pick {brief}")


def _refuse_other_names(brief: Path) -> None:
    if brief.suffix != ".toml":
        raise InputError([Mistake("BRIEF", f'"{brief}"', "a file name that ends in .toml")])


def _kind(kind: str | None, ask: bool) -> str:
    from optopick.uses.new_brief import starts

    if kind is not None:
        return kind
    if not ask:
        raise InputError([Mistake("--kind", "nothing, and no terminal to ask at", f"one of {', '.join(KINDS)}")])
    for name, start in starts().items():
        click.echo(f"  {name:14}{start.about}", err=True)
    return str(click.prompt("Which link is it", type=click.Choice(KINDS), default=KINDS[0], err=True))


def _asked(start: Start, given: dict[str, str]) -> Start:
    """The start with what the user answers to its questions; a key that an option gives is not asked for."""
    from optopick.uses.new_brief import OPTIONS, key_at, typed, with_answers

    options = {path: option for option, path in OPTIONS.items()}
    answers = {}
    for path in start.asked:
        option = options[path]
        if option in given or path not in start.values:
            continue
        key, default = key_at(path), typed(start.values[path])
        if key.choices:
            click.echo(f"  {', '.join(key.choices)}", err=True)
        found = click.prompt(key.meaning, default=default, value_proc=_reader(path), err=True)
        if found != default:
            answers[option] = found
    return with_answers(start, answers)


def _reader(path: str) -> Callable[[str], str]:
    """What reads an answer: it is asked for again until the brief could hold it."""
    from optopick.units import QuantityError
    from optopick.uses.new_brief import answer

    def read(text: str) -> str:
        try:
            answer(path, text)
        except QuantityError as error:
            raise click.UsageError(str(error)) from None
        return text

    return read


def _asked_table() -> Path | None:
    text = click.prompt(
        "Your coupler table (empty: couplers.csv beside the brief)", default="", show_default=False, err=True
    )
    return Path(text) if text.strip() else None


@main.group()
def table() -> None:
    """Start, check and fit a coupler table.

    Example: optopick table check catalogs/demo.csv
    """


table_argument = click.argument("path", type=click.Path(path_type=Path))


@table.command(name="new")
@table_argument
@click.option("--force", is_flag=True, help="Replace PATH where it is there already.")
def table_new(path: Path, force: bool) -> None:
    """Write a blank coupler table (CSV) whose comments say what each column means.

    Example: optopick table new parts.csv
    """
    from optopick.cli.files import refuse_existing, write_text
    from optopick.read_couplers import blank_template

    if path.suffix.lower() != ".csv":
        raise InputError([Mistake("PATH", f'"{path}"', "a file name that ends in .csv")])
    refuse_existing(path, force)
    write_text(path, blank_template())
    click.echo(f"{path}: written; fill in a line for each part, then: optopick table check {path}")


@table.command(name="check")
@table_argument
@json_option
def table_check(path: Path, as_json: bool) -> None:
    """Say what a coupler table lacks: rows that cannot be used, and what rules fill in for the others.

    Mistakes in the file end with exit code 2, a table without a usable row with 1.

    Example: optopick table check catalogs/demo.csv
    """
    from optopick.uses.table_check import check_table

    checked = check_table(path)
    from optopick.report.text_table import table_object, table_text

    if as_json:
        show_json(table_object(checked))
    else:
        show(table_text(checked))
    sys.exit(OK if checked.rows else FAILS)


@table.command(name="fit")
@table_argument
@json_option
def table_fit(path: Path, as_json: bool) -> None:
    """Set the switching times of each part beside those that its fitted constants give.

    Rows that contradict each other are told, with what was done about it.

    Example: optopick table fit catalogs/demo.csv
    """
    from optopick.uses.fit import fit_report

    fitted = fit_report(path)
    from optopick.report.text_table import fit_object, fit_text

    if as_json:
        show_json(fit_object(fitted, path.name))
    else:
        show(fit_text(fitted, path.name))


@main.command()
def schema() -> None:
    """Print the JSON Schema of a brief, for editors that complete and check TOML.

    Example: optopick schema > brief.schema.json
    """
    from optopick.brief_schema import brief_schema

    show_json(brief_schema())
