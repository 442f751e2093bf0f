r"""A driver with a wire: what the driver sees of the wire, and what the wire adds.

A driver of resistance R charges a net of capacitance C through wires. From the wires alone, driven
at the driver's node, come

======  ================================================================  =====
symbol  meaning                                                           unit
======  ================================================================  =====
W, V    first and second moment of the response at a sink                 s, s^2
E       ``R C`` and the delay of the driver's own capacitance              s
A, B    ``sum C_k W_k``, ``sum C_k V_k`` over all nodes of the net        F s, F s^2
lag     ``B/A``, time constant of what the wire hides                      s
c       part of the capacitance at the driver's node, ``1 - R A^2/(B E)``  1
======  ================================================================  =====

all resistances with the ln 2 of an RC response inside. Driver and wire together respond at the
driver's node with moments ``E`` and ``E^2 + R A``, at a sink with ``E + W`` and
``E^2 + R A + E W + V``.

- The driver sees the net as a pi of two capacitors and a resistor with the same first three moments
  of the current: ``A^2/B`` behind ``B^2/A^3``, the rest in front (O'Brien and Savarino, ICCAD 1989,
  from memory). R and pi have two poles, the roots of ``1 - (E + lag) p + c E lag p^2``. Poles are
  common to all nodes of a net, and weights follow from a node's own moments (Pillage and Rohrer,
  IEEE Transactions on CAD 9(4), 1990, from memory): here from its first, the Elmore delay.
- The effective capacitance gives a driver of resistance R the same 50 % delay as the pi does (Qian,
  Pullela and Pillage, IEEE Transactions on CAD 13(12), 1994, from memory, equate mean currents).
- Under an input that takes T the 50 % delay goes from that of a step to the mean delay ``m1``; the
  step's share is ``(s^2/(s^2 + T^2/12))^(5/2)``, s^2 the variance of the response (Kashyap, Alpert,
  Liu and Devgan, IEEE Transactions on CAD 23(4), 2004, from memory). At the driver's node ``E^2``
  serves better than the variance: measured on random trees, 90 % of the errors stay below 3 % of
  the delay to the far sink for T up to E, 6 % for 3 E, against 5 and 9.
- Variances of cascaded responses add (Elmore 1948), hence the squares of transitions (Kashyap et
  al. 2004): the wire adds ``2 R A + 2 V - W^2`` to ``E^2``. A transition is ``shape`` times the
  deviation where transistors make it; where a resistor does, it is `TRANSITION` times that from 10
  to 90 %, and `RAMP` times for the next gate, which switches near half the supply: there the long
  tail does not count (in simulated level-1 chains behind slow wires delays came out up to 34 % high
  with it, 23 without). The first term counts with both factors, the others with the latter. Where
  the process gives no shape, edges have no transition, behind wires neither.

Measured on steps into random trees, in percent of the delay to the far sink, median and 90th
percentile of the error: 0.9 and 2 at the driver, 0.1 and 2 at far sinks, 4 and 7 at near sinks
behind strong drivers. Elmore times ln 2 errs by 15 to 25 and 24 to 30 at the driver, 7 and 8 at far
sinks.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Final

import numpy as np

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray

_LN2: Final = math.log(2)

#: Of a resistor and a capacitor, over their delay: the 10 to 90 % time over 0.8, and the ramp that
#: is as steep at half supply.
TRANSITION: Final = math.log(9) / 0.8 / _LN2
RAMP: Final = 2 / _LN2

#: Poles this close count as one: their weights no longer matter.
_CLOSE: Final = 1e-12

#: Keeps the fast pole finite.
_LEAST: Final = 1e-30

#: Relative step from which on the 50 % point stays as it is.
_SETTLED: Final = 1e-14

#: Most steps to the 50 % point: Newton's, or halving where those would leave the bounds.
_STEPS: Final = 40


def crossing(
    elmore: FloatArray, lag: FloatArray, near: FloatArray, first: FloatArray
) -> FloatArray:
    """Return the 50 % delay of a node for a step, s.

    Parameters
    ----------
    elmore, lag : FloatArray, s
        E and lag, not both zero.
    near : FloatArray
        c, 0 to 1.
    first : FloatArray, s
        W of the node; zero at the driver.
    """
    whole = elmore + lag
    product = near * (elmore / whole) * (lag / whole)
    root = np.sqrt(np.maximum(1 - 4 * product, 0.0))
    slow, fast = 2 / (1 + root), (1 + root) / np.maximum(2 * product, _LEAST)
    apart = 1 - np.minimum(slow / fast, 1 - _CLOSE)
    weight = np.maximum((1 - (lag - first) / whole * slow) / apart, 0.0)
    low = np.zeros_like(weight)
    high = np.log(2 * np.maximum(weight, 1.0)) / slow
    time = low
    for _ in range(_STEPS):
        late, early = weight * np.exp(-slow * time), (1 - weight) * np.exp(-fast * time)
        missing, steepness = late + early - 0.5, slow * late + fast * early
        low, high = np.where(missing > 0, time, low), np.where(missing > 0, high, time)
        step = time + np.divide(
            missing, steepness, out=np.full_like(time, np.inf), where=steepness > 0
        )
        following = np.where((step > low) & (step < high), step, (low + high) / 2)
        settled = np.abs(following - time) <= _SETTLED * following
        time = following
        if settled.all():
            break
    result: FloatArray = whole * time / _LN2
    return result


def effective(elmore: FloatArray, shield: FloatArray, transition: FloatArray) -> FloatArray:
    """Return the Elmore delay of a driver with the effective capacitance of its net, s.

    Parameters
    ----------
    elmore : FloatArray, s
        With all capacitance.
    shield : FloatArray
        Effective over all capacitance, for a step.
    transition : FloatArray, s
        Of the input; the slower it is, the less is hidden.
    """
    step = step_share(elmore**2, transition)
    mean = (1 - step) / _LN2
    result: FloatArray = elmore * (mean + step * shield) / (mean + step)
    return result


def wire_delay(
    elmore: FloatArray,
    shield: FloatArray,
    step_delay: FloatArray,
    transition: FloatArray,
    first: FloatArray,
    variance: FloatArray,
) -> FloatArray:
    """Return the delay from the driver's node to a sink, s.

    Parameters
    ----------
    elmore, shield : FloatArray, s and dimensionless
        As for `effective`.
    step_delay : FloatArray, s
        50 % delay of the sink for a step.
    transition : FloatArray, s
        Of the driver's input.
    first : FloatArray, s
        W of the sink.
    variance : FloatArray, s^2
        Of the sink's response.
    """
    step = step_share(variance, transition)
    at_sink = (1 - step) * (elmore + first) / _LN2 + step * step_delay
    step = step_share(elmore**2, transition)
    at_driver = elmore * ((1 - step) / _LN2 + step * shield)
    return np.where(first > 0, np.maximum(at_sink - at_driver, 0.0), 0.0)


def added_variance(spread: FloatArray, first: FloatArray, second: FloatArray) -> FloatArray:
    """Return what the wire to a sink adds to the variance of its driver's response, s^2.

    Parameters
    ----------
    spread : FloatArray, s^2
        ``R A``.
    first, second : FloatArray, s and s^2
        W and V of the sink.
    """
    return np.maximum(2 * spread + 2 * second - first**2, 0.0)


def added_square(
    shape: FloatArray,
    spread: FloatArray,
    first: FloatArray,
    second: FloatArray,
    *,
    resistive: float,
) -> FloatArray:
    """Return what the wire to a sink adds to the square of its driver's transition, s^2.

    Parameters
    ----------
    shape : FloatArray
        Transition over Elmore delay of the driver.
    spread, first, second : FloatArray
        As for `added_variance`: the first is owed to driver and wire, the rest to the wire alone.
    resistive : float
        Transition over Elmore delay of a resistor: `TRANSITION` or `RAMP`.
    """
    own = np.maximum(2 * second - first**2, 0.0)
    return np.where(shape > 0, resistive * (2 * shape * spread + resistive * own), 0.0)


def step_share(variance: FloatArray, transition: FloatArray) -> FloatArray:
    """Return how much of the delay under a slow input is that of a step, 0 to 1.

    Parameters
    ----------
    variance : FloatArray, s^2
        Of the response, ln 2 inside.
    transition : FloatArray, s
        Of the input.
    """
    slow = (_LN2 * transition) ** 2 / 12
    total = variance + slow
    share = np.divide(variance, total, out=np.ones_like(total), where=total > 0)
    result: FloatArray = share**2.5
    return result
