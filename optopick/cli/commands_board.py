"""`board`: every link of a product at once."""

from __future__ import annotations

import sys
from collections.abc import Mapping, Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, NoReturn

import click

from optopick.board import Board, BoardGoalName
from optopick.cli.app import echo, exit_code, json_option, main, progress, show, show_json, time_option
from optopick.cli.hands import hands, workers_options
from optopick.errors import InputError, Mistake

if TYPE_CHECKING:
    from optopick.board_answers import BoardResult

# Imports stand inside the command: --help and input errors must not wait for the numerical libraries.
# ruff: noqa: PLC0415, PLR0913, PLR0917


@main.command()
@click.argument("files", metavar="BOARD...", nargs=-1, required=True, type=click.Path(path_type=Path))
@json_option
@time_option
@click.option("--csv", "csv_path", type=click.Path(path_type=Path), metavar="FILE", help="Write the bill of materials.")
@click.option(
    "-o",
    "--output",
    type=click.Path(path_type=Path),
    metavar="FOLDER",
    help="Make a folder with the design review: page, JSON, bill of materials.",
)
@click.option("--force", is_flag=True, help="Replace a folder that holds an earlier review.")
@click.option("--date", default=None, help="Date to print on the review; default: today.")
@click.option(
    "--front",
    type=click.Choice(["reels", "couplers", "packages"]),
    help="Show what each number of them costs in the board's first goal, from the fewest up.",
)
@workers_options
def board(
    files: tuple[Path, ...],
    as_json: bool,
    time_limit: float,
    csv_path: Path | None,
    output: Path | None,
    force: bool,
    date: str | None,
    front: str | None,
    workers: int | None,
    cluster: str | None,
) -> None:
    """Choose every link of BOARD together, from a limited number of resistor values and couplers.

    BOARD (TOML) names the links, each with its brief and count, and the limits that they share. Every link is checked
    again alone. Several boards are worked on side by side; the time limit holds for each, and the exit code is the
    highest of theirs.

    Example: optopick board examples/plant/board.toml -o plant-review
    """
    alone = {"--front": front, "--csv": csv_path, "--output": output}
    _refuse_several(len(files), alone)
    _refuse_combinations(alone, {"--force": force, "--date": date}, {"--workers": workers, "--cluster": cluster})
    boards = _read(files)
    if output is not None:
        from optopick.report.folder import refuse_occupied

        refuse_occupied(output, force)
    if front is not None:
        _show_front(boards[0], front, as_json=as_json, time_limit=time_limit)
    results = _solved(boards, time_limit, workers, cluster)
    _write(boards[0], results[0], csv_path, output, force=force, date=date)
    _show(boards, results, as_json=as_json)
    sys.exit(max(exit_code(result.status) for result in results))


def _refuse_several(count: int, alone: Mapping[str, object]) -> None:
    """Raise InputError for options that several boards cannot have."""
    given = [name for name, value in alone.items() if value is not None]
    if count > 1 and given:
        raise InputError([Mistake(name, f"{count} boards beside it", "one board") for name in given])


def _refuse_combinations(
    alone: Mapping[str, object], of_output: Mapping[str, object], doing: Mapping[str, object]
) -> None:
    """Raise InputError for options that mean nothing together."""
    mistakes = []
    if alone["--front"] is not None:
        expected = "one of the two: a front is no single board"
        given = [name for name in ("--csv", "--output") if alone[name] is not None]
        mistakes += [Mistake(name, "--front beside it", expected) for name in given]
        given = [name for name, value in doing.items() if value is not None]
        mistakes += [Mistake(name, "--front beside it", "one of the two: a front is found here") for name in given]
    if alone["--output"] is None:
        given = [name for name, value in of_output.items() if value]
        mistakes += [Mistake(name, "no --output", "the folder that it is about, such as -o review") for name in given]
    if mistakes:
        raise InputError(mistakes)


def _read(files: Sequence[Path]) -> list[Board]:
    """The boards; raises InputError with the mistakes of all of them, each once."""
    from optopick.read_board import read_board

    boards, mistakes = [], list[Mistake]()
    for file in files:
        try:
            boards.append(read_board(file))
        except InputError as error:
            mistakes += error.mistakes
    if mistakes:
        raise InputError(dict.fromkeys(mistakes))
    return boards


def _solved(
    boards: Sequence[Board], time_limit: float, workers: int | None, cluster: str | None
) -> tuple[BoardResult, ...]:
    if len(boards) == 1 and cluster is None:
        from optopick.uses.board import solve_board

        # here, where its progress can be told
        return (solve_board(boards[0], time_limit=time_limit, progress=progress()),)
    from optopick.uses.board_many import solve_boards

    with hands(workers, cluster) as doing:
        return solve_boards(boards, workers=doing, time_limit=time_limit, progress=progress())


def _write(
    board: Board, result: BoardResult, csv_path: Path | None, output: Path | None, *, force: bool, date: str | None
) -> None:
    """What was asked for as files."""
    if csv_path is not None and result.links:
        from optopick.cli.files import write_text
        from optopick.report.board_bill import board_bill

        write_text(csv_path, board_bill(result))
    if output is not None:
        from optopick.report.folder import write_folder
        from optopick.uses.board_documents import board_files

        files = board_files(board, result, date or datetime.now(UTC).date().isoformat())
        write_folder(output, files, force)
        echo(f"optopick: {output}: {', '.join(sorted(files))}", err=True)


def _show(boards: Sequence[Board], results: Sequence[BoardResult], *, as_json: bool) -> None:
    """The answers: one JSON object, or a list of them where there are several boards."""
    from optopick.report.board import board_object, board_text

    answered = [(result, board.title, board.limits) for board, result in zip(boards, results, strict=True)]
    if as_json:
        objects = [board_object(*one) for one in answered]
        show_json(objects if len(objects) > 1 else objects[0])
        return
    for number, one in enumerate(answered):
        if number:
            echo("")
        show(board_text(*one))


def _show_front(read: Board, count: str, *, as_json: bool, time_limit: float) -> NoReturn:
    from optopick.report.board_front import front_object, front_text
    from optopick.uses.board_front import board_front

    found = board_front(read, BoardGoalName(count), time_limit=time_limit, progress=progress())
    if as_json:
        show_json(front_object(found, read.title))
    else:
        show(front_text(found, read.title))
    sys.exit(exit_code(found.status))
