"""Records of simulated circuits: a gzipped CSV each, with the data sheets of its devices beside it."""

from __future__ import annotations

import gzip
import json
from dataclasses import asdict, dataclass, fields
from pathlib import Path

from tests.reference.deck import Circuit
from tests.reference.sheet import Sheet
from tests.reference.simulate import Times

HERE = Path(__file__).parent
RECORDS = ("record", "strangers")
"""The six devices of tests.reference.devices, and devices that no constant was fitted to; nothing flows in the dark."""

LEAKING = "leaking"
"""The devices of both, with dark current and light left in the dark LED."""

EVERY = (*RECORDS, LEAKING)

DIGITS = 6
_TIMES = tuple(f.name for f in fields(Times))
_LEFT = ("i_off", "i_dark", "i_ceo")
"""Columns that a record without them has at 0."""


@dataclass(frozen=True)
class Entry:
    """One simulated circuit; times are nan where the output never gets there.

    i_ceo: what a data sheet would state as the dark current, of the collector with the base open [A].
    """

    device: str
    overdrive: float
    circuit: Circuit
    times: Times
    i_ceo: float = 0.0


@dataclass(frozen=True)
class Record:
    """Simulated circuits, the data sheets of their devices by name, and how it all came about."""

    origin: str
    sheets: dict[str, Sheet]
    entries: tuple[Entry, ...]


def write_record(name: str, record: Record) -> Path:
    """Write a record; returns the path of its circuits."""
    circuits, sheets = _paths(name)
    rows = [
        {"device": e.device, "overdrive": e.overdrive, **asdict(e.circuit), "i_ceo": e.i_ceo, **asdict(e.times)}
        for e in record.entries
    ]
    names = [name for name in rows[0] if name not in _LEFT or any(row[name] for row in rows)]
    lines = [f"# {record.origin}", ",".join(names)]
    lines += [",".join(_cell(row[name]) for name in names) for row in rows]
    # no time stamp: the same circuits give the same file
    circuits.write_bytes(gzip.compress(("\n".join(lines) + "\n").encode(), mtime=0))
    sheets.write_text(json.dumps([asdict(s) for s in record.sheets.values()], indent=1) + "\n")
    return circuits


def read_record(name: str) -> Record:
    """Read a record of EVERY."""
    circuits, sheets = _paths(name)
    lines = gzip.decompress(circuits.read_bytes()).decode().splitlines()
    rows = json.loads(sheets.read_text())
    found = {row["name"]: Sheet(**{**row, "curve_g": tuple(row["curve_g"])}) for row in rows}
    names = lines[1].split(",")
    entries = tuple(_entry(dict(zip(names, line.split(","), strict=True))) for line in lines[2:])
    return Record(lines[0].removeprefix("# "), found, entries)


def _paths(name: str) -> tuple[Path, Path]:
    """Circuits and data sheets of a record."""
    return HERE / f"{name}.csv.gz", HERE / f"{name}_sheets.json"


def _cell(value: str | float | None) -> str:
    if isinstance(value, str):
        return value
    return "" if value is None else f"{float(value):.{DIGITS}g}"


def _entry(cells: dict[str, str]) -> Entry:
    def number(name: str) -> float:
        return float(cells.get(name, "0") if name in _LEFT else cells[name])

    circuit = Circuit(
        pulled_up=bool(number("pulled_up")),
        v_cc=number("v_cc"),
        r_load=number("r_load"),
        r_be=number("r_be") if cells["r_be"] else None,
        c_load=number("c_load"),
        i_f=number("i_f"),
        i_off=number("i_off"),
        i_dark=number("i_dark"),
    )
    times = Times(*(number(name) for name in _TIMES))
    return Entry(cells["device"], number("overdrive"), circuit, times, number("i_ceo"))
