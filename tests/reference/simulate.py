"""Run decks with ngspice and read edges, storage and delays from the waveforms."""

from __future__ import annotations

import re
import shutil
import subprocess
import tempfile
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import numpy.typing as npt

from tests.reference.deck import LED_EDGE, Circuit, Run, output_node, transient_deck
from tests.reference.devices import Device

Array = npt.NDArray[np.float64]

ON_THRESHOLD, OFF_THRESHOLD = 0.3, 0.7
"""Delays are read where the output has come down to 30 %, or up to 70 %, of the supply."""

SATURATED = 0.4
"""Forward voltage of the collector junction [V] above which the transistor counts as saturated."""

EDGE_SHARE = (0.1, 0.9)

FINENESS = 4.0
"""Of every recorded run; doubling it moves no time of a sample by 0.5 % (test_reference.py)."""


class SimulationError(Exception):
    """ngspice failed, or its waveform never settles."""


@dataclass(frozen=True)
class Wave:
    """Waveform: time [s], output, base-emitter and collector-emitter voltage [V]."""

    t: Array
    out: Array
    v_be: Array
    v_ce: Array


@dataclass(frozen=True)
class Times:
    """What is measured on one pulse [s].

    edge_on, edge_off: 10 to 90 % of the swing. storage: LED off until the output has moved 10 % of the swing.
    unsaturated: LED off until the transistor leaves saturation. delay_on, delay_off: LED edge to the threshold.
    fall_90: LED off until 90 % of the swing. rise_90: LED on until 90 % of the swing. v_rest, v_lit: output levels [V].
    v_ce: collector-emitter voltage while lit [V].
    """

    edge_on: float
    edge_off: float
    storage: float
    unsaturated: float
    delay_on: float
    delay_off: float
    rise_90: float
    fall_90: float
    v_rest: float
    v_lit: float
    v_ce: float
    v_be: float


def ngspice() -> str | None:
    """Path of the simulator, None where it is not installed."""
    return shutil.which("ngspice")


def ngspice_version() -> str:
    """The simulator's own words for its version, e.g. "ngspice-39"."""
    words = subprocess.run([_program(), "--version"], capture_output=True, text=True, check=True, timeout=60).stdout
    found = re.search(r"ngspice-\S+", words)
    if found is None:
        raise SimulationError(f"ngspice --version: no version in {words!r}")
    return found.group()


def _program() -> str:
    program = ngspice()
    if program is None:
        raise SimulationError("ngspice: not found on this machine")
    return program


def run_deck(deck: str, folder: Path) -> str:
    """Run a deck in `folder`, return what ngspice printed; raises SimulationError where it fails."""
    path = folder / "link.cir"
    path.write_text(deck)
    command = [_program(), "-b", path.name]
    done = subprocess.run(command, cwd=folder, capture_output=True, text=True, check=False, timeout=300)
    if "no such" in done.stderr.lower() or "aborted" in done.stderr.lower():
        raise SimulationError(done.stderr[-500:])
    return done.stdout


def read_raw(path: Path) -> dict[str, Array]:
    """Vectors of a binary raw file by name."""
    data = path.read_bytes()
    head, _, body = data.partition(b"Binary:\n")
    text = head.decode()
    names = [line.split()[1] for line in text.partition("Variables:\n")[2].splitlines() if line.strip()]
    values = np.frombuffer(body, dtype=np.float64).reshape(-1, len(names))
    return {name: values[:, k] for k, name in enumerate(names)}


def simulate(d: Device, circuit: Circuit, run: Run) -> Wave:
    """Waveform of one pulse."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        run_deck(transient_deck(d, circuit, run, "wave.raw"), folder)
        raw = folder / "wave.raw"
        if not raw.exists():
            raise SimulationError(f"{d.name}, {circuit}: no waveform")
        vectors = read_raw(raw)
    b, c, e = (vectors[f"v({node})"] for node in "bce")
    return Wave(vectors["time"], vectors[f"v({output_node(circuit)})"], b - e, c - e)


def crossing(t: Array, v: Array, level: float, after: float) -> float:
    """First time after `after` at which `v` crosses `level`, by linear interpolation; nan where it does not."""
    inside = np.flatnonzero(t >= after)
    if inside.size == 0:
        return float("nan")
    k0 = max(int(inside[0]) - 1, 0)
    side = v[k0:] > level
    hits = np.flatnonzero(side[1:] != side[0])
    if hits.size == 0:
        return float("nan")
    k = k0 + int(hits[0]) + 1
    share = (level - v[k - 1]) / (v[k] - v[k - 1])
    return float(t[k - 1] + share * (t[k] - t[k - 1]))


def measure(wave: Wave, circuit: Circuit, run: Run) -> Times:
    """Times of one pulse; nan where the waveform ends too early or the output never gets there."""
    dark = run.start + run.lit
    on, off = run.start + LED_EDGE / 2, dark + 1.5 * LED_EDGE
    v_rest, v_lit = (float(np.interp(at, wave.t, wave.out)) for at in (run.start, dark))
    early, late = (v_rest + share * (v_lit - v_rest) for share in EDGE_SHARE)
    low, high = ON_THRESHOLD * circuit.v_cc, OFF_THRESHOLD * circuit.v_cc
    to_on, to_off = (low, high) if circuit.pulled_up else (high, low)
    at = {
        "on_10": crossing(wave.t, wave.out, early, on) - on,
        "on_90": crossing(wave.t, wave.out, late, on) - on,
        "off_10": crossing(wave.t, wave.out, late, dark) - off,
        "off_90": crossing(wave.t, wave.out, early, dark) - off,
    }
    return Times(
        edge_on=at["on_90"] - at["on_10"],
        edge_off=at["off_90"] - at["off_10"],
        storage=at["off_10"],
        unsaturated=crossing(wave.t, wave.v_be - wave.v_ce, SATURATED, dark) - off,
        delay_on=crossing(wave.t, wave.out, to_on, on) - on,
        delay_off=crossing(wave.t, wave.out, to_off, dark) - off,
        rise_90=at["on_90"],
        fall_90=at["off_90"],
        v_rest=v_rest,
        v_lit=v_lit,
        v_ce=float(np.interp(dark, wave.t, wave.v_ce)),
        v_be=float(np.interp(dark, wave.t, wave.v_be)),
    )


def settled(wave: Wave, circuit: Circuit, run: Run) -> bool:
    """Whether output and base rested over the second half of the lit time, and the output is back at the end.

    Back: within 5 % of the swing, past every level that is read.
    """
    at = (run.start, run.start + run.lit / 2, run.start + run.lit)
    v_rest, v_half, v_lit = (float(v) for v in np.interp(at, wave.t, wave.out))
    _, b_half, b_lit = (float(v) for v in np.interp(at, wave.t, wave.v_be))
    swing = abs(v_lit - v_rest)
    return (
        swing > 0.01
        and abs(v_half - v_lit) < 2e-3 * swing
        and abs(b_half - b_lit) < 2e-4
        and abs(wave.out[-1] - v_rest) < 0.05 * swing
    )


def pulse(d: Device, circuit: Circuit, guess: float, fineness: float = FINENESS) -> Times:
    """Times of a pulse long enough to settle: the pulse starts at about `guess` [s] and doubles until it does."""
    for _ in range(14):
        run = Run(start=guess / 50, lit=guess, end=2.2 * guess, fineness=fineness)
        wave = simulate(d, circuit, run)
        if settled(wave, circuit, run):
            return measure(wave, circuit, run)
        guess *= 2.0
    raise SimulationError(f"{d.name}, {circuit}: not settled within {guess:g} s")
