r"""The current of a transistor's channel, and its slopes.

One law covers level 1 and short channels. With the overdrive ``u = V_GS - V_T``,

    I_sat = gain u^alpha,    V_sat = knee u^(alpha/2),
    I = (2 - r) r I_sat (1 + modulation V_DS),    r = min(V_DS/V_sat, 1)

(Sakurai and Newton, "Alpha-power law MOSFET model and its applications to CMOS inverter delay and
other formulas", IEEE Journal of Solid-State Circuits 25(2), 1990, from memory). For ``alpha = 2``
and ``knee = 1`` it is Shichman and Hodges' level 1 with ``gain = KP W/(2 L)``, to the last term.

Whichever end is lower (for a p channel: higher) is the source, so a device conducts both ways;
current and conductances pass through ``V_DS = 0`` without a step. Newton's method needs a current
that is smooth at the threshold too, so the overdrive is rounded,

    u = s ln(1 + exp((V_GS - V_T)/s)),

over some ``s``, a hundredth of the supply: at overdrives of more than 10 s nothing is left of it.
The threshold rises with the source's bias, ``V_T = VTO + body (sqrt(phi + V_SB) - sqrt(phi))``.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray, IntArray

#: Farther below the threshold, in units of the rounding, a device is off; also keeps u above 0.
_OFF = -200.0


@dataclass(frozen=True)
class Channels:
    """Constants of some channels in columns, shape ``(devices,)`` each.

    Parameters
    ----------
    sign : FloatArray
        1 for n, -1 for p channels.
    threshold : FloatArray, V
        Magnitude, without source bias.
    gain : FloatArray, A/V^alpha
        The device's own, its width included.
    alpha : FloatArray
    knee : FloatArray, V^(1 - alpha/2)
        Saturation voltage at an overdrive of 1 V.
    modulation : FloatArray, 1/V
    body, phi : FloatArray, V^0.5 and V
    """

    sign: FloatArray
    threshold: FloatArray
    gain: FloatArray
    alpha: FloatArray
    knee: FloatArray
    modulation: FloatArray
    body: FloatArray
    phi: FloatArray

    def __len__(self) -> int:
        return len(self.sign)

    def take(self, which: IntArray) -> Channels:
        """Return some of the channels, or the same several times."""
        return Channels(*(getattr(self, column.name)[which] for column in fields(self)))


class Flow(NamedTuple):
    """Currents from drain to source, A, and their slopes by each terminal's voltage, S."""

    current: FloatArray
    by_drain: FloatArray
    by_gate: FloatArray
    by_source: FloatArray


def flow(
    channels: Channels,
    drain: FloatArray,
    gate: FloatArray,
    source: FloatArray,
    bulk: FloatArray,
    *,
    rounding: float,
) -> Flow:
    """Return the currents at given voltages.

    Parameters
    ----------
    channels : Channels
    drain, gate, source, bulk : FloatArray, V, shape (devices,)
    rounding : float
        V; s above.
    """
    sign = channels.sign
    d, g, s, b = sign * drain, sign * gate, sign * source, sign * bulk
    forward = d >= s
    low, across = np.minimum(d, s), np.abs(d - s)
    bias = np.maximum(channels.phi + low - b, 0.25 * channels.phi)
    root = np.sqrt(bias)
    threshold = channels.threshold + channels.body * (root - np.sqrt(channels.phi))
    lifts = np.where(bias > 0.25 * channels.phi, channels.body / (2 * root), 0.0)
    x = np.maximum((g - low - threshold) / rounding, _OFF)
    over, rises = rounding * np.logaddexp(0.0, x), 1.0 / (1.0 + np.exp(-x))
    half_power = over ** (channels.alpha / 2)
    saturated = channels.gain * half_power**2
    knee = channels.knee * half_power
    r = np.minimum(across / knee, 1.0)
    longer = 1.0 + channels.modulation * across
    current = saturated * (2.0 - r) * r * longer
    # d((2 - r) r u^alpha)/du = alpha u^(alpha - 1) r, since r falls as u^(-alpha/2).
    by_gate = saturated * channels.alpha / over * r * longer * rises
    by_across = saturated * (2.0 * (1.0 - r) / knee * longer + channels.modulation * (2.0 - r) * r)
    by_low = -by_gate * (1.0 + lifts) - by_across
    return Flow(
        current=sign * np.where(forward, current, -current),
        by_drain=np.where(forward, by_across, -by_low),
        by_gate=np.where(forward, by_gate, -by_gate),
        by_source=np.where(forward, by_low, -by_across),
    )
