"""The records against ngspice, and how they are measured."""

from __future__ import annotations

import math
import secrets

import numpy as np
import pytest

from tests.reference.circuits import (
    BASE_MOST,
    I_C_MOST,
    LEFT,
    OVERDRIVE,
    R_LOAD,
    R_LOAD_LEAKING,
    V_CE,
    draw,
    led_current_for,
)
from tests.reference.deck import LED_EDGE, Circuit, Run, transient_deck
from tests.reference.devices import DEVICES
from tests.reference.generate import COUNT, STRANGERS, devices_of, draw_all
from tests.reference.record import EVERY, LEAKING, RECORDS, Record, read_record
from tests.reference.sheet import CURVE_I, dark_currents, sheet
from tests.reference.simulate import FINENESS, Times, Wave, crossing, measure, ngspice, pulse

TIMES = ("edge_on", "edge_off", "storage", "delay_on", "delay_off")
SAMPLE = 12
TOLERANCE = 0.01

needs_ngspice = pytest.mark.skipif(
    ngspice() is None, reason="ngspice is not installed: nothing simulated again, predictions use the record only"
)


@pytest.fixture(scope="module", params=EVERY)
def name(request: pytest.FixtureRequest) -> str:
    return str(request.param)


@pytest.fixture(scope="module")
def record(name: str) -> Record:
    return read_record(name)


def apart(one: Times, other: Times) -> dict[str, float]:
    """How far two measurements are apart [1], beyond the length of the light's own edge."""
    return {name: _apart(getattr(one, name), getattr(other, name)) for name in TIMES}


def _apart(one: float, other: float) -> float:
    if math.isnan(one) or math.isnan(other):
        return 0.0 if math.isnan(one) and math.isnan(other) else math.inf
    return max(abs(one - other) - LED_EDGE / 10, 0.0) / other


@needs_ngspice
def test_a_random_part_of_the_record_comes_out_again(name: str) -> None:
    seed = secrets.randbits(32)
    record, devices = read_record(name), devices_of(name)
    for k in np.random.default_rng(seed).choice(len(record.entries), SAMPLE // len(EVERY), replace=False):
        e = record.entries[k]
        found = apart(pulse(devices[e.device], e.circuit, 200e-6), e.times)
        assert max(found.values()) < TOLERANCE, f"seed {seed}, entry {k}: {e.circuit} is off by {found}"


@needs_ngspice
def test_data_sheets_come_out_again() -> None:
    record = read_record("record")
    for d in (DEVICES[0], DEVICES[-1]):
        new, old = sheet(d), record.sheets[d.name]
        for name in ("ctr", "h_fe", "v_ce_sat", "c_cb", "t_r", "t_f", "t_on", "t_s", "t_off"):
            assert getattr(new, name) == pytest.approx(getattr(old, name), rel=TOLERANCE), name


@needs_ngspice
def test_halving_the_time_step_changes_nothing_that_counts() -> None:
    record = read_record("record")
    devices = devices_of("record")
    for e in record.entries[:: len(record.entries) // 5]:
        fine = pulse(devices[e.device], e.circuit, 200e-6, 2 * FINENESS)
        assert max(apart(e.times, fine).values()) < 0.005, e.circuit


@needs_ngspice
def test_stated_dark_currents_come_out_again() -> None:
    record = read_record(LEAKING)
    for d in DEVICES:
        own = [e for e in record.entries if e.device == d.name]
        stated = dark_currents(d, np.array([e.circuit.i_dark for e in own]))
        np.testing.assert_allclose(stated, [e.i_ceo for e in own], rtol=TOLERANCE)


def test_the_record_is_what_the_seed_draws(name: str, record: Record) -> None:
    drawn = draw_all(name, record.sheets.values())
    assert [x.device for x in drawn] == [e.device for e in record.entries]
    for x, e in zip(drawn, record.entries, strict=True):
        one, other = (np.array([np.nan if v is None else v for v in vars(c).values()]) for c in (x.circuit, e.circuit))
        np.testing.assert_allclose(one.astype(float), other.astype(float), rtol=1e-4)


def test_the_record_spans_what_it_says(name: str, record: Record) -> None:
    circuits = [e.circuit for e in record.entries]
    assert len(circuits) == COUNT
    sheets = {"record": len(DEVICES), "strangers": STRANGERS, LEAKING: len(DEVICES) + STRANGERS}
    assert len(record.sheets) == sheets[name]
    assert 0.4 < np.mean([c.pulled_up for c in circuits]) < 0.6
    assert 0.3 < np.mean([c.r_be is None for c in circuits]) < 0.7
    assert {c.v_cc for c in circuits} == {3.3, 5.0, 12.0, 15.0, 24.0}
    assert min(c.r_load for c in circuits) < 300
    assert max(c.r_load for c in circuits) > 0.85 * (R_LOAD_LEAKING if name == LEAKING else R_LOAD)[1]
    assert min(c.c_load for c in circuits) < 12e-12
    assert max(c.c_load for c in circuits) > 250e-12
    assert OVERDRIVE[0] <= min(e.overdrive for e in record.entries) < 1.3
    assert 8.0 < max(e.overdrive for e in record.entries) <= OVERDRIVE[1]


@pytest.mark.parametrize("dark", RECORDS)
def test_nothing_is_left_in_the_first_two_records(dark: str) -> None:
    assert all(e.circuit.i_off == e.circuit.i_dark == e.i_ceo == 0 for e in read_record(dark).entries)


def test_what_is_left_spans_what_it_says() -> None:
    record = read_record(LEAKING)
    shares = []
    for e in record.entries:
        sheet, c = record.sheets[e.device], e.circuit
        i_sat = led_current_for(sheet, (c.v_cc - V_CE) / c.r_load)
        shares.append((c.i_off / i_sat, c.i_dark / i_sat * sheet.h_fe / sheet.ctr))
    for share in np.transpose(shares):
        some = share[share > 0]
        assert 0.6 < some.size / share.size < 0.73
        assert LEFT[0] * 0.999 <= some.min() < 1.1 * LEFT[0]
        assert 0.9 * LEFT[1] < some.max() <= LEFT[1] * 1.001
        assert np.median(some) == pytest.approx(math.sqrt(LEFT[0] * LEFT[1]), rel=0.4)


def test_the_devices_span_what_couplers_look_like() -> None:
    sheets = read_record("record").sheets.values()
    assert min(s.ctr for s in sheets) < 0.55
    assert max(s.ctr for s in sheets) > 3.8
    assert min(s.h_fe for s in sheets) < 160
    assert max(s.h_fe for s in sheets) > 850
    taus = [max(s.t_r, s.t_f) / math.log(9) for s in sheets]
    assert min(taus) < 1.3e-6
    assert max(taus) > 4.5e-6
    assert min(d.c_jc for d in DEVICES) < 4.5e-12
    assert max(d.c_jc for d in DEVICES) >= 15e-12


def test_drawn_circuits_stay_inside_the_data_sheet() -> None:
    s = read_record("record").sheets["weak"]
    rng = np.random.default_rng(3)
    for x in (draw(rng, s) for _ in range(200)):
        i_sat = led_current_for(s, (x.circuit.v_cc - 0.1) / x.circuit.r_load)
        assert CURVE_I[0] * 0.999 <= x.circuit.i_f <= CURVE_I[-1] * 1.001
        assert x.circuit.v_cc / x.circuit.r_load < I_C_MOST * 1.05
        assert x.circuit.i_f == pytest.approx(
            x.overdrive * i_sat + (0.65 / x.circuit.r_be * s.h_fe / s.ctr if x.circuit.r_be else 0.0), rel=1e-3
        )
        assert x.circuit.i_f <= (x.overdrive + BASE_MOST) * i_sat * 1.001


def test_an_exponential_pulse_measures_as_it_must() -> None:
    tau_on, tau_off, hold = 2e-6, 5e-6, 7e-6
    run = Run(start=1e-6, lit=60e-6, end=160e-6)
    circuit = Circuit(True, 5.0, 1e3, None, 1e-12, 1e-3)
    on, off = run.start + LED_EDGE / 2, run.start + run.lit + 1.5 * LED_EDGE
    t = np.linspace(0, run.end, 400_001)
    fall = 5.0 * np.exp(-np.maximum(t - on, 0) / tau_on)
    rise = 5.0 * (1 - np.exp(-np.maximum(t - off - hold, 0) / tau_off))
    out = np.where(t < off, fall, rise)
    found = measure(Wave(t, out, np.full_like(t, 0.6), out), circuit, run)
    assert found.edge_on == pytest.approx(tau_on * math.log(9), rel=1e-4)
    assert found.edge_off == pytest.approx(tau_off * math.log(9), rel=1e-4)
    assert found.storage == pytest.approx(hold + tau_off * math.log(1 / 0.9), rel=1e-4)
    assert found.unsaturated == pytest.approx(hold + tau_off * math.log(1 / (1 - 0.2 / 5)), rel=1e-4)
    assert found.delay_on == pytest.approx(tau_on * math.log(1 / 0.3), rel=1e-3)
    assert found.delay_off == pytest.approx(hold + tau_off * math.log(1 / 0.3), rel=1e-4)
    assert found.fall_90 == pytest.approx(hold + tau_off * math.log(10), rel=1e-4)


def test_a_level_that_is_never_crossed_is_nan() -> None:
    t = np.linspace(0, 1, 11)
    assert math.isnan(crossing(t, t, 2.0, 0.0))
    assert math.isnan(crossing(t, t, 0.5, 2.0))
    assert crossing(t, t, 0.55, 0.0) == pytest.approx(0.55)
    assert math.isnan(crossing(t, t, 0.55, 0.7))


@pytest.mark.parametrize("pulled_up", [True, False])
def test_the_deck_places_load_and_light(pulled_up: bool) -> None:
    circuit = Circuit(pulled_up, 12.0, 2200.0, 1e5, 47e-12, 4e-3)
    deck = transient_deck(DEVICES[0], circuit, Run(1e-6, 2e-6, 5e-6), "x.raw").splitlines()
    assert ("rl vcc c 2200" if pulled_up else "rl e 0 2200") in deck
    assert ("cl c 0 4.7e-11" if pulled_up else "cl e 0 4.7e-11") in deck
    assert "rbe b e 100000" in deck
    light = next(line for line in deck if line.startswith("ilight c b"))
    assert light.startswith(f"ilight c b pulse(0 {DEVICES[0].eta * 4e-3:.8g} ")
    assert not any(line.startswith("idark") for line in deck)


def test_the_deck_places_what_is_left_in_the_dark() -> None:
    circuit = Circuit(True, 12.0, 2200.0, None, 47e-12, 4e-3, i_off=3e-5, i_dark=2e-8)
    deck = transient_deck(DEVICES[0], circuit, Run(1e-6, 2e-6, 5e-6), "x.raw").splitlines()
    dark, lit = (f"{DEVICES[0].eta * i:.8g}" for i in (3e-5, 4e-3))
    assert any(line.startswith(f"ilight c b pulse({dark} {lit} ") for line in deck)
    assert "idark c b 2e-08" in deck
