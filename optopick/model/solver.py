"""The one module that knows Pyomo and HiGHS: one value per position, every row held, least of a linear goal."""

from __future__ import annotations

import io
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from enum import StrEnum
from functools import cache
from importlib import import_module
from typing import Any

import numpy as np

from optopick.model.rows import Rows
from optopick.physics.types import Array

FEASIBILITY = 1e-9
"""HiGHS's absolute tolerance on rows and on integrality; rows come scaled to about one."""


class Answer(StrEnum):
    """What one solver call established."""

    FOUND = "found"
    NONE = "none"
    OUT_OF_TIME = "out of time"


@dataclass(frozen=True)
class Outcome:
    """An answer, the combination (i, j, m) where there is one, and the goal's lower bound."""

    answer: Answer
    choice: tuple[int, int, int] | None
    bound: float


@dataclass(frozen=True)
class Problem:
    """Rows, the sizes of the positions, and a linear goal p[i] + q[j] (None where any design will do)."""

    rows: Rows
    sizes: tuple[int, int, int]
    goal: tuple[Array, Array] | None


def solver_name() -> str:
    """The solver and its version, for the proof line."""
    from importlib.metadata import version  # noqa: PLC0415

    return f"HiGHS {version('highspy')} through Pyomo {version('pyomo')}"


def highs_name() -> str:
    """The solver of programs that go to HiGHS directly, and its version."""
    from importlib.metadata import version  # noqa: PLC0415

    return f"HiGHS {version('highspy')}"


@cache
def _load_pyomo() -> None:
    """Import Pyomo as if scipy were not loaded yet.

    Where it is, Pyomo imports scipy.stats and more of it at once, which it never needs for these models and which takes
    longer than Pyomo itself; where it is not, Pyomo leaves that until first use.
    """
    scipy = {name: module for name, module in sys.modules.items() if name == "scipy" or name.startswith("scipy.")}
    for name in scipy:
        del sys.modules[name]
    try:
        import_module("pyomo.environ")
        import_module("pyomo.contrib.solver.solvers.highs")
    finally:
        sys.modules.update(scipy)


def build(problem: Problem) -> Any:
    """The Pyomo model: binaries `pick_led`, `pick_load`, `pick_base`, one chosen in each, and the rows in order."""
    _load_pyomo()
    import pyomo.environ as pyo  # noqa: PLC0415 - half a second that help and input errors must not pay
    from pyomo.core.expr.numeric_expr import LinearExpression  # noqa: PLC0415

    model = pyo.ConcreteModel()
    chosen: list[Any] = []
    for name, size in zip(("led", "load", "base"), problem.sizes, strict=True):
        binaries = pyo.Var(range(size), domain=pyo.Binary)
        model.add_component(f"pick_{name}", binaries)
        chosen.extend(binaries.values())
        one = LinearExpression(linear_coefs=[1.0] * size, linear_vars=list(binaries.values()))
        model.add_component(f"one_{name}", pyo.Constraint(expr=one == 1.0))
    model.rows = pyo.ConstraintList()
    for k in range(len(problem.rows)):
        terms = LinearExpression(linear_coefs=_coefficients(problem, k), linear_vars=chosen)
        model.rows.add(terms >= 0.0)
    model.goal = pyo.Objective(expr=LinearExpression(linear_coefs=_costs(problem), linear_vars=chosen))
    return model


def _coefficients(problem: Problem, k: int) -> list[float]:
    rows = problem.rows
    found: list[float] = np.concatenate([rows.a[k], rows.b[k], rows.c[k]]).tolist()
    return found


def _costs(problem: Problem) -> list[float]:
    if problem.goal is None:
        return [0.0] * sum(problem.sizes)
    found: list[float] = np.concatenate([*problem.goal, np.zeros(problem.sizes[2])]).tolist()
    return found


def solve(problem: Problem, seconds: float) -> Outcome:
    """Solve with one thread and a fixed seed, within `seconds`. Infinite row entries must have been ranged out."""
    _load_pyomo()
    from pyomo.contrib.solver.common.results import SolutionStatus, TerminationCondition  # noqa: PLC0415
    from pyomo.contrib.solver.solvers.highs import Highs  # noqa: PLC0415

    model = build(problem)
    solver = Highs()
    config = solver.config
    config.load_solutions, config.raise_exception_on_nonoptimal_result = False, False
    config.threads, config.rel_gap, config.abs_gap = 1, 0.0, 1e-9
    config.time_limit = max(seconds, 0.01) if np.isfinite(seconds) else None
    config.solver_options = {
        "random_seed": 7,
        "mip_feasibility_tolerance": FEASIBILITY,
        "primal_feasibility_tolerance": FEASIBILITY,
    }
    found = solver.solve(model)
    bound = -np.inf if found.objective_bound is None else float(found.objective_bound)
    if found.solution_status in (SolutionStatus.optimal, SolutionStatus.feasible):
        found.solution_loader.load_vars()
        return Outcome(Answer.FOUND, _chosen(model), bound)
    if found.termination_condition is TerminationCondition.provenInfeasible:
        return Outcome(Answer.NONE, None, np.inf)
    if found.termination_condition is TerminationCondition.maxTimeLimit:
        return Outcome(Answer.OUT_OF_TIME, None, bound)
    raise RuntimeError(f"the solver stopped without an answer: {found.termination_condition}")


def _chosen(model: Any) -> tuple[int, int, int]:
    parts = (model.pick_led, model.pick_load, model.pick_base)
    picked = [max(part, key=lambda index: part[index].value) for part in parts]
    return picked[0], picked[1], picked[2]


@dataclass(frozen=True)
class Program:
    """Any program over columns that are 0 or 1: costs (n,), and rows low <= sum of entries <= high, (R,) each.

    row_of, column_of, entries: the rows' entries, (E,) each, in the order of the rows, no place twice. upper: the most
    of each column where whole numbers above 1 are wanted.
    """

    costs: Array
    row_of: np.ndarray
    column_of: np.ndarray
    entries: Array
    low: Array
    high: Array
    upper: Array | None = None


@dataclass(frozen=True)
class Solution:
    """What a solver call established of a program: the columns chosen (None without any), the costs' lower bound.

    proved: no other choice has costs lower than these by more than the gap asked for.
    """

    answer: Answer
    chosen: np.ndarray | None
    costs: float
    bound: float
    proved: bool


Seen = Callable[[float, float], None]
"""Told now and then of the costs of the best choice so far, infinite without one, and their lower bound."""


def solve_program(
    program: Program, seconds: float = np.inf, *, gap: float = 0.0, nodes: int | None = None, seen: Seen | None = None
) -> Solution:
    """Least costs, with one thread and a fixed seed.

    Ends within `gap` [1] of the bound, after `seconds`, or after so many nodes. Goes to HiGHS without Pyomo, which
    builds large programs term by term. No start is handed over: with one, HiGHS 1.16.0 has been seen to give the start
    back as the optimum, with costs and a bound that belong to nothing, where its presolve left nothing to do.
    """
    solver = _quiet_highs()
    options = {
        "output_flag": False,
        "threads": 1,
        "random_seed": 7,
        "mip_rel_gap": gap,
        "mip_abs_gap": 1e-9,
        "mip_feasibility_tolerance": FEASIBILITY,
        "primal_feasibility_tolerance": FEASIBILITY,
    }
    if np.isfinite(seconds):
        options["time_limit"] = max(seconds, 0.01)
    if nodes is not None:
        options["mip_max_nodes"] = nodes
    for name, value in options.items():
        solver.setOptionValue(name, value)
    solver.passModel(_as_highs(program))
    if seen is not None:
        # of HiGHS's callbacks the one that comes often enough; nothing is interrupted
        solver.cbMipInterrupt.subscribe(lambda e: seen(e.data_out.mip_primal_bound, e.data_out.mip_dual_bound))
    solver.run()
    return _solution(solver, program)


def _quiet_highs() -> Any:
    """HiGHS, whose banner goes past Python to the terminal when it is first made."""
    import highspy  # noqa: PLC0415 - as above
    from pyomo.common.tee import capture_output  # noqa: PLC0415 - as above

    with capture_output(io.StringIO(), capture_fd=True):
        return highspy.Highs()  # type: ignore[no-untyped-call]


def _as_highs(program: Program) -> Any:
    import highspy  # noqa: PLC0415 - as above

    columns, rows = len(program.costs), len(program.low)
    lp = highspy.HighsLp()
    lp.num_col_, lp.num_row_ = columns, rows
    lp.col_cost_ = program.costs
    lp.col_lower_, lp.col_upper_ = np.zeros(columns), np.ones(columns) if program.upper is None else program.upper
    lp.row_lower_, lp.row_upper_ = program.low, program.high
    lp.integrality_ = [highspy.HighsVarType.kInteger] * columns
    lp.a_matrix_.format_ = highspy.MatrixFormat.kRowwise
    lp.a_matrix_.num_col_, lp.a_matrix_.num_row_ = columns, rows
    lp.a_matrix_.start_ = np.searchsorted(program.row_of, np.arange(rows + 1)).astype(np.int32)
    lp.a_matrix_.index_ = program.column_of.astype(np.int32)
    lp.a_matrix_.value_ = program.entries
    return lp


def _solution(solver: Any, program: Program) -> Solution:
    import highspy  # noqa: PLC0415 - as above

    status, info = solver.getModelStatus(), solver.getInfo()
    if status in (highspy.HighsModelStatus.kInfeasible, highspy.HighsModelStatus.kUnboundedOrInfeasible):
        return Solution(Answer.NONE, None, np.inf, np.inf, proved=True)
    ended = highspy.HighsModelStatus
    if status not in (ended.kOptimal, ended.kTimeLimit, ended.kSolutionLimit, ended.kIterationLimit):
        raise RuntimeError(f"the solver stopped without an answer: {solver.modelStatusToString(status)}")
    bound = float(info.mip_dual_bound)
    if info.primal_solution_status != int(highspy.SolutionStatus.kSolutionStatusFeasible):
        return Solution(Answer.OUT_OF_TIME, None, np.inf, bound, proved=False)
    chosen = np.round(np.asarray(solver.getSolution().col_value)).astype(int)
    costs = float(program.costs @ chosen)
    if bound > costs + 1e-6 * max(1.0, abs(costs)) or not np.isclose(costs, info.objective_function_value, rtol=1e-6):
        raise RuntimeError(
            f"the solver contradicts itself: costs {costs}, {info.objective_function_value}, bound {bound}"
        )
    return Solution(Answer.FOUND, chosen, costs, bound, status == ended.kOptimal)


GRACE, GRACE_SHARE = 1.0, 0.1
"""Seconds, and share of the time given, that the bound of an unfinished search may take beyond it."""


class Clock:
    """A deadline, and the count of solver calls made under it."""

    def __init__(self, seconds: float = np.inf) -> None:
        self.started = time.monotonic()
        self.deadline = self.started + seconds
        self.grace = GRACE + GRACE_SHARE * seconds
        self.solves = 0
        self.by_ranges = 0

    @property
    def left(self) -> float:
        """Seconds left."""
        return self.deadline - time.monotonic()

    @property
    def spent(self) -> float:
        """Seconds since the start."""
        return time.monotonic() - self.started

    @property
    def out(self) -> bool:
        """Whether the time is up."""
        return self.left <= 0

    @property
    def grace_over(self) -> bool:
        """Whether it has been up for so long that nothing more is to be shown."""
        return self.left <= -self.grace
