"""The folder of a board's design review: page, JSON, bill of materials, all from one answer."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from importlib.metadata import version
from pathlib import Path

from optopick.board import Board
from optopick.board_answers import BoardResult
from optopick.coupler import Coupler
from optopick.report.as_json import dumps
from optopick.report.board import board_object
from optopick.report.board_bill import board_bill
from optopick.report.board_page import BoardDocument, BoardInput, board_page
from optopick.report.document import InputFile
from optopick.uses.check import coupler_named


def board_files(board: Board, result: BoardResult, date: str) -> Mapping[str, str]:
    """The files of a board's design review by name; date: as it is to be printed."""
    files = {
        "review.html": board_page(document_of_board(board, result, date)),
        "board.json": dumps(board_object(result, board.title, board.limits)),
    }
    return files | {"bom.csv": board_bill(result)} if result.links else files


def document_of_board(board: Board, result: BoardResult, date: str) -> BoardDocument:
    """What the page of a board's design review is made from; its input files are read anew."""
    return BoardDocument(board, result, _couplers(result), tuple(_inputs(board)), version("optopick"), date)


def _couplers(result: BoardResult) -> tuple[Coupler, ...]:
    """The couplers chosen, each from the table of the first link that has it."""
    briefs = {one.review.design.coupler: one.link.brief for one in reversed(result.links)}
    return tuple(coupler_named(briefs[part], part) for part in result.couplers)


def _inputs(board: Board) -> Iterator[BoardInput]:
    """The board file, its briefs and their coupler tables, each file once."""
    yield BoardInput("Board", _read(board.path or Path("board.toml")))
    for path in dict.fromkeys(link.brief.path for link in board.links):
        if path is not None:
            yield BoardInput("Brief", _read(path))
    for path in dict.fromkeys(link.brief.couplers.table for link in board.links):
        yield BoardInput("Coupler table", _read(path))


def _read(path: Path) -> InputFile:
    return InputFile(path.name, path.read_bytes() if path.exists() else b"")
