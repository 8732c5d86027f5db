"""Small boards of invented links, solved once, with the documents that their pages are made from."""

from __future__ import annotations

import tempfile
from dataclasses import replace
from functools import cache
from pathlib import Path

from cli_links import TINY

from optopick.read_board import read_board
from optopick.report.board_page import BoardDocument
from optopick.uses.board import solve_board
from optopick.uses.board_documents import document_of_board

BOARD = """\
title = "Two <links> & more"
[limits]
{limits}
[goal]
minimize = "power"
give = "1 %"
[[link]]
name = "first"
brief = "one.toml"
count = 3
grounds = ["field", "logic"]
[[link]]
name = "second"
brief = "two.toml"
grounds = ["field", "logic"]
{second}
[[link]]
name = "third"
brief = "one.toml"
"""


def written(folder: Path, limits: str = "", second: str = "set.signal.lit = 0.1") -> Path:
    """A board of three links in a folder, with couplers of two channels."""
    table = TINY.with_name("tiny.csv").read_text(encoding="utf-8").splitlines()
    columns = table[next(k for k, line in enumerate(table) if line.startswith("part,"))].split(",")
    rows = []
    for line in table:
        cells = line.split(",")
        if len(cells) == len(columns) and cells != columns:
            cells[columns.index("channels")] = "2"
        rows.append(",".join(cells))
    (folder / "tiny.csv").write_text("\n".join(rows) + "\n", encoding="utf-8")
    text = TINY.read_text(encoding="utf-8")
    (folder / "one.toml").write_text(text, encoding="utf-8")
    slower = (("edge_time", "#edge_time"), ("delay", "#delay"), ('["2k2", "4k7", "10k"]', '["4k7", "10k", "12k"]'))
    for old, new in slower:
        text = text.replace(old, new, 1)
    (folder / "two.toml").write_text(text, encoding="utf-8")
    path = folder / "board.toml"
    path.write_text(BOARD.format(limits=limits, second=second), encoding="utf-8")
    return path


@cache
def document(limits: str = "reels = 5\npackages = 5", second: str = "set.signal.lit = 0.1") -> BoardDocument:
    """The document of a board, dated."""
    with tempfile.TemporaryDirectory() as folder:
        board = read_board(written(Path(folder), limits, second))
        return replace(document_of_board(board, solve_board(board), "2026-01-15"), version="1.2.3")


def full() -> BoardDocument:
    """A board with everything: a link that changes its brief, packages that are shared."""
    return document()


def contradicting() -> BoardDocument:
    """A board whose limits contradict each other."""
    return document("reels = 2\npackages = 9")


def hopeless() -> BoardDocument:
    """A board with a link that has no design even alone."""
    return document("", 'set.limits.power = "1 mW"')


DOCUMENTS = {"full": full, "contradicting": contradicting, "hopeless": hopeless}
