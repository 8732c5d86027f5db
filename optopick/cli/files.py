"""Files that commands write: whole or not at all."""

from __future__ import annotations

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
