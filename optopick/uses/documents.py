"""The folder of a design review: page, JSON, bill of materials, netlist, pictures, all from one answer."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from importlib.metadata import version
from pathlib import Path

from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.report.as_json import dumps, result_object
from optopick.report.bill import bill_csv
from optopick.report.document import Document, InputFile, Walk, document_of
from optopick.report.netlist import netlist
from optopick.report.page import page
from optopick.report.plots import figure_bytes, front_figure, sweep_figure
from optopick.report.schematic import schematic_svg
from optopick.result import Design, Result
from optopick.simulate.corner import typical_corner
from optopick.simulate.design import simulate_all, simulate_pattern
from optopick.simulate.errors import NotSimulatedError
from optopick.uses.budget import budget
from optopick.uses.check import coupler_named
from optopick.uses.engine import Progress, quiet
from optopick.uses.pick import pick
from optopick.uses.rank import rank
from optopick.uses.sweep import sweep
from optopick.uses.tradeoff import tradeoff
from optopick.uses.why import why

FRONT_POINTS = 9
"""Points of the trade-off front in a document."""


def review_files(brief: Brief, date: str, progress: Progress = quiet) -> tuple[Result, Mapping[str, bytes | str]]:
    """The answer to a brief, and the files of its design review by name."""
    result = pick(brief, progress=progress)
    coupler = coupler_named(brief, result.design.coupler) if result.design else None
    document = document_of(brief, result, coupler, _inputs(brief), version("optopick"), date)
    if result.design is None or coupler is None:
        document = replace(document, why=why(brief, progress=progress))
        return result, {"review.html": page(document), "design.json": dumps(result_object(result))}
    return result, _files(
        brief, coupler, result.design, _with_parts(document, brief, coupler, result, progress), result
    )


def _inputs(brief: Brief) -> tuple[InputFile, InputFile]:
    paths = (brief.path or Path("brief.toml"), brief.couplers.table)
    first, second = (InputFile(path.name, path.read_bytes() if path.exists() else b"") for path in paths)
    return first, second


def _with_parts(document: Document, brief: Brief, coupler: Coupler, result: Result, progress: Progress) -> Document:
    """The document with everything a design allows: ranking, front, budget, walks, waveforms."""
    design = result.design
    assert design is not None
    goals = (brief.goal.minimize, brief.goal.then)
    front = tradeoff(brief, goals, points=FRONT_POINTS, progress=progress)
    ranking = rank(brief, progress=progress)
    document = replace(
        document,
        ranking=ranking,
        front=front,
        budget=budget(brief, coupler, design),
        walks=(*_walks(brief, coupler, design), Walk("front", tuple(point.review for point in front.points), None)),
    )
    try:
        simulation = simulate_all(brief, coupler, design)
        pattern = simulate_pattern(brief, coupler, typical_corner(brief, coupler, design))
    except NotSimulatedError:
        return document
    return replace(document, simulation=simulation, pattern=pattern)


def _walks(brief: Brief, coupler: Coupler, design: Design) -> tuple[Walk, ...]:
    """The load and the base resistor over their stock."""
    positions = ["r_load", *(["r_be"] if brief.stock.r_be and coupler.base_pin else [])]
    walks = []
    for position in positions:
        steps = sweep(brief, coupler, design, position).steps
        chosen = next((k for k, step in enumerate(steps) if step.ohms == getattr(design, position)), None)
        walks.append(Walk(position, tuple(step.worst for step in steps), chosen))
    return tuple(walks)


def _files(
    brief: Brief, coupler: Coupler, design: Design, document: Document, result: Result
) -> Mapping[str, bytes | str]:
    schematic = schematic_svg(brief, coupler, design)
    files: dict[str, bytes | str] = {
        "review.html": page(document),
        "design.json": dumps(result_object(result)),
        "bom.csv": bill_csv(brief, coupler, design),
        "schematic.svg": schematic,
    }
    swept = sweep_figure(sweep(brief, coupler, design, "r_load"), brief.title)
    pictures = {"sweep": swept} | ({"front": front_figure(document.front, brief.title)} if document.front else {})
    for name, figure in pictures.items():
        files |= {f"{name}.{kind}": figure_bytes(figure, kind) for kind in ("svg", "png")}
    if coupler.transistor is not None:
        files["link.cir"] = netlist(brief, coupler, design, typical_corner(brief, coupler, design))
    return files
