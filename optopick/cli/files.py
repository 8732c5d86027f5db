"""Files that commands write: whole or not at all."""

from __future__ import annotations

import contextlib
import os
from pathlib import Path
from typing import TYPE_CHECKING

from optopick.errors import InputError, Mistake

if TYPE_CHECKING:
    from matplotlib.figure import Figure


def write_picture(path: Path, figure: Figure) -> None:
    """Write a figure as SVG or PNG by the file's ending; raises InputError for another ending or an unwritable path."""
    if path.suffix not in (".svg", ".png"):
        raise InputError([Mistake("--plot", f'"{path}"', "a file name ending in .svg or .png")])
    unfinished = path.with_name(f".{path.name}.part{path.suffix}")
    try:
        figure.savefig(unfinished, dpi=150)
        unfinished.replace(path)
    except OSError as error:
        unfinished.unlink(missing_ok=True)
        raise InputError([Mistake("--plot", f'"{path}": {error.strerror}', "a path that can be written")]) from None


def refuse_existing(path: Path, force: bool) -> None:
    """Raise InputError where something is at `path` that may not be replaced; a folder never may."""
    if path.is_dir():
        raise InputError([Mistake(str(path), "a directory", "the name of a file")])
    if os.path.lexists(path) and not force:
        raise InputError([Mistake(str(path), "a file that is there already", "a new file, or --force")])


def write_text(path: Path, text: str) -> None:
    """Write a text file in one step, in the place of one that may be there; raises InputError where that fails."""
    unfinished = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        unfinished.write_text(text, encoding="utf-8", newline="\n")
        unfinished.replace(path)
    except OSError as error:
        # where the folder is missing, removing what was never written fails too
        with contextlib.suppress(OSError):
            unfinished.unlink(missing_ok=True)
        found = (error.strerror or "an error").lower()
        raise InputError([Mistake(str(path), found, "a path that can be written")]) from None
