"""Predictions against the simulator: python -m tests.reference.compare [product | plain-row ...].

First the table of README.md with the guards, then the ratio predicted / simulated per quantity, over all circuits of a
record and over parts of it: the record of the six devices, on which constants were fitted, then that of the strangers,
which no formula has seen, then that in which something is left in the dark.
"""

from __future__ import annotations

import sys
from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from optopick.physics.types import Array
from tests.reference.predict import PREDICTORS, Predictor, links, product, rest_of
from tests.reference.record import EVERY, LEAKING, RECORDS, Entry, Record, read_record
from tests.reference.sheet import Sheet

Mask = npt.NDArray[np.bool_]

QUANTITIES = ("edge_on", "edge_off", "storage", "delay_on", "delay_off")
GUARDED = ("edge_on", "edge_off", "delay_on", "delay_off")
"""What a brief limits, and so what `timing_guard` must cover."""

REACH = 0.25
"""How far off most predictions may be [1]."""

BEYOND = 1 / 500
"""Share of simulated edges and delays that may last longer than the guard times the predicted ones [1]."""

LATE = 1.3
"""The default of `timing_guard`: README.md counts what is later."""

EDGE = 0.1
"""How much more or less may be left in the dark until a prediction says what the simulator does [1]."""


@dataclass(frozen=True)
class Ratios:
    """predicted / simulated of every circuit of the record, by quantity, and what the circuits are.

    nan where the simulated output never gets there.
    """

    by_quantity: dict[str, Array]
    entries: tuple[Entry, ...]

    def part(self, keep: Mask) -> Ratios:
        """Those circuits that `keep` marks."""
        chosen = tuple(e for e, k in zip(self.entries, keep, strict=True) if k)
        return Ratios({name: r[keep] for name, r in self.by_quantity.items()}, chosen)


def ratios(predictor: Predictor, entries: tuple[Entry, ...], sheets: dict[str, Sheet]) -> Ratios:
    """Compare a predictor with simulated circuits."""
    ordered: list[Entry] = []
    found: dict[str, list[Array]] = {name: [] for name in QUANTITIES}
    for device, sheet in sheets.items():
        own = [e for e in entries if e.device == device]
        predicted = predictor(sheet, links(own))
        ordered += own
        for name in QUANTITIES:
            found[name].append(getattr(predicted, name) / np.array([getattr(e.times, name) for e in own]))
    return Ratios({name: np.concatenate(parts) for name, parts in found.items()}, tuple(ordered))


def table(r: Ratios) -> list[str]:
    """Lines of median, percentiles, worst both ways, and the share within 25 % per quantity."""
    lines = []
    for name, every in r.by_quantity.items():
        ratio = every[~np.isnan(every)]
        if ratio.size == 0:
            continue
        p5, mid, p95 = np.percentile(ratio, (5, 50, 95))
        low, high = ratio.min(), ratio.max()
        near = np.mean(np.abs(ratio - 1.0) <= REACH)
        lines.append(f"  {name:10} {mid:7.2f} {p5:7.2f} {p95:7.2f} {low:7.2f} {high:7.2f} {near:8.1%}")
    return lines


def parts(r: Ratios) -> dict[str, Ratios]:
    """All circuits, then parts of them by name."""
    base = np.array([e.circuit.r_be is not None for e in r.entries])
    up = np.array([e.circuit.pulled_up for e in r.entries])
    kinds = {"without r_be": ~base, "with r_be": base, "pull-up": up, "emitter load": ~up}
    names = dict.fromkeys(e.device for e in r.entries)
    devices = {f"device {name}": np.array([e.device == name for e in r.entries]) for name in names}
    ends = {"comes back": comes_back(r.entries), "stays": ~comes_back(r.entries)}
    found = {name: r.part(keep) for name, keep in (kinds | ends | devices).items() if np.any(keep)}
    return {"all": r} | found


def comes_back(entries: Iterable[Entry]) -> Mask:
    """Whether the dark output passes the receiver's threshold in the end."""
    return np.array([np.isfinite(e.times.delay_off) for e in entries])


@dataclass(frozen=True)
class Endless:
    """Delays off that are endless by simulation, or by prediction.

    stays: simulated outputs that stay beyond the threshold; found: those of them with an endless predicted delay;
    nearly: those of the others that have one with EDGE more left in the dark. early: outputs that come back although
    the prediction is endless; early_nearly: those of them that are predicted to with EDGE less left.
    """

    stays: int
    found: int
    nearly: int
    early: int
    early_nearly: int


def endless(record: Record) -> Endless:
    """Count endless delays off of a record, by the product."""
    counts: npt.NDArray[np.int_] = np.zeros(5, dtype=int)
    for device, sheet in record.sheets.items():
        own = [e for e in record.entries if e.device == device]
        x, back = links(own), comes_back(own)
        rest = EDGE * rest_of(sheet, x)
        never, with_more, with_less = (
            np.isinf(product(sheet, replace(x, i_off=x.i_off + more)).delay_off) for more in (0.0, rest, -rest)
        )
        early = back & never
        cases = (~back, ~back & never, ~back & ~never & with_more, early, early & ~with_less)
        counts = counts + np.array([np.sum(m) for m in cases])
    return Endless(*counts.tolist())


def report(record: Record, name: str) -> list[str]:
    """Every table of one predictor on one record."""
    lines = []
    for part, r in parts(ratios(PREDICTORS[name], record.entries, record.sheets)).items():
        lines += [f"{name}, {part} ({len(r.entries)} circuits)", HEAD, *table(r)]
    return lines


def guard(records: Iterable[Ratios]) -> float:
    """Least factor g [1] with simulated <= g*predicted for all but BEYOND of the edges and delays."""
    late = np.concatenate([1.0 / r.by_quantity[name] for r in records for name in GUARDED])
    late = np.sort(late[~np.isnan(late)])
    return float(late[late.size - 1 - int(late.size * BEYOND)])


def product_ratios(names: Iterable[str] = RECORDS) -> dict[str, Ratios]:
    """The product on records."""
    records = {name: read_record(name) for name in names}
    return {name: ratios(PREDICTORS["product"], r.entries, r.sheets) for name, r in records.items()}


def summary() -> list[str]:
    """Lines of the table in README.md."""
    found = product_ratios(EVERY)
    dark, leaking = [found[name] for name in RECORDS], parts(found[LEAKING])
    back = leaking["comes back"]
    halves = {f"{LEAKING}, {name}": parts(back)[name] for name in ("without r_be", "with r_be")}
    rows = found | {LEAKING: back} | halves | {f"{LEAKING}, stays": leaking["stays"]}
    head = ("record", "quantity", "median", "5 %", "95 %", "least", "most", "within 25 %")
    lines = [f"| {' | '.join(head)} |", "|---" * len(head) + "|"]
    for name, r in rows.items():
        lines += [f"| {name} | {' | '.join(line.split())} |" for line in table(r)]
    least = f"{guard(dark):.3f} times the predicted"
    return [
        *lines,
        "",
        f"Guard: all but 1 in 500 of the simulated edges and delays last at most {least}.",
        "",
        f"Of `{LEAKING}`: {guard([back]):.3f} times where the output comes back, {guard([leaking['all']]):.3f} times with",
        f"those that stay; of all three records {guard([*dark, back]):.3f} and {guard(found.values()):.3f} times.",
        *(_late_words(name, leaking) for name in ("edge_off", "delay_off")),
        *_endless_words(endless(read_record(LEAKING))),
    ]


def _endless_words(e: Endless) -> list[str]:
    # broken as README.md is
    return [
        f"{e.stays} outputs stay beyond the threshold. The predicted delay off is endless for {e.found} of them, with 10 % more",
        f"left in the dark for {e.nearly} others; of those that come back for {e.early}, of which with 10 % less left it ends for",
        f"{e.early_nearly}.",
    ]


def _late_words(quantity: str, leaking: dict[str, Ratios]) -> str:
    counts = []
    for name in ("comes back", "stays"):
        ratio = leaking[name].by_quantity[quantity]
        measured = int(np.sum(~np.isnan(ratio)))
        counts.append(f"{int(np.sum(ratio < 1.0 / LATE))} of {measured}")
    return (
        f"{quantity} lasts more than {LATE} times the predicted in {counts[0]} that come back, {counts[1]} that stay."
    )


HEAD = f"  {'':10} {'median':>7} {'5 %':>7} {'95 %':>7} {'least':>7} {'most':>7} {'in 25 %':>8}"


def main(which: tuple[str, ...]) -> None:
    """Print the summary and the tables of the predictors asked for, of all without a name."""
    print("\n".join(summary()))
    for name in EVERY:
        record = read_record(name)
        print(f"{name}: {record.origin}")
        for predictor in which or tuple(PREDICTORS):
            print("\n".join(report(record, predictor)))


if __name__ == "__main__":
    main(tuple(sys.argv[1:]))
