"""The formulas a report prints, read from the package's data."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Any

from optopick.coupler import Coupler
from optopick.result import Design


@dataclass(frozen=True)
class Formula:
    """An equation, its symbols with their meaning, where it comes from, and the function that computes it.

    kinds: output stages it applies to, all where empty. needs: the resistor position it is about, if any.
    """

    name: str
    formula: str
    symbols: tuple[tuple[str, str], ...]
    source: str
    function: str
    kinds: tuple[str, ...]
    needs: str


@cache
def all_formulas() -> tuple[Formula, ...]:
    """Every formula of the data file, in its order."""
    text = resources.files("optopick").joinpath("data/formulas.toml").read_text(encoding="utf-8")
    return tuple(_formula(entry) for entry in tomllib.loads(text)["formula"])


def _formula(entry: Mapping[str, Any]) -> Formula:
    return Formula(
        name=entry["name"],
        formula=entry["formula"],
        symbols=tuple((symbol, meaning) for symbol, meaning in entry["symbols"]),
        source=entry["source"],
        function=entry["function"],
        kinds=tuple(entry.get("kinds", ())),
        needs=entry.get("needs", ""),
    )


def formulas_for(coupler: Coupler, design: Design) -> tuple[Formula, ...]:
    """The formulas that a design's checks rest on."""
    return tuple(
        formula
        for formula in all_formulas()
        if (not formula.kinds or coupler.kind.value in formula.kinds)
        and (not formula.needs or getattr(design, formula.needs) is not None)
    )
