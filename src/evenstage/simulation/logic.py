"""Circuits as switches: what nets are worth, 0 or 1, under many input vectors at once.

A device is closed where its gate says so; a net is worth what closed devices join it to. It is not
known where they join it to both values or to none (Bryant, "A switch-level model and simulator for
MOS digital systems", IEEE Transactions on Computers C-33(2), 1984, from memory; without strengths).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray


@dataclass(frozen=True)
class Switches:
    """Some devices of a circuit between numbered nodes, one for each net they touch.

    Parameters
    ----------
    net : IntArray, shape (nodes,)
        Ascending.
    drain, gate, source : IntArray, shape (devices,)
        Nodes.
    is_n : BoolArray, shape (devices,)
    """

    net: IntArray
    drain: IntArray
    gate: IntArray
    source: IntArray
    is_n: BoolArray

    def closed(self, worth: FloatArray) -> BoolArray:
        """Tell which devices conduct, shape (devices, vectors), for what the nodes are worth."""
        result: BoolArray = worth[self.gate] == self.is_n[:, None]
        return result

    def reached(self, roots: BoolArray, closed: BoolArray, stops: BoolArray) -> BoolArray:
        """Return the nodes that closed devices join to roots, shape (nodes, vectors).

        Parameters
        ----------
        roots : BoolArray, shape (nodes, vectors)
        closed : BoolArray, shape (devices, vectors)
        stops : BoolArray, shape (nodes, 1)
            Nodes that no way leads through.
        """
        found = roots.copy()
        while True:
            wider = found.copy()
            np.logical_or.at(wider, self.drain, found[self.source] & closed)
            np.logical_or.at(wider, self.source, found[self.drain] & closed)
            wider = np.where(stops, roots, wider)
            if (wider == found).all():
                return found
            found = wider

    def settle(self, worth: FloatArray) -> FloatArray:
        """Return what all nodes are worth, shape (nodes, vectors).

        Parameters
        ----------
        worth : FloatArray, shape (nodes, vectors)
            0 or 1 for the nodes that are given, the same nodes for all vectors; NaN for the others.
        """
        given = ~np.isnan(worth).any(axis=1, keepdims=True)
        high: BoolArray = given & (worth == 1)
        low: BoolArray = given & (worth == 0)
        stops = np.asarray(given)
        # A round settles at least one more net of a circuit that does not go round in circles.
        for _ in range(len(self.net)):
            closed = self.closed(worth)
            ones, zeros = (self.reached(roots, closed, stops) for roots in (high, low))
            new: FloatArray = np.where(ones & ~zeros, 1.0, np.where(zeros & ~ones, 0.0, np.nan))
            if np.array_equal(new, worth, equal_nan=True):
                break
            worth = new
        return worth

    def voltages(
        self, worth: FloatArray, given: BoolArray, supply: float, thresholds: tuple[float, float]
    ) -> FloatArray:
        """Return the voltages of nodes for what they are worth, V, shape (nodes,).

        An n channel passes no more than its gate's voltage less its threshold, a p channel no less
        than its threshold; what is not known gets half the supply.

        Parameters
        ----------
        worth : FloatArray, shape (nodes,)
            Settled.
        given : BoolArray, shape (nodes,)
        supply : float
            V.
        thresholds : tuple of float
            V; of n and p channels.
        """
        levels = np.where(np.isnan(worth), 0.5, worth) * supply
        closed, stops = self.closed(worth[:, None]), given[:, None]
        for carriers, value, short in (
            (~self.is_n, 1, -thresholds[0]),
            (self.is_n, 0, thresholds[1]),
        ):
            roots = stops & (worth == value)[:, None]
            whole = self.reached(roots, closed & carriers[:, None], stops)[:, 0]
            levels[(worth == value) & ~whole & ~given] += short
        return levels


def switches(circuit: Circuit, devices: IntArray) -> Switches:
    """Return some devices as switches."""
    block = circuit.devices
    ends = np.stack([block.drain[devices], block.gate[devices], block.source[devices]])
    net, node = np.unique(ends, return_inverse=True)
    drain, gate, source = node.reshape(ends.shape)
    polarity = np.array([model.polarity == "n" for model in block.models], bool)
    return Switches(net, drain, gate, source, polarity[block.model[devices]])
