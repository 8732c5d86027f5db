"""Make the records again: python -m tests.reference.generate.

The same seeds and the same ngspice give the same files.
"""

from __future__ import annotations

import math
import multiprocessing
import os
from collections.abc import Iterable
from dataclasses import fields
from multiprocessing.pool import Pool

import numpy as np

from tests.reference.circuits import Drawn, draw
from tests.reference.devices import DEVICES, Device, stranger
from tests.reference.record import Entry, Record, write_record
from tests.reference.sheet import Sheet, sheet
from tests.reference.simulate import Times, ngspice_version, pulse

SEEDS = {"record": 20250611, "strangers": 20250612}
COUNT, STRANGERS = 900, 20
PROCESSES, NICE = 2, 10
CTR, H_FE, TAU_100 = (0.45, 4.2), (140.0, 950.0), (0.9e-6, 5.2e-6)
"""Spans of CTR [1], gain [1] and time constant at 100 ohm [s] that a stranger must lie in to count as a coupler."""


def main() -> None:
    """Simulate both records and write them."""
    with multiprocessing.Pool(PROCESSES, initializer=os.nice, initargs=(NICE,)) as pool:
        for name in SEEDS:
            record = simulate_record(name, pool)
            path = write_record(name, record)
            print(f"{path.name}: {len(record.entries)} circuits, {path.stat().st_size} bytes; {record.origin}")


def simulate_record(name: str, pool: Pool) -> Record:
    """Data sheets and circuits of one record."""
    devices = devices_of(name)
    sheets = {s.name: s for s in pool.map(sheet, devices.values())}
    drawn = draw_all(name, sheets.values())
    times = pool.map(_times_of, [(devices[x.device], x) for x in drawn], chunksize=4)
    entries = [Entry(x.device, x.overdrive, x.circuit, t) for x, t in zip(drawn, times, strict=True)]
    whole = tuple(e for e in entries if complete(e.times))
    origin = f"tests.reference.generate, seed {SEEDS[name]}, {len(whole)} of {COUNT} circuits work, {ngspice_version()}"
    return Record(origin, sheets, whole)


def devices_of(name: str) -> dict[str, Device]:
    """Devices of a record by name."""
    found = DEVICES if name == "record" else tuple(_strangers())
    return {d.name: d for d in found}


def _strangers() -> Iterable[Device]:
    """Random devices that look like couplers, told by their data sheets."""
    rng, found = np.random.default_rng(SEEDS["strangers"]), 0
    while found < STRANGERS:
        d = stranger(rng, f"stranger-{found + 1}")
        if looks_like_a_coupler(sheet(d)):
            found += 1
            yield d


def looks_like_a_coupler(s: Sheet) -> bool:
    """Whether a data sheet lies in the spans of CTR, gain and time constant."""
    tau = max(s.t_r, s.t_f) / math.log(9.0)
    return CTR[0] <= s.ctr <= CTR[1] and H_FE[0] <= s.h_fe <= H_FE[1] and TAU_100[0] <= tau <= TAU_100[1]


def draw_all(name: str, sheets: Iterable[Sheet]) -> list[Drawn]:
    """Circuits of every device in turn, the same for the same seed."""
    rng, every = np.random.default_rng(SEEDS[name]), list(sheets)
    return [draw(rng, every[k % len(every)]) for k in range(COUNT)]


def _times_of(job: tuple[Device, Drawn]) -> Times:
    return simulate_circuit(*job)


def simulate_circuit(d: Device, drawn: Drawn) -> Times:
    """Times of one circuit."""
    return pulse(d, drawn.circuit, guess=200e-6)


def complete(times: Times) -> bool:
    """Whether the output passes both thresholds; it need not have been deep in saturation to count."""
    return all(math.isfinite(getattr(times, f.name)) for f in fields(times) if f.name != "unsaturated")


if __name__ == "__main__":
    main()
