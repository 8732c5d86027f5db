"""The command line: the only place that prints, and the only one that turns errors into messages."""

from optopick.cli import (  # noqa: F401 - their commands join the group
    commands_bench,
    commands_board,
    commands_design,
    commands_files,
    commands_start,
    commands_table,
)
from optopick.cli.app import main

__all__ = ["main"]
