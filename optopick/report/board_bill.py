"""The bill of materials of a board."""

from __future__ import annotations

import csv
import io
from dataclasses import dataclass, field

from optopick.board import reel_of
from optopick.board_answers import BoardResult
from optopick.report.placed import Placed, placed_resistors
from optopick.report.words import amount, ohms_words

BILL_COLUMNS = ("quantity", "value", "tolerance", "rating", "used")


@dataclass
class BillLine:
    """One kind of part: how many, where it is used, and for resistors what the stocks say of it."""

    value: str
    quantity: int = 0
    used: list[str] = field(default_factory=list)
    placed: list[Placed] = field(default_factory=list)

    def add(self, quantity: int, where: str) -> None:
        """So many more, used there."""
        self.quantity += quantity
        self.used.append(where)

    @property
    def cells(self) -> tuple[object, ...]:
        """The line as BILL_COLUMNS say: the tightest tolerance and the highest ratings, which serve everywhere."""
        tolerances = [one.tolerance for one in self.placed if one.tolerance is not None]
        powers = [one.power for one in self.placed if one.power is not None]
        voltages = [one.voltage for one in self.placed if one.voltage is not None]
        tolerance = amount(min(tolerances), "%") if tolerances else ""
        rating = f"{amount(max(powers), 'W')}, {amount(max(voltages), 'V')}" if powers and voltages else ""
        return self.quantity, self.value, tolerance, rating, "; ".join(self.used)


def board_bill(result: BoardResult) -> str:
    """Couplers, then resistors by value, then diodes, as CSV: one line for each reel."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(BILL_COLUMNS)
    writer.writerows(line.cells for line in bill_lines(result))
    return out.getvalue()


def bill_lines(result: BoardResult) -> tuple[BillLine, ...]:
    """Couplers, then resistors by value, then diodes."""
    return (*_coupler_lines(result), *_resistor_lines(result), *_diode_lines(result))


def _coupler_lines(result: BoardResult) -> list[BillLine]:
    """Packages, with the links whose channels are in them."""
    lines = {part: BillLine(part) for part in result.couplers}
    for one in result.packages:
        lines[one.part].quantity += one.count
        lines[one.part].used += [name for name, _ in one.links]
    return list(lines.values())


def _resistor_lines(result: BoardResult) -> list[BillLine]:
    lines: dict[float, BillLine] = {}
    for one in result.links:
        for placed in placed_resistors(one.link.brief, one.review.design):
            line = lines.setdefault(reel_of(placed.ohms), BillLine(ohms_words(placed.ohms)))
            line.placed.append(placed)
            line.add(placed.pieces * one.link.count, f"{one.link.name} {placed.position}")
    return [lines[ohms] for ohms in sorted(lines)]


def _diode_lines(result: BoardResult) -> list[BillLine]:
    line = BillLine("diode")
    for one in result.links:
        if one.review.design.reverse_diode:
            line.add(one.link.count, f"{one.link.name} reverse_diode")
    return [line] if line.quantity else []
