"""Outcomes of a long run as a file of JSON lines, one a finished coupler: killed and run again, it goes on from there.

The first line says what the outcomes belong to. A last line that a kill tore is dropped.
"""

from __future__ import annotations

import fcntl
import json
import math
import os
import sqlite3
from dataclasses import asdict, dataclass, replace
from hashlib import blake2b
from importlib.metadata import version
from pathlib import Path
from types import TracebackType
from typing import IO, Any, Self

from optopick.brief import Brief
from optopick.errors import InputError, Mistake
from optopick.result import Design, Objective, Status

FORMAT = 1


@dataclass(frozen=True)
class PassedOver:
    """A coupler that ranges show to have no design whose first goal is `above` or less."""

    part: str
    above: float


@dataclass(frozen=True)
class Refused:
    """A coupler that cannot serve, and why."""

    part: str
    reason: str


@dataclass(frozen=True)
class Designed:
    """A coupler's best design, what is known of it, and both goals."""

    part: str
    status: Status
    objective: Objective
    second: Objective
    design: Design


Outcome = PassedOver | Refused | Designed


class ResultsFile:
    """The outcomes of one brief, by the key of a row: those that are there, and new ones as they come.

    Raises InputError where the file cannot be used: unwritable, in use, of another brief, version or kind.
    """

    def __init__(self, path: Path, brief: Brief, time_limit: float) -> None:
        self.path = path
        self._file = self._opened()
        try:
            self._lock()
            self._places = sqlite3.connect("", isolation_level=None)
            self._places.execute("create table place (key text primary key, at integer) without rowid")
            self._places.execute("begin")
            self._begin(_header(brief, time_limit))
        except BaseException:
            self._file.close()
            raise

    def __enter__(self) -> Self:
        """Itself."""
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, at: TracebackType | None) -> None:
        """Close the file."""
        self._file.close()

    def find(self, key: str) -> Outcome | None:
        """The outcome of a row, where there is one."""
        place = self._places.execute("select at from place where key = ?", (key,)).fetchone()
        if place is None:
            return None
        self._file.seek(place[0])
        return _outcome(json.loads(self._file.readline()))

    def add(self, key: str, outcome: Outcome) -> None:
        """Write an outcome; it is the system's once this returns."""
        self._write({"key": key} | _told(outcome), key)

    def _write(self, line: dict[str, object], key: str | None) -> None:
        at = self._file.seek(0, os.SEEK_END)
        self._file.write(json.dumps(line, ensure_ascii=False, allow_nan=False).encode() + b"\n")
        self._file.flush()
        if key is not None:
            self._note(key, at)

    def _note(self, key: str, at: int) -> None:
        self._places.execute("insert or replace into place values (?, ?)", (key, at))

    def _opened(self) -> IO[bytes]:
        try:
            return self.path.open("r+b" if self.path.exists() else "x+b")
        except OSError as error:
            found = f'"{self.path}": {(error.strerror or "an error").lower()}'
            raise _refusal(found, "a file that can be written") from None

    def _lock(self) -> None:
        try:
            # a lock of this process alone: processes that it starts must not keep it when it is killed
            fcntl.lockf(self._file, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except OSError:
            raise _refusal(f'"{self.path}", which another run is writing', "a file of its own for each run") from None

    def _begin(self, header: dict[str, object]) -> None:
        """Take what is there, or begin a new file."""
        first = self._file.readline()
        own = json.dumps(header, ensure_ascii=False).encode() + b"\n"
        if not first.endswith(b"\n") and own.startswith(first):
            # new, or killed before the first line was whole
            self._file.truncate(0)
            self._write(header, None)
            return
        self._check(first, header)
        at, number = self._file.tell(), 1
        while line := self._file.readline():
            number += 1
            if not line.endswith(b"\n"):
                self._file.truncate(at)
                return
            self._note(self._key(line, number), at)
            at += len(line)

    def _check(self, line: bytes, header: dict[str, object]) -> None:
        """Refuse a file whose first line is not that of this brief."""
        found = _object(line)
        if "optopick" not in found or "brief" not in found:
            raise _refusal(f'"{self.path}", no file of results', "a new file, or one that this option began")
        for name, what in (("optopick", "version of optopick"), ("format", "version of optopick"), ("brief", "brief")):
            if found.get(name) != header[name]:
                other = f'"{self.path}", begun with another {what}' + (
                    f' or time limit ("{found.get("title")}")' if name == "brief" else f" ({found.get('optopick')})"
                )
                raise _refusal(other, "a new file, or what this one was begun with")

    def _key(self, line: bytes, number: int) -> str:
        found = _object(line)
        try:
            _outcome(found)
            return str(found["key"])
        except (KeyError, TypeError, ValueError):
            expected = "an outcome as it was written; or a new file"
            raise InputError(
                [Mistake(f"{self.path.name} line {number}", "no outcome of a coupler", expected)]
            ) from None


def _refusal(found: str, expected: str) -> InputError:
    return InputError([Mistake("--results", found, expected)])


def _object(line: bytes) -> dict[str, Any]:
    try:
        found = json.loads(line)
    except ValueError:
        return {}
    return found if isinstance(found, dict) else {}


def _header(brief: Brief, time_limit: float) -> dict[str, object]:
    """The first line: what decides the outcomes. Not the brief's title and paths, nor who does the work."""
    choice = replace(brief.couplers, table=Path())
    told = repr((replace(brief, title="", path=None, couplers=choice), time_limit))
    return {
        "optopick": version("optopick"),
        "format": FORMAT,
        "brief": blake2b(told.encode(), digest_size=16).hexdigest(),
        "title": brief.title,
    }


def _told(outcome: Outcome) -> dict[str, object]:
    told: dict[str, object] = {"part": outcome.part}
    match outcome:
        case PassedOver():
            return told | {"outcome": "passed over", "above": outcome.above}
        case Refused():
            return told | {"outcome": "rejected", "reason": outcome.reason}
        case Designed():
            goals = {"objective": _goal(outcome.objective), "second": _goal(outcome.second)}
            return told | {"outcome": outcome.status.value, **goals, "design": asdict(outcome.design)}


def _goal(objective: Objective) -> dict[str, object]:
    """A goal with null for what never ends."""
    return {name: None if value == math.inf else value for name, value in asdict(objective).items()}


def _outcome(found: dict[str, Any]) -> Outcome:
    """The outcome of a line; raises KeyError, TypeError or ValueError where there is none."""
    part, kind = str(found["part"]), found["outcome"]
    if kind == "passed over":
        return PassedOver(part, float(found["above"]))
    if kind == "rejected":
        return Refused(part, str(found["reason"]))
    first, second = (_objective(found[stage]) for stage in ("objective", "second"))
    return Designed(part, Status(kind), first, second, Design(**found["design"]))


def _objective(found: dict[str, Any]) -> Objective:
    value, bound = (math.inf if found[name] is None else float(found[name]) for name in ("value", "bound"))
    return Objective(str(found["name"]), value, bound, str(found["unit"]))
