"""A streamed ranking for people and as a JSON object."""

from __future__ import annotations

from collections.abc import Iterator

from rich.console import Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from optopick.report.as_json import ranking_object
from optopick.report.text_uses import ranking_table
from optopick.stream_answers import StreamedRanking

MOST_REASONS = 15


def streamed_text(streamed: StreamedRanking, title: str) -> RenderableType:
    """The whole answer to `rank --results`."""
    ranked = streamed.ranking.ranked
    parts: list[RenderableType] = [Text(title, style="bold"), *(Text(line) for line in _verdict(streamed))]
    if ranked:
        parts.append(Padding(ranking_table(ranked), (1, 0, 0, 0)))
    if streamed.rejected:
        parts.append(Padding(_reasons(streamed.rejected), (1, 0, 0, 0)))
    return Group(*parts)


def _verdict(streamed: StreamedRanking) -> Iterator[str]:
    ranked = streamed.ranking.ranked
    if not ranked:
        yield f"None of the {streamed.rows:,} couplers has a design that holds every limit at every corner."
    else:
        first, second = ranked[0].objective.name, ranked[0].second.name
        yield (
            f"The best {len(ranked):,} of {streamed.rows:,} couplers, by least {first}, then least {second}; "
            f"{streamed.designed:,} have a design{' and were solved' if streamed.passed_over else ''}."
        )
    if streamed.passed_over:
        yield (
            f"{streamed.passed_over:,} were passed over: ranges show that none of them has a design as good as the "
            f"last of the best {streamed.top:,}."
        )
    if streamed.not_chosen:
        yield f"{streamed.not_chosen:,} are left out by the brief."
    yield f"{streamed.now:,} settled now, {streamed.before:,} before; each with its outcome in {streamed.path.name}."
    if not streamed.ranking.complete:
        yield "Interrupted: not every coupler was tried. Run again, it goes on from there."


def _reasons(rejected: tuple[tuple[str, int], ...]) -> RenderableType:
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold")
    table.add_column("Rejected", justify="right", no_wrap=True)
    table.add_column("Because")
    for reason, count in rejected[:MOST_REASONS]:
        table.add_row(f"{count:,}", reason)
    if len(rejected) > MOST_REASONS:
        left = rejected[MOST_REASONS:]
        table.add_row(f"{sum(count for _, count in left):,}", f"for {len(left):,} other reasons")
    return table


def streamed_object(streamed: StreamedRanking) -> dict[str, object]:
    """The object that `rank --results --json` prints: that of `rank` without the rejected, and the counts."""
    found = ranking_object(streamed.ranking)
    del found["rejected"]
    return found | {
        "rows": streamed.rows,
        "designed": streamed.designed,
        "rejected_for": [{"reason": reason, "count": count} for reason, count in streamed.rejected],
        "passed_over": streamed.passed_over,
        "not_chosen": streamed.not_chosen,
        "before": streamed.before,
        "now": streamed.now,
    }
