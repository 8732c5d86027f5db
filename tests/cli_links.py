"""The small link that the tests of the command line run on, and how they read what comes back."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from command import ROOT, Ran

TINY = ROOT / "tests" / "golden" / "tiny.toml"
SOUND = ("--coupler", "TINYPHOTO", "--r-led", "1k", "--r-load", "10k", "--r-be", "220k")
UNSOUND = ("--coupler", "TINYPHOTO", "--r-led", "10k", "--r-load", "10k")

RESULT = {"status", "objective", "second", "design", "checks", "timing", "power", "assumed", "rejected", "proof"}
RESULT |= {"cautions"}
REVIEW = {"design", "checks", "timing", "power"}
FIELDS = {
    "objective": {"name", "value", "bound", "gap", "unit"},
    "design": {"coupler", "r_led", "r_load", "r_be", "r_shunt"},
    "timing": {"edge_on", "edge_off", "storage", "delay_on", "delay_off", "distortion"},
    "power": {"nominal", "worst"},
    "proof": {"combinations", "solves", "decided_by_ranges", "seconds", "solver"},
}
CHECK = {"name", "value", "limit", "sense", "margin", "unit", "corner", "passed"}
ASSUMED = {"part", "parameter", "value", "rule"}
"""Fields that the JSON of a command has; more may come."""


def changed(folder: Path, *changes: tuple[str, str], name: str = "link.toml") -> Path:
    """The tiny brief with texts replaced, in a folder of its own."""
    text = TINY.read_text(encoding="utf-8").replace('"tiny.csv"', f'"{TINY.with_name("tiny.csv")}"')
    for old, new in changes:
        assert old in text, old
        text = text.replace(old, new, 1)
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return path


def impossible(folder: Path) -> Path:
    """A brief that no design meets: a tenth of the power that the best takes."""
    return changed(folder, ('power = "40 mW"', 'power = "1 mW"'))


def json_of(ran: Ran) -> dict[str, Any]:
    """The one JSON object that is all of standard output."""
    found = json.loads(ran.out)
    assert isinstance(found, dict)
    assert "NaN" not in ran.out
    assert "Infinity" not in ran.out
    return found
