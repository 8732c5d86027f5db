"""Published worked examples as a user would try them: a small brief, a table of one part, and the command line.

The program judges at the corners of every span, where worked examples calculate with one value for each quantity. So
the briefs here have spans of zero width: one supply, 25 degC, resistors without tolerance or drift, an LED that does
not age, a CTR without spread or curve. Then the figures come out as printed. What is left is said beside each example;
a saturation voltage below 50 mV, which the table does not believe, is the most frequent.

READ: read in the source or in a copy of it; CALC: arithmetic on read numbers. The parts are invented.
"""

from __future__ import annotations

import csv
import json
from dataclasses import dataclass
from pathlib import Path

import pytest
from click.testing import CliRunner

from optopick.cli import main

ALL = {
    "part": "PLAIN1", "i_f_max": "100", "i_f_derate": "0", "v_r_max": "6", "p_led": "500", "p_led_derate": "0",
    "p_out": "500", "p_out_derate": "0", "p_total": "1000", "p_total_derate": "0", "led_n": "1", "led_r_s": "0",
    "v_f_tc": "0", "ctr_loss": "0", "channels": "1",
}  # fmt: skip
"""An LED without age, temperature or series resistance; its voltage is exact at v_f_at."""

TRANSISTOR = ALL | {
    "kind": "phototransistor", "base_pin": "yes", "ctr_at": "10", "ctr_curve": "0.001:1 100:1",
    "ctr_temperature": "-60:1 150:1", "light_tc": "0", "v_ce_sat": "0.05", "v_ce_sat_i_f": "20", "v_ce_sat_i_c": "1",
    "i_c_max": "500", "v_ceo": "100", "i_ceo": "0.001", "i_ceo_hot": "0.0001", "i_ceo_hot_t": "100", "h_fe_min": "300",
    "h_fe_max": "300", "v_be": "0.65", "v_be_tc": "0", "v_be_spread": "0", "sw_t_r": "2", "sw_t_f": "3",
    "tau_s_spread": "1",
}  # fmt: skip

LOGIC = ALL | {
    "kind": "logic", "base_pin": "no", "i_f_on": "2", "i_f_off": "0.4", "v_ol": "0.4", "i_ol": "16", "i_oh": "0.0001",
    "i_cc": "1", "v_cc_min": "3", "v_cc_max": "20", "t_phl": "500", "t_plh": "500",
}  # fmt: skip

LEVELS_TTL = {"v_il": "0.8 V", "v_ih": "2 V"}


def led(volts: float, milliamperes: float) -> dict[str, str]:
    """Cells of an LED of one forward voltage at one current."""
    return dict.fromkeys(("v_f_min", "v_f_typ", "v_f_max"), str(volts)) | {"v_f_at": str(milliamperes)}


def ctr(percent: float) -> dict[str, str]:
    """Cells of a CTR without spread."""
    return {"ctr_min": str(percent), "ctr_max": str(percent)}


@dataclass(frozen=True)
class Answer:
    """Exit code and JSON of a command."""

    code: int
    found: dict

    def __getitem__(self, name: str) -> dict:
        """The check of this name."""
        return next(check for check in self.found["checks"] if check["name"] == name)

    def passed(self, *names: str) -> bool:
        return all(self[name]["passed"] for name in names)

    def value(self, name: str) -> float:
        return self[name]["value"]

    @property
    def failing(self) -> set[str]:
        return {check["name"] for check in self.found["checks"] if not check["passed"]}


@dataclass(frozen=True)
class Bench:
    """A folder with one brief and one part."""

    folder: Path
    cells: dict[str, str]
    drive: dict
    output: dict
    limits: dict
    stock: dict

    def check(self, r_led: str, r_load: str, r_be: str | None = None, r_shunt: str | None = None) -> Answer:
        options = ["--coupler", "PLAIN1", "--r-led", r_led, "--r-load", r_load]
        options += [] if r_be is None else ["--r-be", r_be]
        options += [] if r_shunt is None else ["--r-shunt", r_shunt]
        return self._run("check", *options)

    def pick(self) -> Answer:
        return self._run("pick")

    def _run(self, command: str, *options: str) -> Answer:
        brief, table = self.folder / "link.toml", self.folder / "parts.csv"
        with table.open("w", newline="", encoding="utf-8") as file:
            writer = csv.DictWriter(file, self.cells)
            writer.writeheader()
            writer.writerow(self.cells)
        sections = {
            "signal": {"shortest_pulse": "1 s"},
            "drive": self.drive,
            "output": {"input_leakage": "0 A", "capacitance": "0 F"} | self.output,
            "environment": {"temperature": ["25 degC", "25 degC"], "life": "1000 h"},
            "limits": self.limits,
            "stock": {"tolerance": "0 %", "drift": "0 ppm/K"},
            **{f"stock.{name}": position for name, position in (STOCK | self.stock).items()},
            "couplers": {"table": "parts.csv"},
            "goal": {"minimize": "power"},
        }
        brief.write_text("".join(map(toml_section, sections, sections.values())), encoding="utf-8")
        ran = CliRunner().invoke(main, [command, str(brief), *options, "--json"])
        assert ran.exit_code in (0, 1), ran.output
        return Answer(ran.exit_code, json.loads(ran.stdout))


STOCK = {
    "r_led": {"values": ["1k"], "power": "5 W", "voltage": "500 V"},
    "r_load": {"values": ["1k"], "power": "5 W", "voltage": "500 V"},
}


def toml_section(name: str, keys: dict) -> str:
    """A section of a brief; JSON's strings, lists and truth values are TOML's too."""
    return f"[{name}]\n" + "".join(f"{key} = {json.dumps(value)}\n" for key, value in keys.items())


@pytest.fixture
def bench(tmp_path):
    """Make a bench: cells of the part, then sections of the brief that differ from 5 V all round."""

    def make(cells, drive=None, output=None, limits=None, stock=None) -> Bench:
        source = {"circuit": "source", "supply": "5 V"} if drive is None else drive
        receiver = {"circuit": "pull-up", "supply": "5 V"} | LEVELS_TTL | (output or {})
        return Bench(tmp_path, cells, source, receiver, limits or {}, stock or {})

    return make


# ---- LED current ----------------------------------------------------------------------------------------------------


def test_led_resistor(bench):
    """Fairchild AN-3001 (READ in a copy): 5 V, V_F 1.2 V, driver 0.4 V, 20 mA: 170 ohm."""
    drive = {"circuit": "source", "supply": "5 V", "drop": ["0.4 V", "0.4 V"]}
    found = bench(TRANSISTOR | led(1.2, 20) | ctr(100), drive).check("170", "1k")
    assert found.value("led_current") == pytest.approx(20e-3, rel=1e-9)


def test_current_loop(bench):
    """Three 220 ohm resistors at 5 V (READ, mailing list) and V_F 1.2 V: 5.76 mA (CALC); IEC 63035:2017 4.1 (READ in an
    extract): the receiver turns on with less than 5 mA."""
    receiver = LOGIC | led(1.2, 5.76) | {"i_f_on": "5"}
    found = bench(receiver).check("660", "1k")
    assert found.value("led_current") == pytest.approx(5.76e-3, rel=1e-3)
    assert found.passed("switching_current")
    assert found.value("switching_current") > found["switching_current"]["limit"] == 5e-3


def test_heat_of_a_led_resistor(bench):
    """Issue thread of an open hardware project (READ, CALC): 12 V, V_F 1.2 V, 1 kohm: 116 mW: too much for 100 mW,
    close for 125 mW; 1.5 kohm fits."""
    cells, drive = TRANSISTOR | led(1.2, 10.8) | ctr(100), {"circuit": "source", "supply": "12 V"}

    def rated(power, r_led):
        stock = {"r_led": {"values": [r_led], "power": power, "voltage": "500 V"}}
        return bench(cells, drive, stock=stock).check(r_led, "1k")

    assert rated("0.1 W", "1k").value("r_led_power") == pytest.approx(116e-3, rel=6e-3)
    assert not rated("0.1 W", "1k").passed("r_led_power")
    assert rated("0.125 W", "1k")["r_led_power"]["margin"] == pytest.approx(0.07, abs=0.01)
    assert rated("0.1 W", "1.5k").passed("r_led_power")


# ---- pull-up --------------------------------------------------------------------------------------------------------


def weak_link(bench, **stock):
    """The 3.3 V input of the question-and-answer thread: CTR 15 %, 12 V, V_F at most 1.7 V.

    The thread takes the saturated output as 0 V; the table begins at 50 mV, which on 1 kohm is 50 uA less of load. Let
    the input give just that.
    """
    output = {"supply": "3.3 V", "input_current_low": "50 uA"}
    drive = {"circuit": "source", "supply": "12 V"}
    cells = TRANSISTOR | led(1.7, 22) | ctr(15)
    return bench(cells, drive, output, {"ctr_margin": 1}, stock)


def test_pull_up_into_3_3_v(bench):
    """Question-and-answer thread (READ): 1 kohm needs 3.3 mA; CTR 15 %: 22 mA; from 12 V with V_F max 1.7 V at most
    468 ohm."""
    just = weak_link(bench).check("468", "1k")
    assert just.value("collector_current") == pytest.approx(3.3e-3, rel=1e-9)
    assert just.value("led_current") == pytest.approx(22e-3, rel=1e-3)
    assert just.value("ctr_margin") == pytest.approx(1.0, rel=1e-3)
    assert (just.code, just.failing) == (0, set())
    over = weak_link(bench).check("469", "1k")
    assert over.code == 1
    assert "ctr_margin" in over.failing


def test_the_largest_led_resistor_is_picked(bench):
    """The same thread the other way round: of the values around it, 468 ohm takes the least power."""
    values = ["450", "460", "467", "468", "469", "470", "480"]
    found = weak_link(bench, r_led={"values": values, "power": "5 W", "voltage": "500 V"}).pick()
    assert found.found["status"] == "optimal"
    assert found.found["design"]["r_led"] == 468


def test_pull_up_of_a_weak_bin(bench):
    """Question-and-answer thread on the CNY17-2 (READ): CTR at least 22 % at 1 mA into 5 V: pull-up at least 22.7 kohm;
    50 nA and 1 uA leakage drop about 0.1 V on 100 kohm.

    Again 50 mV of saturation voltage, 2.2 uA on 22.7 kohm, from the input.
    """
    cells = TRANSISTOR | led(1.2, 1) | ctr(22) | {"v_ce_sat_i_f": "1", "v_ce_sat_i_c": "0.1", "i_ceo": "50"}
    output = {"input_leakage": "1 uA", "input_current_low": "2.2 uA"}
    link = bench(cells | {"i_ceo_hot": "1"}, output=output, limits={"ctr_margin": 1})
    assert not link.check("3.8k", "22.6k").passed("ctr_margin")
    assert link.check("3.8k", "22.8k").passed("ctr_margin")
    assert 5.0 - link.check("3.8k", "100k").value("output_high") == pytest.approx(0.105, rel=1e-3)


@pytest.mark.parametrize(
    ("from_input", "too_small", "enough"), [("0 A", "1.67k", "1.68k"), ("50 uA", "1.70k", "1.71k")]
)
def test_smallest_load_resistor(bench, from_input, too_small, enough):
    """Vishay application note 45 (READ in a damaged copy): I_F 5 mA, CTR_sat 55 %, 5 V, 0.4 V: R_L at least 1.67 kohm,
    1.70 kohm with 50 uA from the input (1.673 and 1.704 kohm before rounding, CALC)."""
    cells = TRANSISTOR | led(1.2, 5) | ctr(55) | {"v_ce_sat": "0.4", "v_ce_sat_i_f": "5"}
    link = bench(cells, output={"input_current_low": from_input}, limits={"ctr_margin": 1})
    assert not link.check("760", too_small).passed("ctr_margin")
    assert link.check("760", enough).passed("ctr_margin")


def test_darlington_into_a_ttl_input(bench):
    """6N138 sheet (CALC): CTR at least 300 % at 1.6 mA gives 4.8 mA; a pull-up of 2.2 kohm and one TTL input, 1.6 mA,
    need 3.7 mA at an output of 0.4 V."""
    cells = TRANSISTOR | {"kind": "darlington", "base_pin": "no"} | led(1.4, 1.6) | ctr(300)
    cells |= {"ctr_at": "1.6", "v_ce_sat": "0.4", "v_ce_sat_i_f": "1.6", "v_ce_sat_i_c": "4", "v_be": "1.3"}
    link = bench(cells, output={"input_current_low": "1.6 mA"}, limits={"ctr_margin": 1.2})
    found = link.check("2.25k", "2.2k")
    assert found.value("led_current") == pytest.approx(1.6e-3, rel=1e-9)
    assert found.value("collector_current") == pytest.approx(3.7e-3, rel=5e-3)
    assert found.value("ctr_margin") == pytest.approx(4.8 / 3.69, rel=1e-3)
    assert found.code == 0


def test_ctr_times_led_limit_bounds_the_load(bench):
    """Common practice, no source: CTR 20 % with 60 mA in the LED is 12 mA at most, whatever the collector's rating."""
    cells = TRANSISTOR | led(1.2, 60) | ctr(20) | {"i_f_max": "60"}
    link = bench(cells)
    asks_more, asks_less = link.check("60", "390"), link.check("60", "430")
    assert asks_more.code == 1
    assert "deliverable_current" in asks_more.failing
    assert asks_more["deliverable_current"]["limit"] == pytest.approx(12e-3, rel=1e-9)
    assert asks_more.value("deliverable_current") == pytest.approx(4.95 / 390, rel=1e-9)
    assert asks_more.passed("collector_current")
    assert asks_less.passed("deliverable_current")


# ---- base resistor --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("v_be", ["0.65", "0.70"])
def test_base_resistor(bench, v_be):
    """Vishay application note 45 (READ in a damaged copy): I_F 5 mA, CTR_sat 55 %, CTR_CB 0.132 %, so h_FE 417; with
    R_L 3.3 kohm R_BE is at least about 200 to 215 kohm for V_BE 0.65 to 0.70 V, and the note uses 220 kohm."""
    cells = TRANSISTOR | led(1.2, 5) | ctr(55) | {"v_be": v_be, "ctr_cb": "0.132"}
    # V_CE(sat) 0.4 V at next to no overdrive, so that it holds wherever the output saturates at all
    cells |= {"ctr_at": "5", "v_ce_sat": "0.4", "v_ce_sat_i_f": "5", "v_ce_sat_i_c": "2.6"}
    link = bench(cells, limits={"ctr_margin": 1})
    used, less, none = (link.check("760", "3.3k", r_be) for r_be in ("220k", "180k", None))
    assert {a["parameter"]: a["value"] for a in used.found["assumed"]}["h_fe_typ"] == "417"
    assert (used.code, used.failing) == (0, set())
    assert less.code == 1
    # an output that never gets there is also late
    assert less.failing == {"ctr_margin", "output_low", "shortest_pulse"}
    assert none.value("ctr_margin") == pytest.approx(0.55 * 5 / (4.6 / 3.3), rel=1e-6)
    smallest = 200e3 if v_be == "0.65" else 215e3
    assert not link.check("760", "3.3k", f"{0.99 * smallest:.0f}").passed("ctr_margin")
    assert link.check("760", "3.3k", f"{1.01 * smallest:.0f}").passed("ctr_margin")


# ---- emitter resistor -----------------------------------------------------------------------------------------------


def ttl_emitter(bench, percent=50.0, **output):
    """16 mA of a TTL output into the LED; a TTL input, which gives 1.6 mA while it is held low, on the emitter."""
    drive = {"circuit": "sink", "supply": "5 V", "drop": ["0.4 V", "0.4 V"]}
    receiver = {"circuit": "emitter-load", "input_current_low": "1.6 mA"} | output
    return bench(TRANSISTOR | led(1.2, 16) | ctr(percent), drive, receiver)


def test_emitter_resistor_into_a_ttl_input(bench):
    """Vishay application note 02 (READ in a copy): R below V_IL/I_IL = 0.8 V/1.6 mA = 500 ohm; 16 mA at CTR 50 % are at
    most 8 mA, so R above 2 V/8 mA = 250 ohm; the note takes 390 ohm."""
    link = ttl_emitter(bench)
    assert (link.check("212.5", "390").code, link.check("212.5", "390").failing) == (0, set())
    assert link.check("212.5", "240").failing == {"output_high", "shortest_pulse"}  # never high is late too
    assert link.check("212.5", "510").failing == {"output_low"}
    assert link.check("212.5", "499").passed("output_low")
    assert not link.check("212.5", "501").passed("output_low")
    assert link.check("212.5", "251").passed("output_high")
    assert not link.check("212.5", "249").passed("output_high")


def test_the_low_input_current_is_what_bounds_the_emitter_resistor(bench):
    """Without it nothing in the brief asks for less than 500 ohm: a CMOS input leaves the resistor free."""
    assert ttl_emitter(bench, input_current_low="0 A").check("212.5", "510").code == 0


def test_emitter_current_for_a_safe_high_level(bench):
    """Vishay application note 02 (READ in a copy): with V_IH 2.4 V, 20 % of margin, 390 ohm need I_C above 6.15 mA: a
    CTR of 38.5 % at 16 mA (CALC)."""
    assert ttl_emitter(bench, 38.6, v_ih="2.4 V").check("212.5", "390").passed("output_high")
    assert not ttl_emitter(bench, 38.3, v_ih="2.4 V").check("212.5", "390").passed("output_high")
    assert ttl_emitter(bench, 32.5).check("212.5", "390").passed("output_high")


def test_emitter_resistors_of_the_note_are_those_that_pick_may_take(bench):
    """Of E24 between, 270 to 470 ohm hold; least power is the largest of them."""
    stock = {"r_led": {"values": ["212.5"]}, "r_load": {"series": "E24", "from": "200", "to": "620", "power": "1 W"}}
    link = Bench(**(vars(ttl_emitter(bench)) | {"stock": stock}))
    found = link.pick()
    assert (found.found["status"], found.found["design"]["r_load"]) == ("optimal", 470)


# ---- inputs from the field ------------------------------------------------------------------------------------------


def leaking_sensor(bench, leakage):
    """A 24 V input of 2.4 kohm that reads as off up to 3 V: 1.25 mA at 3 V, here those of an LED of 3 V.

    From 3 V on the bleeder, across the input, takes the rest of the leakage, as the shunt does across this LED.
    """
    cells = LOGIC | led(3, 1.25) | {"i_f_on": "2.5", "i_f_off": "1.25"}
    drive = {"circuit": "field", "on": ["20 V", "30 V"], "off_below": "0 V", "off_current": leakage}
    return bench(cells, drive)


@pytest.mark.parametrize(("leakage", "largest"), [(1.5, 12e3), (2.0, 4e3), (3.0, 7.2e3 / 4.2), (5.0, 800.0)])
def test_bleeder_of_a_leaking_sensor(bench, leakage, largest):
    """Two-wire sensor on a 24 V input, manual of a PLC maker (READ): above 1.3 mA of leakage a bleeder of
    R <= 7.2/(2.4*I - 3) kohm, I in mA. That is an input of 2.4 kohm held below 3 V (CALC)."""
    assert largest == pytest.approx(7.2e3 / (2.4 * leakage - 3.0))
    link = leaking_sensor(bench, f"{leakage} mA")
    assert not link.check("1k", "1k").passed("led_dark")
    assert link.check("1k", "1k", r_shunt=f"{0.99 * largest:.6g}").passed("led_dark")
    assert not link.check("1k", "1k", r_shunt=f"{1.01 * largest:.6g}").passed("led_dark")


def test_no_bleeder_below_the_limit(bench):
    """The same manual: none is needed up to 1.3 mA (1.25 mA before rounding, CALC)."""
    assert leaking_sensor(bench, "1.24 mA").check("1k", "1k").passed("led_dark")
    assert not leaking_sensor(bench, "1.3 mA").check("1k", "1k").passed("led_dark")


@pytest.mark.parametrize("kiloohms", [1.0, 2.2, 3.9])
def test_heat_of_a_bleeder(bench, kiloohms):
    """The same manual: W >= 2.3/R (W, kohm). That is four times 24 V squared over R (CALC): the resistor at a quarter
    of its rating. The program's shunt stands behind the series resistor and never sees 24 V; the resistor that does is
    the load resistor of a 24 V output."""
    stock = {"r_load": {"values": [f"{kiloohms}k"], "power": f"{2.3 / kiloohms:.6g} W", "voltage": "500 V"}}
    link = bench(TRANSISTOR | led(1.2, 10) | ctr(300), output={"supply": "24 V"}, stock=stock)
    found = link.check("380", f"{kiloohms}k")["r_load_power"]
    assert found["limit"] == pytest.approx(4 * found["value"], rel=3e-3)


def test_shunt_sets_the_threshold(bench):
    """Fairchild AN-3001 (READ in a copy): I_FT = V_F/R2 and R1 = (V_A - V_F)/I_FT light the LED from V_A on. With V_A
    10 V, I_FT 3 mA and V_F 1.2 V: R2 400 ohm, R1 2933 ohm (CALC). The LED counts as lit from 10 uA, which is 30 mV."""
    cells = LOGIC | led(1.2, 0.01) | {"i_f_off": "0.01"}

    def lit_at(volts):
        drive = {"circuit": "field", "on": ["20 V", "20 V"], "off_below": f"{volts} V"}
        return not bench(cells, drive).check("2933", "1k", r_shunt="400").passed("led_dark")

    assert not lit_at(9.9)
    assert not lit_at(10)
    assert lit_at(10.1)


# Lenze EDKLCMZ3024 p. 62, Siemens A5E00069467-07 4.6 (READ) for type 1; Beckhoff EP8601 page and TI SLVAG20 (READ) for
# the voltages of type 3; the rest of the table of IEC 61131-2 from memory. Least and largest resistor: CALC.
FIELD_INPUTS = [
    ("IEC 61131-2 type 1", 2e-3, 15e-3, 28.8 / 15e-3, 13.8 / 2e-3),
    ("IEC 61131-2 type 2", 6e-3, 30e-3, 28.8 / 30e-3, 9.8 / 6e-3),
    ("IEC 61131-2 type 3", 2e-3, 15e-3, 28.8 / 15e-3, 9.8 / 2e-3),
]


@pytest.mark.parametrize(("kind", "least", "most", "smallest", "largest"), FIELD_INPUTS)
def test_24_v_inputs(bench, kind, least, most, smallest, largest):
    """On from 15 or 11 V to 30 V, drawing 2 to 15 mA, or 6 to 30 mA: the series resistor, V_F 1.2 V at either end."""
    drive = {"circuit": "field", "type": kind}
    thin, thick = (bench(LOGIC | led(1.2, 1e3 * current), drive) for current in (least, most))
    assert thick.check(f"{1.001 * smallest:.6g}", "1k").passed("driver_current")
    assert not thick.check(f"{0.999 * smallest:.6g}", "1k").passed("driver_current")
    assert thin.check(f"{0.999 * largest:.6g}", "1k").passed("input_current")
    assert not thin.check(f"{1.001 * largest:.6g}", "1k").passed("input_current")
    found = thick.check(f"{smallest:.6g}", "1k")
    assert (found["driver_current"]["limit"], found["input_current"]["limit"]) == (most, least)


@pytest.mark.parametrize(("kind", "off_current"), [(1, 0.5e-3), (2, 2e-3), (3, 1.5e-3)])
def test_24_v_inputs_are_dark_when_off(bench, kind, off_current):
    """Off up to 5 V, and with what a contact may leak. The shunt that takes the leakage at the LED's knee, 1.2 V at
    0.4 mA, is the largest that holds (CALC): V_F/(I - 0.4 mA)."""
    link = bench(LOGIC | led(1.2, 0.4), {"circuit": "field", "type": f"IEC 61131-2 type {kind}"})
    by_leak = 1.2 / (off_current - 0.4e-3)
    by_5_v = 1.2 / ((5 - 1.2) / 1.5e3 - 0.4e-3)
    largest = min(by_leak, by_5_v)
    assert link.check("1.5k", "1k", r_shunt=f"{0.999 * largest:.6g}").passed("led_dark")
    assert not link.check("1.5k", "1k", r_shunt=f"{1.001 * largest:.6g}").passed("led_dark")


@pytest.mark.parametrize("kind", [1, 2, 3])
def test_24_v_inputs_can_be_designed(bench, kind):
    """Each type has a design from stock, proved, with every figure of its row among the checks."""
    stock = {
        "r_led": {"series": "E24", "from": "470", "to": "10k", "power": "1 W", "voltage": "200 V"},
        "r_load": {"values": ["1k", "2.2k"]},
        "r_shunt": {"series": "E24", "from": "100", "to": "10k"},
    }
    found = bench(LOGIC | led(1.2, 2), {"circuit": "field", "type": f"IEC 61131-2 type {kind}"}, stock=stock).pick()
    assert (found.code, found.found["status"]) == (0, "optimal")
    assert found.passed("driver_current", "input_current", "led_dark", "switching_current")
    assert found.found["design"]["r_shunt"] is not None


# ---- logic output ---------------------------------------------------------------------------------------------------


def test_logic_output_of_a_data_sheet(bench):
    """Vishay VOH1016 sheet (READ): I_F(on) at most 2.0 mA, I_F(off) at least 0.4 mA, V_OL at most 0.4 V at 16 mA. Hence
    from 5 V at least 287.5 ohm, and a leak of 0.4 mA leaves it off (CALC)."""
    cells, drive = LOGIC | led(1.2, 2), {"circuit": "source", "supply": "5 V", "off_leakage": "0.4 mA"}
    link = bench(cells, drive)
    assert link.check("1.9k", "288").passed("sink_current", "switching_current", "led_dark", "output_low")
    assert link.check("1.9k", "287").failing == {"sink_current"}
    assert link.check("1.91k", "288").failing == {"switching_current"}
    assert bench(cells, drive | {"off_leakage": "0.41 mA"}).check("1.9k", "288").failing == {"led_dark"}
