"""Run the command line in this process, or in one of its own at a terminal."""

from __future__ import annotations

import contextlib
import fcntl
import io
import os
import pty
import re
import struct
import subprocess
import sys
import termios
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import click

from optopick.cli import main

ROOT = Path(__file__).parents[1]
ESCAPE = re.compile(r"\x1b\[[0-9;?]*[A-Za-z]")


@dataclass(frozen=True)
class Ran:
    """Exit code and what went to each stream."""

    code: int
    out: str
    err: str


def run(*arguments: str | Path) -> Ran:
    """Run `optopick` with its output into pipes."""
    out, err = io.StringIO(), io.StringIO()
    code = 0
    with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
        try:
            main([str(argument) for argument in arguments])
        except SystemExit as end:
            code = end.code if isinstance(end.code, int) else 1
    return Ran(code, out.getvalue(), err.getvalue())


def run_at_terminal(columns: int, *arguments: str | Path, **environment: str) -> str:
    """What a terminal so wide shows on standard output, escape codes and all."""
    leader, follower = pty.openpty()
    fcntl.ioctl(follower, termios.TIOCSWINSZ, struct.pack("HHHH", 50, columns, 0, 0))
    kept = {name: os.environ[name] for name in ("PATH", "HOME") if name in os.environ}
    process = subprocess.Popen(
        [sys.executable, "-c", "from optopick.cli import main; main()", *map(str, arguments)],
        cwd=ROOT,
        env={**kept, "TERM": "xterm-256color", "LANG": "C.UTF-8", **environment},
        stdin=follower,
        stdout=follower,
        stderr=subprocess.PIPE,
    )
    os.close(follower)
    shown = bytearray()
    with contextlib.suppress(OSError):  # how Linux says that the other end is closed
        while chunk := os.read(leader, 65536):
            shown += chunk
    os.close(leader)
    _, errors = process.communicate()
    assert process.returncode in (0, 1), errors
    assert b"Traceback" not in errors, errors.decode()
    return shown.decode().replace("\r\n", "\n")


def commands_of(group: click.Group, before: str = "") -> Iterator[tuple[str, click.Command]]:
    """Every command with its name as typed, those of groups too."""
    for name, command in group.commands.items():
        if isinstance(command, click.Group):
            yield from commands_of(command, f"{before}{name} ")
        else:
            yield f"{before}{name}", command
