"""The depletion capacitance of a junction, as the Gummel-Poon model of circuit simulators has it."""

from __future__ import annotations

from dataclasses import dataclass

FORWARD_BEND = 0.5
"""Share of its built-in voltage from which a junction's capacitance goes on in a straight line [1] (SPICE's fc)."""


@dataclass(frozen=True)
class Junction:
    """Depletion capacitance c_0/(1 - v/v_j)^m at forward voltage v [V]; m = 0: constant. c_0 [F], v_j [V], m [1]."""

    c_0: float
    v_j: float
    m: float

    def capacitance(self, v: float) -> float:
        """Capacitance at forward voltage `v` [F]; above FORWARD_BEND*v_j in a straight line."""
        if v <= FORWARD_BEND * self.v_j:
            return float(self.c_0 * (1.0 - v / self.v_j) ** -self.m)
        bend = (1.0 - FORWARD_BEND) ** -(1.0 + self.m)
        return float(self.c_0 * bend * (1.0 - FORWARD_BEND * (1.0 + self.m) + self.m * v / self.v_j))

    def charge(self, v: float) -> float:
        """Charge between 0 V and forward voltage `v` [C]: the integral of `capacitance`."""
        knee = FORWARD_BEND * self.v_j
        low = min(v, knee)
        q = self.c_0 * self.v_j / (1.0 - self.m) * (1.0 - (1.0 - low / self.v_j) ** (1.0 - self.m))
        if v > knee:
            q += (v - knee) * (self.capacitance(v) + self.capacitance(knee)) / 2.0
        return float(q)
