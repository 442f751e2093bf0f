"""Sizing as a convex programme in the logarithms of the sizes.

Every quantity of the model is a sum of monomials ``coefficient * x[plus] / x[minus]`` in the sizes
``x > 0``; with ``y = log x`` each becomes the exponential of something linear, hence convex
(Fishburn and Dunlop, ICCAD 1985; Boyd, Kim, Patil and Horowitz, Operations Research 53(6), 2005).
Delays add up along an acyclic graph: over arrivals ``t`` the constraint of an arc from node u to node
v is ``t_u + delay(arc) <= t_v``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int32]


@dataclass(frozen=True, kw_only=True)
class Monomials:
    """Sums of monomials, one sum per row: ``sum coefficient * x[plus] / x[minus]``.

    Shape ``(k,)`` each. The size index ``n_sizes`` (one past the last) stands for the constant 1.
    Coefficients are positive; several entries may share a row.
    """

    row: IntArray
    coefficient: FloatArray
    plus: IntArray
    minus: IntArray

    def values(self, log_sizes: FloatArray) -> FloatArray:
        """Return each monomial's value, shape ``(k,)``, at log sizes of shape ``(n_sizes,)``."""
        y = np.append(log_sizes, 0.0)
        return self.coefficient * np.exp(y[self.plus] - y[self.minus])

    def sums(self, log_sizes: FloatArray, rows: int) -> FloatArray:
        """Return each row's sum, shape ``(rows,)``."""
        return np.bincount(self.row, self.values(log_sizes), rows)


@dataclass(frozen=True, kw_only=True)
class Problem:
    """Sizes, an acyclic delay graph and limits.

    Parameters
    ----------
    lower, upper : FloatArray, shape (n_sizes,)
        Bounds of the sizes themselves (not their logarithms), all finite and positive.
    spend : FloatArray, shape (n_sizes,)
        Cost of one unit of each size, >= 0: total cost is ``spend @ x + spend_fixed``.
    spend_fixed : float
        Cost of what cannot change.
    nodes : int
        Number of graph nodes; node ids are a topological order: every arc has source < target.
    start_node, start_arrival : IntArray and FloatArray, shape (s,)
        Where paths begin, and when (s).
    arc_source, arc_target : IntArray, shape (a,)
        Parallel arcs are allowed.
    delay : Monomials
        Row = arc; s.
    end_node, end_offset : IntArray and FloatArray, shape (e,)
        Where paths end; the worst delay is ``max(t[end_node] + end_offset)``.
    limit : Monomials
        Row = limit; each sum must stay <= 1 (input capacitance ceilings, transition limits).
    limits : int
        Number of limit rows.
    """

    lower: FloatArray
    upper: FloatArray
    spend: FloatArray
    spend_fixed: float
    nodes: int
    start_node: IntArray
    start_arrival: FloatArray
    arc_source: IntArray
    arc_target: IntArray
    delay: Monomials
    end_node: IntArray
    end_offset: FloatArray
    limit: Monomials
    limits: int
