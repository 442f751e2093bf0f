r"""The equations of a circuit of transistors, resistors and capacitors.

The first ``unknown`` of the nodes move freely, the others are given. With v the unknown and w the
given voltages, Kirchhoff's current law at the unknown nodes is

    C v' = -A i(v, w) - G v - G_w w - C_w w',

i the channel currents, A their incidence, G the conductance and C the capacitance matrix. All
capacitances are linear equivalents, so C is constant and what flows into a capacitor at one end
leaves it at the other: charge is conserved exactly. C is factorised once. Its inverse is full, but
falls off by the coupling from node to node; the Jacobian is built with an inverse without the
entries below a millionth of the largest in their column, which leaves it sparse. Newton's method
needs no more, and the right-hand side is exact.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import coo_array, csc_array, hstack
from scipy.sparse.linalg import splu

from evenstage.simulation.channel import flow

if TYPE_CHECKING:
    from scipy.sparse.linalg import SuperLU

    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.simulation.channel import Channels

#: Entries of the inverse capacitance matrix below this share of their column's largest are dropped.
_DROPPED = 1e-6

#: Columns of the inverse that are worked out together.
_BLOCK = 256


@dataclass(frozen=True)
class Equations:
    """A circuit; nodes are numbered, the unknown ones first.

    Parameters
    ----------
    unknown, given : int
        Numbers of nodes.
    channels : Channels
    drain, gate, source, bulk : IntArray, shape (devices,)
        Nodes of each channel.
    capacitor_ends, capacitance : IntArray, shape (2, capacitors); FloatArray, F
        Every unknown node must have one, and be joined by them to a given node.
    resistor_ends, resistance : IntArray, shape (2, resistors); FloatArray, ohm
    rounding : float
        V; see `evenstage.simulation.channel`.
    """

    unknown: int
    given: int
    channels: Channels
    drain: IntArray
    gate: IntArray
    source: IntArray
    bulk: IntArray
    capacitor_ends: IntArray
    capacitance: FloatArray
    resistor_ends: IntArray
    resistance: FloatArray
    rounding: float

    @cached_property
    def _incidence(self) -> csc_array[np.float64]:
        """A: currents that leave each unknown node, shape (unknown, devices)."""
        devices = np.arange(len(self.drain))
        ends = np.concatenate([self.drain, self.source])
        signs = np.concatenate([np.ones(len(devices)), -np.ones(len(devices))])
        return self._rows(ends, np.tile(devices, 2), signs, len(devices))

    def _rows(
        self, rows: IntArray, columns: IntArray, entries: FloatArray, width: int
    ) -> csc_array[np.float64]:
        """Return a matrix of the rows that belong to unknown nodes."""
        kept = rows < self.unknown
        shape = (self.unknown, width)
        return coo_array((entries[kept], (rows[kept], columns[kept])), shape=shape).tocsc()

    def _laplacian(self, ends: IntArray, entries: FloatArray) -> csc_array[np.float64]:
        """Return the matrix of two-terminal elements, shape (unknown, nodes)."""
        a, b = ends
        rows, columns = np.concatenate([a, b, a, b]), np.concatenate([a, b, b, a])
        signed = np.concatenate([entries, entries, -entries, -entries])
        return self._rows(rows, columns, signed, self.unknown + self.given)

    @cached_property
    def _conductance(self) -> csc_array[np.float64]:
        return self._laplacian(self.resistor_ends, 1.0 / self.resistance)

    @cached_property
    def _capacitance(self) -> csc_array[np.float64]:
        return self._laplacian(self.capacitor_ends, self.capacitance)

    @cached_property
    def _factors(self) -> SuperLU:
        return splu(self._capacitance[:, : self.unknown].tocsc())

    @cached_property
    def _inverse(self) -> csc_array[np.float64]:
        """The inverse of C without its small entries, shape (unknown, unknown)."""
        parts: list[csc_array[np.float64]] = []
        for first in range(0, self.unknown, _BLOCK):
            width = min(_BLOCK, self.unknown - first)
            right = np.zeros((self.unknown, width))
            right[first + np.arange(width), np.arange(width)] = 1.0
            column = self._factors.solve(right)
            small = np.abs(column) < _DROPPED * np.abs(column).max(axis=0)
            parts.append(csc_array(np.where(small, 0.0, column)))
        inverse: csc_array[np.float64] = hstack(parts, format="csc")
        return inverse

    @cached_property
    def _slots(self) -> tuple[csc_array[np.float64], IntArray, IntArray]:
        """Pattern of the slopes of all node currents, and where each channel's six belong.

        The pattern holds the conductances of the resistors; slot and number of each slope follow.
        """
        rows = np.concatenate([np.tile(self.drain, 3), np.tile(self.source, 3)])
        columns = np.tile(np.concatenate([self.drain, self.gate, self.source]), 2)
        kept = np.flatnonzero((rows < self.unknown) & (columns < self.unknown))
        rows, columns = rows[kept], columns[kept]
        still = self._conductance[:, : self.unknown].tocoo()
        keys = np.concatenate([columns, still.col]) * self.unknown
        keys += np.concatenate([rows, still.row])
        used, slot = np.unique(keys, return_inverse=True)
        entries = np.bincount(slot[len(kept) :], still.data, len(used))
        head = np.searchsorted(used, np.arange(self.unknown + 1) * self.unknown)
        size = (self.unknown, self.unknown)
        rows, data = used % self.unknown, entries.astype(np.float64)
        pattern: csc_array[np.float64] = csc_array((data, rows, head), shape=size)
        return pattern, slot[: len(kept)], kept

    def currents(self, voltage: FloatArray) -> FloatArray:
        """Return the channel currents at the voltages of all nodes, A, shape (devices,)."""
        return self._flow(voltage)[0]

    def _flow(self, voltage: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the currents, and their slopes by drain, gate and source in one column."""
        ends = (voltage[node] for node in (self.drain, self.gate, self.source, self.bulk))
        found = flow(self.channels, *ends, rounding=self.rounding)
        return found[0], np.concatenate(found[1:])

    def slope(self, unknown: FloatArray, given: FloatArray, change: FloatArray) -> FloatArray:
        """Return v', V/s, shape (unknown,).

        Parameters
        ----------
        unknown, given : FloatArray, V
            v and w.
        change : FloatArray, V/s
            w'.
        """
        voltage = np.concatenate([unknown, given])
        leaving = self._incidence @ self.currents(voltage) + self._conductance @ voltage
        leaving += self._capacitance[:, self.unknown :] @ change
        result: FloatArray = -self._factors.solve(leaving)
        return result

    def jacobian(self, unknown: FloatArray, given: FloatArray) -> csc_array[np.float64]:
        """Return the slopes of v' by v, 1/s, sparse, shape (unknown, unknown)."""
        _, slopes = self._flow(np.concatenate([unknown, given]))
        pattern, slot, kept = self._slots
        every = np.concatenate([slopes, -slopes])
        data = pattern.data + np.bincount(slot, every[kept], len(pattern.data))
        inner = csc_array((data, pattern.indices, pattern.indptr), shape=pattern.shape)
        return -(self._inverse @ inner).tocsc()

    def supply_current(self, voltage: FloatArray, change: FloatArray, node: int) -> float:
        """Return the current that a given node feeds into the circuit, A.

        Parameters
        ----------
        voltage, change : FloatArray, V and V/s, shape (nodes,)
            Of all nodes.
        node : int
        """
        current = self.currents(voltage)
        total = float(current[self.drain == node].sum() - current[self.source == node].sum())
        for ends, flows in (
            (self.resistor_ends, np.diff(voltage[self.resistor_ends], axis=0)[0] / self.resistance),
            (
                self.capacitor_ends,
                np.diff(change[self.capacitor_ends], axis=0)[0] * self.capacitance,
            ),
        ):
            total -= float(flows[ends[0] == node].sum() - flows[ends[1] == node].sum())
        return total
