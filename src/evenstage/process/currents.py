r"""Resistance, slope and shape of a transistor from its currents and thresholds.

=========  ==================================================================  =====
symbol     meaning                                                             unit
=========  ==================================================================  =====
I_D0       drain current per width at V_GS = V_DS = V_DD                        A/m
I_H, I_L   at V_GS = V_DD, V_DS = V_DD/2, and at V_GS = V_DD/2, V_DS = V_DD     A/m
alpha      power of the overdrive that the saturated current follows            1
V_D0       saturation voltage at full drive                                     V
v          V_T / V_DD                                                           1
=========  ==================================================================  =====

- Two currents: the mean of I_H and I_L is the effective current, and a capacitance C takes
  ``C V_DD/(2 I_eff)`` (Na, Nowak, Haensch and Cai, IEDM 2002).
- One current with threshold and alpha: a capacitance takes ``C V_DD/(2 I_D0)``, an input ramp adds
  ``1/2 - (1 - v)/(1 + alpha)`` of itself, and the output's own ramp is ``C V_DD/I_D0 (0.9/0.8 +
  V_D0/(0.8 V_DD) ln(10 V_D0/(e V_DD)))`` (Sakurai and Newton, IEEE Journal of Solid-State Circuits
  25(2), 1990, from memory).
- One current alone: ``ln 2`` times the resistance averaged from V_DD to V_DD/2, see
  `evenstage.process.level1.effective_resistance`.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from evenstage.process import level1

_LN2 = math.log(2)


@dataclass(frozen=True, slots=True)
class Derived:
    """Constants of the arc model that follow from currents.

    Parameters
    ----------
    r_w : float
        ohm m.
    slope, shape : float, optional
        None where the currents do not say.
    """

    r_w: float
    slope: float | None = None
    shape: float | None = None


def from_effective_current(high: float, low: float, supply: float) -> Derived:
    """Derive from the two currents of an effective current, A/m."""
    return Derived(supply / (high + low))


def from_saturation_current(current: float, supply: float, modulation: float = 0.0) -> Derived:
    """Derive from a saturated current without channel-length modulation, A/m."""
    return Derived(_LN2 * level1.effective_resistance(current, supply, modulation))


def from_long_channel(current: float, threshold: float, supply: float) -> Derived:
    """Derive from the saturated current of a level-1 transistor, A/m.

    Resistance as for any saturated current; slope and shape are those of the square law.
    """
    r_w = from_saturation_current(current, supply).r_w
    v = threshold / supply
    # The saturated current k/2 (V_DD - V_T)^2 gives k.
    k = 2 * current / (supply - threshold) ** 2
    ramp = level1.fall_time_factor(v) / (k * supply) / 0.8
    return Derived(r_w, level1.ramp_delay_share(v), ramp / r_w)


def from_alpha_power(
    current: float, threshold: float, alpha: float, saturation: float, supply: float
) -> Derived:
    """Derive from the alpha-power law.

    Parameters
    ----------
    current : float
        I_D0, A/m.
    threshold, saturation, supply : float
        V; saturation is V_D0.
    alpha : float
    """
    r_w = supply / (2 * current)
    return Derived(
        r_w,
        alpha_power_slope(threshold / supply, alpha),
        alpha_power_ramp(saturation / supply) * supply / current / r_w,
    )


def alpha_power_slope(v: float, alpha: float) -> float:
    """Return how much of a full-swing input ramp adds to the 50 % delay."""
    return 0.5 - (1 - v) / (1 + alpha)


def alpha_power_ramp(saturation: float) -> float:
    """Return the output's full-swing ramp for a step, in ``C V_DD/I_D0``; V_D0 over V_DD."""
    return 0.9 / 0.8 + saturation / 0.8 * math.log(10 * saturation / math.e)
