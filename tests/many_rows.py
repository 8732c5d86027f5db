"""Generated coupler tables of any length, written row by row, and the link that they are ranked for."""

from __future__ import annotations

import csv
from collections.abc import Iterator
from pathlib import Path

import numpy as np
from command import ROOT
from coupler_tables import DARLINGTON, LOGIC, PHOTOTRANSISTOR

BINS = "ABC"
"""Of each part three bins stand one below the other."""

TINY = ROOT / "tests" / "golden" / "tiny.toml"


def rows(count: int, seed: int = 1) -> Iterator[dict[str, str]]:
    """Invented rows of all kinds; one in sixteen lacks a figure that no rule fills."""
    rng = np.random.default_rng(seed)
    for k in range(count):
        part, place = divmod(k, len(BINS))
        if place == 0:
            kind = (PHOTOTRANSISTOR, PHOTOTRANSISTOR, DARLINGTON, LOGIC)[part % 4]
            sheet = _sheet(rng, kind, part)
            lowest = float(sheet.get("ctr_min", 0))
        row = sheet | {"bin": BINS[place], "price": f"{rng.uniform(0.1, 2):.2f}"}
        if kind is not LOGIC:
            low = lowest * 1.6**place
            row |= {"ctr_min": f"{low:.3g}", "ctr_max": f"{2 * low:.3g}"}
        if rng.random() < 1 / 16:
            row["i_f_max"] = ""
        yield row


def _sheet(rng: np.random.Generator, kind: dict[str, str], part: int) -> dict[str, str]:
    """A part's own figures, about those of the kind."""
    typical = rng.uniform(1.05, 1.35)
    sheet = kind | {
        "part": f"GEN-{part:05d}",
        "v_f_min": f"{typical - 0.15:.3f}",
        "v_f_typ": f"{typical:.3f}",
        "v_f_max": f"{typical + rng.uniform(0.05, 0.4):.3f}",
        "withstand": str(rng.choice(["2.5", "3.75", "5"])),
        "c_cb": f"{rng.uniform(3, 12):.2f}",
        "sheet": "",
    }
    if kind is not LOGIC:
        sheet |= {"ctr_min": f"{float(kind['ctr_min']) * rng.uniform(0.3, 1.5):.3g}"}
        sheet |= {"sw_t_f": f"{float(kind['sw_t_f']) * rng.uniform(0.7, 2):.3g}"}
        sheet |= {"i_ceo_hot": f"{rng.uniform(2, 50):.3g}"}
    else:
        sheet |= {"i_f_on": f"{rng.uniform(2, 8):.2f}", "t_plh": f"{rng.uniform(40, 90):.1f}"}
    return {name: text for name, text in sheet.items() if name in kind or name in ("price", "sheet")}


def write_many(path: Path, count: int, seed: int = 1) -> Path:
    """Write a table, never holding it."""
    columns = list(dict.fromkeys((*PHOTOTRANSISTOR, *DARLINGTON, *LOGIC)))
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, columns, restval="", lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows(count, seed))
    return path


SERIES = {
    'r_led = { values = ["470", "680", "1k"], power = "0.25 W" }': ("r_led", "100", "10k", ', power = "0.25 W"'),
    'r_load = { values = ["2k2", "4k7", "10k"] }': ("r_load", "330", "33k", ""),
    'r_be = { values = ["220k", "470k"], absent = true }': ("r_be", "47k", "1M", ", absent = true"),
}
"""Lines of the tiny brief's stock, and the ranges of the series that may stand in their place."""


def link(folder: Path, count: int, seed: int = 1, series: str | None = None) -> Path:
    """The tiny brief with a generated table beside it; with a series its stock is that."""
    write_many(folder / "many.csv", count, seed)
    text = TINY.read_text(encoding="utf-8").replace('"tiny.csv"', '"many.csv"')
    for line, (name, low, high, more) in SERIES.items() if series else ():
        assert line in text
        text = text.replace(line, f'{name} = {{ series = "{series}", from = "{low}", to = "{high}"{more} }}')
    path = folder / "many.toml"
    path.write_text(text, encoding="utf-8")
    return path
