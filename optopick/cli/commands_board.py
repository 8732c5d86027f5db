"""`board`: every link of a product at once."""

from __future__ import annotations

import sys
from pathlib import Path

import click

from optopick.board import Board, BoardGoalName
from optopick.cli.app import exit_code, json_option, main, progress, show, show_json, time_option

# Imports stand inside the command: --help and input errors must not wait for the numerical libraries.
# ruff: noqa: PLC0415


@main.command()
@click.argument("file", metavar="BOARD", type=click.Path(path_type=Path))
@json_option
@time_option
@click.option("--csv", "csv_path", type=click.Path(path_type=Path), metavar="FILE", help="Write the bill of materials.")
@click.option(
    "--front",
    type=click.Choice(["reels", "couplers", "packages"]),
    help="Show what each number of them costs in the board's first goal, from the fewest up.",
)
def board(file: Path, as_json: bool, time_limit: float, csv_path: Path | None, front: str | None) -> None:
    """Choose every link of BOARD together, from a limited number of resistor values and couplers.

    BOARD (TOML) names the links, each with its brief and count, and the limits that they share. Every link is checked
    again alone.

    Example: optopick board examples/plant/board.toml --csv parts.csv
    """
    from optopick.read_board import read_board

    read = read_board(file)
    if front is not None:
        _show_front(read, front, as_json=as_json, time_limit=time_limit, csv_path=csv_path)
        return

    from optopick.report.board import board_bill, board_object, board_text
    from optopick.uses.board import solve_board

    result = solve_board(read, time_limit=time_limit, progress=progress())
    if csv_path is not None and result.links:
        from optopick.cli.files import write_text

        write_text(csv_path, board_bill(result))
    if as_json:
        show_json(board_object(result, read.title, read.limits))
    else:
        show(board_text(result, read.title, read.limits))
    sys.exit(exit_code(result.status))


def _show_front(read: Board, count: str, *, as_json: bool, time_limit: float, csv_path: Path | None) -> None:
    from optopick.errors import InputError, Mistake
    from optopick.report.board_front import front_object, front_text
    from optopick.uses.board_front import board_front

    if csv_path is not None:
        raise InputError([Mistake("--csv", "--front beside it", "one of the two: a front is no single board")])
    found = board_front(read, BoardGoalName(count), time_limit=time_limit, progress=progress())
    if as_json:
        show_json(front_object(found, read.title))
    else:
        show(front_text(found, read.title))
    sys.exit(exit_code(found.status))
