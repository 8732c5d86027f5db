"""The output simulated: the tool's own check of its switching formulas, by integrating the circuit they stand for.

`simulate_all` gives pulses at the corners that count, `simulate_pattern` a bit pattern. The transistor (`device`) is
made from the table's row alone; optopick.report.netlist writes the same circuit for circuit simulators.
"""

from optopick.simulate.corner import Corner, PulseTimes, typical_corner, worst_corners
from optopick.simulate.design import (
    Pattern,
    Simulated,
    Simulation,
    simulate_all,
    simulate_design,
    simulate_pattern,
    simulate_pulse,
)
from optopick.simulate.errors import NotSimulatedError
from optopick.simulate.measure import Balance, Boundary, balance

__all__ = [
    "Balance",
    "Boundary",
    "Corner",
    "NotSimulatedError",
    "Pattern",
    "PulseTimes",
    "Simulated",
    "Simulation",
    "balance",
    "simulate_all",
    "simulate_design",
    "simulate_pattern",
    "simulate_pulse",
    "typical_corner",
    "worst_corners",
]
