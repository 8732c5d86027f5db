"""The keys of the brief, as `data/brief_keys.toml` lists them, and the named sets of values that some of them choose.

The files are data of the package: what is wrong in them is a defect, so nothing here makes a Mistake.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Any

from optopick.units import parse_quantity


@dataclass(frozen=True)
class Bound:
    """One end of an allowed range: as the schema writes it, and its value in SI."""

    text: str
    value: float


@dataclass(frozen=True)
class Key:
    """One key of the brief; `data/brief_keys.toml` says what each field means."""

    section: str
    name: str
    kind: str
    meaning: str
    example: object
    unit: str
    required: bool
    default: object
    default_rule: str
    default_from: str
    least: Bound | None
    most: Bound | None
    above: Bound | None
    choices: tuple[str, ...]
    names_in: str
    circuits: tuple[str, ...]
    only_in: tuple[str, ...]
    single: str

    @property
    def path(self) -> str:
        """The key with its section, as error messages name it: "drive.supply"."""
        return f"{self.section}.{self.name}" if self.section else self.name

    def range_in_words(self) -> str:
        """Say what the range asks for: "more than 0 A and at most 1 A"; empty where anything goes."""
        words = (("more than", self.above), ("at least", self.least), ("at most", self.most))
        return " and ".join(f"{word} {bound.text}" for word, bound in words if bound is not None)

    def allows(self, value: float) -> bool:
        """Whether `value`, in SI, lies in the range."""
        return (
            (self.least is None or value >= self.least.value)
            and (self.most is None or value <= self.most.value)
            and (self.above is None or value > self.above.value)
        )


@dataclass(frozen=True)
class Section:
    """One section (TOML table) of the brief; the name is empty for what stands above the first one."""

    name: str
    meaning: str
    required: bool
    keys: tuple[Key, ...]

    def key(self, name: str) -> Key | None:
        """Return the key called `name`, None if there is none."""
        return next((key for key in self.keys if key.name == name), None)


@dataclass(frozen=True)
class Cell:
    """One value of a named set, written as the brief would write it, and where it comes from."""

    value: object
    source: str


# cached: every key read asks for the schema again
@cache
def brief_sections() -> tuple[Section, ...]:
    """Return every section of the brief, parents before their parts, in the order in which briefs are written."""
    data = _load("brief_keys.toml")
    templates = {template["name"]: template["key"] for template in data["template"]}
    return tuple(_section(entry, templates) for entry in data["section"])


@cache
def named_sets(file: str) -> Mapping[str, Mapping[str, Cell]]:
    """Return the named sets of a data file of the package: set name -> key -> cell."""
    return {
        name: {key: Cell(cell["value"], cell["source"]) for key, cell in cells.items()}
        for name, cells in _load(file).items()
    }


def _load(file: str) -> dict[str, Any]:
    return tomllib.loads(resources.files("optopick").joinpath("data", file).read_text(encoding="utf-8"))


def _section(entry: Mapping[str, Any], templates: Mapping[str, Any]) -> Section:
    name = entry["name"]
    # a section of its own keys first, then those it shares; a shared key may belong to some of its sections only
    rows = [*entry.get("key", ()), *templates.get(entry.get("like", ""), ())]
    return Section(name, entry["meaning"], entry.get("required", False), tuple(_key(name, row) for row in rows))


def _key(section: str, row: Mapping[str, Any]) -> Key:
    # where there is no unit, bounds are plain numbers
    unit = row.get("unit", "1")
    names_in = row.get("names_in", "")
    return Key(
        section=section,
        name=row["name"],
        kind=row["kind"],
        meaning=row["meaning"],
        example=row["example"],
        unit=unit,
        required=row.get("required", False),
        default=row.get("default"),
        default_rule=row.get("default_rule", ""),
        default_from=row.get("default_from", ""),
        least=_bound(row.get("least"), unit),
        most=_bound(row.get("most"), unit),
        above=_bound(row.get("above"), unit),
        choices=tuple(named_sets(names_in)) if names_in else tuple(row.get("choices", ())),
        names_in=names_in,
        circuits=tuple(row.get("circuits", ())),
        only_in=tuple(row.get("only_in", ())),
        single=row.get("single", "both ends"),
    )


def _bound(text: str | None, unit: str) -> Bound | None:
    return None if text is None else Bound(text, parse_quantity(text, unit))
