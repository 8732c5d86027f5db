"""The circuit file: it runs in ngspice as it is, and measures what the simulation finds."""

from __future__ import annotations

import math
import re
import shutil
import subprocess
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import random_links

from optopick.brief import OutputCircuit
from optopick.cautions import FUNCTION_ONLY
from optopick.coupler import Assumed, Kind
from optopick.report.netlist import netlist
from optopick.result import Design
from optopick.simulate import NotSimulatedError, simulate_design, typical_corner, worst_corners

AGREE = 0.003
"""Both integrate the same equations. Left are the drive's edge of 1 ns, ngspice's steps and tolerance (RELTOL 1e-5) and
optopick's own. Measured at 150 random corners: within 0.2 % or 2 ns, wherever the output moves by more than 10 mV."""

EDGE = 2e-9
"""On top: what the drive's edge may shift [s]."""

needs_ngspice = pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed: decks not run")


def link(seed: int, circuit: OutputCircuit):
    rng = np.random.default_rng(seed)
    coupler, brief = random_links.coupler(rng), random_links.brief(rng, circuit=circuit)
    r_be = float(rng.choice([100e3, 470e3])) if seed % 2 else None
    r_shunt = 4700.0 if seed % 3 == 0 else None
    r_led = (brief.drive.supply.middle - 1.3) / 8e-3
    return brief, coupler, Design(coupler.part, r_led, float(rng.choice([1e3, 4.7e3, 22e3])), r_be, r_shunt)


def run_ngspice(deck: str, folder: Path) -> dict[str, float]:
    path = folder / "link.cir"
    path.write_text(deck, encoding="ascii")
    done = subprocess.run(
        ["ngspice", "-b", path.name], cwd=folder, capture_output=True, text=True, check=False, timeout=120
    )
    assert "rror" not in done.stdout + done.stderr, done.stdout[-800:] + done.stderr[-800:]
    return {name: float(value) for name, value in re.findall(r"^(\w+)\s+=\s+(\S+) targ", done.stdout, re.MULTILINE)}


@needs_ngspice
@pytest.mark.parametrize("circuit", list(OutputCircuit))
@pytest.mark.parametrize("seed", range(1, 7))
def test_ngspice_measures_what_is_simulated(seed, circuit, tmp_path):
    brief, coupler, design = link(seed, circuit)
    worst = worst_corners(brief, coupler, design)
    corners = {"typical": typical_corner(brief, coupler, design), "on": worst["delay_on"], "off": worst["delay_off"]}
    for name, corner in corners.items():
        times = vars(simulate_design(brief, coupler, design, corner).times)
        wanted = {k: t for k, t in times.items() if 0 < t < math.inf}
        found = run_ngspice(netlist(brief, coupler, design, corner), tmp_path)
        assert found.keys() == wanted.keys()
        for k, t in wanted.items():
            assert found[k] == pytest.approx(t, rel=AGREE, abs=EDGE), (name, k)


@needs_ngspice
def test_ngspice_runs_a_darlington(tmp_path):
    brief, coupler, design = link(1, OutputCircuit.PULL_UP)
    pair = replace(coupler.transistor, v_be=1.3, v_be_tc=-4e-3, v_ce_sat=0.9, h_fe=2e4)
    pair = replace(pair, tau_0=20e-6, c_m=30e-9, tau_s=60e-6)
    coupler, design = replace(coupler, kind=Kind.DARLINGTON, transistor=pair), replace(design, r_be=None)
    corner = typical_corner(brief, coupler, design)
    found = run_ngspice(netlist(brief, coupler, design, corner), tmp_path)
    wanted = simulate_design(brief, coupler, design, corner).times
    assert found["delay_off"] == pytest.approx(wanted.delay_off, rel=AGREE)
    assert found["edge_on"] == pytest.approx(wanted.edge_on, rel=AGREE, abs=EDGE)


def comments_of(deck: str) -> str:
    """Comment lines put back together."""
    lines = [line.lstrip("*- ") for line in deck.splitlines() if line.startswith("*")]
    return " ".join(" ".join(lines).split())


def test_the_deck_says_what_it_is_and_what_it_takes_for_granted():
    brief, coupler, design = link(2, OutputCircuit.PULL_UP)
    coupler = replace(coupler, assumed=(Assumed("RND-1", "c_be", "10 pF", "10 pF µΩ°\n.include evil"),))
    brief = replace(brief, title="Line one\n.end")
    corner = typical_corner(brief, coupler, design)
    deck = netlist(brief, coupler, design, corner)
    text = comments_of(deck)
    assert deck.startswith("* Line one .end: RND-1\n")
    assert deck.isascii()
    assert f"CAUTION: {FUNCTION_ONLY}" in text
    assert "c_be = 10 pF: 10 pF uohmdeg .include evil" in text
    assert "share node 0 here only because a simulator needs one reference" in text
    assert "typical parts, 25 degC" in text
    assert deck.count("\n.end\n") == 1
    assert not re.search(r"^\.include", deck, re.MULTILINE)
    assert max(map(len, (line for line in deck.splitlines() if line.startswith("*")))) <= 112


def lines_of(deck: str) -> dict[str, str]:
    return {line.split()[0]: line for line in deck.splitlines() if line and not line.startswith(("*", "+", "."))}


@pytest.mark.parametrize("circuit", list(OutputCircuit))
def test_the_deck_places_every_part(circuit):
    brief, coupler, design = link(3, circuit)
    brief = replace(brief, output=replace(brief.output, input_current_low=1e-4, input_leakage=1e-6))
    corner = replace(typical_corner(brief, coupler, design), dark=1.0)
    parts = lines_of(netlist(brief, coupler, replace(design, pieces=2, reverse_diode=True), corner))
    up = circuit is OutputCircuit.PULL_UP
    end, emitter = ("vcc", "0") if up else ("0", "out")
    assert parts["Rload"].split() == ["Rload", end, "out", f"{corner.r_load:.7g}"]
    assert parts["Rinput"].split()[1:3] == [end, "out"]
    assert float(parts["Rinput"].split()[3]) == pytest.approx(corner.v_cc / (1e-4 if up else 1e-6))
    assert parts["Rbe"].split() == ["Rbe", "base", emitter, f"{corner.r_be:.7g}"]
    assert parts["Rshunt"].split() == ["Rshunt", "anode", "0", f"{corner.r_shunt:.7g}"]
    assert parts["Qcore"].split() == ["Qcore", "inner", "base", emitter, "core"]
    assert parts["Voff"].split()[1] == ("out" if up else "vcc")
    assert float(parts["Idark"].split()[3]) > 0
    bare = lines_of(netlist(brief, coupler, replace(design, r_be=None), replace(corner, r_be=math.inf, dark=0.0)))
    assert "Rbe" not in bare
    assert "Idark" not in bare


def test_a_threshold_never_reached_is_said_instead_of_measured():
    brief, coupler, design = link(4, OutputCircuit.PULL_UP)
    corner = replace(typical_corner(brief, coupler, design), i_f=5e-6)
    deck = netlist(brief, coupler, design, corner)
    assert "* delay_on: the output never gets there" in deck
    assert ".meas tran delay_on" not in deck


def test_a_logic_output_has_no_deck():
    brief, coupler, design = link(2, OutputCircuit.PULL_UP)
    corner = typical_corner(brief, coupler, design)
    with pytest.raises(NotSimulatedError, match="logic output"):
        netlist(brief, replace(coupler, kind=Kind.LOGIC, transistor=None, transfer=None), design, corner)
