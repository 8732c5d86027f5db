"""The output over time: two ordinary differential equations, integrated by a stiff solver.

The base has no way out but the base resistor, to the emitter: what flows into the collector comes out of the emitter at
every moment. A load between supply and collector and one between emitter and ground therefore see the same current, and
with the collector-emitter voltage v_ce as unknown both circuits have the same equations:

    C_be*dv_be/dt + (C_bc + C_x)*d(v_be - v_ce)/dt = photocurrent - base current - base to collector - v_be/r_be
    c_load*dv_ce/dt = (v_cc - v_ce)/r - collector current + C_bc*d(v_be - v_ce)/dt

with the capacitances of the charges in `device`: C_be to v_be, C_bc of the collector's charge to v_bc, C_x of the
emitter's charge to v_bc. The output is v_ce or v_cc - v_ce. The LED has no memory: its light follows the drive.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from scipy.integrate import LSODA, DenseOutput, OdeSolution
from scipy.optimize import brentq

from optopick.brief import Brief, OutputCircuit
from optopick.physics.types import Array
from optopick.simulate.corner import Corner
from optopick.simulate.device import Device
from optopick.simulate.errors import NotSimulatedError

TOLERANCE = 2e-6
"""Relative tolerance of the integration; a tenth of it in volts is the absolute one. Storage, which grows out of small
differences in voltage, is then right to 0.05 %, everything else to 0.01 %."""

SETTLED = 1e-3
"""A phase without an end is over when the output is within this share of the swing from where it heads, and ..."""

SETTLED_BASE = 0.01
"""... with the LED lit, both junctions are within this share of the thermal voltage."""

LONGEST = 1.0
"""A phase that is not settled by then [s], or after MOST_STEPS steps, never will be."""

MOST_STEPS = 20_000

MOST_LN = 60.0
"""Exponents are cut here: trial points of the solver may lie far beyond the solution."""


@dataclass(frozen=True)
class Circuit:
    """What surrounds the transistor.

    pulled_up: the output is the collector, else the emitter. v_cc [V]. r: load, the receiver's input beside it [ohm].
    r_be [ohm], infinite where absent; c_load on the output [F].
    """

    pulled_up: bool
    v_cc: float
    r: float
    r_be: float
    c_load: float


class Flows(NamedTuple):
    """Currents at one moment [A] and the capacitances behind them [F].

    transport: collector to emitter; base: base to emitter; reverse: base to collector; leak: through the base
    resistor; load: through the load. c_be, c_bc, c_x: see the module.
    """

    transport: float
    base: float
    reverse: float
    leak: float
    load: float
    c_be: float
    c_bc: float
    c_x: float


@dataclass(frozen=True)
class Phase:
    """The LED at one current i_f [A] for a time [s]; infinite: until the output has settled, and then exactly there."""

    i_f: float
    duration: float = math.inf


@dataclass(frozen=True)
class Stretch:
    """One phase as it was run: from t[0] to t[-1] [s], (v_be, v_ce) at each t [V], and in between by `solution`."""

    i_f: float
    i_photo: float
    t: Array
    states: Array
    solution: OdeSolution


@dataclass(frozen=True)
class Run:
    """What the output made of a drive waveform that began at rest at LED current `before` [A]."""

    device: Device
    circuit: Circuit
    before: float
    stretches: tuple[Stretch, ...]

    def output(self, v_ce: Array | float) -> Array:
        """Output voltage [V] at collector-emitter voltages [V]."""
        v = np.asarray(v_ce)
        return v if self.circuit.pulled_up else np.asarray(self.circuit.v_cc - v)


def input_resistance(brief: Brief, v_cc: float) -> float:
    """The receiver's input beside the load resistor [ohm], infinite where it takes nothing.

    As in the checks it adds to what the output must carry: its largest current at the full swing, in proportion to the
    swing.
    """
    output = brief.output
    pulled_up = output.circuit is OutputCircuit.PULL_UP
    i = max(output.input_leakage, output.input_current_low) if pulled_up else output.input_leakage
    return v_cc / i if i > 0 else math.inf


def circuit_at(brief: Brief, corner: Corner) -> Circuit:
    """The brief's output circuit with a corner's resistors and supply."""
    return Circuit(
        pulled_up=brief.output.circuit is OutputCircuit.PULL_UP,
        v_cc=corner.v_cc,
        r=1.0 / (1.0 / corner.r_load + 1.0 / input_resistance(brief, corner.v_cc)),
        r_be=corner.r_be,
        c_load=brief.output.capacitance,
    )


def flows_of(d: Device, c: Circuit) -> Callable[[float, float], Flows]:
    """Currents and capacitances as a function of v_be and v_ce [V]."""
    # bound once: this runs a thousand times a pulse
    ln_i_s, exp, law = math.log(d.i_s), math.exp, d.gain.at
    at_rest = exp(law(ln_i_s)[0])
    per_v_af, per_r_be = 1.0 / d.v_af, 1.0 / c.r_be

    def flows(v_be: float, v_ce: float) -> Flows:
        v_bc = v_be - v_ce + d.v_off
        ln_f = min(ln_i_s + v_be / d.v_t, MOST_LN)
        i_f, i_r = exp(ln_f), exp(min(ln_i_s + v_bc / d.v_t, MOST_LN))
        early = 1.0 - v_bc * per_v_af
        return Flows(
            transport=(i_f - i_r) * early,
            # less what the law gives at 0 V, where a junction must carry nothing: an open base would never rest
            base=exp(min(law(ln_f)[0], MOST_LN)) - at_rest,
            reverse=(i_r - d.i_s) / d.beta_r,
            leak=v_be * per_r_be,
            load=(c.v_cc - v_ce) / c.r,
            c_be=d.tau_f * i_f * early / d.v_t + d.emitter.capacitance(v_be),
            c_bc=d.tau_r * i_r / d.v_t + d.collector.capacitance(v_bc),
            c_x=-d.tau_f * i_f * per_v_af,
        )

    return flows


def surplus(f: Flows, i_photo: float) -> tuple[float, float]:
    """What the base gets more than it passes on, and the output node likewise [A]; both zero at rest."""
    return i_photo - f.base - f.reverse - f.leak, f.load - (i_photo + f.transport - f.reverse)


def slopes_of(d: Device, c: Circuit, i_photo: float) -> Callable[[float, Array], Array]:
    """d(v_be)/dt and d(v_ce)/dt [V/s] at constant light: the module's two equations solved for them."""
    flows, c_l = flows_of(d, c), c.c_load

    def slopes(_: float, state: Array) -> Array:
        # plain floats: numpy's would double the time of everything below
        f = flows(*state.tolist())
        base, node = surplus(f, i_photo)
        a, b, x = f.c_be, f.c_bc, f.c_x
        det = a * (b + c_l) + (b + x) * c_l
        return np.array((((b + c_l) * base + (b + x) * node) / det, (b * base + (a + b + x) * node) / det))

    return slopes


def at_rest(d: Device, c: Circuit, i_photo: float) -> tuple[float, float]:
    """v_be and v_ce [V] at which nothing moves any more.

    The output node's surplus falls as v_ce rises, and with v_ce set by it the base's falls as v_be rises: a bracketed
    root inside another. Both brackets reach to where a junction carries an ampere.
    """
    ampere = -d.v_t * math.log(d.i_s)
    flows, lowest = flows_of(d, c), d.v_off - ampere
    if c.v_cc <= max(d.v_off, 0.0):
        raise NotSimulatedError(f"a supply of {c.v_cc:.3g} V is below the voltage that the output keeps when on")

    def v_ce(v_be: float) -> float:
        return float(brentq(lambda v: surplus(flows(v_be, v), i_photo)[1], lowest, c.v_cc, xtol=1e-13))

    def base(v_be: float) -> float:
        return surplus(flows(v_be, v_ce(v_be)), i_photo)[0]

    # at 0 V the base only gets current, if only the junction's own; at one ampere it passes on more than light gives
    v_be = float(brentq(base, 0.0, ampere, xtol=1e-13))
    return v_be, v_ce(v_be)


def charges_of(d: Device) -> Callable[[float, float], tuple[float, float]]:
    """Charge between base and emitter, and between base and collector [C], as a function of v_be and v_ce [V]."""

    def charges(v_be: float, v_ce: float) -> tuple[float, float]:
        v_bc = v_be - v_ce + d.v_off
        i_f, i_r = d.i_s * math.exp(v_be / d.v_t), d.i_s * math.exp(v_bc / d.v_t)
        forward = d.tau_f * i_f * (1.0 - v_bc / d.v_af) + d.emitter.charge(v_be)
        return forward, d.tau_r * i_r + d.collector.charge(v_bc)

    return charges


def photocurrent(d: Device, i_f: float) -> float:
    """What the base gets [A] at LED current `i_f` [A]: light, and the dark current."""
    return d.eta * i_f + d.i_cbo


def run(d: Device, c: Circuit, phases: Sequence[Phase], before: float, tolerance: float = TOLERANCE) -> Run:
    """Integrate phase by phase from rest at LED current `before` [A].

    Raises NotSimulatedError where a phase without an end never settles.
    """
    state, t = at_rest(d, c, photocurrent(d, before)), 0.0
    stretches = []
    # each phase is started anew: no step of the solver spans a step of the light
    for phase in phases:
        stretch = _stretch(d, c, phase, state, t, tolerance)
        stretches.append(stretch)
        state, t = (float(stretch.states[-1, 0]), float(stretch.states[-1, 1])), float(stretch.t[-1])
    return Run(d, c, before, tuple(stretches))


def _stretch(d: Device, c: Circuit, phase: Phase, start: tuple[float, float], t: float, tolerance: float) -> Stretch:
    i_photo = photocurrent(d, phase.i_f)
    end = at_rest(d, c, i_photo)
    endless = math.isinf(phase.duration)
    settled = _settling(d, start, end) if endless else lambda state: False
    until = t + (LONGEST if endless else phase.duration)
    solver = LSODA(slopes_of(d, c, i_photo), t, np.array(start), until, rtol=tolerance, atol=tolerance / 10.0)
    ts, states = [t], [np.array(start)]
    between: list[DenseOutput[np.float64]] = []
    while ts[-1] < until and not settled(states[-1]):
        if solver.step() is not None or len(ts) > MOST_STEPS or (endless and solver.t >= until):
            raise NotSimulatedError("the output does not settle: the LED hardly lights")
        ts.append(float(solver.t))
        states.append(solver.y.copy())
        between.append(solver.dense_output())
    if endless:
        # the next phase begins at rest, not a thousandth short of it
        states[-1] = np.array(end)
    return Stretch(phase.i_f, i_photo, np.array(ts), np.array(states), OdeSolution(np.array(ts), between))


def _settling(d: Device, start: tuple[float, float], end: tuple[float, float]) -> Callable[[Array], bool]:
    near, base_near = SETTLED * abs(end[1] - start[1]), SETTLED_BASE * d.v_t
    # in the dark an open base loses its last charge over ages, long after the output has come to rest
    lit = end[0] > start[0]

    def settled(state: Array) -> bool:
        base, out = float(state[0]) - end[0], float(state[1]) - end[1]
        return abs(out) <= near and (not lit or (abs(base) <= base_near and abs(base - out) <= base_near))

    return settled
