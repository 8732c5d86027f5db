"""The switching rows of a data sheet and the typical unit that they were measured on, on plain numbers."""

from __future__ import annotations

import math
from dataclasses import dataclass

from optopick.coupler_curves import Curve


@dataclass(frozen=True)
class TypicalUnit:
    """The unit that the times are of.

    CTR [1], its curve over LED current ([A], 1 at the test current), gain [1], base-emitter voltage [V], capacitance of
    the emitter junction [F].
    """

    ctr: float
    curve: Curve
    h_fe: float
    v_be: float
    c_be: float

    @property
    def eta(self) -> float:
        """Base photocurrent over LED current [1]."""
        return self.ctr / self.h_fe

    def led_current_for(self, i_c: float) -> float:
        """Return the LED current [A] that carries `i_c` [A]; infinite beyond the curve."""
        return self.curve.x_carrying(i_c / self.ctr)


@dataclass(frozen=True)
class PlainRow:
    """Output not saturated.

    t_r, t_f: edges [s], None where the sheet has one only; collector current `i_c` [A], load resistor `r_l` [ohm],
    supply [V].
    """

    t_r: float | None
    t_f: float | None
    i_c: float
    r_l: float
    v_cc: float

    @property
    def t(self) -> float:
        """The longer edge [s]: what the constants are fitted to."""
        return max(t for t in (self.t_r, self.t_f, 0.0) if t is not None)

    @property
    def falls_slower(self) -> bool:
        """Tell whether the longer edge is the one that turns off."""
        return self.t_f is not None and (self.t_r is None or self.t_f > self.t_r)


@dataclass(frozen=True)
class SaturatedRow:
    """Output saturated: storage and turn-off time [s], to 10 and to 90 % of the recovery.

    LED current `i_f` [A], load resistor `r_l` [ohm], supply and collector-emitter voltage [V].
    """

    t_s: float
    t_off: float
    i_f: float
    r_l: float
    v_cc: float
    v_ce: float

    @property
    def i_c(self) -> float:
        """The load current [A]."""
        return (self.v_cc - self.v_ce) / self.r_l

    @property
    def t(self) -> float:
        """10 to 90 % of the recovery [s]."""
        return self.t_off - self.t_s


def rounded(value: float) -> float:
    """Return a figure to 12 digits: bins of one part, a rounding step apart, then share what is worked out of it."""
    return value if value == 0 or not math.isfinite(value) else float(f"{value:.12g}")
