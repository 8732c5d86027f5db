"""What the documents show of the program, taken from the program: command output and the table of the brief's keys.

In a document, a block

    ```console
    $ optopick pick examples/fastest.toml | head -n 20
    ```

is followed by what the command prints; `_filtered` says what may stand after a `|`. The table of keys stands between
the lines `<!-- keys -->` and `<!-- end of keys -->`.
"""

from __future__ import annotations

import os
import re
import shlex
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from command import ROOT, run

from optopick.keys import Key, brief_sections

DOCUMENTS = (ROOT / "README.md", ROOT / "examples" / "README.md", ROOT / "DEVELOPERS.md")
BLOCK = re.compile(r"```console\n(.*?)```", re.DOTALL)
KEYS = re.compile(r"(<!-- keys -->\n).*?(<!-- end of keys -->)", re.DOTALL)

PASSING = re.compile(r"\b[\d.]+(e[-+]?\d+)? s; HiGHS [\d.]+ through Pyomo [\d.]+")
"""What differs from run to run, or from one installation to the next; it moves the line's end too."""


@dataclass(frozen=True)
class Shown:
    """One command of a console block and the output that stands below it."""

    command: str
    output: str


def shown_in(path: Path) -> list[Shown]:
    """Every command of a document's console blocks, in order."""
    return [shown for block in BLOCK.findall(path.read_text(encoding="utf-8")) for shown in _commands(block)]


def _commands(block: str) -> Iterator[Shown]:
    for part in re.split(r"^\$ ", block, flags=re.MULTILINE)[1:]:
        command, _, output = part.partition("\n")
        yield Shown(command, output)


def printed_by(command: str) -> str:
    """What an `optopick ...` command prints on standard output, run from the root of the repository."""
    pipeline = command.split("|")
    words = shlex.split(pipeline[0])
    assert words[0] == "optopick", command
    before = Path.cwd()
    os.chdir(ROOT)
    try:
        lines = run(*words[1:]).out.splitlines()
    finally:
        os.chdir(before)
    assert lines, f"{command} prints nothing"
    for filter_ in pipeline[1:]:
        lines = _filtered(lines, shlex.split(filter_))
    return "".join(f"{line.rstrip()}\n" for line in lines)


def _filtered(lines: list[str], words: list[str]) -> list[str]:
    """What a filter leaves: `head -n N`, `tail -n N`, `sed '/^TEXT/,$d'`, `grep -A N '^TEXT'`."""
    match words:
        case ["head", "-n", count]:
            return lines[: int(count)]
        case ["tail", "-n", count]:
            return lines[-int(count) :]
        case ["sed", cut] if found := re.fullmatch(r"/\^(\w+)/,\$d", cut):
            return lines[: _first(lines, found.group(1))]
        case ["grep", "-A", count, pattern]:
            at = _first(lines, pattern.removeprefix("^"))
            return lines[at : at + 1 + int(count)]
    raise AssertionError(f"no filter that documents may use: {shlex.join(words)}")


def _first(lines: list[str], start: str) -> int:
    return next(k for k, line in enumerate(lines) if line.startswith(start))


def steady(output: str) -> str:
    """Output without what passes, all blanks alike."""
    return PASSING.sub("SECONDS; SOLVER", " ".join(output.split()))


def renewed(text: str) -> str:
    """A document with its outputs and its table of keys as the program has them now."""
    text = BLOCK.sub(lambda found: f"```console\n{_renewed_block(found.group(1))}```", text)
    return KEYS.sub(lambda found: f"{found.group(1)}{keys_table()}{found.group(2)}", text)


def _renewed_block(block: str) -> str:
    parts = []
    for shown in _commands(block):
        now = printed_by(shown.command)
        parts.append(f"$ {shown.command}\n{shown.output if steady(now) == steady(shown.output) else now}")
    return "".join(parts)


def keys_table() -> str:
    """Every section and key of a brief as Markdown."""
    parts = []
    for section in brief_sections():
        title = f"`[{section.name}]`" if section.name else "Above the first section"
        needed = " Required." if section.required else ""
        parts.append(f"\n**{title}** {section.meaning}{needed}\n\n")
        parts.append("| key | meaning | example | where absent |\n|---|---|---|---|\n")
        parts += [_row(key) for key in section.keys]
    return "".join(parts) + "\n"


def _row(key: Key) -> str:
    meaning = key.meaning + (f" One of: {', '.join(key.choices)}." if key.choices else "")
    if key.circuits:
        meaning += f" Drive circuit {' or '.join(key.circuits)} only."
    example = key.example if isinstance(key.example, str | int | float) else ", ".join(map(str, key.example))
    return f"| `{key.name}` | {meaning} | {_written(example)} | {_absent(key)} |\n"


def _written(value: object) -> str:
    return "`true`" if value is True else "`false`" if value is False else f"`{value}`"


def _absent(key: Key) -> str:
    if key.required:
        return "must be given"
    said = [f"as `{key.default_from}` says"] if key.default_from else []
    if key.default is not None:
        said.append(_written(key.default))
    elif key.default_rule:
        said.append(key.default_rule)
    return ", else ".join(said)
