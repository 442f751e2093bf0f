"""Laws of the level-1 (Shichman-Hodges) transistor, one function each.

===========  =============================================  =======
symbol       meaning                                        unit
===========  =============================================  =======
t_ox         thickness of the gate oxide                    m
supply       V_DD                                           V
i_sat        drain current at V_GS = V_DD, saturated,
             without channel-length modulation              A
modulation   lambda, channel-length modulation              1/V
v            threshold over supply, V_T / V_DD              1
phi, m       built-in potential and grading of a junction   V, 1
===========  =============================================  =======

References: Rabaey, Chandrakasan, Nikolic, "Digital Integrated Circuits", 2nd ed. 2003, chapter 3
(from memory); Hedenstierna and Jeppson, "CMOS circuit speed and buffer optimization", IEEE
Transactions on CAD 6(2), 1987 (from memory).
"""

from __future__ import annotations

import math
from typing import Final

#: Permittivity of silicon dioxide, 3.9 times that of vacuum, F/m.
OXIDE_PERMITTIVITY: Final = 3.9 * 8.8541878128e-12


def oxide_capacitance(t_ox: float) -> float:
    """Return the gate capacitance per area, F/m^2."""
    return OXIDE_PERMITTIVITY / t_ox


def transconductance(mobility: float, t_ox: float) -> float:
    """Return KP, A/V^2, from a mobility in cm^2/Vs."""
    return mobility * 1e-4 * oxide_capacitance(t_ox)


def saturation_current(kp: float, aspect: float, overdrive: float) -> float:
    """Return ``KP/2 W/L (V_GS - V_T)^2``, A."""
    return kp / 2 * aspect * overdrive**2


def effective_resistance(i_sat: float, supply: float, modulation: float = 0.0) -> float:
    """Return the resistance averaged while the output falls from V_DD to V_DD/2, ohm.

    ``3/4 V_DD/I_DSAT (1 - 7/9 lambda V_DD)`` (Rabaey et al., equations 3.42 and 3.43); the delay of
    a capacitance is ln 2 times this times the capacitance.
    """
    return 0.75 * supply / i_sat * (1 - 7 / 9 * modulation * supply)


def step_delay_factor(v: float) -> float:
    """Return the 50 % delay for a step input in units of ``C/(k V_DD)``, k = KP W/L, v < 1/2.

    The exact integral through saturation and triode region, without channel-length modulation.
    """
    return (2 * v / (1 - v) + math.log(4 * (1 - v) - 1)) / (1 - v)


def fall_time_factor(v: float) -> float:
    """Return the 90 to 10 % time for a step input in units of ``C/(k V_DD)``, v > 1/10."""
    return 2 / (1 - v) * ((v - 0.1) / (1 - v) + 0.5 * math.log(19 - 20 * v))


def ramp_delay_share(v: float) -> float:
    """Return how much of a full-swing input ramp adds to the 50 % delay: ``(1 + 2v)/6``.

    Hedenstierna and Jeppson 1987; derived for ramps that end while the transistor is saturated.
    """
    return (1 + 2 * v) / 6


def junction_factor(phi: float, m: float, least: float, most: float) -> float:
    """Return K_eq: a junction's mean capacitance over a range of reverse bias, per C_j0.

    ``phi^m ((phi + most)^(1-m) - (phi + least)^(1-m))/((most - least)(1 - m))``
    (Rabaey et al., equation 3.11).
    """
    start, end = phi + least, phi + most
    if math.isclose(m, 1.0):
        return phi / (end - start) * math.log(end / start)
    rise = math.pow(end, 1 - m) - math.pow(start, 1 - m)
    return math.pow(phi, m) * rise / ((end - start) * (1 - m))
