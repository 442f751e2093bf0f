r"""Networks of resistors and capacitors: the moments of their step responses.

All nets of a block are one network of numbered nodes; nets do not touch, so its conductance matrix
G falls into blocks and is factorised once. With the driven nodes held at the step, the response of
every other node is ``1 - m1 s + m2 s^2 - ...`` with

    G m1 = C 1,    G m2 = C m1,

whatever the shape of the nets: trees, meshes, several driven nodes. ``m1 = sum R_k C_k``, R_k the
resistance shared with node k on the way to the driver, is the Elmore delay (Elmore, Journal of
Applied Physics 19(1), 1948; Rubinstein, Penfield and Horowitz, IEEE Transactions on CAD 2(3), 1983,
from memory). It is the mean, and ``2 m2 - m1^2`` the variance, of the impulse response.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components
from scipy.sparse.linalg import splu

if TYPE_CHECKING:
    from scipy.sparse.linalg import SuperLU

    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray


class Moments(NamedTuple):
    """First and second moment of the response at each node, s and s^2, shape (nodes,)."""

    first: FloatArray
    second: FloatArray


@dataclass(frozen=True)
class RCNetwork:
    """Resistors between numbered nodes, some of which are driven.

    Parameters
    ----------
    ends : IntArray, shape (2, resistors)
        The nodes each resistor joins.
    resistance : FloatArray, ohm, shape (resistors,)
        Above zero.
    driven : BoolArray, shape (nodes,)
        Nodes at which a driver holds the network; every other node must be joined to one of them.

    Raises
    ------
    ValueError
        Where a node is joined to no driven one.
    """

    ends: IntArray
    resistance: FloatArray
    driven: BoolArray

    def __post_init__(self) -> None:
        if not self.driven[self._representatives].all():
            message = "a node of an RC network is joined to no driven node"
            raise ValueError(message)

    def __len__(self) -> int:
        return len(self.driven)

    @cached_property
    def _representatives(self) -> IntArray:
        """Return a driven node of each connected part, or any where it has none."""
        size = (len(self), len(self))
        links = coo_array((np.ones(self.ends.shape[1], np.int8), tuple(self.ends)), shape=size)
        count, part = connected_components(links, directed=False)
        found = np.zeros(count, np.int64)
        found[part] = np.arange(len(self))
        found[part[self.driven]] = np.flatnonzero(self.driven)
        return found

    @cached_property
    def _row(self) -> IntArray:
        """Row of each node in the equations; -1 for driven ones."""
        return np.where(self.driven, -1, np.cumsum(~self.driven) - 1)

    @cached_property
    def _part(self) -> IntArray:
        """Which set of equations that do not touch others each node belongs to; driven ones none.

        Nets, and the pieces that driven nodes part them into.
        """
        row = self._row[self.ends]
        inside = (row >= 0).all(axis=0)
        size = (int((~self.driven).sum()),) * 2
        links = coo_array((np.ones(int(inside.sum()), np.int8), tuple(row[:, inside])), shape=size)
        _, part = connected_components(links, directed=False)
        return np.where(self.driven, -1, np.concatenate([part, [-1]])[self._row])

    @cached_property
    def _factors(self) -> SuperLU:
        """The conductance matrix without the driven nodes, factorised: G is positive definite."""
        row, conductance = self._row[self.ends], 1.0 / self.resistance
        both = (row >= 0).all(axis=0)
        own = row[row >= 0]
        a, b, between = row[0, both], row[1, both], -conductance[both]
        entries = np.concatenate([np.stack([conductance, conductance])[row >= 0], between, between])
        rows, columns = np.concatenate([own, a, b]), np.concatenate([own, b, a])
        size = int((~self.driven).sum())
        matrix = coo_array((entries, (rows, columns)), shape=(size, size)).tocsc()
        return splu(
            matrix,
            permc_spec="MMD_AT_PLUS_A",
            diag_pivot_thresh=0.0,
            options={"SymmetricMode": True},
        )

    def voltages(self, current: FloatArray) -> FloatArray:
        """Return the voltages that currents into the nodes cause, V, shape as the currents (A).

        Driven nodes stay at zero.
        """
        result = np.zeros_like(current)
        if not self.driven.all():
            result[~self.driven] = self._factors.solve(current[~self.driven])
        return result

    def moments(self, capacitance: FloatArray) -> Moments:
        """Return the moments of the responses, the driven nodes stepping.

        Parameters
        ----------
        capacitance : FloatArray, F, shape (nodes,)
            To ground.
        """
        first = self.voltages(capacitance)
        return Moments(first, self.voltages(capacitance * first))

    def shared_resistance(self, node: IntArray, other: IntArray) -> FloatArray:
        """Return the resistance pairs of nodes share on the way to the driver, ohm, shape (pairs,).

        It is what a current into one of them raises the other by. Nodes of different nets share
        none. Nets are solved side by side: a pass takes one node of each.
        """
        result = np.zeros(len(node))
        wanted, index = np.unique(node, return_inverse=True)
        part = self._part[wanted]
        order = np.argsort(part, kind="stable")
        begins = np.searchsorted(part[order], part[order])
        turn = np.empty(len(wanted), np.int64)
        turn[order] = np.arange(len(wanted)) - begins
        turn[part < 0] = -1
        joined = (part[index] == self._part[other]) & (part[index] >= 0)
        for now in range(int(turn.max(initial=-1)) + 1):
            current = np.zeros(len(self))
            current[wanted[turn == now]] = 1.0
            here = np.flatnonzero(joined & (turn[index] == now))
            result[here] = self.voltages(current)[other[here]]
        return result
