"""Rankings and fronts as pandas frames, in SI."""

from __future__ import annotations

from dataclasses import asdict

import pandas as pd

from optopick.answers import Front, Ranking, Sweep


def ranking_frame(ranking: Ranking) -> pd.DataFrame:
    """One row a ranked coupler: goals, resistors [ohm], tightest check, price, barrier."""
    rows = []
    for place, one in enumerate(ranking.ranked, 1):
        goals = {
            one.objective.name.replace(" ", "_"): one.objective.value,
            one.second.name.replace(" ", "_"): one.second.value,
        }
        tight = {"tightest": one.tightest.name, "tightest_margin": one.tightest.margin}
        status = {"place": place, "status": one.status.value}
        rows.append(
            status
            | asdict(one.review.design)
            | goals
            | tight
            | {"price": one.coupler.price}
            | asdict(one.coupler.barrier)
        )
    return pd.DataFrame(rows)


def front_frame(front: Front) -> pd.DataFrame:
    """One row a point: goals and the design."""
    names = [goal.value.replace(" ", "_") for goal in front.goals]
    rows = [
        {names[0]: point.first, names[1]: point.second, **asdict(point.review.design), "knee": index == front.knee}
        for index, point in enumerate(front.points)
    ]
    return pd.DataFrame(rows)


def sweep_frame(sweep: Sweep) -> pd.DataFrame:
    """One row a stock value: worst and typical times [s], worst power [W], failing checks."""
    rows = []
    for step in sweep.steps:
        typical = {f"typical_{name}": value for name, value in asdict(step.typical.timing).items()}
        failing = " ".join(check.name for check in step.worst.failing)
        power = {"power": step.worst.power.worst, "fails": failing, "chosen": step.ohms == sweep.chosen}
        rows.append({sweep.position: step.ohms} | asdict(step.worst.timing) | typical | power)
    return pd.DataFrame(rows)
