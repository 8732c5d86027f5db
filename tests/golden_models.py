"""The model of a tiny brief as LP text, one text for each family of rows: what tests/golden/ holds.

A family is all rows of one name. Numbers are rounded, so that another processor's last digit is no difference.
"""

from __future__ import annotations

import re
import tempfile
from collections.abc import Iterator
from dataclasses import replace
from itertools import product
from pathlib import Path

import numpy as np

from optopick.brief import Brief, GoalName, OutputCircuit
from optopick.coupler import Coupler, Kind
from optopick.model.kinds import LinkModel, model_of
from optopick.model.rows import Ask, Rows, stack
from optopick.model.solver import Problem, build
from optopick.read_brief import read_brief
from optopick.read_couplers import read_couplers
from optopick.uses.engine import ask_of

FOLDER = Path(__file__).parent / "golden"
DIGITS = 6
NUMBER = re.compile(r"(?<!\S)[+-]?\d+\.?\d*(?:e[+-]?\d+)?(?!\S)")


def golden_texts() -> dict[str, str]:
    """File name to LP text, of every family of rows."""
    texts: dict[str, str] = {}
    for prefix, model, ask in _models():
        rows = model.rows(ask)
        for family in dict.fromkeys(rows.names):
            if prefix != "emitter_load" or family.startswith("output"):
                chosen = rows.pick(np.array([name == family for name in rows.names]))
                texts[f"{prefix}.{family}.lp"] = lp_text(Problem(chosen, model.sizes, None))
        if prefix == "phototransistor":
            texts[f"{prefix}.least_power.lp"] = lp_text(Problem(stack([], model.sizes), model.sizes, _power(model)))
            for family, cuts in _staircases(model, ask):
                texts[f"{prefix}.staircase_{family}.lp"] = lp_text(Problem(cuts, model.sizes, None))
    return texts


def lp_text(problem: Problem) -> str:
    """A problem as Pyomo's LP writer gives it, numbers rounded."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "model.lp"
        build(problem).write(str(path), io_options={"symbolic_solver_labels": True})
        written = path.read_text(encoding="utf-8")
    return "\n".join(_rounded(line) for line in written.splitlines()) + "\n"


def _rounded(line: str) -> str:
    """A line with its numbers to a few digits; names keep theirs."""
    return NUMBER.sub(lambda found: f"{float(found.group()):+.{DIGITS}g}", line)


def _models() -> Iterator[tuple[str, LinkModel, Ask]]:
    """Prefix of the file names, the model, and what is asked of it."""
    brief = read_brief(FOLDER / "tiny.toml")
    couplers = {coupler.kind: coupler for coupler in read_couplers(brief.couplers.table).couplers}
    emitter = replace(brief, output=replace(brief.output, circuit=OutputCircuit.EMITTER_LOAD))
    photo, logic = couplers[Kind.PHOTOTRANSISTOR], couplers[Kind.LOGIC]
    yield _named("phototransistor", brief, photo)
    yield _named("emitter_load", emitter, photo)
    yield _named("logic", brief, logic)


def _named(prefix: str, brief: Brief, coupler: Coupler) -> tuple[str, LinkModel, Ask]:
    return prefix, model_of(brief, coupler), ask_of(brief)


def _power(model: LinkModel) -> tuple[np.ndarray, np.ndarray]:
    """Power as the search hands it to the solver: about one."""
    p, q = model.power
    scale = float(np.median(p) + np.median(q))
    return p / scale, q / scale


def _staircases(model: LinkModel, ask: Ask) -> Iterator[tuple[str, Rows]]:
    """Cuts of each family of times, from the first combination that fails it under a limit half of them fail."""
    every = [np.array(axis) for axis in zip(*product(*(range(n) for n in model.sizes)), strict=True)]
    scores = model.scores(*every)
    seen: set[str] = set()
    for goal in (GoalName.EDGE_TIME, GoalName.DELAY, GoalName.DISTORTION):
        sharp = Ask().limited(goal, float(np.median(scores.of(goal))))
        for choice in zip(*(axis.tolist() for axis in every), strict=True):
            cuts = model.cuts(sharp, *choice)
            for family in dict.fromkeys(cuts.names):
                if family not in seen:
                    seen.add(family)
                    yield family, cuts.pick(np.array([name == family for name in cuts.names]))
