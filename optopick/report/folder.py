"""A folder of reports, there in full or not at all."""

from __future__ import annotations

import os
import shutil
from collections.abc import Mapping
from pathlib import Path

from optopick.errors import InputError, Mistake

REPORT_FILES = frozenset(
    {
        *("review.html", "design.json", "bom.csv", "schematic.svg", "link.cir"),
        *("sweep.svg", "sweep.png", "front.svg", "front.png"),
    }
)
"""Every name a report may write. An earlier one may have had more of them than the next: it is still a report."""


def write_folder(target: Path, files: Mapping[str, bytes | str], force: bool) -> None:
    """Write `files` (names without folders, text as UTF-8) into the new folder `target`.

    They are written beside it first and moved in one step, so that nobody meets half a report. An existing folder is
    refused; with `force` it is replaced, but only where it holds nothing but files of these names or of REPORT_FILES.
    Raises InputError where that, or the disk, forbids it; ValueError for a name that is not a plain file name.
    """
    _check_names(files)
    target = Path(os.path.abspath(target))  # noqa: PTH100 - resolve() would follow a link that stands for the target
    part, aside = (target.with_name(f".{target.name}.{os.getpid()}.{end}") for end in ("part", "old"))
    try:
        old = _occupied(target, files, force)
        target.parent.mkdir(parents=True, exist_ok=True)
        part.mkdir()
        _fill(part, files)
        _swap(part, target, aside if old else None)
    except OSError as error:
        raise InputError([Mistake(str(target), error.strerror or str(error), "a place that can be written")]) from error
    finally:
        shutil.rmtree(part, ignore_errors=True)


def refuse_occupied(target: Path, force: bool) -> None:
    """Raise InputError before any work where `write_folder` would refuse what is there for lack of `force`."""
    if os.path.lexists(target) and not force:
        raise InputError([Mistake(str(target), "something that is there already", "a new folder, or --force")])


def _check_names(files: Mapping[str, bytes | str]) -> None:
    for name in files:
        if not name or name != Path(name).name or name.startswith("."):
            raise ValueError(f'"{name}" is not a plain file name')


def _occupied(target: Path, files: Mapping[str, bytes | str], force: bool) -> bool:
    """Whether a folder is there that may be replaced; raises InputError for anything there that may not."""
    if not os.path.lexists(target):
        return False
    if target.is_symlink() or not target.is_dir():
        raise InputError([Mistake(str(target), "something that is no folder", "a new folder")])
    if not force:
        raise InputError([Mistake(str(target), "a folder that is there already", "a new folder, or --force")])
    ours = REPORT_FILES | set(files)
    foreign = sorted(entry.name for entry in target.iterdir() if entry.name not in ours or entry.is_dir())
    if foreign:
        others = f" and {len(foreign) - 1} more" if len(foreign) > 1 else ""
        expected = "a folder with nothing in it but an earlier report"
        raise InputError([Mistake(str(target), f'"{foreign[0]}"{others}', expected)])
    return True


def _fill(folder: Path, files: Mapping[str, bytes | str]) -> None:
    for name, content in files.items():
        (folder / name).write_bytes(content.encode() if isinstance(content, str) else content)


def _swap(part: Path, target: Path, aside: Path | None) -> None:
    """Put the new folder in place; the old one comes back where that fails."""
    if aside is None:
        part.rename(target)
        return
    target.rename(aside)
    try:
        part.rename(target)
    except OSError:
        aside.rename(target)
        raise
    shutil.rmtree(aside, ignore_errors=True)
