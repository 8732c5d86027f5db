"""A TOML file of the user: read from disk and parsed, with every fault in plain words."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path
from typing import Any

from optopick.errors import InputError, Mistake
from optopick.toml_lines import unclosed_quote

_PLACE = re.compile(r"(?P<what>.*) \(at (?:line (?P<line>\d+), column (?P<column>\d+)|end of document)\)", re.DOTALL)
_QUOTE = "a closing quote, \" or ', where the text ends"

# What the TOML parser complains of, by how its message begins -> what to write instead.
_PLAIN_WORDS = {
    "Expected newline or end of document": 'one value and the end of the line; text such as "3.3 V" stands in quotes',
    "Invalid value": "a value: text in quotes, a number, true, false, a list in [ ] or a table in { }",
    "Expected '=' after a key": "an equals sign between key and value",
    "Invalid initial character for a key": "a key of letters, digits, _ and -",
    "Invalid statement": 'a line such as key = "value" or [section]',
    "Cannot overwrite a value": "each key once",
    "Duplicate inline table key": "each key once",
    "Cannot declare": "each section once",
    "Cannot redefine namespace": "each section once, with all its keys in one place",
    "Cannot mutate immutable namespace": "each section once, with all its keys in one place",
    "Expected ']": "a closing ] after the name of the section",
    "Unclosed array": "a comma or a closing ] after each value of a list",
    "Unclosed inline table": "a comma or a closing } after each value of a table",
    "Unescaped '\\'": "single quotes around text with a backslash, or / in paths",
    "Illegal character": _QUOTE,
    "Found invalid character": _QUOTE,
    "Unterminated string": _QUOTE,
    "Expected": _QUOTE,
    "Invalid hex value": "four hexadecimal digits after \\u, eight after \\U",
    "Escaped character": "an escape of a character that exists",
    "Invalid date": "a date that exists, or text in quotes",
}


def read_text(path: Path, what: str) -> str:
    """Return the text of the user's file at `path`; `what` says in messages what the file should be.

    Raises InputError if there is no such file, it is a directory, cannot be read, or is not UTF-8.
    """
    try:
        return path.read_bytes().decode("utf-8-sig")
    except FileNotFoundError:
        found = "no such file"
    except IsADirectoryError:
        found = "a directory"
    except UnicodeDecodeError as error:
        line = error.object.count(b"\n", 0, error.start) + 1
        raise InputError([Mistake(f"{path} line {line}", "bytes that are not UTF-8", f"{what} in UTF-8")]) from None
    except (OSError, ValueError) as error:  # ValueError: a path with a zero byte
        found = (getattr(error, "strerror", None) or "no usable path").lower()
    raise InputError([Mistake(str(path), found, what)])


def parse_toml(text: str, file: str) -> dict[str, Any]:
    """Parse TOML `text` that came from `file`. Raises InputError with line and column if it is not valid."""
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise InputError([_syntax_mistake(str(error), text, file)]) from None
    except RecursionError:
        raise InputError([Mistake(file, "brackets nested too deep", "lists and tables a few levels deep")]) from None
    except ValueError:  # Python refuses to convert an integer of thousands of digits
        raise InputError([Mistake(file, "a number of thousands of digits", "numbers of a usable size")]) from None


def _syntax_mistake(message: str, text: str, file: str) -> Mistake:
    match = _PLACE.fullmatch(message)
    what = match["what"] if match else message
    expected = next((words for start, words in _PLAIN_WORDS.items() if what.startswith(start)), f"valid TOML ({what})")
    lines = text.rstrip("\n").split("\n")
    if match is not None and match["line"] is not None:
        line = int(match["line"])
        found = _printable(lines[line - 1]) if line <= len(lines) else "an empty line"
        return Mistake(f"{file} line {line}, column {match['column']}", found, expected)
    # the parser saw the end of the file; a quote that was never closed is where the user should look
    opened = unclosed_quote(text) if expected == _QUOTE else None
    if opened is not None:
        return Mistake(f"{file} line {opened}", _printable(lines[opened - 1]), expected)
    return Mistake(f"{file} line {len(lines)}", "the end of the file", expected)


def _printable(line: str) -> str:
    return "".join(char if char.isprintable() else "?" for char in line.strip()[:60])
