"""Rankings, fronts, reasons and margin budgets for people at a terminal, as rich renderables."""

from __future__ import annotations

import math
from collections.abc import Sequence

from rich.console import Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from optopick.answers import CAUSES, Change, Front, Ranked, Ranking, Share, Sweep, Why, Worth, Yield
from optopick.report.labels import check_label
from optopick.report.words import amount, binding, margin_words, ohms_words
from optopick.result import Design, Rejected
from optopick.units import format_quantity


def ranking_text(ranking: Ranking, title: str, top: int | None) -> RenderableType:
    """The whole answer to `rank`."""
    shown = ranking.ranked[:top] if top else ranking.ranked
    parts: list[RenderableType] = [Text(title, style="bold"), Text(_ranking_verdict(ranking)), Text()]
    if shown:
        parts.append(ranking_table(shown))
    if len(shown) < len(ranking.ranked):
        parts.append(Text(f"and {len(ranking.ranked) - len(shown)} more; --top shows more or fewer"))
    if ranking.rejected:
        parts.append(Padding(rejected_table(ranking.rejected), (1, 0, 0, 0)))
    return Group(*parts)


def _ranking_verdict(ranking: Ranking) -> str:
    if not ranking.ranked:
        said = "No coupler has a design that holds every limit at every corner."
    else:
        first, second = ranking.ranked[0].objective.name, ranking.ranked[0].second.name
        said = f"{len(ranking.ranked)} couplers with a design, by least {first}, then least {second}."
    return said if ranking.complete else said + " Interrupted: not every coupler was tried."


def ranking_table(ranked: Sequence[Ranked]) -> RenderableType:
    """Ranked couplers in order, each with its goals and design."""
    table = Table(box=None, padding=(0, 1, 0, 0), header_style="bold")
    for heading in ("", "Coupler", ranked[0].objective.name, ranked[0].second.name):
        table.add_column(heading, no_wrap=True, justify="left" if heading in ("", "Coupler") else "right")
    table.add_column("R_LED / R_load / R_BE / shunt", ratio=2)
    table.add_column("Tightest", ratio=2)
    table.add_column("Withstand", justify="right", no_wrap=True)
    table.add_column("Price", justify="right", no_wrap=True)
    for place, one in enumerate(ranked, 1):
        tight, withstand = one.tightest, one.coupler.barrier.withstand
        table.add_row(
            f"{place}{'' if one.status == 'optimal' else '?'}",
            one.coupler.part,
            amount(one.objective.value, one.objective.unit),
            amount(one.second.value, one.second.unit),
            values_text(one.review.design),
            f"{check_label(tight.name)} {margin_words(tight.margin, 0)}",
            "–" if withstand is None else amount(withstand, "V"),
            "–" if one.coupler.price is None else f"{one.coupler.price:g}",
        )
    return table


def values_text(design: Design) -> str:
    """The four resistors on one line, a dash where a position stays empty."""
    values = (design.r_led, design.r_load, design.r_be, design.r_shunt)
    texts = ["–" if ohms is None else ohms_words(ohms) for ohms in values]
    if design.pieces > 1:
        texts[0] = f"{design.pieces}×{texts[0]}"
    return " / ".join(texts)


def rejected_table(rejected: Sequence[Rejected]) -> RenderableType:
    """The couplers that cannot serve, with the reason."""
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold")
    table.add_column("Rejected", no_wrap=True)
    table.add_column("Because")
    for one in rejected:
        table.add_row(one.part, one.reason)
    return table


def front_text(front: Front, title: str) -> RenderableType:
    """The whole answer to `tradeoff`."""
    first, second = (goal.value for goal in front.goals)
    kind = "every point of the front" if front.complete else "points of the front"
    said = f"{first} against {second}: {len(front.points)} designs that nothing in stock beats in both ({kind})."
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold")
    for heading in (first, second):
        table.add_column(heading, justify="right", no_wrap=True)
    table.add_column("Coupler", no_wrap=True)
    table.add_column("R_LED / R_load / R_BE / shunt")
    table.add_column("", no_wrap=True)
    units = ["W" if goal == "power" else "s" for goal in front.goals]
    for index, point in enumerate(front.points):
        design = point.review.design
        knee = "knee" if index == front.knee else ""
        table.add_row(
            amount(point.first, units[0]), amount(point.second, units[1]), design.coupler, values_text(design), knee
        )
    return Group(Text(title, style="bold"), Text(said), Text(), table)


def why_text(why: Why, title: str) -> RenderableType:
    """The whole answer to `why`."""
    parts: list[RenderableType] = [Text(title, style="bold")]
    if why.result is not None and why.result.objective is not None:
        objective = why.result.objective
        parts.append(Text(f"A design exists: least {objective.name} {amount(objective.value, objective.unit)}."))
        tight = binding(why.result.review) if why.result.review else ()
        if tight:
            said = ", ".join(f"{check_label(check.name)} {margin_words(check.margin)}" for check in tight)
            parts.append(Text("What binds, with the room left: " + said))
        parts.append(Padding(_worths(why.worth, objective.unit), (1, 0, 0, 0)))
        return Group(*parts)
    if why.status == "unknown":
        return Group(*parts, Text("Out of time before it was clear whether a design exists."))
    parts.append(Text("No design exists. These limits contradict each other; no part of a set does:", style="red"))
    for conflict in why.conflicts:
        parts.append(Text("  • " + ", ".join(check_label(name) for name in conflict)))
    if not why.complete:
        parts.append(Text("  There may be further sets."))
    parts.append(Padding(_changes(why.changes), (1, 0, 0, 0)))
    return Group(*parts)


def _changes(changes: Sequence[Change]) -> RenderableType:
    if not changes:
        return Text("No single limit, moved alone, makes a design exist.")
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold")
    table.add_column("Any one of these makes a design exist")
    table.add_column("Now", justify="right", no_wrap=True)
    table.add_column("Needed", justify="right", no_wrap=True)
    for change in changes:
        table.add_row(change.key, _told(change.now, change.unit), _told(change.needed, change.unit))
    return table


def _told(value: float | str, unit: str) -> str:
    return value if isinstance(value, str) else amount(value, unit)


def _worths(worths: Sequence[Worth], unit: str) -> RenderableType:
    if not worths:
        return Text("No limit stands in the way of a better one: none of them, a tenth easier, buys anything.")
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold")
    table.add_column("A step of this limit")
    for heading in ("from", "to", "gives"):
        table.add_column(heading, justify="right", no_wrap=True)
    for worth in worths:
        goal = "–" if worth.goal is None else amount(worth.goal, unit)
        table.add_row(worth.key, amount(worth.now, worth.unit), amount(worth.stepped, worth.unit), goal)
    return table


def budget_text(shares: Sequence[Share]) -> RenderableType:
    """The margin budget: for every check the room left, the room with all nominal, and what each cause eats."""
    table = Table(box=None, padding=(0, 1, 0, 0), header_style="bold")
    table.add_column("Room, % of the limit", ratio=1)
    for heading in ("left", "nominal", *CAUSES):
        table.add_column(heading, justify="right", no_wrap=True)
    for share in shares:
        costs = [_percent(share.cost[cause]) for cause in CAUSES]
        table.add_row(check_label(share.check), _percent(share.worst), _percent(share.nominal), *costs)
    note = Text(
        "left: at the worst corner; nominal: with everything at its nominal value; then the room that comes back if "
        "one cause alone stands there: CTR bin, the LED's light at a given CTR, the transistor's base-emitter voltage "
        "and storage constant, the LED's forward voltage, ageing, temperature, drive supply and drop, output supply, "
        "resistor tolerance."
    )
    return Group(Text(), Text("Margin budget", style="bold"), table, note)


def _percent(share: float) -> str:
    if math.isnan(share) or share == -math.inf:
        return "–"
    if share == math.inf:
        return "∞"
    return "0" if abs(share) < 5e-4 else f"{100 * share:.0f}" if abs(share) >= 0.1 else f"{100 * share:.1f}"


def sweep_text(sweep: Sweep, title: str) -> RenderableType:
    """The whole answer to `sweep`."""
    table = Table(box=None, padding=(0, 1, 0, 0), header_style="bold")
    for heading in (
        sweep.position,
        "edge on",
        "edge off",
        "delay on",
        "delay off",
        "typical edge",
        "CTR margin",
        "power",
    ):
        table.add_column(heading, justify="right")
    table.add_column("fails", ratio=1)
    for step in sweep.steps:
        timing, typical = step.worst.timing, step.typical.timing
        margins = [check for check in step.worst.checks if check.name == "ctr_margin"]
        marked = "chosen" if step.ohms == sweep.chosen else ""
        failing = ", ".join(check_label(check.name) for check in step.worst.failing)
        table.add_row(
            unbroken(ohms_words(step.ohms)),
            *(short(value) for value in (timing.edge_on, timing.edge_off, timing.delay_on, timing.delay_off)),
            short(max(typical.edge_on, typical.edge_off)),
            f"{margins[0].value:.3g}" if margins else "–",
            unbroken(format_quantity(step.worst.power.worst, "W", 3)),
            failing or marked,
            style="bold" if marked else "",
        )
    said = f"{sweep.position} over its stock, the rest of the design as it is; worst cases but for one typical column."
    return Group(Text(title, style="bold"), Text(said), Text(), table)


def short(seconds: float) -> str:
    """A time with three digits, not to be broken."""
    return unbroken(format_quantity(seconds, "s", 3))


def unbroken(text: str) -> str:
    """A quantity that stays on one line in a narrow column."""
    return text.replace(" ", "\u00a0")


def yield_text(drawn: Yield, title: str) -> RenderableType:
    """The whole answer to `yield`."""
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="bold")
    table.add_column("Check")
    table.add_column("Pass", justify="right", no_wrap=True)
    table.add_column("Least room", justify="right", no_wrap=True)
    table.add_column("Room from -100 % to 300 %", no_wrap=True)
    for passing in drawn.checks:
        share = f"{100 * passing.passed / drawn.count:.4f} %"
        table.add_row(check_label(passing.check), share, margin_words(passing.least, 1), _bars(passing.histogram))
    said = f"{drawn.good:,} of {drawn.count:,} random units pass every check ({100 * drawn.good / drawn.count:.4f} %)."
    return Group(
        Text(title, style="bold"), Text(said, style="green" if drawn.good == drawn.count else "red"), Text(), table
    )


def _bars(counts: Sequence[int]) -> str:
    """A histogram of block characters; any count at all shows."""
    blocks, most = " ▁▂▃▄▅▆▇█", max(counts) or 1
    return "".join(blocks[0 if not n else max(1, round(8 * n / most))] for n in counts)
