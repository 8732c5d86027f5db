"""What is read from a run: edges, storage, delays, the edges of a bit pattern, and whether charge and energy add up."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
from scipy.optimize import brentq

from optopick.simulate.corner import PulseTimes
from optopick.simulate.transient import Circuit, Run, Stretch, charges_of, flows_of

EARLY, LATE = 0.1, 0.9
"""Shares of the swing between which an edge is measured [1]."""

NODES = 6
"""Points of Gauss's rule in each step of the solver."""

PIECES = 8
"""Pieces of each step over which stored energy is summed."""


def pulse_times(run: Run, thresholds: tuple[float, float]) -> PulseTimes:
    """Times of a run of two phases, on and off, both until settled; thresholds: the receiver's v_il and v_ih [V].

    The swing is that between the two states of rest. A threshold that rest is already beyond takes no time.
    """
    lit, dark = run.stretches
    v_rest, v_lit = float(lit.states[0, 1]), float(lit.states[-1, 1])
    early, late = (v_rest + share * (v_lit - v_rest) for share in (EARLY, LATE))
    to_on, to_off = _collector_thresholds(run.circuit, thresholds)
    storage = _falling_back(dark, late)
    return PulseTimes(
        edge_on=_minus(_reaching(lit, late), _reaching(lit, early)),
        edge_off=_minus(_falling_back(dark, early), storage),
        storage=storage,
        delay_on=_reaching(lit, to_on),
        delay_off=_falling_back(dark, to_off),
    )


def _minus(last: float, first: float) -> float:
    return last - first if math.isfinite(last) else math.inf


def _collector_thresholds(circuit: Circuit, thresholds: tuple[float, float]) -> tuple[float, float]:
    """Collector-emitter voltages [V] at which the receiver sees the LED lit, and dark."""
    v_il, v_ih = thresholds
    return (v_il, v_ih) if circuit.pulled_up else (circuit.v_cc - v_ih, circuit.v_cc - v_il)


def _reaching(stretch: Stretch, level: float) -> float:
    """Time from the start of a stretch until v_ce is down at `level` [s]."""
    return crossing(stretch, level, falling=True)


def _falling_back(stretch: Stretch, level: float) -> float:
    """Time from the start of a stretch until v_ce is up at `level` [s]."""
    return crossing(stretch, level, falling=False)


def crossing(stretch: Stretch, level: float, falling: bool) -> float:
    """Time from the start of a stretch until v_ce is at or beyond `level` [V] [s]; infinite where it never is."""
    # within a step the output is taken to move one way: the solver's steps are far shorter than an edge
    v = stretch.states[:, 1]
    beyond = np.flatnonzero(v <= level if falling else v >= level)
    if beyond.size == 0:
        return math.inf
    k = int(beyond[0])
    if k == 0:
        return 0.0
    return _root(stretch, level, k) - float(stretch.t[0])


def _root(stretch: Stretch, level: float, k: int) -> float:
    """When v_ce is at `level` [s], between the moments k - 1 and k."""

    def above(t: float) -> float:
        return float(stretch.solution(t)[1]) - level

    before, after = float(stretch.t[k - 1]), float(stretch.t[k])
    if above(before) * above(after) > 0:  # the last moment of a settled phase is moved to where it heads
        return after
    return float(brentq(above, before, after, xtol=1e-15))


@dataclass(frozen=True)
class Boundary:
    """One edge of a bit pattern: when the LED switched and when the receiver saw it [s]; infinite: never.

    lit: the LED goes on.
    """

    sent: float
    received: float
    lit: bool

    @property
    def delay(self) -> float:
        """From sent to received [s]."""
        return self.received - self.sent


def boundaries(run: Run, thresholds: tuple[float, float]) -> tuple[Boundary, ...]:
    """Every edge of a pattern, and when a receiver that keeps its state between its thresholds [V] saw it.

    An edge that the output does not follow before the LED switches back is never received.
    """
    to_on, to_off = _collector_thresholds(run.circuit, thresholds)
    sees_lit, i_f = float(run.stretches[0].states[0, 1]) <= to_on, run.before
    edges: list[Boundary] = []
    for stretch in run.stretches:
        if stretch.i_f != i_f:
            edges.append(Boundary(float(stretch.t[0]), math.inf, stretch.i_f > i_f))
            i_f = stretch.i_f
        for t in _flips(stretch, to_on, to_off, sees_lit):
            sees_lit = not sees_lit
            _mark(edges, t, sees_lit)
    return tuple(edges)


def _flips(stretch: Stretch, to_on: float, to_off: float, sees_lit: bool) -> Iterator[float]:
    """When the receiver changes its mind within a stretch [s]."""
    v, k = stretch.states[:, 1], 0
    while True:
        level = to_off if sees_lit else to_on
        beyond = np.flatnonzero(v[k:] >= level if sees_lit else v[k:] <= level)
        if beyond.size == 0:
            return
        k += int(beyond[0])
        yield _root(stretch, level, k) if k > 0 else float(stretch.t[0])
        sees_lit = not sees_lit


def _mark(edges: list[Boundary], t: float, lit: bool) -> None:
    """Note on the last edge of its kind that the receiver saw it at `t` [s]."""
    for k in reversed(range(len(edges))):
        if edges[k].lit == lit:
            edges[k] = replace(edges[k], received=t)
            return


@dataclass(frozen=True)
class Balance:
    """How well a run adds up, the worst of its stretches.

    charge: what flowed into the base against what is stored there, over the largest change of that store [1].
    energy: what the supply gave against what became heat and what is stored, over what it gave [1].
    """

    charge: float
    energy: float


@dataclass(frozen=True)
class Account:
    """Sums over one stretch: charge into the base and gained by its store [C]; energy given, lost and stored [J]."""

    into_base: float
    base_gained: float
    given: float
    lost: float
    stored: float


def balance(run: Run) -> Balance:
    """Add up a run."""
    accounts = [_account(run, stretch) for stretch in run.stretches]
    most = max(abs(a.base_gained) for a in accounts)
    return Balance(
        charge=max(abs(a.into_base - a.base_gained) for a in accounts) / most,
        energy=max(abs(a.given - a.lost - a.stored) / abs(a.given) for a in accounts),
    )


def _account(run: Run, stretch: Stretch) -> Account:
    """Sums over one stretch, from the solution alone: no slope of the equations enters, so a wrong one would show."""
    d, c = run.device, run.circuit
    into_base, charge_out, heat = _flowed(run, stretch)
    stored, gained = _stored(run, stretch)
    # by the solution, not by the states: the last state of a settled phase is moved to where it heads
    first, last = (float(stretch.solution(t)[1]) for t in (stretch.t[0], stretch.t[-1]))
    before, after = (float(v) for v in run.output(np.array([first, last])))
    node = c.c_load * (last - first)
    # an emitter load's capacitor is charged from the supply through the transistor, a pull-up's through the load
    given = c.v_cc * (charge_out - (0.0 if c.pulled_up else node))
    heat += d.v_off * (charge_out - node)
    return Account(into_base, gained, given, heat, stored + c.c_load * (after**2 - before**2) / 2.0)


def _flowed(run: Run, stretch: Stretch) -> tuple[float, float, float]:
    """Charge into the base and through the load [C], and heat but that of v_off [J], by Gauss's rule in each step."""
    d, c, flows = run.device, run.circuit, flows_of(run.device, run.circuit)
    node, weight = np.polynomial.legendre.leggauss(NODES)
    steps = np.diff(stretch.t)
    at = (stretch.t[:-1, None] + (node + 1.0) / 2.0 * steps[:, None]).ravel()
    share = (weight / 2.0 * steps[:, None]).ravel()
    rows = []
    for v_be, v_ce in stretch.solution(at).T:
        f, v_bc = flows(v_be, v_ce), v_be - v_ce + d.v_off
        # the light's source works against v_bc: it takes power while the junction is reversed, gives some in saturation
        in_transistor = f.transport * (v_ce - d.v_off) + f.base * v_be + (f.reverse - stretch.i_photo) * v_bc
        heat = in_transistor + f.leak * v_be + f.load * (c.v_cc - v_ce)
        rows.append((stretch.i_photo - f.base - f.reverse - f.leak, f.load, heat))
    into_base, charge_out, heat = share @ np.array(rows)
    return float(into_base), float(charge_out), float(heat)


def _stored(run: Run, stretch: Stretch) -> tuple[float, float]:
    """Energy that the transistor's charges took up [J] and the charge itself [C], summed over pieces of each step."""
    charges, v_off = charges_of(run.device), run.device.v_off
    steps = np.diff(stretch.t)
    at = np.append((stretch.t[:-1, None] + np.arange(PIECES) / PIECES * steps[:, None]).ravel(), stretch.t[-1])
    v_be, v_ce = stretch.solution(at)
    q = np.array([charges(float(b), float(v)) for b, v in zip(v_be, v_ce, strict=True)])
    v = np.column_stack([v_be, v_be - v_ce + v_off])
    energy = np.sum((v[1:] + v[:-1]) / 2.0 * np.diff(q, axis=0))
    return float(energy), float(np.sum(q[-1] - q[0]))
