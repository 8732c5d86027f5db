"""The best board under caps, with its proof: narrow, solve, evaluate exactly, cut, and solve again."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from optopick.board import BoardGoalName
from optopick.brief import GoalName
from optopick.coupler import Coupler
from optopick.model.board import WHOLE, BoardProgram, Caps
from optopick.model.board_packages import Counts, cost_of, packages_of
from optopick.model.board_seats import Prices, Seat, Taken, narrower, repaired, seat_of, sharpened, with_cuts
from optopick.model.kinds import LinkModel
from optopick.model.rows import Ask
from optopick.model.search import STEP, first_look
from optopick.model.solver import Answer, Clock, Solution, solve_program

LOOSE = 0.01
"""Gap [1] to which the first rounds are solved, until the exact times refuse nothing."""

SKETCH_GAP = 0.05
"""Gap [1] to which a first board is looked for among a few couplers."""

SKETCH_NODES = 200
"""Nodes after which each round over a few couplers ends: a good board to start from is all that is wanted."""

SKETCH_SEATS = 3
"""Couplers a link that such a round sees, besides those that serve most links."""

KEPT = 1e-7
"""Share by which a total may miss its limit: the solver's tolerance."""

Told = Callable[[str, int, int], None]

Seen = Callable[[BoardGoalName, float, float], None]
"""Told as a search goes: the goal, the best so far, infinite without any, and the bound below which there is none."""


@dataclass(frozen=True)
class Place:
    """One link of the model: couplers that may serve it, each with what makes its model, what is asked, how many where.

    least: a bound on the power of one of it [W]; quickest: on its edge time [s]. prices: for each coupler, where they
    count.
    """

    couplers: tuple[tuple[Coupler, Callable[[], LinkModel]], ...]
    ask: Ask
    counts: Counts
    least: float
    quickest: float = 0.0
    prices: tuple[Prices, ...] | None = None

    @property
    def count(self) -> int:
        """How many there are."""
        return sum(self.counts.values())

    def asked(self, caps: Caps, power: float) -> Ask:
        """What a board's limits ask of it; power: the most that one of it may take [W]."""
        asked = self.ask.limited(GoalName.POWER, power)
        share = caps.edge if np.isfinite(self.ask.edge) else np.inf
        return asked.limited(GoalName.EDGE_TIME, self.ask.edge * share) if np.isfinite(share) else asked


@dataclass(frozen=True)
class BoardFound:
    """The best board, the goal's value (infinite without one), and the bound below which there is none."""

    taken: tuple[Taken, ...] | None
    value: float
    bound: float

    @property
    def proved(self) -> bool:
        """Whether nothing better exists; nothing at all where there is no board."""
        return self.bound >= self.value * (1 - 4 * STEP)


@dataclass
class Size:
    """Size of the last program, and the cuts made."""

    columns: int = 0
    rows: int = 0
    cuts: int = 0


class BoardSearch:
    """Searches over the same links for one goal after the other; what one finds out the next uses."""

    def __init__(self, places: Sequence[Place], clock: Clock, told: Told, seen: Seen | None = None) -> None:
        self.places, self.clock, self.told = places, clock, told
        self.seen: Seen = seen or (lambda goal, value, bound: None)
        self.counts = [place.counts for place in places]
        self.floor = sum(place.count * place.least for place in places)
        self.size = Size()
        self.kept: list[tuple[Caps, list[Seat]]] = []

    def least(self, goal: BoardGoalName, caps: Caps, start: Sequence[Taken] | None = None) -> BoardFound:
        """The least `goal` under `caps`; start: a board that keeps them."""
        best = BoardFound(None, np.inf, self._floor(goal))
        if start is not None:
            best = replace(best, taken=tuple(start), value=self.value(start, goal))
        if goal is BoardGoalName.EDGE:
            return self._least_edge(caps, best)
        return best if self.clock.out else self._least_sum(goal, caps, best)

    def any(self, caps: Caps) -> BoardFound:
        """Any board under `caps`: the bound is infinite where there is none."""
        return self._least_sum(None, caps, BoardFound(None, np.inf, 0.0))

    def _floor(self, goal: BoardGoalName) -> float:
        """What no board comes below in a goal."""
        if goal is BoardGoalName.POWER:
            return self.floor
        if goal is BoardGoalName.EDGE:
            limited = (place for place in self.places if np.isfinite(place.ask.edge))
            return max((place.quickest / place.ask.edge for place in limited), default=0.0)
        return 1.0 if goal in WHOLE else 0.0

    def _least_sum(self, goal: BoardGoalName | None, caps: Caps, best: BoardFound) -> BoardFound:
        if goal is BoardGoalName.POWER and (best.taken is None or not np.isfinite(caps.power)):
            best = self._sketched(caps, best)
        power = min(caps.power, best.value) if goal is BoardGoalName.POWER else caps.power
        seats = self._seats(caps, power)
        if seats is None:
            return replace(best, bound=best.value)
        if not seats:
            return best
        self._keep(replace(caps, power=power), seats)
        return self._rounds(
            seats, goal, caps, best, LOOSE if goal in (BoardGoalName.POWER, BoardGoalName.COST) else 0.0
        )

    def _least_edge(self, caps: Caps, best: BoardFound) -> BoardFound:
        """The least worst edge by halving: a board is sought whose edges are shorter still, and none is the proof.

        The first try is at what the links need alone, which often is enough; without a board the next is at the limits.
        """
        try_at = best.bound * (1 + STEP)
        while not self.clock.out and not best.proved:
            found = self.any(caps.limited(BoardGoalName.EDGE, try_at))
            if found.taken is not None:
                best = replace(best, taken=found.taken, value=self.value(found.taken, BoardGoalName.EDGE))
            elif np.isposinf(found.bound):
                if try_at >= 1.0:
                    return replace(best, bound=best.value)
                best = replace(best, bound=min(try_at, best.value))
            else:
                break
            try_at = 1.0 if best.taken is None else (best.bound + best.value) / 2
        return replace(best, bound=min(best.bound, best.value))

    def value(self, taken: Sequence[Taken], goal: BoardGoalName) -> float:
        """What a board comes to in a goal."""
        if goal is BoardGoalName.POWER:
            return float(sum(place.count * one.power for place, one in zip(self.places, taken, strict=True)))
        if goal is BoardGoalName.COST:
            return cost_of(taken, self.counts)
        if goal is BoardGoalName.PACKAGES:
            return float(sum(packages_of(taken, self.counts).values()))
        if goal is BoardGoalName.EDGE:
            limited = [(one.edge, place.ask.edge) for one, place in zip(taken, self.places, strict=True)]
            return max((edge / limit for edge, limit in limited if np.isfinite(limit)), default=0.0)
        if goal is BoardGoalName.REELS:
            return float(len(set().union(*(one.reels for one in taken))))
        return float(len({one.seat.coupler.part for one in taken}))

    def keeps(self, taken: Sequence[Taken], caps: Caps) -> bool:
        """Whether a board keeps every limit over it."""
        return all(self.value(taken, goal) <= caps.of(goal) * (1 + KEPT) for goal in caps.stated)

    def _room(self, link: int, power: float) -> float:
        """The most that one of a link may take where all together take `power` at most [W]."""
        place = self.places[link]
        return (power * (1 + 2 * STEP) - (self.floor - place.count * place.least)) / place.count

    def _seats(self, caps: Caps, power: float) -> list[Seat] | None:
        """Every seat that is left where the board takes `power` at most; None where a link has none.

        Empty where time ran out first.
        """
        found: list[Seat] = []
        before = next((seats for at, seats in self.kept if _covers(at, power, caps.edge)), [])
        for link, place in enumerate(self.places):
            if self.clock.out:
                return []
            self.told("narrowing links", link, len(self.places))
            asked = place.asked(caps, self._room(link, power))
            if before:
                mine = [narrower(seat, asked) for seat in before if seat.link == link]
            else:
                mine = [self._seat(link, k, asked) for k in range(len(place.couplers))]
            kept = _sharp(mine)
            if not kept:
                return None
            found += kept
        return found

    def _keep(self, caps: Caps, seats: list[Seat]) -> None:
        """Keep seats for who asks for less: these, and the widest there were."""
        wider = [kept for kept in self.kept if not _covers(caps, kept[0].power, kept[0].edge)]
        self.kept = [(caps, seats), *wider[-1:]]

    def _seat(self, link: int, k: int, asked: Ask) -> Seat | None:
        """The seat of a link's coupler number k."""
        place = self.places[link]
        coupler, make = place.couplers[k]
        return seat_of(link, coupler, make(), asked, place.prices[k] if place.prices else None)

    def _sketched(self, caps: Caps, best: BoardFound) -> BoardFound:
        """A good board from few couplers, if they have a better one than `best`; the bound stays as it was."""
        seats = self._few(caps, min(caps.power, best.value))
        if seats is None:
            return best
        found = self._rounds(seats, BoardGoalName.POWER, caps, best, SKETCH_GAP, nodes=SKETCH_NODES)
        return replace(found, bound=best.bound)

    def _few(self, caps: Caps, power: float) -> list[Seat] | None:
        """Seats of the couplers that look best for each link, and of those that look best for most."""
        looks: list[list[tuple[float, Coupler, int]]] = []
        for link, place in enumerate(self.places):
            asked = place.asked(caps, self._room(link, power))
            found = [(first_look(make(), GoalName.POWER, asked), c, k) for k, (c, make) in enumerate(place.couplers)]
            mine = [(look.value, c, k) for look, c, k in found if look.choice is not None]
            looks.append(sorted(mine, key=lambda one: one[0]))
        shared = self._shared(looks, caps)
        seats: list[Seat] = []
        for link, mine in enumerate(looks):
            if self.clock.out:
                return None
            self.told("a first board", link, len(looks))
            picked = [k for n, (_, c, k) in enumerate(mine) if n < SKETCH_SEATS or c.part in shared]
            asked = self.places[link].asked(caps, self._room(link, power))
            kept = _sharp([self._seat(link, k, asked) for k in picked])
            if not kept:
                return None
            seats += kept
        return seats

    def _shared(self, looks: Sequence[Sequence[tuple[float, Coupler, int]]], caps: Caps) -> set[str]:
        """Parts taken one by one, each the one that brings the total of the first looks down most."""
        values = [{coupler.part: value for value, coupler, _ in mine} for mine in looks]
        # a link that no part taken serves counts as ten times its best
        now = [10 * min(mine.values(), default=0.0) for mine in values]
        taken: list[str] = []
        while len(taken) < min(caps.couplers, SKETCH_SEATS):
            gains = {
                part: sum(
                    place.count * max(0.0, old - mine.get(part, np.inf))
                    for place, old, mine in zip(self.places, now, values, strict=True)
                )
                for part in sorted({part for mine in values for part in mine} - set(taken))
            }
            if not gains:
                break
            part = max(gains, key=lambda name: gains[name])
            taken.append(part)
            now = [min(old, mine.get(part, np.inf)) for old, mine in zip(now, values, strict=True)]
        return set(taken)

    def _rounds(
        self,
        seats: list[Seat],
        goal: BoardGoalName | None,
        caps: Caps,
        best: BoardFound,
        gap: float,
        nodes: int | None = None,
    ) -> BoardFound:
        """Solver calls, with cuts for what the exact times refuse, until one answer stands."""
        scale = self._scale(goal, seats)
        while not self.clock.out:
            built = BoardProgram(seats, self.counts, caps, goal, scale)
            program = built.program()
            self.size.columns, self.size.rows = built.size, len(program.low)
            seen = self._solving(goal, best, scale)
            solution = solve_program(program, self.clock.left, gap=gap, nodes=nodes, seen=seen)
            self.clock.solves += 1
            best = replace(best, bound=max(best.bound, self._bound(solution, goal, scale)))
            if solution.answer is Answer.NONE:
                # nothing but what is known already
                return replace(best, bound=best.value)
            if solution.chosen is None:
                return best
            taken = built.taken(solution.chosen)
            refused = [one for one in taken if not one.sound]
            self.told(_stage(goal), len(refused), len(taken))
            if refused:
                best = self._better(best, repaired(seats, taken, goal or BoardGoalName.POWER), goal, caps)
                if best.taken is not None and (nodes is not None or goal is None):
                    return best
                seats = self._cut(seats, refused)
                continue
            best = self._better(best, taken, goal, caps)
            self._solving(goal, best, scale)(np.inf, -np.inf)
            if nodes is not None or best.proved or (solution.proved and gap <= STEP):
                return replace(best, bound=min(best.bound, best.value))
            if solution.proved:
                gap = STEP
        return best

    def _solving(self, goal: BoardGoalName | None, best: BoardFound, scale: float) -> Callable[[float, float], None]:
        """What the solver tells, in the goal's unit and beside what is known already."""

        def seen(costs: float, bound: float) -> None:
            if goal is not None:
                self.seen(goal, min(best.value, costs * scale), max(best.bound, bound * scale))

        return seen

    def _scale(self, goal: BoardGoalName | None, seats: Sequence[Seat]) -> float:
        """About what a goal comes to, by which the solver's costs are divided."""
        if goal is BoardGoalName.POWER:
            return self.floor or 1.0
        if goal is BoardGoalName.COST:
            dearest = [seat.coupler.price or 0.0 for seat in seats]
            return sum(place.count for place in self.places) * max(dearest) or 1.0
        return 1.0

    def _better(
        self, best: BoardFound, taken: Sequence[Taken] | None, goal: BoardGoalName | None, caps: Caps
    ) -> BoardFound:
        """The better of the best so far and a board that may break a cap."""
        if taken is None or not self.keeps(taken, caps):
            return best
        value = 0.0 if goal is None else self.value(taken, goal)
        return replace(best, taken=tuple(taken), value=value) if value < best.value else best

    def _bound(self, solution: Solution, goal: BoardGoalName | None, scale: float) -> float:
        """The solver's bound in the goal's unit; whole numbers are rounded up."""
        if goal not in WHOLE:
            return solution.bound * scale
        return float(np.ceil(solution.bound - 1e-6)) if np.isfinite(solution.bound) else solution.bound

    def _cut(self, seats: Sequence[Seat], refused: Sequence[Taken]) -> list[Seat]:
        self.size.cuts += len(refused)
        by_seat = {id(one.seat): one.choice for one in refused}
        return [with_cuts(seat, by_seat[id(seat)]) if id(seat) in by_seat else seat for seat in seats]


def _sharp(seats: Sequence[Seat | None]) -> list[Seat]:
    """The seats that have a design, small ones sharpened."""
    found = (sharpened(seat) for seat in seats if seat is not None)
    return [seat for seat in found if seat is not None]


def _covers(kept: Caps, power: float, edge: float) -> bool:
    """Whether seats narrowed for some limits hold all that these leave."""
    return power <= kept.power and edge <= kept.edge


def _stage(goal: BoardGoalName | None) -> str:
    return f"least {goal.value}, links that fail" if goal else "any board, links that fail"
