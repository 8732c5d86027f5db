"""Briefs that are right, for tests to read, vary and spoil. The parts in them are invented."""

from __future__ import annotations

import math

from optopick.brief import Brief

GOOD = """\
title = "Meter head, telemetry out"

[signal]
rate = "19.2 kbit/s"
lit = 0.25

[drive]
circuit = "source"
supply = ["3.0 V", "3.6 V"]
drop = ["0.1 V", "0.4 V"]
max_current = "8 mA"
off_leakage = "10 uA"
reverse = "1 V"

[output]
circuit = "pull-up"
supply = ["3.135 V", "3.465 V"]
logic = "LVCMOS 3.3 V"
noise_margin = "0.2 V"
input_leakage = "2 uA"
input_current_low = "0.1 mA"
capacitance = "20 pF"

[environment]
temperature = ["-20 degC", "70 degC"]
life = "5 years"

[limits]
ctr_margin = 1.3
edge_time = "15 us"
delay = "25 us"
distortion = "10 us"
power = "40 mW"
timing_guard = 1.2
isolation = { withstand = "3.75 kV", working = "300 V", creepage = "6 mm" }

[stock]
tolerance = "2 %"
drift = "50 ppm/K"
r_led = { series = "E12", from = "100R", to = "10k", power = "0.25 W", pieces = 2 }
r_load = { series = "E24", tolerance = "5 %", voltage = "50 V" }
r_be = { series = "E6", from = "10k", absent = true }
r_shunt = { values = ["1k", "470R", 2200] }

[couplers]
table = "parts.csv"
only = ["XP-1", "XP-2"]
at_least = { channels = 2 }

[goal]
minimize = "edge time"
then = "delay"
give = "2 %"
"""

# Nothing but what a brief must give.
LEAST = """\
[signal]
shortest_pulse = "1 ms"
[drive]
circuit = "sink"
supply = "5 V"
[output]
circuit = "emitter-load"
supply = "5 V"
v_il = "0.8 V"
v_ih = "2 V"
[environment]
temperature = ["0 degC", "50 degC"]
[stock]
r_led = { series = "E24" }
r_load = { series = "E24" }
[couplers]
table = "parts.csv"
[goal]
minimize = "power"
"""

FIELD = """\
[signal]
rate = "1 kbit/s"
[drive]
circuit = "field"
type = "IEC 61131-2 type 3"
reverse_diode = false
[output]
circuit = "pull-up"
supply = ["3.135 V", "3.465 V"]
logic = "LVTTL 3.3 V"
[environment]
temperature = ["-40 degC", "85 degC"]
[stock]
r_led = { series = "E24" }
r_load = { series = "E24" }
r_shunt = { series = "E24", absent = true }
[couplers]
table = "parts.csv"
kinds = ["phototransistor", "darlington"]
[goal]
minimize = "power"
"""


SAMPLES = {"GOOD": GOOD, "LEAST": LEAST, "FIELD": FIELD}


def changed(text: str, *changes: tuple[str, str]) -> str:
    """Return `text` with each old text, which must be there, replaced by the new one."""
    for old, new in changes:
        assert old in text, f"the sample has no {old!r}"
        text = text.replace(old, new, 1)
    return text


def assert_sound(brief: Brief) -> None:
    """What later stages take for granted of every brief."""
    assert 0 < brief.signal.shortest_pulse < math.inf
    assert 0 < brief.drive.supply.low <= brief.drive.supply.high < math.inf
    assert 0 <= brief.drive.drop.low <= brief.drive.drop.high < brief.drive.supply.low
    output = brief.output
    assert output.noise_margin < output.v_il.low < output.v_ih.low
    assert output.v_ih.low + output.noise_margin < output.supply.low
    for position in (brief.stock.r_led, brief.stock.r_load, brief.stock.r_be, brief.stock.r_shunt):
        if position is not None:
            columns = (position.values, position.tolerance, position.power, position.voltage, position.price)
            assert len({len(column) for column in columns}) == 1
            assert position.values
            assert list(position.values) == sorted(set(position.values))
            assert min(position.values) > 0
    assert brief.goal.minimize != brief.goal.then
    assert brief.couplers.table.is_file()
