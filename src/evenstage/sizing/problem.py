"""Sizing as a convex programme in the logarithms of the sizes.

Every quantity of the model is a sum of monomials ``coefficient * x[plus] / x[minus]`` in the sizes
``x > 0``; with ``y = log x`` each becomes the exponential of something linear, hence convex
(Fishburn and Dunlop, ICCAD 1985; Boyd, Kim, Patil and Horowitz, Operations Research 53(6), 2005).
Delays add up along an acyclic graph: over arrivals ``t`` the constraint of an arc from node u to
node v is ``t_u + delay(arc) <= t_v``.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from evenstage.errors import NoPathError
from evenstage.sizing.arrivals import Levels

if TYPE_CHECKING:
    from numpy.typing import ArrayLike

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int32]


def totals(index: NDArray[np.integer], weight: FloatArray, length: int) -> FloatArray:
    """Return per index the sum of the weights that go there, shape ``(length,)``."""
    return np.bincount(index, weight, length).astype(np.float64, copy=False)


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
        ratio: FloatArray = np.exp(y[self.plus] - y[self.minus])
        return self.coefficient * ratio

    def sums(self, log_sizes: FloatArray, rows: int) -> FloatArray:
        """Return each row's sum, shape ``(rows,)``."""
        return totals(self.row, self.values(log_sizes), rows)

    def gradient(self, log_sizes: FloatArray, weight: FloatArray) -> FloatArray:
        """Return the gradient of ``weight @ sums`` in the log sizes, shape ``(n_sizes,)``."""
        n = len(log_sizes)
        part = weight[self.row] * self.values(log_sizes)
        return (totals(self.plus, part, n + 1) - totals(self.minus, part, n + 1))[:n]


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

    @cached_property
    def levels(self) -> Levels:
        """The graph in the order of a sweep; worked out once."""
        return Levels.of(self.nodes, self.arc_source, self.arc_target)

    @cached_property
    def start_time(self) -> FloatArray:
        """Latest arrival from outside per node, s, shape (nodes,); minus infinity for none."""
        time = np.full(self.nodes, -np.inf)
        np.maximum.at(time, self.start_node, self.start_arrival)
        return time

    def cost(self, sizes: FloatArray) -> float:
        """Return ``spend @ sizes + spend_fixed``."""
        return float(self.spend @ sizes) + self.spend_fixed

    def arc_delays(self, sizes: FloatArray) -> FloatArray:
        """Return each arc's delay, s, shape (a,)."""
        return self.delay.sums(np.log(sizes), len(self.arc_source))

    def limit_sums(self, sizes: FloatArray) -> FloatArray:
        """Return what each limit holds at or below 1, shape (limits,)."""
        return self.limit.sums(np.log(sizes), self.limits)


def arrivals(problem: Problem, sizes: ArrayLike) -> FloatArray:
    """Return the latest arrival at each node, s, shape (nodes,).

    Nodes that no path reaches have arrival minus infinity.

    Parameters
    ----------
    problem : Problem
        What is sized.
    sizes : array_like, shape (n_sizes,)
        The sizes.
    """
    delays = problem.arc_delays(np.asarray(sizes, dtype=np.float64))
    return problem.levels.arrivals(problem.start_time, delays)


def worst_delay(problem: Problem, sizes: ArrayLike) -> float:
    """Return the latest arrival at a path end, offsets included, s.

    Parameters
    ----------
    problem : Problem
        What is sized.
    sizes : array_like, shape (n_sizes,)
        The sizes.

    Raises
    ------
    NoPathError
        If no path end can be reached from a start.
    """
    at_end = arrivals(problem, sizes)[problem.end_node] + problem.end_offset
    worst = float(at_end.max(initial=-np.inf))
    if worst == -np.inf:
        raise NoPathError("no path leads from a start to a path end", code="no-path")
    return worst
