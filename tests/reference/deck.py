"""One optocoupler link as a SPICE deck: a step of light, the output transistor, and the resistors around it."""

from __future__ import annotations

from dataclasses import dataclass

from tests.reference.devices import Device

TEMPERATURE = 25.0
"""Junction temperature of every simulation [degC]."""

LED_EDGE = 10e-9
"""Rise and fall of the light [s]: far below every time constant of the output."""


@dataclass(frozen=True)
class Circuit:
    """What surrounds the output transistor.

    pulled_up: load from supply to collector, output at the collector; else from emitter to ground, output at the
    emitter. v_cc [V], r_load [ohm], r_be [ohm] or None where absent, c_load on the output [F], i_f: LED current [A].
    i_off: LED current left in the dark LED; i_dark: dark current into the base beyond the device's own [A].
    """

    pulled_up: bool
    v_cc: float
    r_load: float
    r_be: float | None
    c_load: float
    i_f: float
    i_off: float = 0.0
    i_dark: float = 0.0


@dataclass(frozen=True)
class Run:
    """How a deck is run: LED lit from `start` for `lit` seconds, then dark until `end` [s]; finer with `fineness`."""

    start: float
    lit: float
    end: float
    fineness: float = 1.0


def model_line(d: Device) -> str:
    """The .model statement of a device; the base-emitter junction graded as usual (0.75 V, 0.33)."""
    return (
        f".model q npn(is={d.i_s:g} bf={d.b_f:g} ise={d.i_se:g} ne={d.n_e:g} ikf={d.i_kf:g} br={d.b_r:g} "
        f"vaf={d.v_af:g} cje={d.c_je:g} vje=0.75 mje=0.33 cjc={d.c_jc:g} vjc={d.v_jc:g} mjc={d.m_jc:g} fc=0.5 "
        f"tf={d.t_f:g} tr={d.t_r:g} rb={d.r_b:g} rc={d.r_c:g})"
    )


def transistor_lines(d: Device) -> list[str]:
    """Transistor between nodes c, b, e with its dark current; light adds to the same junction, collector to base."""
    return [model_line(d), "q1 c b e q", f"icbo c b {d.i_cbo:g}"]


def output_lines(circuit: Circuit) -> list[str]:
    """Supply, load and base resistor; the output node is c or e."""
    lines = [f"vcc vcc 0 {circuit.v_cc:.6g}"]
    if circuit.pulled_up:
        lines += [f"rl vcc c {circuit.r_load:.6g}", "ve e 0 0", f"cl c 0 {circuit.c_load:.6g}"]
    else:
        lines += ["vc vcc c 0", f"rl e 0 {circuit.r_load:.6g}", f"cl e 0 {circuit.c_load:.6g}"]
    if circuit.r_be is not None:
        lines.append(f"rbe b e {circuit.r_be:.6g}")
    return lines


def output_node(circuit: Circuit) -> str:
    """Name of the node whose voltage is the output."""
    return "c" if circuit.pulled_up else "e"


def transient_deck(d: Device, circuit: Circuit, run: Run, raw: str) -> str:
    """A deck that writes output, base-emitter and collector-emitter voltage to the binary raw file `raw`."""
    step = run.end / (2000 * run.fineness)
    dark, lit = (f"{d.eta * i:.8g}" for i in (circuit.i_off, circuit.i_f))
    light = f"pulse({dark} {lit} {run.start:.6g} {LED_EDGE:g} {LED_EDGE:g} {run.lit:.8g} 1)"
    lines = [
        "optocoupler link",
        *transistor_lines(d),
        *output_lines(circuit),
        f"ilight c b {light}",
        *([f"idark c b {circuit.i_dark:.6g}"] if circuit.i_dark > 0 else []),
        f".options temp={TEMPERATURE:g} reltol={1e-4 / run.fineness:g} vntol=1e-7 abstol=1e-14 chgtol=1e-16 gmin=1e-15",
        f".save v({output_node(circuit)}) v(b) v(c) v(e)",
        ".control",
        "set filetype=binary",
        f"tran {step:.6g} {run.end:.8g} 0 {step:.6g}",
        f"write {raw}",
        "quit",
        ".endc",
        ".end",
    ]
    return "\n".join(lines) + "\n"
