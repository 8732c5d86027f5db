"""What a board's answer must survive: a re-check that refuses, a count that is off, time that runs out; its example."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest
from cli_links import TINY
from command import ROOT

from optopick.board import Board, BoardGoal, BoardGoalName, BoardLimits, BoardLink, reel_of
from optopick.errors import DisagreementError
from optopick.model import board_search
from optopick.model.board import clipped
from optopick.model.rows import Rows
from optopick.model.solver import Answer, Program, solve_program
from optopick.read_board import read_board
from optopick.read_brief import read_brief
from optopick.read_couplers import read_couplers
from optopick.recheck import review
from optopick.result import Design, Status
from optopick.uses import board as uses
from optopick.uses import board_work as work
from optopick.uses import engine
from optopick.uses.board import solve_board
from optopick.uses.board_totals import resistances

PLANT = ROOT / "examples" / "plant"
DEMO = ROOT / "catalogs" / "demo.csv"


def two_links(**limits: float) -> Board:
    brief = read_brief(TINY)
    slow = replace(brief.limits, edge_time=None, delay=None, distortion=None)
    # a load of 12 kohm takes least power, one of 10 kohm no reel of its own
    stock = replace(brief.stock, r_load=replace(brief.stock.r_load, values=(4.7e3, 10e3, 12e3)))
    other = replace(brief, title="other", limits=slow, stock=stock)
    links = (BoardLink("first", brief, 3), BoardLink("second", other, 1))
    return Board("two", BoardLimits(**limits), BoardGoal(BoardGoalName.POWER, BoardGoalName.REELS, 0.0), links)


class TestDisagreement:
    def test_names_link_and_check(self, monkeypatch):
        def refusing(brief, coupler, design, nominal=()):
            found = review(brief, coupler, design, nominal)
            worse = [replace(c, value=-1.0) if c.name == "ctr_margin" else c for c in found.checks]
            return replace(found, checks=tuple(worse)) if brief.title == "other" else found

        monkeypatch.setattr(engine, "review", refusing)
        with pytest.raises(DisagreementError, match=r"^link second: .*refuses: ctr_margin -1 against 1\.2"):
            solve_board(two_links())

    @pytest.mark.parametrize("limits", [{"reels": 1}, {"couplers": 0}, {"power": 1e-3}])
    def test_limits_are_counted_again(self, limits):
        result = solve_board(two_links())
        with pytest.raises(DisagreementError, match=f"{next(iter(limits))} in the designs, limit"):
            work._recount(two_links(**limits), result)

    def test_goals_are_counted_again(self):
        result = solve_board(two_links())
        wrong = tuple(replace(goal, value=goal.value * 1.01) for goal in result.goals)
        with pytest.raises(DisagreementError, match=r"power is .* in the model, .* again"):
            work._recount(two_links(), replace(result, goals=wrong))


class TestTime:
    def test_none_left_at_all(self):
        result = solve_board(two_links(), time_limit=0.0)
        assert result.status in (Status.UNKNOWN, Status.FEASIBLE)

    def test_what_is_not_proved_is_not_called_so(self, monkeypatch):
        """As if the solver ended every call early, with its solution and a bound of half of it."""

        def early(program, seconds=np.inf, *, gap=0.0, nodes=None, seen=None):
            found = solve_program(program, seconds, gap=gap, nodes=nodes)
            clock.append(1)
            return replace(found, bound=found.costs / 2, proved=False)

        class Short(board_search.Clock):
            @property
            def out(self) -> bool:
                return len(clock) > 2

        clock: list[int] = []
        monkeypatch.setattr(board_search, "solve_program", early)
        monkeypatch.setattr(uses, "Clock", Short)
        result = solve_board(two_links(reels=3))
        assert result.status is Status.FEASIBLE
        assert len(result.links) == 2
        assert result.goals[0].bound < result.goals[0].value * (1 - 1e-4)

    def test_a_solver_out_of_time_with_nothing(self, monkeypatch):
        def nothing(program, seconds=np.inf, *, gap=0.0, nodes=None, seen=None):
            return board_search.Solution(Answer.OUT_OF_TIME, None, np.inf, 0.0, proved=False)

        monkeypatch.setattr(board_search, "solve_program", nothing)
        assert solve_board(two_links()).status is Status.UNKNOWN


@pytest.mark.parametrize(("shown", "bound"), [(4.999999, 5.0), (5.0, 5.0), (5.0000001, 5.0), (5.2, 6.0)])
def test_bounds_on_counts_are_whole(shown, bound):
    search = board_search.BoardSearch([], board_search.Clock(), lambda *_: None)
    solution = board_search.Solution(Answer.FOUND, None, 7.0, shown, proved=False)
    assert search._bound(solution, BoardGoalName.REELS, 1.0) == bound


class TestProgram:
    """The general entry of the solver against all choices there are."""

    @pytest.mark.parametrize("seed", range(12))
    def test_as_enumeration_says(self, seed):
        rng = np.random.default_rng(seed)
        n, rows = 8, 5
        dense = np.where(rng.random((rows, n)) < 0.6, rng.uniform(-1, 1, (rows, n)), 0.0)
        low = rng.uniform(-1.5, 0.8, rows)
        high = low + rng.uniform(0.3, 2.0, rows)
        costs = rng.uniform(-1, 1, n)
        row_of, column_of = np.nonzero(dense)
        found = solve_program(Program(costs, row_of, column_of, dense[row_of, column_of], low, high))
        every = np.array(np.meshgrid(*[[0, 1]] * n)).reshape(n, -1)
        held = ((dense @ every >= low[:, None]) & (dense @ every <= high[:, None])).all(axis=0)
        if not held.any():
            assert found.answer is Answer.NONE
            return
        assert found.proved
        assert found.costs == pytest.approx((costs @ every[:, held]).min())
        assert costs @ found.chosen == pytest.approx(found.costs)

    def test_tells_how_far_it_is(self):
        """A program that takes some branching: what is told closes in on what is returned."""
        rng = np.random.default_rng(3)
        dense = rng.integers(1, 100, (3, 30)).astype(float)
        row_of, column_of = np.nonzero(dense)
        low = dense.sum(axis=1) / 2
        told: list[tuple[float, float]] = []
        costs = rng.integers(50, 100, 30).astype(float)
        program = Program(costs, row_of, column_of, dense[row_of, column_of], low, low + 4)
        found = solve_program(program, seen=lambda best, bound: told.append((best, bound)))
        assert found.proved
        assert len(told) >= 2
        assert all(best >= found.costs - 1e-6 and bound <= found.costs + 1e-6 for best, bound in told)
        assert told[-1][1] > told[0][1]

    def test_says_nothing_on_the_terminal(self, capfd):
        solve_program(Program(np.ones(1), np.zeros(1, int), np.zeros(1, int), np.ones(1), np.ones(1), np.ones(1)))
        assert capfd.readouterr() == ("", "")


@pytest.mark.parametrize("seed", range(20))
def test_clipped_rows_hold_for_the_same_combinations(seed):
    rng = np.random.default_rng(seed)
    rows = Rows(("one", "two"), *(rng.normal(size=(2, n)) * 10 ** rng.uniform(-2, 2) for n in (4, 5, 3)))
    i, j, m = (axis.ravel() for axis in np.meshgrid(*(np.arange(n) for n in (4, 5, 3)), indexing="ij"))
    tight = clipped(rows)
    for k in range(2):
        one, other = (r.pick(np.arange(2) == k).holds(i, j, m) for r in (rows, tight))
        assert (one == other).all()


def test_clipped_rows_give_no_more_than_is_of_use():
    rows = Rows(("one",), np.array([[5.0, -2.0]]), np.array([[1.0, -1.0]]), np.array([[0.0]]))
    tight = clipped(rows)
    # 1 makes up for the worst of the others, and 2 then is what b has to make up for
    assert tight.a == pytest.approx(np.array([[0.5, -1.0]]), abs=1e-8)
    assert tight.b == pytest.approx(np.array([[0.5, -0.5]]), abs=1e-8)


def test_progress_tells_best_bound_and_gap():
    told: list[str] = []
    result = solve_board(two_links(reels=3), progress=lambda stage, done, total: told.append(stage))
    power = f"{1e3 * result.goals[0].value:.4g} mW"
    assert {f"power {power}, at least {power} ({gap} %)" for gap in ("0", "0.0")} & {*told}
    assert any(re.fullmatch(r"power [\d.]+ mW, at least [\d.]+ mW \([\d.]+ %\)", stage) for stage in told)
    assert any(re.fullmatch(r"reels \d, at least \d \([\d.]+ %\)", stage) for stage in told)


@pytest.mark.parametrize(
    ("goal", "value", "bound", "said"),
    [
        (BoardGoalName.POWER, np.inf, 0.0608, "power: no board yet, at least 60.8 mW"),
        (BoardGoalName.POWER, 0.0612, 0.0608, "power 61.2 mW, at least 60.8 mW (0.7 %)"),
        (BoardGoalName.COST, 0.0, 0.0, "cost 0, at least 0 (0 %)"),
        (BoardGoalName.EDGE, 0.5, 0.4, "edge 50 % of its limit, at least 40 % of its limit (20 %)"),
    ],
)
def test_progress_in_words(goal, value, bound, said):
    told: list[tuple[str, int, int]] = []
    work._tell(lambda *stage: told.append(stage), goal, value, bound)
    assert told == [(said, 0, 0)]


def test_reels():
    assert reel_of(2200.0) == reel_of(2200.0 * (1 + 1e-12)) != reel_of(2210.0)
    design = Design("X", 1e3, 1e3, None, 470.0, pieces=3)
    assert sorted(set(resistances(design))) == [470.0, 1000.0]


def test_links_of_one_brief_get_one_design():
    board = two_links()
    same = replace(board, links=(*board.links, BoardLink("third", board.links[0].brief, 2)))
    links = solve_board(same).links
    assert [one.link.name for one in links] == ["first", "second", "third"]
    assert links[0].review == links[2].review


class TestExample:
    def test_it_is_a_board_worth_the_name(self):
        board = read_board(PLANT / "board.toml")
        assert len(board.links) >= 12
        assert board.limits.reels
        assert board.limits.couplers
        used = {link.brief.path for link in board.links}
        assert used == set(PLANT.glob("*.toml")) - {PLANT / "board.toml"}

    def test_it_shows_changes_and_shared_packages(self):
        """Among them a limit on packages that only sharing holds, and a part that can be shared."""
        board = read_board(PLANT / "board.toml")
        assert any(link.changes for link in board.links)
        assert board.limits.packages < sum(link.count for link in board.links)
        shared = {link.brief for link in board.links if link.grounds == ("logic", "relays")}
        table = {coupler.part: coupler.channels for coupler in read_couplers(DEMO).couplers}
        assert any(table[part] > 1 for brief in shared for part in brief.couplers.only)

    @pytest.mark.parametrize("path", sorted(PLANT.glob("*.toml")), ids=lambda path: path.stem)
    def test_it_is_said_to_be_invented(self, path):
        text = path.read_text(encoding="utf-8")
        assert text.startswith("# An invented product with invented parts")
        assert "(plant/board.toml)" in (ROOT / "examples" / "README.md").read_text(encoding="utf-8")
