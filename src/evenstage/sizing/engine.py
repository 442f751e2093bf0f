"""Sizes of a whole block: which may move, which goal follows which, and where the answer stops.

The continuous answer is found in at most three kinds of steps, each a convex programme whose certificate
the independent checker confirms:

1. The least delay. With scope ``path`` only the sizes on the slowest path move at first; sizes that the
   multipliers show on the limiting paths of the answer join until none is left to join.
2. The least spend within the margin of that delay, and no slower than today. Near the optimum delay is
   flat in the sizes, so this costs nothing a designer notices and saves width they do.
3. For a delay in 50 % arrivals the charged delay asked for is adjusted until the arrivals agree.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import InfeasibleError
from evenstage.sizing.certificate import check
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.interior_point import solve
from evenstage.timing.sweep import sweep
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.interior_point import Solution
    from evenstage.sizing.model import Limits, Model
    from evenstage.sizing.problem import Problem
    from evenstage.sizing.wishes import Wishes
    from evenstage.timing.sweep import Timing

_ON_LIMITING_PATH = 1e-3
"""Share of the unit flow above which a size counts as on a limiting path."""
_AGREES = 1e-5
"""Relative distance at which a delay in arrivals counts as met."""


@dataclass(frozen=True, kw_only=True)
class Continuous:
    """The certified answer before widths are rounded.

    Parameters
    ----------
    sizes : FloatArray, shape (sizes,)
        Relative to today.
    active : BoolArray, shape (sizes,)
        Which sizes were allowed to move.
    lower, upper : FloatArray, shape (sizes,)
        The bounds they moved in.
    solution : Solution
        Of the last programme.
    goal : Goal
        Of the last programme.
    least_delay : float
        s; least worst charged delay.
    fastest : Solution
        The answer to the first step.
    deadline : float
        s; worst charged delay the written widths must keep.
    """

    sizes: FloatArray
    active: BoolArray
    lower: FloatArray
    upper: FloatArray
    solution: Solution
    goal: Goal
    least_delay: float
    fastest: Solution
    deadline: float


@dataclass(frozen=True)
class Engine:
    """A model with its limits and costs, ready for goals.

    Parameters
    ----------
    model : Model
    limits : Limits
    spend : FloatArray, shape (sizes,)
        Cost of one unit of each size.
    spend_fixed : float
        Cost of everything that has no size.
    wishes : Wishes
    cost_today : float
        Total cost that ``wishes.width`` multiplies.
    """

    model: Model
    limits: Limits
    spend: FloatArray
    spend_fixed: float
    wishes: Wishes
    cost_today: float

    @cached_property
    def today(self) -> Timing:
        """The block as drawn."""
        return sweep(self.model.circuit, self.model.graph, self.model.unit)

    @property
    def cost_drawn(self) -> float:
        """Cost of the block as drawn."""
        return self.spend_fixed + float(self.spend.sum())

    def run(self) -> Continuous:
        """Find the continuous answer.

        Raises
        ------
        InfeasibleError
            Where the wishes cannot be met.
        NotConvergedError
            Where the proof fails.
        """
        fastest, active = self._least_delay()
        least, drawn = fastest.delay, self._drawn_delay()
        free = self.model.variables.free
        limiting = active & self._limiting(fastest) if self.wishes.scope == "block" else active
        lower, upper = self._bounds(active)
        if not self.wishes.reclaim:
            held = active & ~limiting
            lower[held] = np.maximum(lower[held], 1.0)
        else:
            active = free
            lower, upper = self._bounds(active)
        if self.wishes.delay is not None:
            return self._for_delay(fastest, active, lower, upper)
        deadline = least * (1 + max(self.wishes.margin, _AGREES))
        if self.wishes.width is None:
            deadline = min(deadline, max(drawn, least * (1 + _AGREES)))
        return self._within(deadline, fastest, active, lower, upper)

    def _within(
        self,
        deadline: float,
        fastest: Solution,
        active: BoolArray,
        lower: FloatArray,
        upper: FloatArray,
    ) -> Continuous:
        goal = Cheapest(deadline)
        solution = self._solve(goal, lower, upper, fastest.sizes)
        return Continuous(
            sizes=solution.sizes,
            active=active,
            lower=lower,
            upper=upper,
            solution=solution,
            goal=goal,
            least_delay=fastest.delay,
            fastest=fastest,
            deadline=deadline,
        )

    def _for_delay(
        self, fastest: Solution, active: BoolArray, lower: FloatArray, upper: FloatArray
    ) -> Continuous:
        """Find the least spend whose 50 % arrivals meet the wished delay."""
        wanted = self.wishes.delay or 0.0
        possible = self.timed(fastest.sizes).lateness.max()
        if possible > wanted * (1 + _AGREES):
            raise InfeasibleError(
                f"a delay of {engineering(wanted, 's', 4)} cannot be met: the least possible within "
                f"the limits is {engineering(possible, 's', 4)}, "
                f"{engineering(possible - wanted, 's')} more; {self._blame(fastest)}",
                code="delay-out-of-reach",
            )
        floor = fastest.delay * (1 + _AGREES)
        deadline, best = max(floor, wanted * fastest.delay / possible), None
        for _ in range(12):
            answer = self._within(deadline, fastest, active, lower, upper)
            reached = float(self.timed(answer.sizes).lateness.max())
            best = answer if reached <= wanted else best
            following = max(floor, deadline * wanted * (1 - _AGREES / 4) / reached)
            if wanted * (1 - _AGREES) < reached <= wanted or following == deadline:
                break
            deadline = following
        return best or answer

    def timed(self, sizes: FloatArray) -> Timing:
        """Time the block with some sizes, by the full arc model."""
        model = self.model
        circuit = model.circuit.resized(model.variables.factors(sizes))
        return sweep(circuit, model.graph, model.unit)

    def _least_delay(self) -> tuple[Solution, BoolArray]:
        """Find the least delay and the sizes that may move for it."""
        free = self.model.variables.free
        if self.wishes.scope == "block":
            lower, upper = self._bounds(free)
            return self._solve(self._first_goal(), lower, upper, np.ones(len(free))), free
        active = free & (self._on_slowest_path() | self._beyond_limits())
        start = np.ones(len(free))
        while True:
            lower, upper = self._bounds(active)
            fastest = self._solve(self._first_goal(), lower, upper, start)
            joining = self._limiting(fastest) & free & ~active
            if not joining.any():
                return fastest, active
            active = active | joining
            start = fastest.sizes

    def _first_goal(self) -> Goal:
        if self.wishes.width is None:
            return Fastest()
        return Budget(self.wishes.width * self.cost_today)

    def _bounds(self, active: BoolArray) -> tuple[FloatArray, FloatArray]:
        variables = self.model.variables
        return (
            np.where(active, variables.lower, 1.0),
            np.where(active, variables.upper, 1.0),
        )

    def _problem(self, lower: FloatArray, upper: FloatArray) -> Problem:
        problem = self.model.problem(lower, upper, self.spend, self.limits)
        return replace(problem, spend_fixed=self.spend_fixed)

    def _solve(
        self, goal: Goal, lower: FloatArray, upper: FloatArray, start: FloatArray
    ) -> Solution:
        problem = self._problem(lower, upper)
        solution = solve(problem, goal, start=np.clip(start, lower, upper))
        check(problem, goal, solution)
        return solution

    def _limiting(self, solution: Solution) -> BoolArray:
        """Tell which sizes carry flow: those of gates on limiting paths."""
        graph, model = self.model.graph, self.model
        flow = solution.flow[len(solution.flow) - len(graph.arc) :]
        gates = model.circuit.arcs.gate[graph.arc[flow > _ON_LIMITING_PATH]]
        found = np.zeros(len(model.variables), bool)
        found[model.variables.partition.of_gate[gates]] = True
        return found

    def _on_slowest_path(self) -> BoolArray:
        """Tell which sizes lie on today's slowest paths, by arrival and by charged delay."""
        model, found = self.model, np.zeros(len(self.model.variables), bool)
        timing = self.today
        for arrival, delay in (
            (timing.arrival, timing.delay),
            (timing.charged_arrival, timing.charged),
        ):
            found[_sizes_on_path(model, arrival, delay)] = True
        return found

    def _beyond_limits(self) -> BoolArray:
        """Tell which sizes load an input over its ceiling, or make too slow an edge, today."""
        model, limits = self.model, self.limits
        circuit, parts = model.circuit, model.variables.partition
        over = limits.ceiling_net[circuit.net_cap[limits.ceiling_net] > limits.ceiling * (1 + 1e-9)]
        gates = circuit.pins.gate[np.isin(circuit.pins.net, over)]
        if limits.strict:
            slow = self.today.transition[model.graph.target] > limits.transition
            gates = np.concatenate([gates, circuit.arcs.gate[model.graph.arc[slow]]])
        found = np.zeros(len(parts), bool)
        found[parts.of_gate[gates]] = True
        return found

    def _drawn_delay(self) -> float:
        """Return today's worst charged delay, s."""
        return worst_charged(self.today)

    def _blame(self, solution: Solution) -> str:
        """Say which limits hold the fastest answer back."""
        variables, limits = self.model.variables, self.limits
        limiting = self._limiting(solution)
        names = self.model.circuit.devices.net_names
        ceilings = len(limits.ceiling_net)
        prices = solution.limit_prices
        held = []
        if ceilings and (prices[:ceilings] > 1e-3 * solution.delay).any():
            worst = int(limits.ceiling_net[int(prices[:ceilings].argmax())])
            held.append(f"the input capacitance allowed on '{names[worst]}'")
        if (prices[ceilings:] > 1e-3 * solution.delay).any():
            held.append("the transition limit")
        at_top = limiting & variables.free & (solution.sizes > variables.upper * (1 - 1e-6))
        if at_top.any():
            held.append(f"the largest widths allowed ({int(at_top.sum())} sizes)")
        if (limiting & ~variables.free).any():
            count = int((limiting & ~variables.free).sum())
            held.append(f"{count} sizes on the limiting paths that are fixed")
        if self.wishes.width is not None and solution.spend_price > 0:
            held.append("the budget")
        return "it is held by " + (", ".join(held) or "the topology: no limit is active")


def worst_charged(timing: Timing) -> float:
    """Return the worst charged arrival at any path end, required times counted in, s."""
    end = timing.graph.end
    offset = timing.lateness - timing.arrival[end]
    return float((timing.charged_arrival[end] + offset).max())


def _sizes_on_path(model: Model, arrival: FloatArray, delay: FloatArray) -> list[int]:
    """Return the sizes along the path that makes the latest arrival under some arc delays."""
    graph = model.graph
    node = int(graph.end[int(arrival[graph.end].argmax())])
    heads = np.searchsorted(graph.target, np.arange(len(graph) + 1))
    found = []
    while heads[node] < heads[node + 1]:
        some = np.arange(heads[node], heads[node + 1])
        arc = int(some[int((arrival[graph.source[some]] + delay[some]).argmax())])
        found.append(
            int(model.variables.partition.of_gate[model.circuit.arcs.gate[graph.arc[arc]]])
        )
        node = int(graph.source[arc])
    return found
