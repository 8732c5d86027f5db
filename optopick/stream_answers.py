"""What a streamed ranking answers. Frozen; SI throughout."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from optopick.answers import Ranking


@dataclass(frozen=True)
class StreamedRanking:
    """The best of a table that is not held, and counts of its rows.

    ranking: the best `top`, none rejected; complete: every row was settled. designed: couplers with a design. rejected:
    reasons without their numbers, with how many couplers have each, the commonest first. passed_over: couplers that
    ranges show to have no design as good as the worst of the best. not_chosen: left out by the brief's choice of
    couplers. before, now: settled by the results file, and by this run. path: of the results file.
    """

    ranking: Ranking
    rows: int
    designed: int
    rejected: tuple[tuple[str, int], ...]
    passed_over: int
    not_chosen: int
    before: int
    now: int
    top: int
    path: Path
