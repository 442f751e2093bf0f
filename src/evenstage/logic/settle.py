"""What the free nodes of a batch are worth, many input vectors at once.

The model is that of switches (Bryant, "A switch-level model and simulator for MOS digital systems",
IEEE Transactions on Computers C-33(2), 1984), with drives compared by resistance instead of by
classes of strength (Terman, Simulation Tools for Digital LSI Design, MIT, 1983), both from memory.

A switch is closed, open, or, where its gate is unknown, perhaps closed. Along closed switches a
node has a least resistance to a 1 and to a 0: surely, through switches that are closed, and
perhaps, through all that are not open, from nets that are not known to be otherwise. An n channel
passes a 1 badly and a p channel a 0: there it counts `POOR` times (common practice, no source).

- A node is 1 if it surely has a way to a 1 and perhaps none to a 0, or none of less than `CLEAR`
  times the resistance: a divider then stays within a third of the supply from the stronger side.
  For 0 likewise. Where neither holds it is unknown.
- Without a sure way to either it keeps its charge: nodes that closed switches join share theirs,
  and are 1 where those that were hold two thirds of the capacitance, and 0 likewise. Where switches
  that are perhaps closed matter, only what is true with them and without them is known.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.logic.switches import UNKNOWN

if TYPE_CHECKING:
    from evenstage.logic.order import Batch
    from evenstage.logic.switches import BoolArray, Switches, Values
    from evenstage.netlist.devices import FloatArray, IntArray

CLEAR: Final = 2.0
"""Resistance of the weaker of two drives over that of the stronger from which that one wins."""
POOR: Final = 2.0
"""Factor on the resistance of a channel that passes the level it degrades."""
_SHARE: Final = 1 / (1 + CLEAR)
#: What a net without any capacitance counts among others, F.
_CAP_LEAST: Final = 1e-24

GIVEN: Final = 3
"""Strength of a net decided from outside."""
STRONG: Final = 2
"""Strength of a net driven to the full level with nothing against it."""
WEAK: Final = 1
"""Strength of a net that is driven against something, or to a degraded level."""
KEPT: Final = 0
"""Strength of a net that nothing surely drives."""


def settle(switches: Switches, batch: Batch, values: Values) -> Values:
    """Return what the free nodes are worth next, shape (free, vectors).

    Parameters
    ----------
    switches : Switches
    batch : Batch
    values : Values, shape (nets, vectors)
        Of all nets now; of free nodes they are the charge.
    """
    ways = _ways(switches, batch, values)
    sure_one, sure_zero, maybe_one, maybe_zero = (way[: batch.free] for way in ways)
    one = np.isfinite(sure_one) & (maybe_zero >= CLEAR * sure_one)
    zero = np.isfinite(sure_zero) & (maybe_one >= CLEAR * sure_zero)
    loose = ~(np.isfinite(sure_one) | np.isfinite(sure_zero))
    if loose.any():
        charge = _charge(switches, batch, values, loose)
        one |= loose & (charge == 1) & np.isinf(maybe_zero)
        zero |= loose & (charge == 0) & np.isinf(maybe_one)
    return np.where(one, 1, np.where(zero, 0, UNKNOWN)).astype(np.int8)


def _ways(switches: Switches, batch: Batch, values: Values) -> FloatArray:
    """Return the least resistances to 1 and 0, sure and perhaps, shape (4, nodes, vectors)."""
    closed, perhaps = _states(switches, batch, values)
    is_n = switches.is_n[batch.device][batch.switch]
    ohm = switches.resistance[batch.device][batch.switch]
    toll = np.stack([np.where(is_n, POOR, 1.0), np.where(is_n, 1.0, POOR)]) * ohm
    passes = np.stack([closed, perhaps])[:, batch.switch]
    cost = np.where(passes[:, None], toll[None, :, :, None], np.inf)
    cost = cost.reshape(4, *passes.shape[1:])
    given = values[batch.nets[batch.free :]]
    roots = np.stack([given == 1, given == 0, given != 0, given != 1])
    found = np.full((4, len(batch.nets), values.shape[1]), np.inf)
    found[:, batch.free :][roots] = 0.0
    while True:
        near = np.minimum.reduceat(found[:, batch.start] + cost, batch.head, axis=1)
        if not (near < found[:, : batch.free]).any():
            return found
        np.minimum(near, found[:, : batch.free], out=found[:, : batch.free])


def _states(switches: Switches, batch: Batch, values: Values) -> tuple[BoolArray, BoolArray]:
    """Tell which switches are closed, and which are not open, shape (switches, vectors)."""
    at_gate = values[switches.gate[batch.device]]
    closed = at_gate == switches.is_n[batch.device][:, None]
    return closed, closed | (at_gate == UNKNOWN)


def _charge(switches: Switches, batch: Batch, values: Values, loose: BoolArray) -> Values:
    """Return what loose nodes keep, shape (free, vectors); other nodes' values mean nothing."""
    lanes = np.flatnonzero(loose.any(axis=0))
    states = _states(switches, batch, values[:, lanes])
    near, far = (_labels(batch, passes) for passes in states)
    nets = batch.nets[: batch.free]
    was, member = values[nets][:, lanes], loose[:, lanes]
    cap = np.where(member, np.maximum(switches.cap[nets], _CAP_LEAST)[:, None], 0.0)
    total, ones, unknown = (_summed(near, cap * part) for part in (1.0, was == 1, was == UNKNOWN))
    shared = np.where(
        ones >= (1 - _SHARE) * total, 1, np.where(ones + unknown <= _SHARE * total, 0, UNKNOWN)
    )
    wide, ones, zeros = (_summed(far, member & part) for part in (True, was == 1, was == 0))
    with_all = np.where(ones == wide, 1, np.where(zeros == wide, 0, UNKNOWN))
    shared = np.where(wide == _summed(near, member), shared, with_all)
    kept = np.full(loose.shape, UNKNOWN, np.int8)
    kept[:, lanes] = shared
    return kept


def _labels(batch: Batch, passes: BoolArray) -> IntArray:
    """Return the least free node that switches join each free node to, shape (free, vectors)."""
    nodes = len(batch.nets)
    found = np.repeat(np.arange(nodes)[:, None], passes.shape[1], axis=1)
    open_edge = ~passes[batch.switch] | (batch.start >= batch.free)[:, None]
    while True:
        offered = np.where(open_edge, nodes, found[batch.start])
        near = np.minimum.reduceat(offered, batch.head, axis=0)
        if not (near < found[: batch.free]).any():
            return found[: batch.free]
        np.minimum(near, found[: batch.free], out=found[: batch.free])


def _summed(label: IntArray, weight: FloatArray | BoolArray) -> FloatArray:
    """Return the sum of a weight over all nodes with the label of each, vector by vector."""
    lanes = label.shape[1]
    key = (label * lanes + np.arange(lanes)).ravel()
    sums = np.bincount(key, weight.ravel().astype(float), minlength=label.size)
    found: FloatArray = sums[key].reshape(label.shape)
    return found
