"""A table too large to hold, ranked row by row: outcomes go to a file as they come, the best and counts are kept."""

from __future__ import annotations

import re
from bisect import insort
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from optopick.answers import Ranked, Ranking
from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.coupler_stream import CouplerStream, StreamedRow
from optopick.errors import InputError, Mistake
from optopick.model.kinds import model_of
from optopick.model.search import STEP, refuted
from optopick.read_couplers import SetAside
from optopick.recheck import review
from optopick.result import NOT_CHOSEN, Rejected, Review, goal_of
from optopick.stream_answers import StreamedRanking
from optopick.uses.engine import AGREE, Progress, ask_of, guard_of, quiet, unusable
from optopick.uses.rank import Task, order, rank_one
from optopick.uses.results_file import Designed, Outcome, PassedOver, Refused, ResultsFile
from optopick.uses.workers import Processes, Workers

TOP = 20

NUMBER = re.compile(r"(?<![\w.])-?\d[\d.]*(e-?\d+)?( [pnµmkMG]?(V|A|W|Ω|m|s|F|°C)\b| %)?")
"""What tells the reasons of two couplers apart that are rejected for the same."""


def rank_streamed(
    brief: Brief,
    results: Path,
    *,
    top: int = TOP,
    top_only: bool = False,
    workers: Workers | None = None,
    progress: Progress = quiet,
    time_limit: float = np.inf,
) -> StreamedRanking:
    """Rank the brief's table into a file of results; what stands there is not done again.

    The best `top` are those of `rank`, designs and order. top_only: couplers that cannot come among them, as ranges
    show, are passed over: they get neither a design nor a reason. time_limit [s] holds for each coupler. An interrupt
    (KeyboardInterrupt) ends it early with what is finished. Raises InputError for a table or file that cannot be used.
    """
    table = CouplerStream(brief.couplers.table)
    hands, now = workers or Processes(), 0
    stale = -np.inf if top_only else np.inf
    with ResultsFile(results, brief, time_limit) as file:
        while True:
            run = _Run(brief, table, file, top, stale, time_limit)
            complete = run.all(hands, progress, top_only=top_only)
            now += run.now
            # couplers passed over for designs that are no longer in the table, or for the best few of more
            if not complete or run.least_above >= run.behind:
                break
            stale = run.behind
    return run.answer(complete, now, results)


@dataclass(frozen=True)
class _Item:
    """A row to be solved; behind: the first goal, guard included, that is too much to be among the best."""

    key: str
    task: Task
    behind: float

    def __str__(self) -> str:
        return str(self.task)


def _solved(item: _Item) -> Ranked | Rejected | PassedOver:
    brief, coupler = item.task.brief, item.task.coupler
    if np.isfinite(item.behind):
        goal = brief.goal.minimize
        # a little beyond: what is as good may still be ahead by the second goal
        limit = item.behind * (1 + STEP) / guard_of(brief, goal)
        if refuted(model_of(brief, coupler), ask_of(brief).limited(goal, limit)):
            return PassedOver(coupler.part, item.behind)
    return rank_one(item.task)


class _Run:
    """Once through the table: counts, and the best so far. stale: outcomes passed over for less are done again."""

    def __init__(
        self, brief: Brief, table: CouplerStream, file: ResultsFile, top: int, stale: float, time_limit: float
    ) -> None:
        self.brief, self.table, self.file, self.top = brief, table, file, top
        self.stale, self.time_limit = stale, time_limit
        self.best: list[Ranked] = []
        self.reasons: Counter[str] = Counter()
        self.designed = self.passed_over = self.not_chosen = self.before = self.now = 0
        self.least_above = np.inf

    @property
    def behind(self) -> float:
        """The first goal of the last of the best; infinite while there are too few."""
        return self.best[-1].objective.value if len(self.best) == self.top else np.inf

    def all(self, hands: Workers, progress: Progress, *, top_only: bool) -> bool:
        """Settle every row; False where an interrupt came first."""
        try:
            for item, answer in hands.as_done(_solved, self._items(top_only=top_only)):
                self.now += 1
                progress("rows settled", self.before + self.now + self.not_chosen, self.table.count)
                outcome = _outcome(answer)
                self.file.add(item.key, outcome)
                self._count(outcome)
                if isinstance(answer, Ranked):
                    self._enter(answer)
        except KeyboardInterrupt:
            return False
        return True

    def answer(self, complete: bool, now: int, path: Path) -> StreamedRanking:
        """What was found."""
        return StreamedRanking(
            ranking=Ranking(tuple(self.best), (), complete),
            rows=self.table.count,
            designed=self.designed,
            rejected=tuple(self.reasons.most_common()),
            passed_over=self.passed_over,
            not_chosen=self.not_chosen,
            before=self.before + self.now - now,
            now=now,
            top=self.top,
            path=path,
        )

    def _items(self, *, top_only: bool) -> Iterator[_Item]:
        """The rows that must be solved; the others are settled on the way."""
        for row in self.table.rows():
            key = row.key
            known = self.file.find(key)
            if known is not None and not (isinstance(known, PassedOver) and known.above < self.stale):
                self.before += 1
                self._count(known)
                self._recall(known, row)
                continue
            coupler = row.resolved
            reason = coupler.reason if isinstance(coupler, SetAside) else unusable(self.brief, coupler)
            if reason == NOT_CHOSEN:
                self.not_chosen += 1
            elif reason or isinstance(coupler, SetAside):
                self.now += 1
                refused = Refused(coupler.part, reason)
                self.file.add(key, refused)
                self._count(refused)
            else:
                yield _Item(key, Task(self.brief, coupler, self.time_limit), self.behind if top_only else np.inf)

    def _count(self, outcome: Outcome) -> None:
        match outcome:
            case Designed():
                self.designed += 1
            case Refused():
                self.reasons[NUMBER.sub("…", outcome.reason)] += 1
            case PassedOver():
                self.passed_over += 1
                self.least_above = min(self.least_above, outcome.above)

    def _recall(self, known: Outcome, row: StreamedRow) -> None:
        """Enter a design of the file, reviewed anew, where it comes among the best."""
        if not isinstance(known, Designed):
            return
        key = (known.objective.value, known.second.value, known.part)
        if len(self.best) == self.top and key > order(self.best[-1]):
            return
        coupler = row.resolved
        if isinstance(coupler, Coupler):
            self._enter(Ranked(coupler, known.status, known.objective, known.second, self._reviewed(known, coupler)))

    def _reviewed(self, known: Designed, coupler: Coupler) -> Review:
        reviewed = review(self.brief, coupler, known.design)
        value = goal_of(reviewed, self.brief.goal.minimize)
        if not reviewed.passed or not np.isclose(value, known.objective.value, rtol=AGREE, atol=0.0):
            found = f"a design of {known.part} that does not hold when it is checked again"
            raise InputError([Mistake(self.file.path.name, found, "outcomes as they were written; or a new file")])
        return reviewed

    def _enter(self, one: Ranked) -> None:
        insort(self.best, one, key=order)
        del self.best[self.top :]


def _outcome(answer: Ranked | Rejected | PassedOver) -> Outcome:
    match answer:
        case Ranked():
            return Designed(answer.coupler.part, answer.status, answer.objective, answer.second, answer.review.design)
        case Rejected():
            return Refused(answer.part, answer.reason)
        case PassedOver():
            return answer
