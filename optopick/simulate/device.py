"""The output transistor of one unit at one corner, large-signal: what the simulation and the circuit file both use.

Voltages: `v_be` base to emitter; `v_bc` base to the inner collector, which lies `v_off` below the outer one. Currents
and charges of Ebers and Moll (Proc. IRE 42 (1954) 1761) in the transport form of Gummel and Poon (Bell System
Technical Journal 49 (1970) 827):

- forward i_f = i_s*exp(v_be/v_t), reverse i_r = i_s*exp(v_bc/v_t); from collector to emitter flows
  (i_f - i_r)*(1 - v_bc/v_af);
- from base to emitter the base current of the gain law at i_f, from base to collector (i_r - i_s)/beta_r;
- stored between base and emitter tau_f*i_f*(1 - v_bc/v_af) and the charge of the emitter junction, between base and
  collector tau_r*i_r and the charge of the collector junction;
- the light drives its photocurrent from collector to base, and so does the dark current.

No series resistances, and no Early effect where the device comes from a coupler table: tables do not have them.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from optopick.coupler import Coupler, Kind, Transfer, Transistor
from optopick.physics.charge import J_V_BE, M_J, V_J
from optopick.physics.leakage import dark_current
from optopick.physics.led import thermal_voltage
from optopick.physics.saturation import saturation_shape, sheet_overdrive
from optopick.physics.transfer import light_factor, temperature_factor
from optopick.simulate.corner import Corner
from optopick.simulate.errors import NotSimulatedError
from optopick.simulate.gain import GainLaw, gain_law
from optopick.simulate.junction import Junction

LEAST_GAIN = 1.5
"""Where the gain falls to this on the CTR curve, photocurrent and collector current are no longer apart [1]."""

LEAST_C = 1e-15
"""Least capacitance of the collector junction [F]: with none at all the output voltage would jump."""

LEAST_OVERDRIVE = 1.05
"""Overdrive that the table's v_ce_sat row is at least taken to have [1]."""


@dataclass(frozen=True)
class Device:
    """One unit at one corner; see the module.

    eta: base photocurrent per LED current, at this temperature and age [1]. v_t: thermal voltage times the number of
    junctions between base and emitter [V]. i_s [A]; gain: base current over i_f; beta_r [1]. tau_f, tau_r: transit
    times [s]. emitter, collector: the junctions. v_off: what the table's v_ce_sat has above that of the junctions
    [V]. i_cbo: dark current from collector to base [A]. v_af: Early voltage [V], infinite where it is not known.
    """

    eta: float
    v_t: float
    i_s: float
    gain: GainLaw
    beta_r: float
    tau_f: float
    tau_r: float
    emitter: Junction
    collector: Junction
    v_off: float
    i_cbo: float
    v_af: float = math.inf


def transistor_parts(coupler: Coupler) -> tuple[Transfer, Transistor]:
    """Transfer and transistor; raises NotSimulatedError for a logic output."""
    if coupler.transfer is None or coupler.transistor is None:
        raise NotSimulatedError(
            f"{coupler.part} has a logic output: its table row gives delays, not what its circuit does in between"
        )
    return coupler.transfer, coupler.transistor


def device_at(coupler: Coupler, corner: Corner) -> Device:
    """The unit of a coupler that a corner describes.

    eta = ctr_mid/h_fe times the light's temperature factor, its spread and what ageing has left, ctr_mid the middle
    of the bin. i_s puts the table's v_be at J_V_BE. The gain law goes through every point of the CTR curve, moved by
    this unit's CTR, its light and the temperature. Transit time and junctions are those of the formulas: tau_0/h_fe,
    c_m/h_fe at 0 V, c_be; tau_r gives the table's tau_s. Raises NotSimulatedError where the table's figures leave no
    such transistor.
    """
    transfer, transistor = transistor_parts(coupler)
    junctions = 2.0 if coupler.kind is Kind.DARLINGTON else 1.0
    # two junctions in a row: the same current takes twice the voltage
    v_t = junctions * float(thermal_voltage(corner.t))
    ctr_mid = math.sqrt(transfer.ctr_min * transfer.ctr_max)
    eta = ctr_mid / transistor.h_fe * float(light_factor(transfer, corner.t)) * corner.light
    carried = corner.ctr * float(temperature_factor(transfer, corner.t))
    gain = gain_of_curve(coupler.part, transfer, carried, eta)
    v_be = transistor.v_be + corner.v_be + transistor.v_be_tc * (corner.t - 25.0)
    tau_f = transistor.tau_0 / transistor.h_fe
    i_ceo = float(dark_current(transistor.i_ceo_1, transistor.t_1, transistor.i_ceo_2, transistor.t_2, corner.t))
    return Device(
        eta=eta * corner.left,
        v_t=v_t,
        i_s=J_V_BE * math.exp(-v_be / v_t),
        gain=gain,
        beta_r=transistor.beta_r,
        tau_f=tau_f,
        tau_r=reverse_transit(transistor.tau_s * corner.storage, tau_f, carried / eta, transistor.beta_r),
        emitter=Junction(transistor.c_be, V_J, 0.0),
        collector=Junction(max(transistor.c_m / transistor.h_fe, LEAST_C), V_J, M_J),
        v_off=_v_off(transfer, transistor, v_t, carried / eta),
        # the dark current of the sheet is the collector's, with the base open: this is what the base then gets
        i_cbo=corner.dark * math.exp(gain.at(math.log(i_ceo))[0]) if i_ceo > 0 else 0.0,
    )


def gain_of_curve(part: str, transfer: Transfer, carried: float, eta: float) -> GainLaw:
    """The gain law through every point of the CTR curve: collector current carried*g*i less the photocurrent eta*i.

    carried: CTR at the test current times its temperature factor [1]; eta of a new LED [1]. Raises NotSimulatedError
    where the curve leaves no gain or does not rise.
    """
    i = np.asarray(transfer.curve_i)
    # what a sheet calls collector current has the light's own current in it
    drawn, light = carried * np.asarray(transfer.curve_g) * i, eta * i
    if np.any(drawn <= LEAST_GAIN * light):
        raise NotSimulatedError(f"{part}: on its CTR curve the current gain falls to {np.min(drawn / light):.2g}")
    try:
        return gain_law(drawn - light, light)
    except ValueError:
        raise NotSimulatedError(f"{part}: along its CTR curve the collector current does not rise") from None


def reverse_transit(tau_s: float, tau_f: float, h_fe: float, beta_r: float) -> float:
    """Reverse transit time [s] that makes the storage constant deep in saturation tau_s [s]; 0 where tau_f does alone.

    There the load holds the collector current, so di_f = (1 + 1/beta_r)*di_r; stored charge over base current is
    tau_s = [tau_f*(1 + 1/beta_r) + tau_r]/[(1 + 1/beta_r)/h_fe + 1/beta_r]. Source: Moll, Proc. IRE 42 (1954) 1773.
    """
    both = 1.0 + 1.0 / beta_r
    return max(tau_s * (both / h_fe + 1.0 / beta_r) - tau_f * both, 0.0)


def _v_off(transfer: Transfer, transistor: Transistor, v_t: float, h_fe: float) -> float:
    """What the table's v_ce_sat has above the saturation voltage of the junctions in its own row [V]."""
    sheet = sheet_overdrive(transfer, transistor)
    overdrive = max(sheet, LEAST_OVERDRIVE) if math.isfinite(sheet) else LEAST_OVERDRIVE
    junctions = v_t * math.log(float(saturation_shape(overdrive, h_fe, transistor.beta_r)))
    return max(transistor.v_ce_sat - junctions, 0.0)
