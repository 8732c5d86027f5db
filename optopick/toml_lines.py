"""On which line of a TOML text each key stands, so that a mistake in a value can be pointed at."""

from __future__ import annotations

import re
import tomllib
from dataclasses import dataclass

KeyPath = tuple[str, ...]

_TOKEN = re.compile(
    r'''
    (?P<text> """(?:\\.|[^\\])*?"""(?:"{1,2}(?!"))? | \'\'\'.*?\'\'\'(?:'{1,2}(?!'))?
            | "(?:\\.|[^"\\\n])*" | '[^'\n]*' )
    | (?P<comment> \#[^\n]* )
    | (?P<mark> [\[\]{}=,.\n] )
    | (?P<word> [^\s\[\]{}=,."'\#]+ )
    ''',
    re.VERBOSE | re.DOTALL,
)


@dataclass
class _Level:
    """One nesting level: the file itself, an inline table or a list. prefix is None inside lists."""

    kind: str
    prefix: KeyPath | None


def key_lines(text: str) -> dict[KeyPath, int]:
    """Return the line, from 1, of every key and section of `text`, which must be valid TOML.

    Keys of tables that stand inside lists are left out. Text that is not valid TOML gives some lines, never an error.
    """
    scanner = _Scanner()
    line, end = 1, 0
    for match in _TOKEN.finditer(text):
        # counted from token to token, so that the whole stays linear in the length of the text
        line += text.count("\n", end, match.start())
        end = match.start()
        if match.lastgroup != "comment":
            scanner.take(match.group(), match.lastgroup == "mark", line)
    return scanner.lines


def unclosed_quote(text: str) -> int | None:
    """Return the line, from 1, of the first quote that opens a text of TOML and is never closed; None without one."""
    end = 0
    for match in _TOKEN.finditer(text):
        # a quote that begins no token is all that the scan steps over, besides white space
        if text[end : match.start()].strip():
            break
        end = match.end()
    rest = text[end:].lstrip()
    return text.count("\n", 0, len(text) - len(rest)) + 1 if rest else None


class _Scanner:
    """Follows the tokens of a TOML text and notes the line of every key."""

    def __init__(self) -> None:
        self.lines: dict[KeyPath, int] = {}
        self._levels = [_Level("file", ())]
        self._reset()
        self._path: KeyPath | None = None

    def _reset(self) -> None:
        self._parts: list[str] = []
        self._in_key = True
        self._in_header = False

    def take(self, token: str, mark: bool, line: int) -> None:
        """Take the next token, `mark` if it is punctuation."""
        level = self._levels[-1]
        if token == "\n" and level.kind == "file":
            self._reset()
        elif self._in_key:
            self._take_key(token, mark, line, level)
        elif mark:
            self._take_value(token, level)

    def _take_key(self, token: str, mark: bool, line: int, level: _Level) -> None:
        if not mark:
            self._parts.append(_unquoted(token))
        elif token == "[" and level.kind == "file":
            self._in_header = True
        elif token == "]" and self._in_header:
            level.prefix = self._note((), line)
            self._in_key = False
        elif token == "=":
            # kept for a table that may follow, whose keys continue this path
            self._path = self._note(level.prefix, line)
            self._in_key = False
        elif token == "}":
            self._close()

    def _take_value(self, token: str, level: _Level) -> None:
        if token in ("[", "{"):
            # a table inside a list has a place but no path of keys
            inside_list = level.kind == "list"
            kind = "list" if token == "[" else "table"
            self._levels.append(_Level(kind, None if inside_list or kind == "list" else self._path))
            self._parts, self._in_key = [], kind == "table"
        elif token in ("]", "}"):
            self._close()
        elif token == "," and level.kind == "table":
            self._parts, self._in_key = [], True

    def _close(self) -> None:
        if len(self._levels) > 1:
            self._levels.pop()
        self._in_key = False

    def _note(self, prefix: KeyPath | None, line: int) -> KeyPath | None:
        """Note the key just read, and the tables its dots imply; return its full path."""
        if prefix is None:
            return None
        for count in range(1, len(self._parts) + 1):
            self.lines.setdefault((*prefix, *self._parts[:count]), line)
        return (*prefix, *self._parts)


def _unquoted(token: str) -> str:
    if token[0] not in "\"'":
        return token
    try:
        return str(tomllib.loads(f"key = {token}")["key"])
    except tomllib.TOMLDecodeError:
        return token
