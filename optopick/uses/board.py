"""Every link of a product at once, from few reels and few couplers: found, proved, each link checked again alone."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from optopick.board import Board, BoardGoalName, BoardLink, reel_of
from optopick.board_answers import BoardProof, BoardResult, LinkChoice
from optopick.brief import Brief, GoalName
from optopick.cautions import cautions
from optopick.coupler import Coupler
from optopick.errors import DisagreementError
from optopick.model.board import Caps, Taken
from optopick.model.board_search import BoardFound, BoardSearch, Place
from optopick.model.search import STEP
from optopick.model.solver import Clock, highs_name
from optopick.read_board import read_board
from optopick.result import Design, Objective, Status
from optopick.uses.engine import Best, Entry, Progress, ask_of, entries_of, over_all, quiet, rechecked

UNITS = {BoardGoalName.POWER: "W", BoardGoalName.REELS: "1", BoardGoalName.COUPLERS: "1"}


@dataclass(frozen=True)
class _Group:
    """Links with one brief, which get one design.

    That loses nothing: give each of them the design that takes least power among theirs, and the board takes from no
    further reel, has no further part and takes no more power.
    """

    brief: Brief
    links: tuple[BoardLink, ...]
    entries: tuple[Entry, ...]

    @property
    def count(self) -> int:
        return sum(link.count for link in self.links)


@dataclass(frozen=True)
class _Stages:
    """The goals in turn, each with what was found for it: those asked for, then power where it decides between equals.

    The last one ends where there is no board, or none is known.
    """

    goals: tuple[BoardGoalName, ...]
    found: tuple[BoardFound, ...]

    @property
    def last(self) -> BoardFound:
        """What was found last: the board to give."""
        return self.found[-1]

    @property
    def proved(self) -> bool:
        """Whether every goal is proved least."""
        return len(self.found) == len(self.goals) and all(one.proved for one in self.found)


def solve_board(
    board: Board | Path | str,
    *,
    time_limit: float = np.inf,
    progress: Progress = quiet,
    couplers: Sequence[Coupler] | None = None,
) -> BoardResult:
    """The best designs of all links of a board (or of the path of one) together, with the proof.

    time_limit [s]: past it the best board so far is given with the bound shown, status "feasible", or "unknown" where
    there is none. couplers: instead of the briefs' tables. Raises InputError for wrong input and DisagreementError
    where the re-check contradicts the model.
    """
    if not isinstance(board, Board):
        board = read_board(Path(board))
    clock = Clock(time_limit)
    groups = _groups(board, couplers)
    alone = _alone(groups, clock, progress)
    places = [_place(group, best) for group, best in zip(groups, alone, strict=True)]
    search = BoardSearch(places, clock, progress)
    if all(best.choice is not None for best in alone):
        stages = _staged(board, search)
    else:
        # a link that has no design, or none that is known, even alone
        hopeless = any(best.choice is None and np.isinf(best.bound) for best in alone)
        stages = _Stages((board.goal.minimize,), (BoardFound(None, np.inf, np.inf if hopeless else 0.0),))
    return _result(board, groups, alone, stages, search)


def _groups(board: Board, couplers: Sequence[Coupler] | None) -> list[_Group]:
    by_brief: dict[Brief, list[BoardLink]] = {}
    for link in board.links:
        by_brief.setdefault(link.brief, []).append(link)
    return [_Group(brief, tuple(links), tuple(entries_of(brief, couplers)[0])) for brief, links in by_brief.items()]


def _alone(groups: Sequence[_Group], clock: Clock, progress: Progress) -> list[Best]:
    """The least power of each link by itself."""
    found = []
    for done, group in enumerate(groups):
        progress("links alone", done, len(groups))
        found.append(over_all(group.entries, GoalName.POWER, ask_of(group.brief), clock))
    return found


def _place(group: _Group, best: Best) -> Place:
    couplers = tuple((entry.coupler, entry.model) for entry in group.entries)
    return Place(couplers, ask_of(group.brief), group.count, best.bound if np.isfinite(best.bound) else 0.0)


def _staged(board: Board, search: BoardSearch) -> _Stages:
    limits, goal = board.limits, board.goal
    given = {"reels": limits.reels, "couplers": limits.couplers, "power": limits.power}
    caps = {name: np.inf if limit is None else float(limit) for name, limit in given.items()}
    goals = [goal.minimize, goal.then]
    if goal.then is not BoardGoalName.POWER:
        # of boards that are equal in both goals the one that takes least power
        goals.append(BoardGoalName.POWER)
    found: list[BoardFound] = []
    for one, give in zip(goals, (goal.give, 0.0, 0.0), strict=False):
        found.append(search.least(one, Caps(**caps), start=found[-1].taken if found else None))
        if found[-1].taken is None:
            break
        relaxed = found[-1].value * (1 + give) * (1 + STEP)
        cap = relaxed if one is BoardGoalName.POWER else float(np.floor(relaxed))
        caps[one.value] = min(caps[one.value], cap)
    return _Stages(tuple(goals), tuple(found))


def _result(
    board: Board, groups: Sequence[_Group], alone: Sequence[Best], stages: _Stages, search: BoardSearch
) -> BoardResult:
    found = stages.last
    hopeless = [
        link.name
        for group, best in zip(groups, alone, strict=True)
        if best.choice is None and np.isinf(best.bound)
        for link in group.links
    ]
    links = _choices(board, groups, alone, found.taken) if found.taken else ()
    designs = [one.review.design for one in links]
    result = BoardResult(
        status=_status(stages),
        goals=_objectives(search, stages) if found.taken else (),
        links=links,
        reels=tuple(sorted({reel_of(ohms) for design in designs for ohms in resistances(design)})),
        couplers=tuple(sorted({design.coupler for design in designs})),
        hopeless=tuple(hopeless),
        proof=_proof(search),
        cautions=tuple(dict.fromkeys(text for group in groups for text in cautions(group.brief))),
    )
    _recount(board, result)
    return result


def _status(stages: _Stages) -> Status:
    if stages.found[0].taken is None:
        return Status.INFEASIBLE if np.isinf(stages.found[0].bound) else Status.UNKNOWN
    return Status.OPTIMAL if stages.proved else Status.FEASIBLE


def _choices(
    board: Board, groups: Sequence[_Group], alone: Sequence[Best], taken: Sequence[Taken]
) -> tuple[LinkChoice, ...]:
    """The links in the board's order, each with its design checked again alone."""
    found = {}
    for group, best, one in zip(groups, alone, taken, strict=True):
        entry = next(entry for entry in group.entries if entry.coupler is one.seat.coupler)
        try:
            reviewed = rechecked(group.brief, entry, one.seat.box.whole(one.choice))
        except DisagreementError as error:
            raise DisagreementError(f"link {group.links[0].name}: {error}") from error
        found.update({link.name: LinkChoice(link, reviewed, best.value) for link in group.links})
    return tuple(found[link.name] for link in board.links)


def resistances(design: Design) -> tuple[float, ...]:
    """The resistances that a design places [ohm]; equal ones in series count as one."""
    placed = (design.r_led, design.r_shunt, design.r_load, design.r_be)
    return tuple(ohms for ohms in placed if ohms is not None)


def _recount(board: Board, result: BoardResult) -> None:
    """Hold the board's limits and goals against what the designs themselves say."""
    if not result.links:
        return
    counted = {"reels": len(result.reels), "couplers": len(result.couplers), "power": result.power}
    limits = {"reels": board.limits.reels, "couplers": board.limits.couplers, "power": board.limits.power}
    for name, limit in limits.items():
        if limit is not None and counted[name] > limit * (1 + STEP):
            raise DisagreementError(f"board: {counted[name]:g} {name} in the designs, limit {limit:g}")
    for goal in result.goals:
        if not np.isclose(goal.value, counted[goal.name], rtol=STEP, atol=0.0):
            raise DisagreementError(f"board: {goal.name} is {goal.value:g} in the model, {counted[goal.name]:g} again")


def _objectives(search: BoardSearch, stages: _Stages) -> tuple[Objective, ...]:
    """Both goals at the board given, with their bounds."""
    taken = stages.last.taken or ()
    return tuple(
        Objective(goal.value, search.value(taken, goal), one.bound, UNITS[goal])
        for goal, one in list(zip(stages.goals, stages.found, strict=False))[:2]
    )


def _proof(search: BoardSearch) -> BoardProof:
    size, clock = search.size, search.clock
    return BoardProof(size.columns, size.rows, size.cuts, clock.solves, clock.spent, highs_name())
