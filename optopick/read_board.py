"""Read a board file: which links a product has and what they share. Every mistake at once, those of its briefs too."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import cast

from optopick.board import Board, BoardGoal, BoardGoalName, BoardLimits, BoardLink, Grounds
from optopick.board_changes import Changes, changed_brief
from optopick.board_keys import LINK, LINKS, SECTIONS, SET, TOP
from optopick.brief import Brief
from optopick.errors import InputError, Mistake
from optopick.key_values import nearest, one_of, read_value, shown
from optopick.keys import Key
from optopick.read_brief import read_brief
from optopick.read_keys import Mistakes
from optopick.toml_lines import KeyPath, key_lines
from optopick.toml_text import parse_toml, read_text
from optopick.units import QuantityError

Read = dict[str, object]
"""Values of one table by key; what was wrong is not in it."""

_HEADER = re.compile(r"^[ \t]*\[\[[ \t]*link[ \t]*\]\]", re.MULTILINE)


def read_board(path: Path | str) -> Board:
    """Read the board at `path` and the brief of every link. Raises InputError with every mistake in them."""
    path = Path(path)
    text = read_text(path, "a board in TOML")
    if not text.strip():
        raise InputError([Mistake(str(path), "an empty file", "a board in TOML")])
    document = parse_toml(text, str(path))
    mistakes = Mistakes(str(path), _lines(text, document.get(LINK)))
    _report_unknown(document, (), [*(key.name for key in TOP), *SECTIONS, LINK], mistakes)
    top = _table(document, (), TOP, path.parent, mistakes)
    sections = {name: _section(document, name, keys, path.parent, mistakes) for name, keys in SECTIONS.items()}
    links = _links(document.get(LINK), path.parent, mistakes)
    _check_goals(sections["goal"], mistakes)
    briefs = _briefs(links, path.parent, mistakes)
    _check_edges(sections["goal"], briefs, mistakes)
    mistakes.raise_any()
    # from here on every required value is there
    return Board(
        title=str(top.get("title", path.stem)),
        limits=BoardLimits(**sections["limits"]),  # type: ignore[arg-type]
        goal=_goal(sections["goal"]),
        links=tuple(_link(one, cast(Brief, brief)) for one, brief in zip(links, briefs, strict=True)),
        path=path,
    )


def _lines(text: str, links: object) -> dict[KeyPath, int]:
    """The line of every key; the keys of link number n (from 1) under ("link", "n")."""
    starts = [match.start() for match in _HEADER.finditer(text)]
    found = key_lines(text[: starts[0]] if starts else text)
    if not starts or not isinstance(links, list) or len(links) != len(starts):
        return key_lines(text)
    for number, (start, end) in enumerate(zip(starts, [*starts[1:], len(text)], strict=True), 1):
        before = text.count("\n", 0, start)
        for key, line in key_lines(text[start:end]).items():
            # other sections may stand behind the links
            inside = (LINK, str(number), *key[1:]) if key[0] == LINK else key
            found.setdefault(inside, line + before)
    return found


def _report_unknown(table: Mapping[str, object], path: KeyPath, known: Sequence[str], mistakes: Mistakes) -> None:
    for name, value in table.items():
        if name not in known:
            what = "section" if isinstance(value, Mapping) else "key"
            expected = f"one of {', '.join(known)}{nearest(name, known)}"
            mistakes.add((*path, name), f"an unknown {what}", expected)


def _section(document: Mapping[str, object], name: str, keys: Sequence[Key], base: Path, mistakes: Mistakes) -> Read:
    table = document.get(name, {})
    if not isinstance(table, Mapping):
        mistakes.add((name,), shown(table), f"a section, [{name}]")
        return {}
    _report_unknown(table, (name,), [key.name for key in keys], mistakes)
    return _table(table, (name,), keys, base, mistakes)


def _table(table: Mapping[str, object], path: KeyPath, keys: Sequence[Key], base: Path, mistakes: Mistakes) -> Read:
    """The values of `keys` in `table`, defaults filled in."""
    read: Read = {}
    for key in keys:
        if key.name in table:
            try:
                read[key.name] = _read(key, table[key.name], base)
            except QuantityError as error:
                expected = error.expected.replace("the brief's folder", "the board file's folder")
                mistakes.add((*path, key.name), error.found, expected)
        elif key.default is not None:
            read[key.name] = key.default
        elif key.required:
            wanted = one_of(key.choices) if key.choices else f"such as {shown(key.example)}"
            mistakes.add((*path, key.name), "nothing", f"{key.name}, {wanted}")
    return read


def _read(key: Key, value: object, base: Path) -> object:
    if key.name == "price" and isinstance(value, str):
        # prices have no unit; a share of one is none
        raise QuantityError(shown(value), f"a number such as {shown(key.example)}")
    return read_value(key, value, base)


def _links(found: object, base: Path, mistakes: Mistakes) -> list[Read]:
    if found is None or found == []:
        mistakes.add((LINK,), "no link", "a table [[link]] for each link, with name and brief")
        return []
    if not isinstance(found, list) or not all(isinstance(one, Mapping) for one in found):
        mistakes.add((LINK,), shown(found), "a table [[link]] for each link, with name and brief")
        return []
    read, seen = [], dict[object, int]()
    for number, table in enumerate(found, 1):
        path = (LINK, str(number))
        _report_unknown(table, path, [*(key.name for key in LINKS), SET], mistakes)
        one = _table(table, path, LINKS, base, mistakes)
        one["changes"] = _changes(table, path, one, mistakes)
        _check_grounds(one, path, mistakes)
        name = one.get("name")
        if name is not None and name in seen:
            mistakes.add((*path, "name"), f"{shown(name)}, the name of link {seen[name]} too", "each name once")
        seen.setdefault(name, number)
        read.append(one)
    return read


def _check_goals(goal: Read, mistakes: Mistakes) -> None:
    if "then" in goal and goal.get("minimize") == goal["then"]:
        mistakes.add(("goal", "then"), shown(goal["then"]), "another goal than minimize")


def _check_grounds(one: Read, path: KeyPath, mistakes: Mistakes) -> None:
    grounds = cast("tuple[str, ...]", one.get("grounds", ("", "")))
    if len(grounds) != 2:
        expected = "two names, the ground on the LED's side and the one on the output's"
        mistakes.add((*path, "grounds"), shown(grounds), expected)


def _changes(table: Mapping[str, object], path: KeyPath, one: Read, mistakes: Mistakes) -> Changes:
    given = table.get(SET, {})
    if not isinstance(given, Mapping):
        mistakes.add((*path, SET), shown(given), "keys of the brief, such as set.signal.lit = 0.3")
        given = {}
    return Changes(path, given, cast("tuple[str, ...]", one.get("unset", ())))


def _check_edges(goal: Read, briefs: Sequence[Brief | None], mistakes: Mistakes) -> None:
    """An edge is measured against its link's limit: one link at least has to have one."""
    unlimited = all(brief is not None and brief.limits.edge_time is None for brief in briefs)
    for name in ("minimize", "then"):
        if briefs and unlimited and goal.get(name) == BoardGoalName.EDGE:
            mistakes.add(("goal", name), shown("edge"), "another goal, or a link whose brief has limits.edge_time")


def _briefs(links: Sequence[Read], base: Path, mistakes: Mistakes) -> list[Brief | None]:
    """The brief of each link with the link's changes; None where it has mistakes, each of which is noted once."""
    read: dict[Path, Brief | None] = {}
    found: list[Brief | None] = []
    for one in links:
        path, changes = one.get("brief"), cast(Changes, one["changes"])
        if not isinstance(path, Path):
            found.append(None)
            continue
        if path not in read:
            read[path] = _brief(path, mistakes)
        brief = read[path]
        found.append(changed_brief(path, changes, base, mistakes) if brief and changes.any else brief)
    return found


def _brief(path: Path, mistakes: Mistakes) -> Brief | None:
    try:
        return read_brief(path)
    except InputError as error:
        mistakes.take(error.mistakes)
        return None


def _link(read: Read, brief: Brief) -> BoardLink:
    return BoardLink(
        name=cast(str, read["name"]),
        brief=brief,
        count=cast(int, read["count"]),
        grounds=cast("Grounds | None", read.get("grounds")),
        changes=cast(Changes, read["changes"]).told,
    )


def _goal(read: Read) -> BoardGoal:
    minimize = BoardGoalName(cast(str, read["minimize"]))
    # default of the second goal
    then = BoardGoalName.REELS if minimize is BoardGoalName.POWER else BoardGoalName.POWER
    return BoardGoal(minimize, BoardGoalName(cast(str, read.get("then", then))), cast(float, read["give"]))
