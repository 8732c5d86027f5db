"""The command line: the only place that prints, and the only one that turns errors into messages."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from optopick.errors import DisagreementError, InputError

if TYPE_CHECKING:
    from rich.console import RenderableType

OK, FAILS, WRONG_INPUT, NO_DESIGN, OUT_OF_TIME = range(5)


class Messages(click.Group):
    """A group whose commands turn the program's errors into messages and exit codes."""

    def invoke(self, ctx: click.Context) -> Any:  # noqa: ANN401 - click's own signature
        """Run a command; wrong input exits with 2."""
        try:
            return super().invoke(ctx)
        except InputError as error:
            for mistake in error.mistakes:
                click.echo(f"optopick: {mistake}", err=True)
            sys.exit(WRONG_INPUT)
        except DisagreementError as error:
            click.echo(f"optopick: internal disagreement, no result given: {error}", err=True)
            sys.exit(70)


@click.group(cls=Messages, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(package_name="optopick")
def main() -> None:
    """Choose an optocoupler and the stock resistors around it, and prove the choice.

    A brief (TOML) says what one link must do; a coupler table (CSV) says what may be used. Exit codes: 0 a valid
    design, or all checks pass; 1 a checked design fails; 2 wrong input; 3 no design exists; 4 out of time with none.
    """


brief_argument = click.argument("brief", type=click.Path(path_type=Path))
json_option = click.option("--json", "as_json", is_flag=True, help="Print one JSON object and nothing else.")


@main.command()
@brief_argument
@json_option
@click.option(
    "--time-limit", type=click.FloatRange(min=0.0), default=None, metavar="SECONDS", help="Stop searching after this."
)
def pick(brief: Path, as_json: bool, time_limit: float | None) -> None:
    """Find the best design for BRIEF, prove it, and check it again.

    Example: optopick pick examples/meter.toml
    """
    from optopick.uses.pick import pick as run  # noqa: PLC0415 - the solver's import must not slow --help
    from optopick.read_brief import read_brief  # noqa: PLC0415
    from optopick.result import Status  # noqa: PLC0415

    read = read_brief(brief)
    limit = float("inf") if time_limit is None else time_limit
    result = run(read, time_limit=limit, progress=_progress())
    if as_json:
        from optopick.report.as_json import dumps, result_object  # noqa: PLC0415

        click.echo(dumps(result_object(result)))
    else:
        from optopick.report.text import result_text  # noqa: PLC0415

        _show(result_text(result, read.title))
    codes = {Status.OPTIMAL: OK, Status.FEASIBLE: OK, Status.INFEASIBLE: NO_DESIGN, Status.UNKNOWN: OUT_OF_TIME}
    sys.exit(codes[result.status])


def _resistor(name: str, required: bool, text: str) -> Callable[[Any], Any]:
    return click.option(f"--{name}", required=required, metavar="OHMS", help=text)


@main.command()
@brief_argument
@click.option("--coupler", required=True, metavar="PART", help="Part as the coupler table names it.")
@_resistor("r-led", True, "LED series resistor, such as 330 or 2k2.")
@_resistor("r-load", True, "Load resistor.")
@_resistor("r-be", False, "Base-emitter resistor; leave out where there is none.")
@_resistor("r-shunt", False, "Resistor across the LED; leave out where there is none.")
@json_option
def check(  # noqa: PLR0913 - one option for each position
    brief: Path, coupler: str, r_led: str, r_load: str, r_be: str | None, r_shunt: str | None, as_json: bool
) -> None:
    """Evaluate every check of an existing design against BRIEF.

    Example: optopick check examples/meter.toml --coupler LUMO-2A --r-led 330 --r-load 2k2 --r-be 150k
    """
    from optopick.uses.check import check_design, design_from_text  # noqa: PLC0415
    from optopick.read_brief import read_brief  # noqa: PLC0415

    texts = {"r_led": r_led, "r_load": r_load, "r_be": r_be, "r_shunt": r_shunt}
    read = read_brief(brief)
    checked = check_design(read, design_from_text(coupler, texts))
    if as_json:
        from optopick.report.as_json import checked_object, dumps  # noqa: PLC0415

        click.echo(dumps(checked_object(checked)))
    else:
        from optopick.report.text import checked_text  # noqa: PLC0415

        _show(checked_text(checked, read.title))
    sys.exit(OK if checked.review.passed else FAILS)


def _show(text: RenderableType) -> None:
    """Print for people: colours on a terminal only, plain and 100 wide when piped."""
    from rich.console import Console  # noqa: PLC0415

    console = Console(highlight=False, width=None if sys.stdout.isatty() else 100)
    console.print(text)


def _progress() -> Callable[[str, int, int], None]:
    """A progress line on standard error once the work has taken two seconds; quiet before."""
    started, shown = time.monotonic(), [0.0]

    def report(stage: str, done: int, total: int) -> None:
        now = time.monotonic()
        if now - started < 2 or now - shown[0] < 0.5:
            return
        shown[0] = now
        click.echo(f"optopick: {stage}: {done} of {total} couplers, {now - started:.0f} s", err=True)

    return report
