"""Some devices of a circuit as switches between their own nodes: values, and voltages for them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.logic.evaluate import Evaluation, evaluate
from evenstage.logic.switches import Switches

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.circuit.network import BoolArray
    from evenstage.logic.switches import Values
    from evenstage.netlist.devices import FloatArray, IntArray


@dataclass(frozen=True)
class Part:
    """Some devices of a circuit, one node for each net they touch.

    Parameters
    ----------
    net : IntArray, shape (nodes,)
        Ascending.
    switches : Switches
        The devices between nodes.
    """

    net: IntArray
    switches: Switches

    def node(self, net: int) -> int | None:
        """Return the node of a net; None: the part does not touch it."""
        found = int(np.searchsorted(self.net, net))
        return found if found < len(self.net) and self.net[found] == net else None

    def evaluate(self, known: Mapping[int, Values], *, strong: bool = False) -> Evaluation:
        """Return what all nodes are worth; see `evenstage.logic.evaluate.evaluate`.

        Parameters
        ----------
        known : mapping of int to Values, shape (steps, vectors) each
            What nets are worth that are given, by net; others than the part's do not matter.
        strong : bool
        """
        rows = {net: self.node(net) for net in known}
        given = {row: known[net] for net, row in rows.items() if row is not None}
        found = evaluate(self.switches, given, strong=strong)
        if given or not known:
            return found
        # Nothing that is given touches the part: it stands still, in as many steps and vectors.
        shape = (len(self.net), *next(iter(known.values())).shape)
        values, strength = (np.broadcast_to(a, shape) for a in (found.values, found.strength))
        return Evaluation(values, strength, found.names)

    def voltages(
        self, worth: Values, given: BoolArray, supply: float, thresholds: tuple[float, float]
    ) -> FloatArray:
        """Return the voltages of nodes for what they are worth, V, shape (nodes,).

        An n channel passes no more than its gate's voltage less its threshold, a p channel no less
        than its threshold; what is not known gets half the supply.

        Parameters
        ----------
        worth : Values, shape (nodes,)
        given : BoolArray, shape (nodes,)
            Nodes that are held from outside.
        supply : float
            V.
        thresholds : tuple of float
            V; of n and p channels.
        """
        levels = np.where(worth < 0, 0.5, worth) * supply
        closed = worth[self.switches.gate] == self.switches.is_n
        for carriers, value, short in (
            (~self.switches.is_n, 1, -thresholds[0]),
            (self.switches.is_n, 0, thresholds[1]),
        ):
            whole = self._reached(given & (worth == value), closed & carriers, given)
            levels[(worth == value) & ~whole & ~given] += short
        return levels

    def _reached(self, roots: BoolArray, closed: BoolArray, given: BoolArray) -> BoolArray:
        """Return the nodes that closed devices join to roots, not through given nodes."""
        found = roots
        drain, source = self.switches.drain, self.switches.source
        while True:
            wider = found.copy()
            wider[drain[found[source] & closed]] = True
            wider[source[found[drain] & closed]] = True
            wider = np.where(given, roots, wider)
            if (wider == found).all():
                return found
            found = wider


def part_of(every: Switches, devices: IntArray) -> Part:
    """Return some of a circuit's devices as a part of their own."""
    ends = np.stack([every.drain[devices], every.gate[devices], every.source[devices]])
    net, node = np.unique(ends, return_inverse=True)
    drain, gate, source = node.reshape(ends.shape)
    return Part(
        net,
        Switches(
            drain,
            gate,
            source,
            every.is_n[devices],
            every.resistance[devices],
            every.cap[net],
            every.supply[net],
            [""] * len(net),
        ),
    )


def held_at(levels: Mapping[int, bool], vectors: int = 1, steps: int = 2) -> dict[int, Values]:
    """Return values that stay as they are, for `Part.evaluate`."""
    return {net: np.full((steps, vectors), level, np.int8) for net, level in levels.items()}


def moving(edges: Mapping[int, tuple[bool, bool]], vectors: int = 1) -> dict[int, Values]:
    """Return values of nets before and after an edge, for `Part.evaluate`."""
    return {
        net: np.repeat(np.array(edge, np.int8)[:, None], vectors, axis=1)
        for net, edge in edges.items()
    }
