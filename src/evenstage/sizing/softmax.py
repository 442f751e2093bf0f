"""Soft arrivals: the latest arrival, smoothed by a temperature, with exact derivatives.

The graph has one source (node 0, arrival 0) and one sink (the last node). At temperature T

=========  ================================================================  ==================
symbol     meaning                                                           shape
=========  ================================================================  ==================
``A_v``    soft arrival ``T log sum_e exp((A_u + d_e) / T)`` over arcs e:    ``(nodes,)``
           u -> v
``q_e``    share of arc e, ``exp((A_u + d_e - A_v) / T)``                    ``(arcs,)``
``mu_v``   flow through a node: 1 at the sink, else the sum of ``phi``       ``(nodes,)``
           over the arcs that leave it
``phi_e``  flow ``mu_v q_e`` of arc e, the gradient of ``A_sink``            ``(arcs,)``
=========  ================================================================  ==================

``A_sink`` is T times the logarithm of the sum of ``exp(length / T)`` over all paths, hence convex
in the delays, at least the longest path and at most T times the entropy of phi above phi's mean.
Delays that move by ``dd`` move the flow by the Hessian's product

    dA_v = sum_e q_e (dA_u + dd_e)
    dphi_e = dmu_v q_e + phi_e (dA_u + dd_e - dA_v) / T,    dmu_u = sum of dphi_e over arcs from u

(A log-sum-exp over paths by dynamic programming; the flow is the gradient by the chain rule.)
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, Protocol

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from evenstage.sizing.problem import FloatArray, IntArray

    Index = NDArray[np.intp]

#: Shares below this change no sum of shares, but make sweeps slow once products underflow.
LEAST_SHARE: Final = 4e-18


@dataclass(frozen=True, kw_only=True)
class Graph:
    """Arcs sorted by target, from the source, node 0, to the sink, the last node.

    Parameters
    ----------
    first : IntArray, shape (nodes + 1,)
        Where the arcs into each node begin; every node but the source has some.
    source, target : IntArray, shape (arcs,)
        source < target.
    level : IntArray, shape (levels + 1,)
        Where each level of nodes begins, the source's included, if nodes are ordered by level: no
        arc stays inside a level.
    """

    first: IntArray
    source: IntArray
    target: IntArray
    level: IntArray

    @property
    def nodes(self) -> int:
        """Number of nodes."""
        return len(self.first) - 1


class Sweeps(Protocol):
    """What a graph can work out for given delays, however it is done."""

    def __init__(self, graph: Graph) -> None:
        """Make a graph ready."""

    def longest(self, delay: FloatArray) -> float:
        """Return the length of the longest path."""

    def soft(self, delay: FloatArray, temperature: float) -> Soft:
        """Return soft arrivals at a temperature > 0."""

    def carrying(self, flow: FloatArray, least: float) -> NDArray[np.bool_]:
        """Tell which arcs carry flow, shape (arcs,): paths from source to sink and nothing else.

        Those that carry at least so much, and before each the way most of its flow comes.
        """


class Soft(Protocol):
    """Soft arrivals for some delays."""

    @property
    def worst(self) -> float:
        """Soft arrival at the sink."""

    @property
    def share(self) -> FloatArray:
        """Share of each arc, shape (arcs,)."""

    @property
    def flow(self) -> FloatArray:
        """Flow of each arc, shape (arcs,)."""

    def product(self, moved: FloatArray) -> FloatArray:
        """Return how the flow moves with the delays: the Hessian times `moved`, shape (arcs,)."""
