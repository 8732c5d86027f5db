"""A design as a circuit for circuit simulators: plain SPICE text, complete, with the measurements in it.

The transistor is the one of `optopick.simulate.device` at the same corner: its transport current, charges and junctions
as an NPN model, the base current of its gain law as a current source. Nothing in the text needs more than a diode, an
NPN with the usual parameters, independent and controlled sources, and functions exp, ln, abs, min and max.
"""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterable, Iterator
from dataclasses import dataclass

from scipy.constants import Boltzmann, elementary_charge, zero_Celsius

from optopick.brief import Brief
from optopick.cautions import cautions
from optopick.coupler import Coupler, Led
from optopick.physics.charge import J_V_BE
from optopick.physics.led import branch_current, forward_voltage
from optopick.report.words import rule_words
from optopick.result import Design
from optopick.simulate.corner import Corner, threshold_pair
from optopick.simulate.design import simulate_pulse
from optopick.simulate.device import Device, device_at
from optopick.simulate.junction import FORWARD_BEND
from optopick.simulate.measure import EARLY, LATE, pulse_times
from optopick.simulate.transient import Run, input_resistance

DRIVE_EDGE = 1e-9
"""Rise and fall of the drive [s]."""

FINENESS = 50
"""Steps at least within the shortest of the times measured, and ..."""

MOST_STEPS = 20_000
"""... at most over the whole run."""

LONGER = 1.6
"""The LED stays lit by this factor longer than optopick takes for settled: a simulator goes on from there."""

LEAST_LED_CURRENT = 1e-12
"""LED current that counts as none [A]."""

MOST_LN = 5.0
"""The base current source ends at exp of this [A]: a simulator's trial points may lie far off."""

WIDTH = 110

PLAIN = str.maketrans({"°": "deg", "µ": "u", "μ": "u", "Ω": "ohm", "≤": "<=", "≥": ">=", "·": "*", "–": "-", "−": "-"})


@dataclass(frozen=True)
class Scene:
    """What the parts of the text are written from."""

    brief: Brief
    coupler: Coupler
    design: Design
    corner: Corner
    device: Device
    run: Run

    @property
    def pulled_up(self) -> bool:
        """Whether the load is at the collector."""
        return self.run.circuit.pulled_up

    @property
    def nodes(self) -> tuple[str, str]:
        """Names of the collector's and the emitter's node."""
        return ("out", "0") if self.pulled_up else ("vcc", "out")


def netlist(brief: Brief, coupler: Coupler, design: Design, corner: Corner) -> str:
    """The circuit of a design at one corner as SPICE text, ready to run: one pulse and its five times.

    Raises NotSimulatedError where the transistor model cannot stand for the link, as `simulate_pulse` does.
    """
    scene = Scene(brief, coupler, design, corner, device_at(coupler, corner), simulate_pulse(brief, coupler, corner))
    parts = (_title, _comments, _led_side, _output_side, _transistor, _analysis, _measurements)
    lines = [line for part in parts for line in part(scene)]
    return "\n".join([*lines, ".end"]) + "\n"


def _title(s: Scene) -> Iterator[str]:
    yield _one_line(f"* {s.brief.title}: {s.coupler.part}")


def _comments(s: Scene) -> Iterator[str]:
    for caution in cautions(s.brief):
        yield from _comment(f"CAUTION: {caution}")
    yield from _comment(
        "The two sides share node 0 here only because a simulator needs one reference. On the board they are isolated."
    )
    yield from _comment(f"Corner: {s.corner.words}. All values below are those of this corner, at {s.corner.t:g} degC.")
    yield "*"
    yield "* How the models follow from the coupler table (no maker's model is used):"
    for rule in RULES:
        yield from _comment(rule, "* - ")
    assumed = s.coupler.assumed
    yield "*"
    yield "* Assumed, because the table does not say:" if assumed else "* The table left nothing to assume."
    for item in assumed:
        yield from _comment(f"{item.parameter} = {item.value}: {rule_words(item)}", "* - ")


RULES = (
    "LED: diode law through this unit's forward voltage at its test current, with emission coefficient and series "
    "resistance of the table, drift with temperature included.",
    "Light: base current per LED current (Flight) from CTR in the middle of the bin over gain, times light spread, "
    "temperature and ageing.",
    "Base current (Bbase): goes through every point of the CTR curve at this unit's CTR; ln of the current is a sum of "
    "straight stretches over v(b,e) with rounded bends.",
    "Qcore carries the collector current and stores the charge; its BF is as good as infinite, as Bbase is its base "
    "current.",
    "TF and CJC follow from the table's two switching rows, TR from the storage time of the saturated one, longer or "
    "shorter by this unit's spread.",
    "Voff: what the table's largest V_CE(sat) has above the saturation voltage of the junctions.",
    f"Taken from memory, not from the table: V_BE holds at {J_V_BE * 1e3:g} mA; built-in voltage and grading of the "
    "collector junction; no Early effect; no resistance in base, collector and emitter.",
    "A darlington is one transistor with two junctions in series (NF = 2).",
)


def _led_side(s: Scene) -> Iterator[str]:
    c, led = s.corner, s.coupler.led
    yield from ("", "* LED side: drive voltage less the driver's drop")
    low, high = _drive_levels(led, c)
    lit, dark = _durations(s.run)
    pulse = f"{_num(low)} {_num(high)} {_num(_before(s.run))} {_num(DRIVE_EDGE)} {_num(DRIVE_EDGE)} {_num(lit)}"
    yield f"Vdrive drive 0 PULSE({pulse} {_num(2 * (lit + dark))})"
    if s.design.pieces > 1:
        yield f"* {s.design.pieces} equal resistors in series"
    yield f"Rled drive anode {_num(c.r_led)}"
    if math.isfinite(c.r_shunt):
        yield f"Rshunt anode 0 {_num(c.r_shunt)}"
    if s.design.reverse_diode:
        yield "* the diode antiparallel to the LED carries nothing here and is left out"
    yield "Dled anode cathode led"
    yield "Vsense cathode 0 0"
    # TEMP and TNOM are the corner's, so that no simulator moves parameters by rules of its own
    n_v_t = led.n * _thermal(c.t)
    at_ref = c.v_f + led.v_f_tc * (c.t - 25.0) - led.r_s * led.i_ref
    yield f".model led D(IS={_num(led.i_ref * math.exp(-at_ref / n_v_t))} N={_num(led.n)} RS={_num(led.r_s)})"


def _thermal(t: float) -> float:
    return (t + zero_Celsius) * Boltzmann / elementary_charge


def _drive_levels(led: Led, c: Corner) -> tuple[float, float]:
    """Voltage at the LED resistor while dark, the one that leaves the LED its off current, and while lit [V]."""
    if c.i_off <= LEAST_LED_CURRENT:
        return 0.0, c.drive - c.drop
    # a leaking driver as a voltage: the LED's current in the dark is then the one optopick simulates with
    v_f = float(forward_voltage(led, c.v_f, c.i_off, c.t))
    return v_f + c.r_led * float(branch_current(c.i_off, v_f, c.r_shunt)), c.drive - c.drop


def _output_side(s: Scene) -> Iterator[str]:
    c, circuit = s.corner, s.run.circuit
    yield from ("", "* output side")
    yield f"Vcc vcc 0 {_num(c.v_cc)}"
    load_end = "vcc" if s.pulled_up else "0"
    yield f"Rload {load_end} out {_num(c.r_load)}"
    r_in = input_resistance(s.brief, c.v_cc)
    if math.isfinite(r_in):
        yield "* the receiver's input: its largest current at the full swing"
        yield f"Rinput {load_end} out {_num(r_in)}"
    if circuit.c_load > 0:
        yield f"Cload out 0 {_num(circuit.c_load)}"
    if math.isfinite(c.r_be):
        yield f"Rbe base {s.nodes[1]} {_num(c.r_be)}"


def _transistor(s: Scene) -> Iterator[str]:
    d, (collector, emitter) = s.device, s.nodes
    yield from ("", "* coupler, output side: inner is the collector behind Voff")
    yield f"Voff {collector} inner {_num(d.v_off)}"
    yield f"Flight inner base Vsense {_num(d.eta)}"
    if d.i_cbo > 0:
        yield f"Idark inner base {_num(d.i_cbo)}"
    yield f"Qcore inner base {emitter} core"
    n = d.v_t / _thermal(s.corner.t)
    yield f".model core NPN(IS={_num(d.i_s)} BF=1e15 NF={_num(n)} BR={_num(d.beta_r)} NR={_num(n)}"
    yield f"+ TF={_num(d.tau_f)} TR={_num(d.tau_r)} CJE={_num(d.emitter.c_0)} VJE={_num(d.emitter.v_j)} MJE=0"
    yield f"+ CJC={_num(d.collector.c_0)} VJC={_num(d.collector.v_j)} MJC={_num(d.collector.m)} FC={FORWARD_BEND})"
    yield from _base_source(d, emitter)


def _base_source(d: Device, emitter: str) -> Iterator[str]:
    """The gain law over the base-emitter voltage: knots and widths in volts."""
    law, ln_i_s = d.gain, math.log(d.i_s)
    v = f"V(base,{emitter})" if emitter != "0" else "V(base)"
    start = law.y_0 + law.slope * (ln_i_s - law.x_0)
    terms = [f"{_num(start)}+{_num(law.slope / d.v_t)}*{v}"]
    for knot, width, bend in zip(law.knots, law.widths, law.bends, strict=True):
        z = f"(({v}-({_num((knot - ln_i_s) * d.v_t)}))/{_num(width * d.v_t)})"
        terms.append(f"+({_num(bend * width)})*(max({z},0)+ln(1+exp(-abs({z}))))")
    at_rest = math.exp(law.at(ln_i_s)[0])
    # max and abs in place of a plain ln(1 + exp(z)), which overflows at a simulator's trial points
    yield f"Bbase base {emitter} I=exp(min({terms[0]}"
    for term in terms[1:]:
        yield f"+ {term}"
    yield f"+ ,{MOST_LN:g}))-{_num(at_rest)}"


def _before(run: Run) -> float:
    """Time before the pulse [s]."""
    return 0.02 * _durations(run)[0]


def _durations(run: Run) -> tuple[float, float]:
    """How long the LED is lit, and dark afterwards [s]: until everything has settled."""
    lit, dark = (float(stretch.t[-1] - stretch.t[0]) for stretch in run.stretches)
    return LONGER * lit, LONGER * dark


def _analysis(s: Scene) -> Iterator[str]:
    lit, dark = _durations(s.run)
    total = _before(s.run) + lit + dark
    times = vars(pulse_times(s.run, threshold_pair(s.brief, s.corner))).values()
    shortest = min(t for t in times if t > 0)
    step = max(min(shortest, total) / FINENESS, total / MOST_STEPS)
    yield ""
    # GMIN: the usual 1e-12 would feed an open base more than its own leakage
    yield f".options TEMP={_num(s.corner.t)} TNOM={_num(s.corner.t)}"
    yield ".options RELTOL=1e-5 ABSTOL=1e-14 VNTOL=1e-7 CHGTOL=1e-17 GMIN=1e-18"
    yield f".tran {_num(step)} {_num(total)} 0 {_num(step)}"
    yield ".save V(out) V(drive)"


def _measurements(s: Scene) -> Iterator[str]:
    """The five times. Their levels are numbers, from the states of rest that optopick computes for this circuit."""
    rest, on = (float(v) for v in s.run.output(s.run.stretches[0].states[[0, -1], 1]))
    early, late = (rest + share * (on - rest) for share in (EARLY, LATE))
    v_il, v_ih = threshold_pair(s.brief, s.corner)
    there, back = ("FALL", "RISE") if s.pulled_up else ("RISE", "FALL")
    to_on, to_off = (v_il, v_ih) if s.pulled_up else (v_ih, v_il)
    middle = sum(_drive_levels(s.coupler.led, s.corner)) / 2.0
    lights, darkens = (f"V(drive) VAL={_num(middle)} {way}=1" for way in ("RISE", "FALL"))
    yield ""
    yield f"* output dark {rest:.4g} V, lit {on:.4g} V; thresholds of the receiver {v_il:.4g} V and {v_ih:.4g} V"
    wanted = {
        "edge_on": (f"V(out) VAL={_num(early)} {there}=1", f"V(out) VAL={_num(late)} {there}=1"),
        "edge_off": (f"V(out) VAL={_num(late)} {back}=1", f"V(out) VAL={_num(early)} {back}=1"),
        "storage": (darkens, f"V(out) VAL={_num(late)} {back}=1"),
        "delay_on": (lights, f"V(out) VAL={_num(to_on)} {there}=1"),
        "delay_off": (darkens, f"V(out) VAL={_num(to_off)} {back}=1"),
    }
    # numbers, as not every simulator takes a measured level into another measurement
    for name, time in vars(pulse_times(s.run, (v_il, v_ih))).items():
        trigger, target = wanted[name]
        if math.isfinite(time) and time > 0:
            yield f".meas tran {name} TRIG {trigger} TARG {target}"
        else:
            yield f"* {name}: the output never gets there" if time > 0 else f"* {name}: the output is there already"


def _comment(text: str, start: str = "* ") -> Iterable[str]:
    return textwrap.wrap(_one_line(text), WIDTH, initial_indent=start, subsequent_indent="*   ")


def _one_line(text: str) -> str:
    """Text that cannot leave its comment line, in ASCII."""
    return " ".join(text.translate(PLAIN).encode("ascii", "replace").decode().split())


def _num(value: float) -> str:
    return f"{value:.7g}"
