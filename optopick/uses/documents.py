"""The folder of a design review: page, JSON, bill of materials, netlist, pictures, all from one answer."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from importlib.metadata import version
from pathlib import Path
from typing import cast

from optopick.answers import Front, Ranked, Ranking, Sweep
from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.report.as_json import dumps, result_object
from optopick.report.bill import bill_csv
from optopick.report.document import Document, InputFile, Walk, document_of
from optopick.report.netlist import netlist
from optopick.report.page import page
from optopick.report.plots import figure_bytes, front_figure, sweep_figure
from optopick.report.schematic import schematic_svg
from optopick.report.styles import standalone
from optopick.result import Design, Rejected, Result
from optopick.simulate.corner import typical_corner
from optopick.simulate.design import simulate_all, simulate_pattern
from optopick.simulate.errors import NotSimulatedError
from optopick.uses.budget import budget
from optopick.uses.check import coupler_named
from optopick.uses.engine import Progress, quiet
from optopick.uses.pick import pick
from optopick.uses.rank import Task, rank_one, ranking_of, tasks_of
from optopick.uses.sweep import sweep
from optopick.uses.tradeoff import tradeoff
from optopick.uses.why import why
from optopick.uses.workers import Processes

FRONT_POINTS = 9
"""Points of the trade-off front in a document."""


def review_files(brief: Brief, date: str, progress: Progress = quiet) -> tuple[Result, Mapping[str, bytes | str]]:
    """The answer to a brief, and the files of its design review by name."""
    tasks, rejected = tasks_of(brief)
    work: list[Brief | Task] = [brief, *tasks]
    answers = Processes().map(_answered, work)
    chosen = next(answers)
    assert isinstance(chosen, _Chosen)
    result, coupler = chosen.result, chosen.coupler
    document = document_of(brief, result, coupler, _inputs(brief), version("optopick"), date)
    if result.design is None or coupler is None:
        document = replace(document, why=why(brief, progress=progress))
        return result, {"review.html": page(document), "design.json": dumps(result_object(result))}
    ranking = ranking_of(cast(Iterator[Ranked | Rejected], answers), len(tasks), rejected, progress)
    document = _with_parts(document, brief, coupler, result.design, chosen.sweeps, ranking, progress)
    return result, _files(brief, coupler, result, document, chosen.sweeps)


@dataclass(frozen=True)
class _Chosen:
    """The answer to a brief, its coupler, and what moving its resistors does."""

    result: Result
    coupler: Coupler | None
    sweeps: tuple[Sweep, ...]


def _answered(task: Brief | Task) -> _Chosen | Ranked | Rejected:
    """The best design of a brief, or that of one coupler: done side by side, as neither needs the other."""
    if isinstance(task, Task):
        return rank_one(task)
    result = pick(task)
    if result.design is None:
        return _Chosen(result, None, ())
    coupler = coupler_named(task, result.design.coupler)
    return _Chosen(result, coupler, _sweeps(task, coupler, result.design))


def _inputs(brief: Brief) -> tuple[InputFile, InputFile]:
    paths = (brief.path or Path("brief.toml"), brief.couplers.table)
    first, second = (InputFile(path.name, path.read_bytes() if path.exists() else b"") for path in paths)
    return first, second


def _sweeps(brief: Brief, coupler: Coupler, design: Design) -> tuple[Sweep, ...]:
    """The load and the base resistor over their stock; the LED resistor where the load has one value only."""
    stock = brief.stock
    first = "r_load" if len(stock.r_load.values) > 1 else "r_led"
    positions = [first, *(["r_be"] if stock.r_be and coupler.base_pin else [])]
    sweeps = (sweep(brief, coupler, design, position) for position in positions)
    return tuple(swept for swept in sweeps if len(swept.steps) > 1)


def _with_parts(
    document: Document,
    brief: Brief,
    coupler: Coupler,
    design: Design,
    sweeps: Sequence[Sweep],
    ranking: Ranking,
    progress: Progress,
) -> Document:
    """The document with everything a design allows: ranking, front, budget, walks, waveforms."""
    front = _front(brief, ranking, progress)
    document = replace(
        document,
        ranking=ranking,
        front=front,
        budget=budget(brief, coupler, design),
        walks=(
            *(_walk(swept) for swept in sweeps),
            Walk("front", tuple(point.review for point in front.points), None),
        ),
    )
    try:
        simulation = simulate_all(brief, coupler, design)
        pattern = simulate_pattern(brief, coupler, typical_corner(brief, coupler, design))
    except NotSimulatedError:
        return document
    return replace(document, simulation=simulation, pattern=pattern)


def _front(brief: Brief, ranking: Ranking, progress: Progress) -> Front:
    """The trade-off front; couplers that the ranking proves to have no design take no part in it."""
    goals = (brief.goal.minimize, brief.goal.then)
    designed = sorted((one.coupler for one in ranking.ranked), key=lambda coupler: coupler.row)
    couplers = designed if ranking.complete else None
    floors = {one.coupler.part: one.objective.bound for one in ranking.ranked}
    return tradeoff(brief, goals, points=FRONT_POINTS, couplers=couplers, progress=progress, floors=floors)


def _walk(swept: Sweep) -> Walk:
    chosen = next((k for k, step in enumerate(swept.steps) if step.ohms == swept.chosen), None)
    return Walk(swept.position, tuple(step.worst for step in swept.steps), chosen)


def _files(
    brief: Brief, coupler: Coupler, result: Result, document: Document, sweeps: Sequence[Sweep]
) -> Mapping[str, bytes | str]:
    design = result.design
    assert design is not None
    files: dict[str, bytes | str] = {
        "review.html": page(document),
        "design.json": dumps(result_object(result)),
        "bom.csv": bill_csv(brief, coupler, design),
        "schematic.svg": standalone(schematic_svg(brief, coupler, design)),
    }
    pictures = {"sweep": sweep_figure(sweeps[0], brief.title)} if sweeps else {}
    if document.front:
        pictures["front"] = front_figure(document.front, brief.title)
    for name, figure in pictures.items():
        files |= {f"{name}.{kind}": figure_bytes(figure, kind) for kind in ("svg", "png")}
    if coupler.transistor is not None:
        files["link.cir"] = netlist(brief, coupler, design, typical_corner(brief, coupler, design))
    return files
