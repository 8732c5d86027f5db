"""The columns of the coupler table and the rules that fill its gaps, read from one data file.

Validation, the blank template and the page that documents the columns all come from here.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any

from optopick.coupler import Kind

DATA_FILE = "data/coupler_columns.toml"


@dataclass(frozen=True)
class TableUnit:
    """A unit of the table: the one `optopick.units` knows it by, the power of ten between them, how it is shown."""

    base: str
    exponent: int
    shown: str

    def to_si(self, number: float) -> float:
        """Return a number of this unit in SI (degC and h stay)."""
        # dividing by an exact power of ten rounds once; multiplying by 1e-3 would round twice
        return number / self._tens if self.exponent < 0 else number * self._tens

    def from_si(self, value: float) -> float:
        """Return a value in SI as a number of this unit."""
        return value * self._tens if self.exponent < 0 else value / self._tens

    @property
    def _tens(self) -> float:
        return float(10 ** abs(self.exponent))


UNITS: Mapping[str, TableUnit] = {
    "V": TableUnit("V", 0, "V"),
    "kV": TableUnit("V", 3, "kV"),
    "mA": TableUnit("A", -3, "mA"),
    "µA": TableUnit("A", -6, "µA"),
    "nA": TableUnit("A", -9, "nA"),
    "mV": TableUnit("V", -3, "mV"),
    "mW": TableUnit("W", -3, "mW"),
    "mA/K": TableUnit("A/K", -3, "mA/K"),
    "mW/K": TableUnit("W/K", -3, "mW/K"),
    "mV/K": TableUnit("V/K", -3, "mV/K"),
    "%/K": TableUnit("1/K", -2, "%/K"),
    "%": TableUnit("%", -2, "%"),
    "1": TableUnit("1", 0, ""),
    "ohm": TableUnit("ohm", 0, "Ω"),
    "kohm": TableUnit("ohm", 3, "kΩ"),
    "pF": TableUnit("F", -12, "pF"),
    "nF": TableUnit("F", -9, "nF"),
    "µs": TableUnit("s", -6, "µs"),
    "ns": TableUnit("s", -9, "ns"),
    "h": TableUnit("h", 0, "h"),
    "eV": TableUnit("eV", 0, "eV"),
    "mm": TableUnit("m", -3, "mm"),
    "degC": TableUnit("degC", 0, "°C"),
}


# Compared and hashed as the one object it is: cells are cached by column, and a field by field hash would cost more
# than reading the cell.
@dataclass(frozen=True, eq=False)
class Column:
    """One column: how its cells are read, what they mean, and what happens where one is empty.

    type: quantity, text, choice, flag, count or curve. low, high: the range believed, in the table unit.
    gap: "mistake", "row", "open", or "" where `rules` fill it.
    """

    name: str
    type: str
    meaning: str
    unit: str
    kinds: tuple[Kind, ...]
    low: float
    high: float
    choices: tuple[str, ...]
    gap: str
    rules: tuple[str, ...]

    @property
    def table_unit(self) -> TableUnit:
        """The unit of its plain numbers."""
        return UNITS[self.unit]

    @property
    def range_text(self) -> str:
        """The range believed, in words, with its unit."""
        shown = self.table_unit.shown
        return f"{self.low:g} to {self.high:g} {shown}".rstrip()


Constant = float | str
"""A constant of a rule: a number in table units, or a curve as text."""


@dataclass(frozen=True)
class Rule:
    """One rule that fills gaps: what it does, where that comes from, its constants (one each, or one by kind)."""

    name: str
    sentence: str
    source: str
    constants: Mapping[str, Constant | Mapping[str, Constant]]

    def constant(self, name: str, kind: Kind) -> Constant:
        """Return one constant as it holds for an output stage."""
        value = self.constants[name]
        return value[kind] if isinstance(value, Mapping) else value

    def number(self, name: str, kind: Kind) -> float:
        """Return one numeric constant, in table units."""
        return float(self.constant(name, kind))

    def words(self, kind: Kind) -> str:
        """Return the sentence with its constants and the source, for one output stage."""
        constants = {name: _plain(self.constant(name, kind)) for name in self.constants}
        return f"{self.sentence.format(**constants)} ({self.source})"

    def general_sentence(self) -> str:
        """Return the sentence with its constants, those by kind with the kind beside each."""
        return self.sentence.format(**{name: _general(value) for name, value in self.constants.items()})


def _plain(value: Constant) -> str:
    return value if isinstance(value, str) else f"{value:g}"


def _general(value: Constant | Mapping[str, Constant]) -> str:
    if not isinstance(value, Mapping):
        return _plain(value)
    return " or ".join(f"{_plain(constant)} ({kind})" for kind, constant in value.items())


@dataclass(frozen=True)
class Schema:
    """Everything the data file says: columns and rules by name, units of derived parameters, ascending columns."""

    columns: Mapping[str, Column]
    rules: Mapping[str, Rule]
    parameters: Mapping[str, tuple[str, str]]
    orders: tuple[tuple[tuple[str, ...], bool], ...]

    def show(self, parameter: str, value: float) -> str:
        """Return an SI value of a column or derived parameter as text in table units."""
        unit = UNITS[self.columns[parameter].unit if parameter in self.columns else self.parameters[parameter][0]]
        number = unit.from_si(value)
        text = f"{number:.0f}" if abs(number) >= 1000 else f"{number:.3g}"
        return f"{text} {unit.shown}".rstrip()


@cache
def schema() -> Schema:
    """Return the schema of the coupler table, read once."""
    raw = tomllib.loads(files("optopick").joinpath(DATA_FILE).read_text(encoding="utf-8"))
    return Schema(
        columns={name: _column(name, entry) for name, entry in raw["columns"].items()},
        rules={name: _rule(name, entry) for name, entry in raw["rules"].items()},
        parameters={name: (entry["unit"], entry["meaning"]) for name, entry in raw["parameters"].items()},
        orders=tuple((tuple(entry["names"]), entry.get("strict", False)) for entry in raw["orders"]),
    )


def _column(name: str, entry: dict[str, Any]) -> Column:
    gap = entry["gap"]
    low, high = entry.get("range", (float("-inf"), float("inf")))
    return Column(
        name=name,
        type=entry.get("type", "quantity"),
        meaning=entry["meaning"],
        unit=entry.get("unit", "1"),
        kinds=tuple(Kind(kind) for kind in entry.get("kinds", list(Kind))),
        low=low,
        high=high,
        choices=tuple(entry.get("choices", ())),
        gap=gap if isinstance(gap, str) else "",
        rules=() if isinstance(gap, str) else tuple(gap),
    )


def _rule(name: str, entry: dict[str, Any]) -> Rule:
    constants = {key: value for key, value in entry.items() if key not in ("sentence", "source")}
    return Rule(name, entry["sentence"], entry["source"], constants)


_GAP_WORDS = {
    "mistake": "must be filled",
    "row": "row cannot be used",
    "open": "stays empty",
}


def blank_template() -> str:
    """Return an empty coupler table: comments with the unit and meaning of every column, then the header line."""
    columns = schema().columns.values()
    lines = [
        "# Coupler table: one line per part and CTR bin. Lines that begin with # are passed over.",
        "# A cell holds a plain number in the unit below, or a quantity with its own unit such as 60 mA.",
        "# Leave a cell empty where the data sheet says nothing; columns that stay empty may be deleted.",
        "#",
        *(f"# {column.name}{_unit_note(column)}: {column.meaning}" for column in columns),
        ",".join(column.name for column in columns),
    ]
    return "\n".join(lines) + "\n"


def _unit_note(column: Column) -> str:
    return f" [{column.unit}]" if column.type in ("quantity", "curve") and column.unit != "1" else ""


def columns_markdown() -> str:
    """Return the tables of columns, derived parameters and rules in Markdown."""
    known = schema()
    columns = [_column_line(column) for column in known.columns.values()]
    derived = [f"| `{name}` | {unit} | {meaning} |" for name, (unit, meaning) in known.parameters.items()]
    rules = [f"| `{rule.name}` | {rule.general_sentence()} | {rule.source} |" for rule in known.rules.values()]
    return "\n".join(
        [
            "### Columns",
            "",
            "| column | unit | meaning | output stage | believed range | where the cell is empty |",
            "|---|---|---|---|---|---|",
            *columns,
            "",
            "### Worked out of several columns",
            "",
            "| parameter | unit | meaning |",
            "|---|---|---|",
            *derived,
            "",
            "### Rules that fill gaps",
            "",
            "| rule | what is taken | where that comes from |",
            "|---|---|---|",
            *rules,
            "",
        ]
    )


def _column_line(column: Column) -> str:
    kinds = "all" if len(column.kinds) == len(Kind) else ", ".join(column.kinds)
    unit = {"choice": "one of " + ", ".join(column.choices), "flag": "yes or no", "count": "whole number"}
    believed = column.range_text if column.type in ("quantity", "curve", "count") else ""
    gap = _GAP_WORDS.get(column.gap) or "rule " + ", then ".join(f"`{rule}`" for rule in column.rules)
    shown = unit.get(column.type, "text" if column.type == "text" else column.unit)
    return f"| `{column.name}` | {shown} | {column.meaning} | {kinds} | {believed} | {gap} |"
