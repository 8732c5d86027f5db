"""Random couplers and briefs, plausible enough that some have designs and some do not."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np

from optopick.brief import (
    Brief,
    CouplerChoice,
    Drive,
    DriveCircuit,
    Environment,
    Goal,
    GoalName,
    Isolation,
    Limits,
    Output,
    OutputCircuit,
    Position,
    Signal,
    Span,
    Stock,
)
from optopick.coupler import Ageing, Barrier, Coupler, Kind, Led, Logic, Rating, Transfer, Transistor
from optopick.eseries import series_values


def coupler(rng: np.random.Generator, part: str = "RND-1") -> Coupler:
    """A random phototransistor coupler."""
    aside = rng.spawn(1)[0]
    ctr_min = float(rng.choice([0.2, 0.5, 0.8, 1.0, 1.6]))
    ctr_max = ctr_min * float(rng.uniform(1.5, 4))
    h_fe = float(rng.uniform(150, 900))
    tau_100 = float(rng.uniform(0.8e-6, 2.5e-6))
    c_m = h_fe * float(rng.uniform(3e-12, 9e-12))
    v_f = float(rng.uniform(1.1, 1.3))
    curve_i = (0.2e-3, 1e-3, 5e-3, 10e-3, 40e-3)
    curve_g = (float(rng.uniform(0.3, 0.6)), float(rng.uniform(0.65, 0.85)), 1.0, 1.02, float(rng.uniform(0.7, 0.95)))
    curve_h = (float(rng.uniform(0.7, 1.0)), 1.0, float(rng.uniform(0.5, 0.8)))
    return Coupler(
        part=part,
        maker="Random",
        kind=Kind.PHOTOTRANSISTOR,
        base_pin=bool(rng.random() < 0.6),
        channels=1,
        led=Led(
            v_f - 0.1, v_f, v_f + 0.2, 10e-3, 2.0, 3.0, -1.5e-3, Rating(60e-3, 60, 1e-3), Rating(0.1, 60, 1.5e-3), 5.0
        ),
        p_out=Rating(0.15, 25, 1.5e-3),
        p_total=Rating(0.2, 25, 2e-3),
        barrier=Barrier(5000.0, 600.0, 7e-3, "invented"),
        ageing=Ageing(float(rng.uniform(0.05, 0.2)), 1000.0, 20e-3, 100.0, 2.0, 0.43),
        transfer=Transfer(ctr_min, ctr_max, 5e-3, curve_i, curve_g, (-40.0, 25.0, 100.0), curve_h, -0.005),
        transistor=Transistor(
            h_fe=h_fe,
            light_spread=float(rng.choice([1.0, 1.25, 1.5])),
            v_be=0.65,
            v_be_tc=-2e-3,
            v_be_spread=float(aside.choice([0.0, 0.05])),
            v_ce_sat=float(rng.uniform(0.2, 0.4)),
            sat_i_f=10e-3,
            sat_i_c=float(rng.uniform(0.5e-3, 1.5e-3)),
            beta_r=5.0,
            i_c_max=50e-3,
            v_ceo=float(rng.choice([30, 70])),
            i_ceo_1=50e-9,
            t_1=25.0,
            i_ceo_2=float(rng.uniform(5e-6, 50e-6)),
            t_2=100.0,
            c_be=10e-12,
            tau_0=tau_100 - 100 * c_m if tau_100 > 150 * c_m else tau_100 / 3,
            c_m=c_m,
            tau_s=float(rng.uniform(5e-6, 20e-6)),
            tau_s_spread=float(aside.choice([1.0, 1.5])),
        ),
        logic=None,
        price=None,
        sheet="invented",
        row=1,
        assumed=(),
    )


def position(series: str, low: float, high: float, absent: bool = False, tolerance: float = 0.01) -> Position:
    """A stock position from a series."""
    values = series_values(series, low, high)
    n = len(values)
    return Position(values, (tolerance,) * n, (0.25,) * n, (200.0,) * n, (None,) * n, absent, series)


def brief(rng: np.random.Generator, series: str = "E12", circuit: OutputCircuit | None = None) -> Brief:
    """A random brief over random spans of a series."""
    v_cc = float(rng.choice([3.3, 5.0, 12.0]))
    v_drive = float(rng.choice([3.3, 5.0, 12.0, 24.0]))
    circuit = circuit or OutputCircuit(str(rng.choice(["pull-up", "emitter-load"])))
    goals = list(GoalName)
    first, second = (goals[k] for k in rng.choice(4, 2, replace=False))

    def maybe(share: float, low: float, high: float) -> float | None:
        return float(np.exp(rng.uniform(np.log(low), np.log(high)))) if rng.random() < share else None

    centre = (v_drive - 1.3) / 5e-3
    shunt = position("E6", 470, 10e3, absent=bool(rng.random() < 0.5)) if rng.random() < 0.25 else None
    base = position(series, 47e3, 1e6, absent=bool(rng.random() < 0.5)) if rng.random() < 0.7 else None
    return Brief(
        title="random",
        signal=Signal(
            shortest_pulse=float(np.exp(rng.uniform(np.log(60e-6), np.log(3e-3)))), lit=float(rng.uniform(0.1, 0.9))
        ),
        drive=Drive(
            circuit=DriveCircuit.SOURCE,
            supply=Span(v_drive * 0.95, v_drive * 1.05),
            drop=Span(0.0, float(rng.uniform(0, 0.4))),
            max_current=maybe(0.5, 4e-3, 30e-3),
            off_leakage=float(rng.choice([0, 1e-6, 50e-6, 200e-6])),
        ),
        output=Output(
            circuit=circuit,
            supply=Span(v_cc * 0.95, v_cc * 1.05),
            v_il=Span(0.3 * v_cc * 0.95, 0.3 * v_cc * 1.05),
            v_ih=Span(0.7 * v_cc * 0.95, 0.7 * v_cc * 1.05),
            noise_margin=float(rng.choice([0, 0.1, 0.2])),
            input_leakage=1e-6,
            input_current_low=float(rng.choice([0, 100e-6])),
            capacitance=float(rng.choice([10e-12, 50e-12])),
        ),
        environment=Environment(
            Span(float(rng.choice([-40, -20, 0])), float(rng.choice([50, 70, 85]))), life=10 * 8766.0
        ),
        limits=Limits(
            ctr_margin=maybe(0.7, 1.05, 1.6),
            edge_time=maybe(0.3, 8e-6, 200e-6),
            delay=maybe(0.3, 20e-6, 200e-6),
            distortion=maybe(0.2, 10e-6, 100e-6),
            power=maybe(0.2, 10e-3, 200e-3),
            isolation=Isolation(),
            timing_guard=float(rng.choice([1.0, 1.3])),
        ),
        stock=Stock(
            drift=1e-4,
            r_led=position(series, centre / 4, centre * 4),
            r_load=position(series, 330, 33e3),
            r_be=base,
            r_shunt=shunt,
        ),
        couplers=CouplerChoice(Path("none.csv"), None, 1),
        goal=Goal(first, second, float(rng.choice([0.0, 0.02, 0.1]))),
    )


# ---- other kinds of coupler -----------------------------------------------------------------------------------------


def darlington(rng: np.random.Generator, part: str = "RND-D") -> Coupler:
    """A random photodarlington: two junctions, gain in the thousands, slow."""
    plain = coupler(rng, part)
    ctr_min = float(rng.choice([6.0, 10.0, 20.0]))
    h_fe = float(rng.uniform(3e3, 15e3))
    transit, c_cb = float(rng.uniform(2e-9, 7e-9)), float(rng.uniform(2e-12, 10e-12))
    curve_g = (float(rng.uniform(0.15, 0.4)), float(rng.uniform(0.6, 0.8)), 1.0, 1.1, float(rng.uniform(0.7, 0.9)))
    return replace(
        plain,
        kind=Kind.DARLINGTON,
        base_pin=bool(rng.random() < 0.3),
        transfer=Transfer(
            ctr_min=ctr_min,
            ctr_max=ctr_min * float(rng.uniform(1.8, 5)),
            i_ref=1e-3,
            curve_i=(0.05e-3, 0.3e-3, 1e-3, 3e-3, 20e-3),
            curve_g=curve_g,
            curve_t=plain.transfer.curve_t,
            curve_h=(float(rng.uniform(0.5, 0.8)), 1.0, float(rng.uniform(0.65, 0.95))),
            light_tc=-0.005,
        ),
        transistor=replace(
            plain.transistor,
            h_fe=h_fe,
            v_be=1.3,
            v_be_tc=-4e-3,
            v_ce_sat=float(rng.uniform(0.7, 1.1)),
            sat_i_f=5e-3,
            sat_i_c=float(rng.uniform(2e-3, 8e-3)),
            v_ceo=float(rng.choice([30, 60])),
            i_ceo_1=100e-9,
            i_ceo_2=float(rng.uniform(10e-6, 100e-6)),
            tau_0=h_fe * transit,
            c_m=h_fe * c_cb,
            tau_s=float(rng.uniform(15e-6, 60e-6)),
        ),
    )


def logic(rng: np.random.Generator, part: str = "RND-L") -> Coupler:
    """A random logic output with open collector."""
    i_f_on = float(rng.choice([0.5e-3, 1.6e-3, 3e-3, 5e-3]))
    v_cc_min, v_cc_max = ((3.0, 5.5), (4.5, 5.5), (4.5, 20.0), (2.7, 15.0))[int(rng.integers(4))]
    t_phl = float(np.exp(rng.uniform(np.log(50e-9), np.log(4e-6))))
    return replace(
        coupler(rng, part),
        kind=Kind.LOGIC,
        base_pin=False,
        p_out=Rating(0.2, 60, 3e-3),
        p_total=Rating(0.3, 60, 4e-3),
        ageing=Ageing(float(rng.uniform(0.03, 0.1)), 1000.0, 20e-3, 100.0, 2.0, 0.43),
        transfer=None,
        transistor=None,
        logic=Logic(
            i_f_on=i_f_on,
            i_f_off=i_f_on * float(rng.uniform(0.05, 0.2)),
            v_ol=float(rng.uniform(0.3, 0.6)),
            i_ol=float(rng.choice([4e-3, 8e-3, 16e-3])),
            i_oh=float(rng.choice([5e-6, 50e-6, 100e-6])),
            i_cc=float(rng.uniform(1e-3, 10e-3)),
            v_cc_min=v_cc_min,
            v_cc_max=v_cc_max,
            t_phl=t_phl,
            t_plh=t_phl * float(rng.uniform(0.9, 1.4)),
            t_r=float(rng.uniform(0.1, 0.6)) * t_phl,
            t_f=float(rng.uniform(0.1, 0.4)) * t_phl,
            r_l=float(rng.choice([280.0, 350.0, 1e3])),
            c_l=15e-12,
            c_out=float(rng.uniform(3e-12, 12e-12)),
        ),
    )


def mixed_couplers(rng: np.random.Generator) -> list[Coupler]:
    """One coupler of each kind, in random order."""
    made = [coupler(rng, "RND-1"), darlington(rng), logic(rng)]
    return [made[k] for k in rng.permutation(3)]


# ---- other drives ---------------------------------------------------------------------------------------------------


def sink_brief(rng: np.random.Generator, series: str = "E12", circuit: OutputCircuit | None = None) -> Brief:
    """A random brief whose pin lights the LED by pulling low."""
    drawn = brief(rng, series, circuit)
    return replace(drawn, drive=replace(drawn.drive, circuit=DriveCircuit.SINK))


def field_brief(rng: np.random.Generator, series: str = "E12", circuit: OutputCircuit | None = None) -> Brief:
    """A random brief whose LED is lit by a voltage from outside, which may leak when off and may be reversed."""
    drawn = brief(rng, series, circuit)
    off_current = float(rng.choice([0.0, 0.3e-3, 1e-3, 1.5e-3], p=[0.5, 0.2, 0.2, 0.1]))
    drive = Drive(
        circuit=DriveCircuit.FIELD,
        supply=Span(float(rng.choice([11.0, 15.0, 18.0])), float(rng.choice([28.8, 30.0]))),
        drop=Span(0.0, float(rng.choice([0.0, 1.0]))),
        max_current=float(rng.choice([15e-3, 30e-3])) if rng.random() < 0.6 else None,
        off_leakage=0.0,
        off_voltage=float(rng.choice([0.5, 1.0, 3.0, 5.0])),
        off_current=off_current,
        on_current_min=float(rng.choice([0.0, 2e-3])),
        reverse=float(rng.choice([0.0, 4.0, 30.0])),
        reverse_diode=bool(rng.random() < 0.8),
    )
    # without a shunt a contact that leaks, or that reads as off above the knee, lights the LED: mostly no design
    shunt = position("E12", 220, 3.3e3, absent=bool(rng.random() < 0.5)) if rng.random() < 0.85 else None
    # 30 V on a few kiloohms is more than one small resistor takes
    r_led = rated(position(series, 820, 10e3), float(rng.choice([0.25, 0.5, 1.0])), float(rng.choice([20.0, 200.0])))
    r_led = replace(r_led, pieces=int(rng.integers(1, 4)))
    slow = replace(drawn.signal, shortest_pulse=float(np.exp(rng.uniform(np.log(0.3e-3), np.log(20e-3)))))
    return replace(drawn, signal=slow, drive=drive, stock=replace(drawn.stock, r_led=r_led, r_shunt=shunt))


def rated(stock: Position, power: float, voltage: float) -> Position:
    """The same stock with other ratings: power [W], voltage [V]."""
    n = len(stock.values)
    return replace(stock, power=(power,) * n, voltage=(voltage,) * n)


def mixed_brief(rng: np.random.Generator, series: str = "E12") -> Brief:
    """A random brief of any drive and either output circuit, for couplers of every kind."""
    circuit = list(OutputCircuit)[int(rng.integers(2))]
    drawn = (brief, sink_brief, field_brief)[int(rng.integers(3))](rng, series, circuit)
    if drawn.drive.circuit is DriveCircuit.FIELD:
        # power is drawn for a few volts, distortion for one kind
        return replace(drawn, limits=replace(drawn.limits, power=None, distortion=None))
    # three couplers of three kinds hold more than one does: ask more
    return replace(drawn, signal=replace(drawn.signal, shortest_pulse=0.2 * drawn.signal.shortest_pulse))
