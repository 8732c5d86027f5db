"""`rank` and `tradeoff`: one link, the whole coupler table."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, NoReturn

import click

from optopick.cli.app import (
    NO_DESIGN,
    OK,
    OUT_OF_TIME,
    brief_argument,
    echo,
    json_option,
    main,
    progress,
    show,
    show_json,
    time_option,
)
from optopick.cli.hands import hands, workers_options
from optopick.errors import InputError, Mistake

if TYPE_CHECKING:
    from optopick.brief import Brief

# Imports stand inside the commands: --help and input errors must not wait for the numerical libraries.
# ruff: noqa: PLC0415, PLR0913, PLR0917


@main.command()
@brief_argument
@click.option("--top", type=click.IntRange(min=1), default=None, metavar="N", help="Show the best N only.")
@click.option("--csv", "as_csv", is_flag=True, help="Print the ranking as CSV and nothing else.")
@json_option
@click.option(
    "--results",
    type=click.Path(path_type=Path),
    default=None,
    metavar="FILE",
    help="For large tables: read row by row, outcomes to FILE as they come (JSON lines); run again, it goes on there.",
)
@click.option(
    "--top-only", is_flag=True, help="With --results: pass over couplers that cannot come among the best --top (20)."
)
@workers_options
@time_option
def rank(
    brief: Path,
    top: int | None,
    results: Path | None,
    top_only: bool,
    as_csv: bool,
    as_json: bool,
    workers: int | None,
    cluster: str | None,
    time_limit: float,
) -> None:
    """Rank every coupler of BRIEF's table by its best proved design; the others with the reason.

    Ctrl-C ends it early with what is finished. The time limit holds for each coupler.

    Example: optopick rank examples/fastest.toml --top 5
    """
    from optopick.read_brief import read_brief

    if top_only and results is None:
        raise InputError([Mistake("--top-only", "no --results", "--results FILE beside it")])
    read = read_brief(brief)
    if results is not None:
        _rank_streamed(read, results, top, top_only, as_csv, as_json, workers, cluster, time_limit)

    from optopick.uses.rank import rank as run

    with hands(workers, cluster) as doing:
        ranking = run(read, workers=doing, progress=progress(), time_limit=time_limit)
    if as_json:
        from optopick.report.as_json import ranking_object

        show_json(ranking_object(ranking))
    elif as_csv:
        from optopick.report.frames import ranking_frame

        echo(ranking_frame(ranking).head(top or len(ranking.ranked)).to_csv(index=False), nl=False)
    else:
        from optopick.report.text_uses import ranking_text

        show(ranking_text(ranking, read.title, top))
    sys.exit(OK if ranking.ranked else NO_DESIGN)


def _rank_streamed(
    brief: Brief,
    results: Path,
    top: int | None,
    top_only: bool,
    as_csv: bool,
    as_json: bool,
    workers: int | None,
    cluster: str | None,
    time_limit: float,
) -> NoReturn:
    """`rank --results`."""
    from optopick.uses.rank_stream import TOP, rank_streamed

    with hands(workers, cluster) as doing:
        found = rank_streamed(
            brief,
            results,
            top=top or TOP,
            top_only=top_only,
            workers=doing,
            progress=progress(),
            time_limit=time_limit,
        )
    if as_json:
        from optopick.report.streamed import streamed_object

        show_json(streamed_object(found))
    elif as_csv:
        from optopick.report.frames import ranking_frame

        echo(ranking_frame(found.ranking).to_csv(index=False), nl=False)
    else:
        from optopick.report.streamed import streamed_text

        show(streamed_text(found, brief.title))
    sys.exit(OK if found.ranking.ranked else NO_DESIGN)


@main.command()
@brief_argument
@click.option("--first", default="edge time", metavar="GOAL", help='Goal along the front; default "edge time".')
@click.option("--second", default="power", metavar="GOAL", help='Goal traded against it; default "power".')
@click.option("--points", type=click.IntRange(min=2), default=None, metavar="N", help="At most N points; default: all.")
@click.option("--csv", "as_csv", is_flag=True, help="Print the points as CSV and nothing else.")
@click.option(
    "--plot", type=click.Path(path_type=Path), default=None, help="Also draw the front to a .svg or .png file."
)
@workers_options
@json_option
@time_option
def tradeoff(
    brief: Path,
    first: str,
    second: str,
    points: int | None,
    as_csv: bool,
    plot: Path | None,
    workers: int | None,
    cluster: str | None,
    as_json: bool,
    time_limit: float,
) -> None:
    """The exact front between two goals over the whole table, each point proved.

    Goals: edge time, delay, distortion, power.

    Example: optopick tradeoff examples/shortlist.toml --first delay --points 8
    """
    from optopick.read_brief import read_brief
    from optopick.uses.goals import goal_pair

    goals, read = goal_pair(first, second), read_brief(brief)

    from optopick.uses.tradeoff import tradeoff as run
    from optopick.uses.workers import Processes

    with hands(workers, cluster) as doing:
        found = doing or Processes()
        front = run(read, goals, points=points, workers=found, progress=progress(), time_limit=time_limit)
    if plot is not None:
        from optopick.cli.files import write_picture
        from optopick.report.plots import front_figure

        write_picture(plot, front_figure(front, read.title))
    if as_json:
        from optopick.report.as_json import front_object

        show_json(front_object(front))
    elif as_csv:
        from optopick.report.frames import front_frame

        echo(front_frame(front).to_csv(index=False), nl=False)
    else:
        from optopick.report.text_uses import front_text

        show(front_text(front, read.title))
    sys.exit(OK if front.points else OUT_OF_TIME if front.out_of_time else NO_DESIGN)
