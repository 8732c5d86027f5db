"""The command group, its exit codes, and what all commands share: options, printing, progress."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from pathlib import Path
from shutil import get_terminal_size
from typing import TYPE_CHECKING, Any

import click

from optopick.errors import DisagreementError, InputError, WorkLostError

if TYPE_CHECKING:
    from rich.console import RenderableType

    from optopick.result import Status

OK, FAILS, WRONG_INPUT, NO_DESIGN, OUT_OF_TIME = range(5)
DISAGREES, WORK_LOST = 70, 71
PIPED_WIDTH = 100

WIPED = "\r\x1b[2K"
"""Back to the start of an empty line, on a terminal (ECMA-48)."""

_open: list[str] = []
"""The progress line that stands on the terminal, if any."""


class Messages(click.Group):
    """A group whose commands turn the program's errors into messages and exit codes."""

    def invoke(self, ctx: click.Context) -> Any:  # noqa: ANN401 - click's own signature
        """Run a command; wrong input exits with 2."""
        try:
            return super().invoke(ctx)
        except InputError as error:
            for mistake in error.mistakes:
                echo(f"optopick: {mistake}", err=True)
            sys.exit(WRONG_INPUT)
        except DisagreementError as error:
            echo(f"optopick: internal disagreement, no result given: {error}", err=True)
            sys.exit(DISAGREES)
        except WorkLostError as error:
            echo(f"optopick: work lost, no result given: {error}", err=True)
            sys.exit(WORK_LOST)
        finally:
            _wipe()


@click.group(cls=Messages, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(package_name="optopick")
@click.option("-q", "--quiet", is_flag=True, help="No progress on standard error. Example: optopick -q rank BRIEF")
@click.option("-v", "--verbose", is_flag=True, help="Every stage as it begins, too. Example: optopick -v pick BRIEF")
@click.pass_context
def main(ctx: click.Context, quiet: bool, verbose: bool) -> None:
    """Choose an optocoupler and the stock resistors around it, and prove the choice.

    A brief (TOML) says what one link must do; a coupler table (CSV) says what may be used. Exit codes: 0 a valid
    design, or all checks pass; 1 a checked design fails; 2 wrong input; 3 no design exists; 4 out of time with none.
    """
    if quiet and verbose:
        raise click.UsageError("--quiet and --verbose: one of them at the most")
    ctx.obj = "quiet" if quiet else "verbose" if verbose else ""


brief_argument = click.argument("brief", type=click.Path(path_type=Path))
json_option = click.option("--json", "as_json", is_flag=True, help="Print one JSON object and nothing else.")
time_option = click.option(
    "--time-limit",
    type=click.FloatRange(min=0.0),
    default=float("inf"),
    metavar="SECONDS",
    help="Stop searching after this; the best so far is given with its bound. Example: --time-limit 30",
)


def echo(text: str, *, err: bool = False, nl: bool = True) -> None:
    """Print plain text, where a progress line stood if one does."""
    _wipe()
    click.echo(text, err=err, nl=nl)


def show(text: RenderableType) -> None:
    """Print for people: colours on a terminal only, plain and 100 wide when piped."""
    from rich.console import Console  # noqa: PLC0415 - not for --help

    _wipe()
    width = None if sys.stdout.isatty() else PIPED_WIDTH
    Console(highlight=False, width=width).print(text)


def show_json(value: object) -> None:
    """Print one JSON object."""
    from optopick.report.as_json import dumps  # noqa: PLC0415

    echo(dumps(value))


def exit_code(status: Status) -> int:
    """The exit code of an answer."""
    return {"optimal": OK, "feasible": OK, "infeasible": NO_DESIGN, "unknown": OUT_OF_TIME}[status.value]


def progress() -> Callable[[str, int, int], None]:
    """A progress line on standard error once the work has taken two seconds; none with --quiet.

    At a terminal one line, written over each time; elsewhere lines ever farther apart. With --verbose a line for each
    stage as it begins, which stays.
    """
    started, shown, stages = time.monotonic(), [0.0], [""]
    said = click.get_current_context().obj
    quiet, here = said == "quiet", sys.stderr.isatty()

    def report(stage: str, done: int, total: int) -> None:
        now = time.monotonic()
        if said == "verbose" and stage != stages[0]:
            stages[0] = stage
            echo(f"optopick: {stage}, from {now - started:.2f} s", err=True)
        pause = 0.3 if here else 0.5 * (shown[0] - started)
        if quiet or now - started < 2 or now - shown[0] < pause:
            return
        shown[0] = now
        count = f": {done} of {total}" if total else ""
        told = f"optopick: {stage}{count}, {now - started:.0f} s"
        if here:
            told = f"{WIPED}{told[: get_terminal_size().columns - 1]}"
            _open[:] = [told]
        click.echo(told, err=True, nl=not here)

    return report


def _wipe() -> None:
    """Take the progress line away, if one stands."""
    if _open:
        _open.clear()
        click.echo(WIPED, err=True, nl=False)
