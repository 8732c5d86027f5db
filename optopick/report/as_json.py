"""Results as JSON objects, in SI, with null for what is absent and for what is not a finite number."""

from __future__ import annotations

import json
import math
from collections.abc import Sequence
from dataclasses import asdict
from typing import Any

from optopick.answers import Checked, Front, Nearest, Ranked, Ranking, Share, Sweep, Why, Yield
from optopick.result import Check, Design, Objective, Result, Review
from optopick.simulate.design import Simulation


def dumps(value: object) -> str:
    """One JSON object as text; infinities and not-a-number become null."""
    return json.dumps(_finite(value), ensure_ascii=False, indent=2)


def _finite(value: Any) -> Any:  # noqa: ANN401 - JSON values are any of six types
    if isinstance(value, float) and not math.isfinite(value):
        return None
    if isinstance(value, dict):
        return {key: _finite(inner) for key, inner in value.items()}
    if isinstance(value, list | tuple):
        return [_finite(inner) for inner in value]
    return value


def result_object(result: Result) -> dict[str, object]:
    """The object that `pick --json` prints."""
    found: dict[str, object] = {
        "status": result.status.value,
        "objective": objective_object(result.objective),
        "second": objective_object(result.second),
    }
    found |= review_object(result.review)
    return found | {
        "assumed": [asdict(assumed) for assumed in result.assumed],
        "rejected": [asdict(rejected) for rejected in result.rejected],
        "proof": asdict(result.proof),
        "cautions": list(result.cautions),
    }


def review_object(review: Review | None) -> dict[str, object]:
    """Design, checks, timing and power; nulls where there is no design."""
    if review is None:
        return {"design": None, "checks": [], "timing": None, "power": None}
    return {
        "design": design_object(review.design),
        "checks": [check_object(check) for check in review.checks],
        "timing": asdict(review.timing),
        "power": asdict(review.power),
    }


def design_object(design: Design) -> dict[str, object]:
    """Coupler and ohms."""
    return asdict(design)


def check_object(check: Check) -> dict[str, object]:
    """A check with its margin and whether it holds."""
    return {
        "name": check.name,
        "value": check.value,
        "limit": check.limit,
        "sense": check.sense,
        "margin": check.margin,
        "unit": check.unit,
        "corner": check.corner,
        "passed": check.passed,
    }


def objective_object(objective: Objective | None) -> dict[str, object] | None:
    """A goal with value, bound, and gap."""
    return None if objective is None else asdict(objective) | {"gap": objective.gap}


def checked_object(checked: Checked, near: Nearest | None, shares: Sequence[Share]) -> dict[str, object]:
    """The object that `check --json` prints."""
    return {
        "status": "passes" if checked.review.passed else "fails",
        **review_object(checked.review),
        "nearest": None if near is None else {"changed": list(near.changed), **review_object(near.result.review)},
        "budget": [asdict(share) for share in shares],
        "notes": list(checked.notes),
        "assumed": [asdict(assumed) for assumed in checked.assumed],
        "cautions": list(checked.cautions),
    }


def results_object(results: Sequence[Result]) -> dict[str, object]:
    """The object that `pick --next --json` prints: the best design's object with those after it under "next"."""
    return result_object(results[0]) | {"next": [result_object(result) for result in results[1:]]}


def ranking_object(ranking: Ranking) -> dict[str, object]:
    """The object that `rank --json` prints."""
    return {
        "complete": ranking.complete,
        "ranked": [_ranked_object(one) for one in ranking.ranked],
        "rejected": [asdict(rejected) for rejected in ranking.rejected],
    }


def _ranked_object(one: Ranked) -> dict[str, object]:
    return {
        "status": one.status.value,
        "objective": objective_object(one.objective),
        "second": objective_object(one.second),
        "tightest": check_object(one.tightest),
        "price": one.coupler.price,
        "barrier": asdict(one.coupler.barrier),
        **review_object(one.review),
    }


def front_object(front: Front) -> dict[str, object]:
    """The object that `tradeoff --json` prints."""
    return {
        "goals": [goal.value for goal in front.goals],
        "complete": front.complete,
        "knee": front.knee,
        "points": [{"first": p.first, "second": p.second, **review_object(p.review)} for p in front.points],
    }


def why_object(why: Why) -> dict[str, object]:
    """The object that `why --json` prints."""
    return {
        "status": why.status.value,
        "conflicts": [list(conflict) for conflict in why.conflicts],
        "changes": [asdict(change) for change in why.changes],
        "complete": why.complete,
        "objective": objective_object(why.result.objective) if why.result else None,
        "worth": [asdict(worth) for worth in why.worth],
    }


def sweep_object(sweep: Sweep) -> dict[str, object]:
    """The object that `sweep --json` prints."""
    steps = [
        {"ohms": step.ohms, "worst": review_object(step.worst), "typical": review_object(step.typical)}
        for step in sweep.steps
    ]
    return {"position": sweep.position, "chosen": sweep.chosen, "steps": steps}


def yield_object(drawn: Yield) -> dict[str, object]:
    """The object that `yield --json` prints."""
    return {"samples": drawn.count, "good": drawn.good, "checks": [asdict(passing) for passing in drawn.checks]}


def simulation_object(simulation: Simulation | None, cut: int) -> dict[str, object] | None:
    """What `pick --simulate --json` adds: times of the formulas (guard included) and simulated, by corner."""
    if simulation is None:
        return None
    pulses = [
        {
            "corner": pulse.corner.words,
            "worst_for": list(pulse.worst_for),
            "formula": {name: simulation.guard * value for name, value in asdict(pulse.by_formula).items()},
            "simulated": None if pulse.times is None else asdict(pulse.times),
            "reason": pulse.reason,
        }
        for pulse in simulation.pulses
    ]
    return {"refuted": cut, "reason": simulation.reason, "pulses": pulses}
