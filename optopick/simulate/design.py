"""A design simulated: pulses at the corners that the formulas find worst, and a bit pattern at the brief's rate."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from optopick.brief import Brief
from optopick.coupler import Coupler
from optopick.result import Design
from optopick.simulate.corner import Corner, PulseTimes, closed_form, threshold_pair, typical_corner, worst_corners
from optopick.simulate.device import device_at, transistor_parts
from optopick.simulate.errors import NotSimulatedError
from optopick.simulate.measure import Boundary, boundaries, pulse_times
from optopick.simulate.transient import TOLERANCE, Phase, Run, circuit_at, run

PATTERN = "0001000010111011000111110100101"
"""Ones light the LED: single ones and zeros, and runs of up to five of each, in every order of their kind."""


@dataclass(frozen=True)
class Simulated:
    """One pulse at one corner.

    worst_for: those of corner.TIMES that the formulas find longest here. by_formula: their times, without guard.
    times: the simulated ones and `run` the waveforms, None where `reason` says why there are none.
    """

    corner: Corner
    worst_for: tuple[str, ...]
    by_formula: PulseTimes
    times: PulseTimes | None
    run: Run | None
    reason: str


@dataclass(frozen=True)
class Simulation:
    """Every pulse of a design: typical parts first, then the worst corners. guard: the brief's factor on times [1]."""

    design: Design
    guard: float
    pulses: tuple[Simulated, ...]
    reason: str

    @property
    def beyond(self) -> tuple[str, ...]:
        """Those times of which a worst corner simulates longer than the formula with its guard says."""
        return tuple(
            name
            for pulse in self.pulses
            for name in pulse.worst_for
            if pulse.times is not None
            and getattr(pulse.times, name) > self.guard * getattr(pulse.by_formula, name) * (1 + 1e-9)
        )


@dataclass(frozen=True)
class Pattern:
    """A bit pattern at one corner: the bits ("1" lights the LED), one bit's time [s], and every edge."""

    corner: Corner
    bits: str
    bit: float
    run: Run
    edges: tuple[Boundary, ...]

    @property
    def received(self) -> bool:
        """Whether the receiver saw every edge."""
        return all(edge.received < math.inf for edge in self.edges)

    @property
    def shift(self) -> float:
        """Largest less smallest delay of the edges [s]: how much a bit's length can change; infinite if one is lost."""
        delays = [edge.delay for edge in self.edges]
        return max(delays) - min(delays) if self.received else math.inf


def simulate_all(brief: Brief, coupler: Coupler, design: Design) -> Simulation:
    """Pulses of typical parts and at every corner at which the formulas find one of the times longest."""
    guard = brief.limits.timing_guard
    try:
        transistor_parts(coupler)
    except NotSimulatedError as error:
        return Simulation(design, guard, (), str(error))
    # one vertex is often the worst for several times: simulated once, named for all of them
    corners: dict[Corner, list[str]] = {typical_corner(brief, coupler, design): []}
    for name, corner in worst_corners(brief, coupler, design).items():
        same = next((c for c in corners if _same(c, corner)), corner)
        corners.setdefault(same, []).append(name)
    pulses = tuple(_simulated(brief, coupler, corner, tuple(names)) for corner, names in corners.items())
    return Simulation(design, guard, pulses, "")


def _same(one: Corner, other: Corner) -> bool:
    """Whether two corners are one in all but words."""
    return all(getattr(one, name) == getattr(other, name) for name in vars(one) if name != "words")


def _simulated(brief: Brief, coupler: Coupler, corner: Corner, names: tuple[str, ...]) -> Simulated:
    formula = closed_form(brief, coupler, corner)
    try:
        made = simulate_pulse(brief, coupler, corner)
    except NotSimulatedError as error:
        return Simulated(corner, names, formula, None, None, str(error))
    return Simulated(corner, names, formula, pulse_times(made, threshold_pair(brief, corner)), made, "")


def simulate_design(brief: Brief, coupler: Coupler, design: Design, corner: Corner | None = None) -> Simulated:
    """One pulse of a design at one corner, that of typical parts where none is given."""
    return _simulated(brief, coupler, corner or typical_corner(brief, coupler, design), ())


def simulate_pulse(brief: Brief, coupler: Coupler, corner: Corner, tolerance: float = TOLERANCE) -> Run:
    """The LED on until everything has settled, then dark until the output has.

    Raises NotSimulatedError where the model cannot stand for the link.
    """
    _check_light(coupler, corner)
    phases = (Phase(corner.i_f), Phase(corner.i_off))
    return run(device_at(coupler, corner), circuit_at(brief, corner), phases, corner.i_off, tolerance)


def simulate_pattern(brief: Brief, coupler: Coupler, corner: Corner, bits: str = PATTERN) -> Pattern:
    """A bit pattern at the brief's shortest pulse, from rest with the LED dark; the last bit lasts two more.

    bits: ones and zeros, a one lights the LED. Raises NotSimulatedError where the model cannot stand for the link.
    """
    _check_light(coupler, corner)
    bit = brief.signal.shortest_pulse
    # the last bit is held, so that its edge still arrives
    phases = [Phase(corner.i_f if lit else corner.i_off, count * bit) for lit, count in _runs(bits + bits[-1:] * 2)]
    made = run(device_at(coupler, corner), circuit_at(brief, corner), phases, corner.i_off)
    return Pattern(corner, bits, bit, made, boundaries(made, threshold_pair(brief, corner)))


def _runs(bits: str) -> Sequence[tuple[bool, int]]:
    """Equal bits in a row: lit or not, and how many."""
    found: list[tuple[bool, int]] = []
    for bit in bits:
        if found and found[-1][0] == (bit == "1"):
            found[-1] = (found[-1][0], found[-1][1] + 1)
        else:
            found.append((bit == "1", 1))
    return found


def _check_light(coupler: Coupler, corner: Corner) -> None:
    """The CTR curve must reach the LED current: it is not extrapolated upward."""
    transfer, _ = transistor_parts(coupler)
    if not corner.i_f * corner.left <= transfer.curve_i[-1] * (1 + 1e-9):
        raise NotSimulatedError(
            f"the LED current of {corner.i_f * 1e3:.3g} mA is beyond the CTR curve of {coupler.part}, "
            f"which ends at {transfer.curve_i[-1] * 1e3:.3g} mA"
        )
