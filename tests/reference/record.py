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
"""The six devices of tests.reference.devices, and devices that no constant was fitted to."""

DIGITS = 6
_CIRCUIT = tuple(f.name for f in fields(Circuit))
_TIMES = tuple(f.name for f in fields(Times))


@dataclass(frozen=True)
class Entry:
    """One simulated circuit."""

    device: str
    overdrive: float
    circuit: Circuit
    times: Times


@dataclass(frozen=True)
class Record:
    """Simulated circuits, the data sheets of their devices by name, and how it all came about."""

    origin: str
    sheets: dict[str, Sheet]
    entries: tuple[Entry, ...]


def write_record(name: str, record: Record) -> Path:
    """Write a record; returns the path of its circuits."""
    circuits, sheets = _paths(name)
    lines = [f"# {record.origin}", ",".join(("device", "overdrive", *_CIRCUIT, *_TIMES))]
    for e in record.entries:
        values = [e.overdrive, *asdict(e.circuit).values(), *asdict(e.times).values()]
        lines.append(",".join([e.device, *(_cell(v) for v in values)]))
    # no time stamp: the same circuits give the same file
    circuits.write_bytes(gzip.compress(("\n".join(lines) + "\n").encode(), mtime=0))
    sheets.write_text(json.dumps([asdict(s) for s in record.sheets.values()], indent=1) + "\n")
    return circuits


def read_record(name: str) -> Record:
    """Read a record of RECORDS."""
    circuits, sheets = _paths(name)
    lines = gzip.decompress(circuits.read_bytes()).decode().splitlines()
    rows = json.loads(sheets.read_text())
    found = {row["name"]: Sheet(**{**row, "curve_g": tuple(row["curve_g"])}) for row in rows}
    return Record(lines[0].removeprefix("# "), found, tuple(_entry(line.split(",")) for line in lines[2:]))


def _paths(name: str) -> tuple[Path, Path]:
    """Circuits and data sheets of a record."""
    return HERE / f"{name}.csv.gz", HERE / f"{name}_sheets.json"


def _cell(value: float | None) -> str:
    return "" if value is None else f"{float(value):.{DIGITS}g}"


def _entry(cells: list[str]) -> Entry:
    device, overdrive, pulled_up, v_cc, r_load, r_be, c_load, i_f, *times = cells
    circuit = Circuit(
        bool(float(pulled_up)), float(v_cc), float(r_load), float(r_be) if r_be else None, float(c_load), float(i_f)
    )
    return Entry(device, float(overdrive), circuit, Times(*(float(cell) for cell in times)))
