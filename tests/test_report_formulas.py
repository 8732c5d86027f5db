"""The formulas a report prints are those the program computes: each is evaluated and compared with its function."""

from __future__ import annotations

import ast
import re
import tomllib
from dataclasses import replace
from importlib import import_module, resources

import numpy as np
import pytest
import report_samples as samples
from scipy.constants import Boltzmann, elementary_charge

from optopick.coupler import Ageing, Kind, Led, Logic, Rating, Transfer
from optopick.physics.charge import J_V_BE, M_J, V_J, Base, Load, base_charge, base_voltage, junction_charge
from optopick.physics.leakage import V_EARLY, V_SHEET
from optopick.physics.led import forward_voltage, thermal_voltage
from optopick.physics.saturation import saturation_shape
from optopick.physics.switching import Cut, Steps
from optopick.physics.transfer import led_current_for, relative_ctr
from optopick.report.formulas import Formula, all_formulas, formulas_for

LED = Led(1.1, 1.2, 1.4, 10e-3, 1.8, 3.0, -1.5e-3, Rating(60e-3, 60, 1e-3), Rating(0.1, 60, 1e-3), 5.0)
TRANSFER = Transfer(0.5, 1.5, 5e-3, (1e-3, 5e-3, 20e-3), (0.7, 1.0, 0.9), (-40.0, 100.0), (0.8, 0.7), -0.005)
LOGIC = Logic(1e-3, 1e-4, 0.4, 13e-3, 1e-5, 5e-3, 4.5, 20, 5e-7, 6e-7, 5e-8, 4e-8, 350.0, 15e-12, 8e-12)
AGEING = Ageing(0.1, 1000.0, 20e-3, 85.0, 2.0, 0.43)
BASE = Base(8e-9, 9e-12, 10e-12, 0.65, 2e-3)
LOAD = Load(1e-3, 5.0, 4.7, 4700.0, 50e-12, 61.0)
ONE_STEP = Steps(
    tau=np.array([9e-6]),
    i_low=np.array([2e-4]),
    i_high=np.array([9e-4]),
    hold=np.array([0.95]),
    least=np.array([1e-7]),
    lag=np.asarray(3e-14),
)

SYMBOLS = {
    **{"value": 4700.0, "tolerance": 0.01, "drift": 1e-4, "t": 61.0, "k": Boltzmann, "q": elementary_charge},
    **{"v_f_ref": 1.2, "i_f": 4e-3, "i_ref": LED.i_ref, "r_s": LED.r_s, "v_f_tc": LED.v_f_tc},
    **{"r_led": 560.0, "r_shunt": 2200.0, "v": 5.0, "v_f": 1.17, "v_t": float(thermal_voltage(61.0))},
    **{"i": 6e-3, "e_a": 0.43, "k_ev": Boltzmann / elementary_charge, "t_ref": 85.0},
    **{"life": 87660.0, "lit": 0.4, "ctr": 0.8, "h": 0.9, "i_eff": 3e-3, "eta": 2e-3, "v_be": 0.65, "r_be": 150e3},
    **{"v_cc": 15.0, "v_ce": 0.3, "r_load": 4700.0, "i_input": 1e-4, "v_ce_sat": 0.25, "beta_r": 5.0, "h_fe": 300.0},
    **{
        "overdrive": 1.6,
        "i_1": 50e-9,
        "i_2": 20e-6,
        "t_1": 25.0,
        "t_2": 100.0,
        "i_ceo": 2e-6,
        "i_dark": 3e-5,
        "i_rest": 5e-5,
    },
    **{"c_load": 50e-12, "tau": 9e-6, "i_be": 4e-4, "i_sat": 9e-4, "i_a": 2e-4, "i_b": 9e-4, "hold": 0.95, "n": 2.6e-3},
    **{"tau_s": 12e-6, "fraction": 0.7, "slope": 2e-3, "above": 25.0, "power": 0.25, "least": 1e-7, "lag": 3e-14},
    **{"v_sheet": V_SHEET, "v_early": V_EARLY},
    **{"j": 3e-4, "j_v_be": J_V_BE, "v_j": V_J, "m_j": M_J, "c_0": BASE.c_cb, "x": 0.4, "charge": 2e-11},
    **{"transit": BASE.transit, "c_be": BASE.c_be, "j_s": LOAD.j_s},
    **{"loss": AGEING.loss, "time": AGEING.time, "t_plh": LOGIC.t_plh, "t_r": LOGIC.t_r, "c_out": LOGIC.c_out},
    **{"r_l": LOGIC.r_l, "c_l": LOGIC.c_l, "i_ol": LOGIC.i_ol},
}

FUNCTIONS = {"ln": np.log, "exp": np.exp, "max": max, "min": min, "abs": abs}


def python_of(text: str) -> str:
    """A printed expression as Python: times, minus, power, outer brackets, absolute value."""
    text = text.replace("·", "*").replace("−", "-").replace("^", "**").replace("[", "(").replace("]", ")")
    return re.sub(r"\|([^|]+)\|", r"abs(\1)", text)


def sides(formula: Formula) -> tuple[str, str]:
    left, _, right = formula.formula.partition(" = ")
    return python_of(left), python_of(right)


def names_in(expression: str) -> set[str]:
    return {node.id for node in ast.walk(ast.parse(expression, mode="eval")) if isinstance(node, ast.Name)}


def value_of(expression: str, **also: float) -> float:
    return float(eval(expression, {"__builtins__": {}}, {**FUNCTIONS, **SYMBOLS, **also}))


def function_of(formula: Formula):
    module, _, name = formula.function.rpartition(".")
    return getattr(import_module(module), name)


# What each function is called with, where its arguments are not simply the symbols by their names.
S = SYMBOLS
CALLS = {
    "forward_voltage": lambda f: f(LED, S["v_f_ref"], S["i_f"], S["t"]),
    "acceleration_factor": lambda f: f(S["i"], S["i_ref"], S["t"], S["t_ref"], 2.0, S["e_a"]),
    "base_voltage": lambda f: f(BASE, S["j"], S["t"]),
    "junction_charge": lambda f: f(S["c_0"], S["v"]),
    "base_charge": lambda f: f(BASE, LOAD, S["x"]),
    "steps": lambda f: f(BASE, LOAD, TRANSFER, 0.9, Cut(0.1, 0.9, 1)).tau[0],
    "time_on": lambda f: f(ONE_STEP, S["n"]),
    "time_off": lambda f: f(ONE_STEP, S["i_be"], S["i_rest"]),
    "crossing_on": lambda f: f(ONE_STEP, S["n"]),
    "light_left": lambda f: f(AGEING, S["i"], S["t"], S["life"], S["lit"]),
    "collector_current": lambda f: f(TRANSFER, S["ctr"], S["h"], S["i_eff"]),
    "v_ce_on": lambda f: f(S["v_ce_sat"], 3.0, S["overdrive"], S["h_fe"], S["beta_r"], S["t"]),
    "dark_current_held": lambda f: f(S["i_ceo"], S["eta"] * S["i_dark"], 10e3),
    "resistor_span": lambda f: f(S["value"], S["tolerance"], S["drift"], S["t"])[1],
    "derated": lambda f: f(Rating(S["value"], S["above"], S["slope"]), S["t"]),
    "extra_rc": lambda f: f(LOGIC, S["r_load"], S["c_load"]),
    "rise_delay": lambda f: f(LOGIC, S["r_load"], S["c_load"], S["fraction"]),
    "rise_edge": lambda f: f(LOGIC, S["r_load"], S["c_load"]),
    "discharge": lambda f: f(LOGIC, S["v_cc"], S["c_load"]),
}

# Symbols that stand for what another function gives.
ALSO = {
    "forward_voltage": lambda: {"n": LED.n},
    "acceleration_factor": lambda: {"n": 2.0},
    "base_charge": lambda: _junction_at(S["x"]),
    "steps": lambda: _ends_of_step(0.1, 0.9),
    "crossing_on": lambda: {"t_on": value_of("tau*ln((n - i_a)/(n - i_b))")},
    "light_left": lambda: {"af": value_of(python_of("(i/20e-3)**2*exp(e_a/k_ev*(1/(85 + 273.15) - 1/(t + 273.15)))"))},
    "collector_current": lambda: {"g": float(relative_ctr(TRANSFER, S["i_eff"]))},
    "v_ce_on": lambda: {"shape_sheet": float(saturation_shape(3.0, S["h_fe"], S["beta_r"]))},
    "rise_delay": lambda: {"rc": value_of("r_load*(c_load + c_out) - r_l*(c_l + c_out)")},
    "rise_edge": lambda: {"rc": value_of("r_load*(c_load + c_out) - r_l*(c_l + c_out)")},
}


def _junction_at(x: float) -> dict[str, float]:
    v_b = float(base_voltage(BASE, x * LOAD.j_s, LOAD.t))
    rest, now = (float(junction_charge(BASE.c_cb, v)) for v in (LOAD.v_cc, LOAD.v_cc - x * LOAD.swing - v_b))
    return {"v_b": v_b, "q_rest": rest, "q_now": now}


def _ends_of_step(a: float, b: float) -> dict[str, float]:
    """Charges and LED currents at two shares of the swing."""
    ends = {"a": a, "b": b}
    charges = {f"q_{end}": float(base_charge(BASE, LOAD, x)) for end, x in ends.items()}
    return charges | {f"i_{end}": float(led_current_for(TRANSFER, 0.9, 1.0, x * LOAD.j_s)) for end, x in ends.items()}


@pytest.mark.parametrize("formula", all_formulas(), ids=lambda formula: formula.name)
def test_formula_is_the_function(formula):
    function, name = function_of(formula), formula.function.rpartition(".")[2]
    also = ALSO.get(name, dict)()
    _, right = sides(formula)
    if name == "led_current":
        _check_led_equation(formula, function)
        return
    call = CALLS.get(name)
    computed = call(function) if call else function(**{key: S[key] for key in _arguments(function)})
    assert value_of(right, **also) == pytest.approx(float(computed), rel=1e-12)


def _arguments(function) -> list[str]:
    return [name for name in function.__code__.co_varnames[: function.__code__.co_argcount] if name in S]


def _check_led_equation(formula: Formula, function) -> None:
    """The equation holds at the current that the function solves it for."""
    i_f = float(function(LED, S["v_f_ref"], S["v"], S["r_led"], S["t"], S["r_shunt"]))
    v_f = float(forward_voltage(LED, S["v_f_ref"], i_f, S["t"]))
    left, right = sides(formula)
    assert value_of(right, i_f=i_f, v_f=v_f) == pytest.approx(value_of(left), rel=1e-9)


@pytest.mark.parametrize("formula", all_formulas(), ids=lambda formula: formula.name)
def test_every_symbol_is_explained(formula):
    """Each symbol of the right side has its meaning, and no meaning is without its symbol."""
    left, right = sides(formula)
    used = names_in(right) - set(FUNCTIONS)
    explained = [symbol for symbol, _ in formula.symbols]
    assert len(explained) == len(set(explained))
    assert set(explained) - names_in(left) <= used
    assert used <= set(explained) | names_in(left) | _explained_in_words(formula)
    assert formula.source
    assert not formula.source.endswith(".")


def _explained_in_words(formula: Formula) -> set[str]:
    """Symbols named within the meaning of another."""
    return {word for _, meaning in formula.symbols for word in re.findall(r"\w+", meaning)}


def test_formulas_by_kind():
    """A logic output prints none of the transistor's formulas, and the other way round; a resistor's only with it."""
    _, coupler, design = samples.link()
    bare = replace(design, r_be=None, r_shunt=None)
    transistor = {formula.name for formula in formulas_for(coupler, design)}
    assert "Storage" in transistor
    assert "Light taken by the base-emitter resistor" in transistor
    assert "Light taken by the base-emitter resistor" not in {f.name for f in formulas_for(coupler, bare)}
    logic = {formula.name for formula in formulas_for(replace(coupler, kind=Kind.LOGIC), bare)}
    assert "Storage" not in logic
    assert "Discharge of further capacitance" in logic - transistor


def test_data_file_has_no_unknown_key():
    text = resources.files("optopick").joinpath("data/formulas.toml").read_text(encoding="utf-8")
    known = {"name", "formula", "symbols", "source", "function", "kinds", "needs"}
    for entry in tomllib.loads(text)["formula"]:
        assert set(entry) <= known
        assert set(entry.get("kinds", ())) <= {kind.value for kind in Kind}
        assert entry.get("needs", "r_be") in {"r_led", "r_load", "r_be", "r_shunt"}
