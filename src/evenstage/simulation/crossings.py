"""When voltages cross levels: found on the dense output of the integrator."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np
from scipy.optimize import brentq

if TYPE_CHECKING:
    from evenstage.simulation.integrate import Waveforms

#: A transition is the time from 10 to 90 % over this: that of a ramp over the whole supply.
TRANSITION_SHARE: Final = 0.8


def last_crossing(waves: Waveforms, node: int, level: float, *, rising: bool) -> float | None:
    """Return when a node last crosses a level in one direction, s; None: never.

    Parameters
    ----------
    waves : Waveforms
    node : int
        An unknown node.
    level : float
        V.
    rising : bool
    """
    side = waves.voltage[node] - level if rising else level - waves.voltage[node]
    found = np.flatnonzero((side[:-1] < 0) & (side[1:] >= 0))
    if not len(found):
        return None
    at = int(found[-1])
    if side[at + 1] == 0:
        return float(waves.time[at + 1])
    return float(
        brentq(
            lambda time: float(waves.at(time)[node]) - level,
            float(waves.time[at]),
            float(waves.time[at + 1]),
            xtol=1e-9 * waves.unit,
        )
    )


def transition(waves: Waveforms, node: int, supply: float, *, rising: bool) -> float | None:
    """Return the full-swing transition of a node's last edge, s; None: it has none."""
    early, late = (0.1, 0.9) if rising else (0.9, 0.1)
    end = last_crossing(waves, node, late * supply, rising=rising)
    begin = last_crossing(waves, node, early * supply, rising=rising)
    if begin is None or end is None or end <= begin:
        return None
    return (end - begin) / TRANSITION_SHARE
