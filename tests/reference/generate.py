"""Make the records again: python -m tests.reference.generate [record | strangers | leaking ...].

The same seeds and the same ngspice give the same files.
"""

from __future__ import annotations

import math
import multiprocessing
import os
import sys
from collections.abc import Iterable
from dataclasses import fields, replace
from multiprocessing.pool import Pool

import numpy as np

from tests.reference.circuits import Drawn, draw, draw_leaking
from tests.reference.devices import DEVICES, Device, stranger
from tests.reference.record import EVERY, LEAKING, Entry, Record, write_record
from tests.reference.sheet import Sheet, dark_currents, sheet
from tests.reference.simulate import SimulationError, Times, ngspice_version, pulse

SEEDS = {"record": 20250611, "strangers": 20250612, LEAKING: 20261201}
COUNT, STRANGERS = 900, 20
PROCESSES, NICE = 2, 10
CTR, H_FE, TAU_100 = (0.45, 4.2), (140.0, 950.0), (0.9e-6, 5.2e-6)
"""Spans of CTR [1], gain [1] and time constant at 100 ohm [s] that a stranger must lie in to count as a coupler."""


NEVER = Times(*(math.nan for _ in fields(Times)))
"""Of a circuit whose output does not move, or never settles."""


def main(names: tuple[str, ...] = EVERY) -> None:
    """Simulate records and write them."""
    with multiprocessing.Pool(PROCESSES, initializer=os.nice, initargs=(NICE,)) as pool:
        for name in names:
            record = simulate_record(name, pool)
            path = write_record(name, record)
            print(f"{path.name}: {len(record.entries)} circuits, {path.stat().st_size} bytes; {record.origin}")


def simulate_record(name: str, pool: Pool) -> Record:
    """Data sheets and circuits of one record."""
    devices = devices_of(name)
    sheets = {s.name: s for s in pool.map(sheet, devices.values())}
    drawn = draw_all(name, sheets.values())
    times = pool.map(_times_of, [(devices[x.device], x) for x in drawn], chunksize=4)
    entries = tuple(Entry(x.device, x.overdrive, x.circuit, t) for x, t in zip(drawn, times, strict=True))
    working = tuple(e for e in entries if complete(e.times))
    kept = with_dark_currents(entries, devices) if name == LEAKING else working
    work = f"{len(working)} of {COUNT} circuits work"
    return Record(f"tests.reference.generate, seed {SEEDS[name]}, {work}, {ngspice_version()}", sheets, kept)


def with_dark_currents(entries: tuple[Entry, ...], devices: dict[str, Device]) -> tuple[Entry, ...]:
    """The same with what a data sheet would state as the dark current."""
    stated = {
        name: iter(dark_currents(d, np.array([e.circuit.i_dark for e in entries if e.device == name])).tolist())
        for name, d in devices.items()
    }
    return tuple(replace(e, i_ceo=next(stated[e.device])) for e in entries)


def devices_of(name: str) -> dict[str, Device]:
    """Devices of a record by name."""
    found = [*(DEVICES if name != "strangers" else ()), *(_strangers() if name != "record" else ())]
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
    one = draw_leaking if name == LEAKING else draw
    return [one(rng, every[k % len(every)]) for k in range(COUNT)]


def _times_of(job: tuple[Device, Drawn]) -> Times:
    return simulate_circuit(*job)


def simulate_circuit(d: Device, drawn: Drawn) -> Times:
    """Times of one circuit; those of one in which something is left in the dark may all be nan."""
    circuit = drawn.circuit
    try:
        return pulse(d, circuit, guess=200e-6)
    except SimulationError:
        if circuit.i_off > 0 or circuit.i_dark > 0:
            return NEVER
        raise


def complete(times: Times) -> bool:
    """Whether the output passes both thresholds; it need not have been deep in saturation to count."""
    return all(math.isfinite(getattr(times, f.name)) for f in fields(times) if f.name != "unsaturated")


if __name__ == "__main__":
    main(tuple(sys.argv[1:]) or EVERY)
