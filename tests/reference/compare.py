"""Predictions against the simulator: python -m tests.reference.compare [product | plain-row ...].

First the table of README.md with the guard, then the ratio predicted / simulated per quantity, over all circuits of a
record and over parts of it: the record of the six devices, on which constants were fitted, then that of the strangers,
which no formula has seen.
"""

from __future__ import annotations

import sys
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from optopick.physics.types import Array
from tests.reference.predict import PREDICTORS, Predictor, links
from tests.reference.record import RECORDS, Entry, Record, read_record
from tests.reference.sheet import Sheet

QUANTITIES = ("edge_on", "edge_off", "storage", "delay_on", "delay_off")
GUARDED = ("edge_on", "edge_off", "delay_on", "delay_off")
"""What a brief limits, and so what `timing_guard` must cover."""

REACH = 0.25
"""How far off most predictions may be [1]."""

BEYOND = 1 / 500
"""Share of simulated edges and delays that may last longer than the guard times the predicted ones [1]."""


@dataclass(frozen=True)
class Ratios:
    """predicted / simulated of every circuit of the record, by quantity, and what the circuits are."""

    by_quantity: dict[str, Array]
    entries: tuple[Entry, ...]

    def part(self, keep: Array) -> Ratios:
        """Those circuits that `keep` marks."""
        chosen = tuple(e for e, k in zip(self.entries, keep, strict=True) if k)
        return Ratios({name: r[keep] for name, r in self.by_quantity.items()}, chosen)


def ratios(predictor: Predictor, entries: tuple[Entry, ...], sheets: dict[str, Sheet]) -> Ratios:
    """Compare a predictor with simulated circuits."""
    ordered: list[Entry] = []
    found: dict[str, list[Array]] = {name: [] for name in QUANTITIES}
    for device, sheet in sheets.items():
        own = [e for e in entries if e.device == device]
        predicted = predictor(sheet, links(e.circuit for e in own))
        ordered += own
        for name in QUANTITIES:
            found[name].append(getattr(predicted, name) / np.array([getattr(e.times, name) for e in own]))
    return Ratios({name: np.concatenate(parts) for name, parts in found.items()}, tuple(ordered))


def table(r: Ratios) -> list[str]:
    """Lines of median, percentiles, worst both ways, and the share within 25 % per quantity."""
    lines = []
    for name, ratio in r.by_quantity.items():
        low, p5, mid, p95, high = np.percentile(ratio, (0, 5, 50, 95, 100))
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
    return {"all": r} | {name: r.part(keep) for name, keep in (kinds | devices).items()}


def report(record: Record, name: str) -> list[str]:
    """Every table of one predictor on one record."""
    lines = []
    for part, r in parts(ratios(PREDICTORS[name], record.entries, record.sheets)).items():
        lines += [f"{name}, {part} ({len(r.entries)} circuits)", HEAD, *table(r)]
    return lines


def guard(records: Iterable[Ratios]) -> float:
    """Least factor g [1] with simulated <= g*predicted for all but BEYOND of the edges and delays."""
    late = np.sort(np.concatenate([1.0 / r.by_quantity[name] for r in records for name in GUARDED]))
    return float(late[late.size - 1 - int(late.size * BEYOND)])


def product_ratios() -> dict[str, Ratios]:
    """The product on every record."""
    records = {name: read_record(name) for name in RECORDS}
    return {name: ratios(PREDICTORS["product"], r.entries, r.sheets) for name, r in records.items()}


def summary() -> list[str]:
    """Lines of the table in README.md."""
    found = product_ratios()
    head = ("record", "quantity", "median", "5 %", "95 %", "least", "most", "within 25 %")
    lines = [f"| {' | '.join(head)} |", "|---" * len(head) + "|"]
    for name, r in found.items():
        lines += [f"| {name} | {' | '.join(line.split())} |" for line in table(r)]
    least = f"{guard(found.values()):.3f} times the predicted"
    return [*lines, "", f"Guard: all but 1 in 500 of the simulated edges and delays last at most {least}."]


HEAD = f"  {'':10} {'median':>7} {'5 %':>7} {'95 %':>7} {'least':>7} {'most':>7} {'in 25 %':>8}"


def main(which: tuple[str, ...]) -> None:
    """Print the summary and the tables of the predictors asked for, of all without a name."""
    print("\n".join(summary()))
    for name in RECORDS:
        record = read_record(name)
        print(f"{name}: {record.origin}")
        for predictor in which or tuple(PREDICTORS):
            print("\n".join(report(record, predictor)))


if __name__ == "__main__":
    main(tuple(sys.argv[1:]))
