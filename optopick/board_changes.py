"""What a link of a board changes in its brief: read by the rules of the brief's keys, mistakes told of the board."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path

from optopick.brief import Brief
from optopick.errors import InputError, Mistake
from optopick.key_values import nearest, read_value, shown
from optopick.keys import Key, brief_sections
from optopick.read_brief import brief_from_document
from optopick.read_keys import Mistakes
from optopick.toml_lines import KeyPath
from optopick.toml_text import parse_toml, read_text
from optopick.units import QuantityError

Table = Mapping[str, object]

PATHS = ("file", "stock")
"""Kinds of key whose text is a path."""


@dataclass(frozen=True)
class Changes:
    """What a link changes. place: its table in the board file; given: keys as parsed; unset: dotted keys taken out."""

    place: KeyPath
    given: Table
    unset: tuple[str, ...] = ()

    @property
    def any(self) -> bool:
        """Whether there are any."""
        return bool(self.given or self.unset)

    @property
    def told(self) -> tuple[tuple[str, str | None], ...]:
        """Each key with its value as the board writes it, None where it is taken out."""
        changed = (
            (".".join(path), shown(value)) for path, value in _walked(self.given) if not isinstance(value, Mapping)
        )
        return (*changed, *((name, None) for name in self.unset))


def changed_brief(path: Path, changes: Changes, base: Path, mistakes: Mistakes) -> Brief | None:
    """The brief at `path`, which is right by itself, with `changes`, whose relative paths start at the folder `base`.

    None where that is no brief; `mistakes` then says why.
    """
    document = _without(parse_toml(read_text(path, "a brief in TOML"), str(path)), changes, mistakes)
    told = _OfLink(mistakes, changes)
    given = _rooted(changes.given, (), base, told)
    try:
        told.raise_any()
        return brief_from_document(_merged(document, given), path, told)
    except InputError:
        return None


class _OfLink(Mistakes):
    """Mistakes of a changed brief, told of the board: at the key there, or at the changes as a whole."""

    def __init__(self, board: Mistakes, changes: Changes) -> None:
        super().__init__("", {})
        self._board, self._place = board, changes.place
        self._given = {path for path, _ in _walked(changes.given)}

    def add(self, path: KeyPath, found: str, expected: str) -> None:
        """Note a mistake at the key `path` of the brief."""
        super().add(path, found, expected)
        if path in self._given:
            words = expected.replace("the brief's folder", "the board file's folder")
            self._board.add((*self._place, "set", *path), found, words)
        else:
            # the brief alone has no such mistake: what is changed makes it
            which = "set" if self._given else "unset"
            self._board.add((*self._place, which), f"{found} at {'.'.join(path)}", expected)

    def take(self, mistakes: Iterable[Mistake]) -> None:
        """Note the mistakes of another file."""
        found = list(mistakes)
        super().take(found)
        self._board.take(found)


def _walked(table: Table, path: KeyPath = ()) -> Iterator[tuple[KeyPath, object]]:
    """Every key of a table and of the tables in it, with its value."""
    for name, value in table.items():
        yield (*path, name), value
        if isinstance(value, Mapping):
            yield from _walked(value, (*path, name))


def _without(document: Table, changes: Changes, mistakes: Mistakes) -> Table:
    """The document less the keys taken out; a key that it does not have is a mistake."""
    known = {".".join(path) for path, _ in _walked(document)}
    for name in changes.unset:
        if name not in known:
            hint = nearest(name, sorted(known))
            mistakes.add((*changes.place, "unset"), shown(name), f"keys that the brief gives{hint}")
    return _less(document, (), set(changes.unset))


def _less(table: Table, path: KeyPath, names: set[str]) -> Table:
    kept = {name: value for name, value in table.items() if ".".join((*path, name)) not in names}
    return {
        name: _less(value, (*path, name), names) if isinstance(value, Mapping) else value
        for name, value in kept.items()
    }


def _rooted(table: Table, path: KeyPath, base: Path, mistakes: Mistakes) -> Table:
    """The same table, its texts that are paths made to start at `base`."""
    return {name: _rooted_value((*path, name), value, base, mistakes) for name, value in table.items()}


def _rooted_value(path: KeyPath, value: object, base: Path, mistakes: Mistakes) -> object:
    if isinstance(value, Mapping):
        return _rooted(value, path, base, mistakes)
    key = _key(".".join(path))
    if key is None or key.kind not in PATHS or not isinstance(value, str):
        return value
    try:
        return read_value(key, value, base.absolute())
    except QuantityError as error:
        mistakes.add(path, error.found, error.expected)
        return value


def _key(path: str) -> Key | None:
    return next((key for section in brief_sections() for key in section.keys if key.path == path), None)


def _merged(under: Table, over: Table) -> Table:
    """Both tables, key by key; where both have one the second counts."""
    found = dict(under)
    for name, value in over.items():
        old = found.get(name)
        found[name] = _merged(old, value) if isinstance(old, Mapping) and isinstance(value, Mapping) else value
    return found
