"""Read a brief against the list of its keys: every value checked, every mistake kept with its place."""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import cast

from optopick.brief import Span
from optopick.errors import InputError, Mistake
from optopick.key_values import Threshold, nearest, one_of, read_value, shown
from optopick.keys import Key, Section, brief_sections, named_sets
from optopick.toml_lines import KeyPath
from optopick.units import QuantityError


class Mistakes:
    """Collects what is wrong in one brief, and where."""

    def __init__(self, file: str, lines: Mapping[KeyPath, int]) -> None:
        self._file = file
        self._lines = lines
        self._noted: dict[Mistake, float] = {}

    def add(self, path: KeyPath, found: str, expected: str) -> None:
        """Note a mistake at the key `path`."""
        line = self._lines.get(path)
        name = ".".join(_bare_or_quoted(part) for part in path)
        where = f"{self._file}: key {name}" if line is None else f"{self._file} line {line}, {name}"
        # the same mistake may be met twice, as when two positions share a shelf
        self._noted.setdefault(Mistake(where, found, expected), math.inf if line is None else line)

    def take(self, mistakes: Iterable[Mistake]) -> None:
        """Note the mistakes of another file."""
        for mistake in mistakes:
            self._noted.setdefault(mistake, math.inf)

    def raise_any(self) -> None:
        """Raise InputError with every mistake noted, in the order of the lines, those without a line last."""
        if self._noted:
            raise InputError(sorted(self._noted, key=lambda mistake: self._noted[mistake]))


class Values:
    """The values of a brief by their path, such as "drive.supply", as given or filled in.

    given: the paths that the brief itself gives, valid or not. sections: the sections that it has.
    """

    def __init__(self) -> None:
        self.given: set[str] = set()
        self.sections: set[str] = set()
        self._values: dict[str, object] = {}

    def put(self, path: str, value: object) -> None:
        """Keep `value` for `path`."""
        self._values[path] = value

    def has(self, *paths: str) -> bool:
        """Whether every one of `paths` has a valid value."""
        return all(path in self._values for path in paths)

    def number(self, path: str) -> float:
        """Return a quantity; raises KeyError if there is none."""
        return cast(float, self._values[path])

    def optional(self, path: str) -> float | None:
        """Return a quantity, None if there is none."""
        return cast("float | None", self._values.get(path))

    def span(self, path: str) -> Span:
        """Return a span; raises KeyError if there is none."""
        return cast(Span, self._values[path])

    def threshold(self, path: str) -> Threshold:
        """Return a threshold; raises KeyError if there is none."""
        return cast(Threshold, self._values[path])

    def text(self, path: str, otherwise: str = "") -> str:
        """Return a text or a choice."""
        return cast(str, self._values.get(path, otherwise))

    def get(self, path: str) -> object:
        """Return a value of any kind, None if there is none."""
        return self._values.get(path)


def read_values(document: Mapping[str, object], base: Path, mistakes: Mistakes) -> Values:
    """Read `document`, the parsed brief, whose relative paths start at the folder `base`."""
    values = Values()
    for section in brief_sections():
        table = _table(document, section, values, mistakes)
        if table is not None:
            _report_unknown(table, section, mistakes)
            _read_section(table, section, values, base, mistakes)
    return values


def _bare_or_quoted(part: str) -> str:
    bare = part.isascii() and part.replace("_", "a").replace("-", "a").isalnum()
    return part if bare else json.dumps(part, ensure_ascii=False)


def _path(dotted: str) -> KeyPath:
    return tuple(dotted.split(".")) if dotted else ()


def _table(
    document: Mapping[str, object], section: Section, values: Values, mistakes: Mistakes
) -> Mapping[str, object] | None:
    """Return the table of `section`, empty if it may be left out; None if it is wrong, or what it is part of is."""
    table: object = document
    # no name: what stands above the first section
    *parents, name = _path(section.name) or ("",)
    for parent in parents:
        table = table.get(parent) if isinstance(table, Mapping) else None
    if not isinstance(table, Mapping) or not name:
        return table if isinstance(table, Mapping) else None
    if name not in table:
        if section.required:
            mistakes.add(_path(section.name), "nothing", f"this section: {_lower_first(section.meaning)}")
        return None if section.required else {}
    inner = table[name]
    if not isinstance(inner, Mapping):
        mistakes.add(_path(section.name), shown(inner), f"a section, [{section.name}]")
        return None
    values.sections.add(section.name)
    return inner


def _lower_first(text: str) -> str:
    return text[:1].lower() + text[1:].rstrip(".")


def _children(section: Section) -> list[str]:
    """Return the names of the sections that stand directly in `section`."""
    names = (other.name for other in brief_sections() if other.name)
    return [name.rpartition(".")[2] for name in names if name.rpartition(".")[0] == section.name]


def _report_unknown(table: Mapping[str, object], section: Section, mistakes: Mistakes) -> None:
    known = [key.name for key in section.keys] + _children(section)
    for name in table:
        if name not in known:
            expected = f"one of {', '.join(known)}{_home(str(name)) or nearest(str(name), known)}"
            what = "section" if isinstance(table[name], Mapping) else "key"
            mistakes.add((*_path(section.name), str(name)), f"an unknown {what}", expected)


def _home(name: str) -> str:
    """Say in which other sections a key of this very name stands; empty if in none."""
    # `power` or `tolerance` stand in many places; naming them all would not help
    homes = [f"[{section.name}]" for section in brief_sections() if section.name and section.key(name)]
    return f' ("{name}" belongs to {" and ".join(homes)})' if 0 < len(homes) <= 2 else ""


def _read_section(
    table: Mapping[str, object], section: Section, values: Values, base: Path, mistakes: Mistakes
) -> None:
    for key in section.keys:
        # the schema puts `circuit` and the choosers of named sets before the keys that depend on them
        circuit = values.text(f"{section.name}.circuit")
        if key.name not in table:
            _fill(table, key, circuit, values, base, mistakes)
            continue
        values.given.add(key.path)
        stranger = _stranger(key, circuit)
        if stranger:
            mistakes.add(_path(key.path), *stranger)
            continue
        try:
            values.put(key.path, read_value(key, table[key.name], base))
        except QuantityError as error:
            mistakes.add(_path(key.path), error.found, error.expected)


def _stranger(key: Key, circuit: str) -> tuple[str, str] | None:
    """Return what was found and expected if `key` does not belong where it stands."""
    if key.only_in and key.section not in key.only_in:
        return f"a key of {' and '.join(key.only_in)}", f"no such key in {key.section}"
    if key.circuits and circuit and circuit not in key.circuits:
        return f"a key of circuit {' and '.join(key.circuits)}", f'no such key with circuit = "{circuit}"'
    return None


def _fill(table: Mapping[str, object], key: Key, circuit: str, values: Values, base: Path, mistakes: Mistakes) -> None:
    """Fill in a key that the brief does not give: from the named set, else the default; else it may be missing."""
    cell = _named_cell(key, values)
    if cell is not None:
        values.put(key.path, read_value(key, cell, base))
    elif key.default is not None:
        values.put(key.path, read_value(key, key.default, base))
    elif not key.default_rule and _wanted(table, key, circuit):
        other = f" (or {key.default_from}, a named set)" if key.default_from else ""
        value = one_of(key.choices) if key.choices else f"such as {shown(key.example)}"
        mistakes.add(_path(key.path), "nothing", f"{key.name}, {value}{other}")


def _wanted(table: Mapping[str, object], key: Key, circuit: str) -> bool:
    """Whether the lack of `key` is a mistake of its own: not if it follows from another mistake."""
    # a named set that is spelled wrong is one mistake, not one more for each key it would have filled
    follows = bool(key.default_from) and key.default_from in table
    return not follows and (not key.circuits or circuit in key.circuits)


def _named_cell(key: Key, values: Values) -> object:
    chooser = next((other for other in _keys_of(key.section) if other.name == key.default_from), None)
    name = values.text(chooser.path) if chooser else ""
    if chooser is None or not name:
        return None
    cell = named_sets(chooser.names_in)[name].get(key.name)
    return cell.value if cell else None


def _keys_of(section: str) -> tuple[Key, ...]:
    return next(entry.keys for entry in brief_sections() if entry.name == section)
