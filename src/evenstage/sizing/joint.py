"""One block in several corners as one programme.

The widths are the same in every corner; delays, ceilings and transitions are not. So the programme
has the sizes once and, side by side, a graph for each corner, with its own delays and limits. The
worst delay over the ends of all graphs is the worst over corners; a unit flow may spread over the
graphs, and what flows through a corner says how much it limits. The bound of
:mod:`evenstage.sizing.bound` asks nothing of the graph but that the flow is conserved, so it holds.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from itertools import pairwise
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np

from evenstage.sizing.problem import Monomials, Problem
from evenstage.sizing.timed import Timed, resized
from evenstage.timing.sweep import sweep

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.devices import FloatArray
    from evenstage.sizing.model import Limits, Model
    from evenstage.sizing.pulls import Skews
    from evenstage.sizing.solution import Solution
    from evenstage.sizing.variables import Variables

_ROUNDING: Final = 1e-9
"""Relative room that rounding is given at limits."""


class Corner(NamedTuple):
    """One corner with what must be kept in it, and the rows of the programme that are its own.

    ``arcs`` are those of the timing graph; ``limits`` those of its input ceilings and transitions.
    """

    model: Model
    limits: Limits
    arcs: slice
    rows: slice


@dataclass(frozen=True)
class Joint:
    """The models of one block, a corner each, over the same sizes.

    Parameters
    ----------
    models : tuple of Model
        At least one; all of one partition and one set of variables.
    """

    models: tuple[Model, ...]

    @property
    def first(self) -> Model:
        """The model of the first corner, for what is the same in all: cards, gates, sizes."""
        return self.models[0]

    @property
    def variables(self) -> Variables:
        """The sizes."""
        return self.first.variables

    def with_variables(self, variables: Variables) -> Joint:
        """Return the block with other reasons or bounds of its sizes."""
        return Joint(tuple(replace(one, variables=variables) for one in self.models))

    @cached_property
    def today(self) -> Timed:
        """The block as drawn."""
        return Timed(tuple(sweep(one.circuit, one.graph, one.unit) for one in self.models))

    def timed(self, factor: FloatArray) -> Timed:
        """Time the block with every device's width multiplied by a factor, shape (devices,)."""
        return resized(self.today, factor)

    def corners(self, limits: Sequence[Limits]) -> list[Corner]:
        """Return each corner with its limits and its rows of the programme."""
        arcs = np.cumsum([0, *(one.arcs for one in self.models)]).tolist()
        counts = [one.limit_count(some) for one, some in zip(self.models, limits, strict=True)]
        rows = np.cumsum([0, *counts]).tolist()
        return [
            Corner(one, some, slice(end - len(one.graph.arc), end), slice(*row))
            for one, some, end, row in zip(
                self.models, limits, arcs[1:], pairwise(rows), strict=True
            )
        ]

    def flows(self, solution: Solution) -> list[FloatArray]:
        """Return the flow on the arcs of each corner's timing graph."""
        ends = np.cumsum([one.arcs for one in self.models]).tolist()
        return [
            solution.flow[end - len(one.graph.arc) : end]
            for one, end in zip(self.models, ends, strict=True)
        ]

    def shares(self, solution: Solution) -> list[float]:
        """Return which part of the unit flow leaves through the ends of each corner."""
        ends = np.cumsum([0, *(len(one.graph.end) for one in self.models)]).tolist()
        return [float(solution.end_flow[begin:end].sum()) for begin, end in pairwise(ends)]

    def problem(
        self, lower: FloatArray, upper: FloatArray, spend: FloatArray, limits: Sequence[Limits]
    ) -> Problem:
        """Return the programme of all corners; see `Model.problem`.

        Limits of what pull-up and pull-down may go apart come last: they are the same everywhere.
        """
        problem = side_by_side(
            [
                model.problem(lower, upper, spend, some)
                for model, some in zip(self.models, limits, strict=True)
            ]
        )
        skews = self.variables.skews
        return problem if skews is None else _with_skews(problem, skews)


def side_by_side(problems: Sequence[Problem]) -> Problem:
    """Return one problem over the same sizes with the graphs and limits of several."""
    first = problems[0]
    if len(problems) == 1:
        return first
    nodes, arcs, rows = (
        np.cumsum([0, *counts]).tolist()
        for counts in (
            [q.nodes for q in problems],
            [len(q.arc_source) for q in problems],
            [q.limits for q in problems],
        )
    )

    def numbered(name: str) -> np.ndarray[tuple[int], np.dtype[np.int32]]:
        parts = [getattr(q, name) + np.int32(k) for q, k in zip(problems, nodes, strict=False)]
        return np.concatenate(parts)

    return replace(
        first,
        nodes=nodes[-1],
        start_node=numbered("start_node"),
        start_arrival=np.concatenate([q.start_arrival for q in problems]),
        arc_source=numbered("arc_source"),
        arc_target=numbered("arc_target"),
        delay=_under_each_other([q.delay for q in problems], arcs),
        end_node=numbered("end_node"),
        end_offset=np.concatenate([q.end_offset for q in problems]),
        limit=_under_each_other([q.limit for q in problems], rows),
        limits=rows[-1],
    )


def _with_skews(problem: Problem, skews: Skews) -> Problem:
    """Return a problem in which sizes of both sides of a gate keep their ratio within bounds."""
    room = 1 + _ROUNDING
    rows = (problem.limits + np.arange(2 * len(skews))).astype(np.int32)
    more = Monomials(
        row=rows,
        coefficient=np.concatenate([1 / (skews.most * room), skews.least / room]),
        plus=np.concatenate([skews.up, skews.down]),
        minus=np.concatenate([skews.down, skews.up]),
    )
    return replace(
        problem,
        limit=_under_each_other([problem.limit, more], [0, 0]),
        limits=problem.limits + len(rows),
    )


def _under_each_other(parts: Sequence[Monomials], first: Sequence[int]) -> Monomials:
    """Return sums of several tables as one, the rows of each from its first row on."""
    rows = [some.row + np.int32(k) for some, k in zip(parts, first, strict=False)]
    return Monomials(
        row=np.concatenate(rows),
        coefficient=np.concatenate([some.coefficient for some in parts]),
        plus=np.concatenate([some.plus for some in parts]),
        minus=np.concatenate([some.minus for some in parts]),
    )
