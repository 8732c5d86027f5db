"""A starting brief for one of the usual links: every line explained by the list of keys, ready to run.

Which keys it gives and with what values stands in data/new_briefs.toml; what they mean, in data/brief_keys.toml.
"""

from __future__ import annotations

import json
import os
import textwrap
import tomllib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from functools import cache
from importlib import resources
from pathlib import Path
from typing import Any

from optopick.brief_schema import alternatives
from optopick.errors import InputError, Mistake
from optopick.key_values import one_of, read_value, shown
from optopick.keys import Key, Section, brief_sections
from optopick.read_brief import brief_from_mapping
from optopick.read_couplers import read_couplers
from optopick.units import QuantityError

DEMO_TABLE = "couplers.csv"
"""Name of the demonstration table that a new brief gets beside it where it has no other."""

OPTIONS: Mapping[str, str] = {
    "--title": "title",
    "--rate": "signal.rate",
    "--pulse": "signal.shortest_pulse",
    "--lit": "signal.lit",
    "--field-type": "drive.type",
    "--drive-supply": "drive.supply",
    "--max-current": "drive.max_current",
    "--off-leakage": "drive.off_leakage",
    "--output-supply": "output.supply",
    "--logic": "output.logic",
    "--temperature": "environment.temperature",
    "--life": "environment.life",
    "--delay": "limits.delay",
    "--withstand": "limits.isolation.withstand",
    "--minimize": "goal.minimize",
}
"""The options of `optopick new` and the key of the brief that each one gives."""

_WIDTH = 118


@dataclass(frozen=True)
class Start:
    """A usual link: what it is, where its figures come from, the keys to ask for, and the values by path."""

    kind: str
    about: str
    source: str
    asked: tuple[str, ...]
    values: Mapping[str, object]

    @property
    def circuit(self) -> object:
        """The drive circuit."""
        return self.values["drive.circuit"]


@dataclass(frozen=True)
class NewBrief:
    """A starting brief ready to be written; demo: the table to write beside it, None where there is one already."""

    text: str
    table: Path
    demo: str | None


@cache
def starts() -> Mapping[str, Start]:
    """Return the usual links by kind."""
    raw: dict[str, Any] = tomllib.loads(_data("new_briefs.toml"))
    return {
        kind: Start(kind, entry["about"], entry["source"], tuple(entry["asked"]), entry["values"])
        for kind, entry in raw.items()
    }


def start_of(kind: str) -> Start:
    """Return one usual link; raises InputError for a kind that is none."""
    if kind not in starts():
        raise InputError([Mistake("--kind", shown(kind), one_of(starts()))])
    return starts()[kind]


def key_at(path: str) -> Key:
    """Return the key of the brief at `path`, such as "drive.supply"."""
    section, _, name = path.rpartition(".")
    key = next(entry for entry in brief_sections() if entry.name == section).key(name)
    assert key is not None, path
    return key


def answer(path: str, text: str) -> object:
    """Return what the user typed for the key at `path` as a brief would write it; raises QuantityError."""
    key = key_at(path)
    if not text.isprintable():
        raise QuantityError(shown(text.encode("utf-8", "replace").decode()), "one line of printable text")
    words = [word.strip() for word in text.split(" to ")] if key.kind == "span" else [text.strip()]
    found: object = words[0] if len(words) == 1 else words
    read_value(key, found, Path())
    return found


def typed(value: object) -> str:
    """Return a value as a user would type it for `answer`."""
    return " to ".join(value) if isinstance(value, list) else str(value)


def with_answers(start: Start, texts: Mapping[str, str]) -> Start:
    """Return the start with the options given, by option; raises InputError with every one that is wrong."""
    mistakes: list[Mistake] = []
    answers: dict[str, object] = {}
    for option, text in texts.items():
        key = key_at(OPTIONS[option])
        if key.circuits and start.circuit not in key.circuits:
            found = f"an option for circuit {' and '.join(key.circuits)}"
            mistakes.append(Mistake(option, found, f"no such option with --kind {start.kind}"))
            continue
        try:
            answers[key.path] = answer(key.path, text)
        except QuantityError as error:
            mistakes.append(Mistake(option, error.found, error.expected))
    if {"--rate", "--pulse"} <= texts.keys():
        mistakes.append(Mistake("--pulse", "--rate and --pulse", "one of the two"))
    if mistakes:
        raise InputError(mistakes)
    return replace(start, values=_settled(start.values, answers))


def _settled(values: Mapping[str, object], answers: Mapping[str, object]) -> Mapping[str, object]:
    """Return the values with the answers in place, and without those that an answer puts out of force."""
    together = {**values, **answers}
    for one, other in (("signal.rate", "signal.shortest_pulse"), ("signal.shortest_pulse", "signal.rate")):
        if one in answers:
            together.pop(other, None)
    # the key's own default never equals the first goal
    if together["goal.minimize"] == together.get("goal.then"):
        together.pop("goal.then")
    return together


def new_brief(start: Start, path: Path, table: Path | None) -> NewBrief:
    """Return the brief to write at `path`, with the couplers of `table`, or of the demonstration table beside it.

    A table that is there is read first. Raises InputError where it, or the brief as a whole, has a mistake.
    """
    if not path.parent.is_dir():
        raise InputError([Mistake("BRIEF", f'"{path}", whose folder does not exist', "a file in a folder that does")])
    beside = path.parent / DEMO_TABLE
    found = table or beside
    demo = None if table is not None or os.path.lexists(beside) else _data("demo_couplers.csv")
    if demo is None:
        read_couplers(found)
    text = brief_text(start, path.name, _relative(found, path.parent))
    _check(text, path, found if demo is None else None)
    return NewBrief(text, found, demo)


def _relative(table: Path, folder: Path) -> str:
    """Return the path of `table` from `folder` in the way a brief has it."""
    try:
        found = os.path.relpath(table.absolute(), folder.absolute())
    except ValueError:  # another drive
        found = str(table.absolute())
    if not found.isprintable():
        raise InputError([Mistake("--table", "a path with characters that cannot be printed", "another path")])
    return Path(found).as_posix()


def _check(text: str, path: Path, table: Path | None) -> None:
    """Read the brief before it is written; mistakes name the option where there is one."""
    document = tomllib.loads(text)
    # the demonstration table is not there yet; any file will do, as a brief only asks whether it exists
    with resources.as_file(resources.files("optopick").joinpath("data", "demo_couplers.csv")) as demo:
        document["couplers"]["table"] = (table or demo).absolute()
        try:
            brief_from_mapping(document, path.parent)
        except InputError as error:
            raise InputError(_by_option(mistake) for mistake in error.mistakes) from None


def _by_option(mistake: Mistake) -> Mistake:
    paths = {f"brief: key {path}": option for option, path in OPTIONS.items()}
    return replace(mistake, where=paths.get(mistake.where, mistake.where))


def _data(name: str) -> str:
    return resources.files("optopick").joinpath("data", name).read_text(encoding="utf-8")


# ---- the text -------------------------------------------------------------------------------------------------------


def brief_text(start: Start, name: str, table: str) -> str:
    """Return the brief in TOML, to stand in the file `name` and take its couplers from `table`."""
    values = {**start.values, "couplers.table": table}
    head = [
        *_comment(f"A starting brief: {start.about}. Replace what your link has otherwise, then: optopick pick {name}"),
        *_comment(f"Where its figures come from: {start.source}."),
        *_comment(
            "A line such as # key = value shows a key that is left to its default; to set it, take the # away and give "
            "it your value."
        ),
    ]
    # what the resistor positions share is explained at the first of them
    explained: set[str] = set()
    parts = [head, *(_section(section, values, explained) for section in brief_sections() if _has(section, values))]
    return "\n\n".join("\n".join(part) for part in parts) + "\n"


def _has(section: Section, values: Mapping[str, object]) -> bool:
    """Whether the brief shows a section: all but the resistor positions that it does not use."""
    return not section.name.startswith("stock.") or any(key.path in values for key in section.keys)


def _section(section: Section, values: Mapping[str, object], explained: set[str]) -> list[str]:
    lines = [*_comment(section.meaning), f"[{section.name}]"] if section.name else []
    replaced = {name for key, others in alternatives(section) for name in (key.name, *others)}
    is_position = section.name.startswith("stock.")
    for key in section.keys:
        known = is_position and key.name in explained
        if key.path in values:
            lines += [*([] if known else _comment(key.meaning)), f"{key.name} = {_toml(values[key.path])}"]
        elif not known and key.name not in replaced and _belongs(key, values):
            lines += [
                *_comment(f"{key.meaning} Without it: {_otherwise(key, values)}."),
                f"# {key.name} = {_toml(key.example)}",
            ]
        else:
            continue
        if is_position:
            explained.add(key.name)
    return lines


def _belongs(key: Key, values: Mapping[str, object]) -> bool:
    circuit = not key.circuits or values["drive.circuit"] in key.circuits
    # the ends of a series mean nothing beside a list of values
    listed = key.name in ("from", "to") and f"{key.section}.values" in values
    return circuit and not listed and (not key.only_in or key.section in key.only_in)


def _otherwise(key: Key, values: Mapping[str, object]) -> str:
    """Say what holds where the key is not given."""
    chosen = f"{key.section}.{key.default_from}" in values
    said = [f"as {key.default_from} has it"] if key.default_from and chosen else []
    said += [_toml(key.default)] if key.default is not None else [key.default_rule] if key.default_rule else []
    return ", else ".join(said)


def _comment(text: str) -> Iterator[str]:
    yield from textwrap.wrap(text, _WIDTH, initial_indent="# ", subsequent_indent="# ", break_on_hyphens=False)


def _toml(value: object) -> str:
    """Return a value in TOML; its texts are printable, so that JSON's quoting is TOML's."""
    if isinstance(value, list):
        return "[" + ", ".join(_toml(item) for item in value) + "]"
    return json.dumps(value, ensure_ascii=False)
