"""The resistors of a design as the stock gives them: value, tolerance, rating, price, and the package that suggests."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

from optopick.brief import Brief, Position
from optopick.report.labels import POSITIONS
from optopick.report.words import ohms_words
from optopick.result import Design

SAME = 1e-6
"""Share by which a design's value may differ from the stock's and still be the same resistor: rounding."""

# Chip package usual for a rating [W]. 0.1 W in 0603 and 0.125 W in 0805: two makers' data sheets (see
# published-checks); the others from memory.
_PACKAGES = ((0.75, "2010"), (0.5, "1210"), (0.25, "1206"), (0.125, "0805"), (0.1, "0603"), (0.0625, "0402"))


@dataclass(frozen=True)
class Placed:
    """One resistor in its position; tolerance [1], power [W], voltage [V] and price None where no stock states them.

    symbol: as in formulas, "R_LED". stocked: whether the brief's stock holds this value. pieces: how many of them stand
    in series; value and ratings are those of one.
    """

    position: str
    symbol: str
    label: str
    ohms: float
    tolerance: float | None
    power: float | None
    voltage: float | None
    price: float | None
    described: str
    stocked: bool
    pieces: int = 1

    @property
    def words(self) -> str:
        """The value, and how many of it where there are several."""
        return value_words(self.ohms, self.pieces)

    @property
    def package(self) -> str:
        """The chip package that often has this rating; empty where the rating is unknown or beyond chips."""
        return package_hint(self.power)


SYMBOLS = {"r_led": "R_LED", "r_load": "R_load", "r_be": "R_BE", "r_shunt": "R_shunt"}


def resistors_words(design: Design) -> str:
    """The resistors of a design in one line, which breaks between them and not within."""
    given = ((name, getattr(design, name)) for name in POSITIONS)
    placed = [
        f"{SYMBOLS[name]} {value_words(ohms, pieces_of(design, name))}" for name, ohms in given if ohms is not None
    ]
    placed += ["reverse diode"] if design.reverse_diode else []
    return ", ".join(words.replace(" ", "\u00a0") for words in placed)


def pieces_of(design: Design, position: str) -> int:
    """How many equal resistors stand in series in a position."""
    return design.pieces if position == "r_led" else 1


def value_words(ohms: float | None, pieces: int) -> str:
    """A resistor value, and how many of it where there are several in series."""
    return f"{pieces} × {ohms_words(ohms)}" if pieces > 1 else ohms_words(ohms)


def package_hint(power: float | None) -> str:
    """The chip package usual for a rating [W]: the smallest that takes it; empty where none does."""
    if power is None:
        return ""
    fitting = [package for rating, package in _PACKAGES if rating >= power * (1 - SAME)]
    return fitting[-1] if fitting else ""


def placed_resistors(brief: Brief, design: Design) -> tuple[Placed, ...]:
    """The resistors that the design places, in the order of the positions."""
    return tuple(_placed(brief, design))


def _placed(brief: Brief, design: Design) -> Iterator[Placed]:
    for position, label in POSITIONS.items():
        ohms, stock = getattr(design, position), getattr(brief.stock, position)
        if ohms is not None:
            one = _of_stock(position, label, ohms, stock)
            yield replace(one, pieces=pieces_of(design, position))


def _of_stock(position: str, label: str, ohms: float, stock: Position | None) -> Placed:
    at = _index(stock, ohms) if stock else None
    if stock is None or at is None:
        described = f"not in the stock ({stock.described})" if stock else "the brief has no stock here"
        return Placed(position, SYMBOLS[position], label, ohms, None, None, None, None, described, stocked=False)
    return Placed(
        position=position,
        symbol=SYMBOLS[position],
        label=label,
        ohms=ohms,
        tolerance=stock.tolerance[at],
        power=stock.power[at],
        voltage=stock.voltage[at],
        price=stock.price[at],
        described=stock.described,
        stocked=True,
    )


def _index(stock: Position, ohms: float) -> int | None:
    return next((k for k, value in enumerate(stock.values) if abs(value / ohms - 1) < SAME), None)
