"""Sizes of a whole block: which may move, which goal follows which, and where the answer stops.

The continuous answer is found in at most three kinds of steps, each a convex programme whose
certificate the independent checker confirms:

1. The least delay. What it would be if every size could move tells which paths cannot stay as they
   are; only the sizes on those move at first. Sizes that the multipliers show on the limiting paths
   of the answer join until none is left to join. (With scope ``block`` all others may grow too.)
2. The least spend within the margin of that delay, and no slower than today. Near the optimum delay
   is flat in the sizes, so this costs nothing a designer notices and saves width they do.
3. For a delay in 50 % arrivals the charged delay asked for is adjusted until the arrivals agree.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import InfeasibleError, NotConvergedError
from evenstage.sizing.certificate import check
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.infeasible import BudgetTooSmallError, LimitOutOfReachError
from evenstage.sizing.optimum import solve
from evenstage.sizing.presolve import with_guard, without_room
from evenstage.timing.sweep import end_offsets, sweep
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.model import Limits, Model
    from evenstage.sizing.problem import Problem
    from evenstage.sizing.solution import Solution
    from evenstage.sizing.wishes import Wishes
    from evenstage.timing.sweep import Timing

_ON_LIMITING_PATH = 1e-3
"""Share of the unit flow above which a size counts as on a limiting path."""
_NEAR_LIMITING_PATH = 1e-4
"""The same on the way to the answer, where the flow still spreads over paths close to limiting."""
_AGREES = 1e-5
"""Relative distance at which a delay counts as met."""
_SHARES = (1.0, 0.9, 0.7, 0.4, 0.0)
"""Parts of the transition limit that stages are given in turn."""
_LOOSE, _TIGHT = 1e-3, 1e-9
"""Gaps at which programmes on the way, and the one that is shown, may stop."""
_FULL = 1e-5
"""Relative room below which a limit counts as used up."""


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
    full : BoolArray, shape (limits,)
        Which limits of the programme leave no room.
    limits : Limits
        As the programme had them.
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
    full: BoolArray
    limits: Limits
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

        Where it makes an edge slower than the limit, because a stage that may stay as slow as it is
        gets a slower input, all stages are given less of the limit, in the end none of it: then no
        stage gets slower at all.

        Raises
        ------
        InfeasibleError
            Where the wishes cannot be met.
        NotConvergedError
            Where the proof fails.
        """
        for share in _SHARES:
            engine = replace(self, limits=replace(self.limits, share=share))
            answer = engine._run()  # noqa: SLF001 -- the same engine with less room
            slowest = max(self.limits.transition, self.today.worst_transition)
            if self.limits.strict or engine.timed(answer.sizes).worst_transition <= slowest * (
                1 + _AGREES / 10
            ):
                break
        return answer

    def _run(self) -> Continuous:
        """Find the continuous answer for the limits as they are."""
        fastest, lower, upper = self._least_delay()
        least, drawn = fastest.delay, worst_charged(self.today)
        active = lower < upper
        if self.wishes.delay is not None:
            return self._for_delay(fastest, active, lower, upper)
        deadline = least * (1 + max(self.wishes.margin, _AGREES))
        if self.wishes.width is None:
            deadline = min(deadline, max(drawn, least * (1 + _AGREES)))
        late = float(self.today.lateness.max())
        for _ in range(6):
            answer = self._within(deadline, fastest, active, lower, upper)
            reached = float(self.timed(answer.sizes).lateness.max())
            tighter = max(least * (1 + _AGREES), deadline * late / reached * (1 - 10 * _AGREES))
            # No faster in charged delay than today must not mean slower in arrivals.
            if reached <= late or tighter >= deadline:
                break
            deadline = tighter
        return answer

    def _within(
        self,
        deadline: float,
        fastest: Solution,
        active: BoolArray,
        lower: FloatArray,
        upper: FloatArray,
    ) -> Continuous:
        """Find the least spend for a deadline.

        At the least delay itself sizes on the limiting paths have no room: they stay as they are.
        """
        exact = (deadline < fastest.delay * (1 + 2 * _AGREES)) & self._limiting(fastest)
        solution = self._solve(
            Cheapest(deadline),
            np.where(exact, fastest.sizes, lower),
            np.where(exact, fastest.sizes, upper),
            fastest.sizes,
        )
        return Continuous(
            sizes=solution.sizes,
            active=active,
            lower=lower,
            upper=upper,
            solution=solution,
            full=self._full(solution),
            limits=self.limits,
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
                f"a delay of {engineering(wanted, 's', 4)} cannot be met: the least possible "
                f"within the limits is {engineering(possible, 's', 4)}, "
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

    def guarded(self, answer: Continuous, guard: float) -> FloatArray | None:
        """Return sizes that miss deadline and limits by a share, for the grid to use up.

        None where there are none: the least delay leaves no room.
        """
        problem = with_guard(self._problem(answer.lower, answer.upper, answer.limits), guard)
        goal = Cheapest(answer.deadline * (1 - guard))
        try:
            return solve(problem, goal, start=answer.sizes, tolerance=_LOOSE).sizes
        except (InfeasibleError, NotConvergedError):
            return None

    def timed(self, sizes: FloatArray) -> Timing:
        """Time the block with some sizes, by the full arc model."""
        model = self.model
        circuit = model.circuit.resized(model.variables.factors(sizes))
        return sweep(circuit, model.graph, model.unit)

    def _least_delay(self) -> tuple[Solution, FloatArray, FloatArray]:
        """Find the least delay, and the bounds within which sizes may move for it."""
        free = self.model.variables.free
        start = np.ones(len(free))
        everything = self._solve(
            self._first_goal(), *self._box(free, free), start, tolerance=_LOOSE
        )
        # No path that is slower today than the least delay of all can stay as it is.
        limiting = free & (
            self._on_slowest_path() | self._beyond_limits() | self._slower_than(everything.delay)
        )
        if self.wishes.scope == "block":
            limiting |= free & self._limiting(everything)
        tolerance = _LOOSE
        while True:
            lower, upper = self._bounds(limiting)
            fastest = self._solve(self._first_goal(), lower, upper, start, tolerance)
            share = _ON_LIMITING_PATH if tolerance == _TIGHT else _NEAR_LIMITING_PATH
            joining = self._limiting(fastest, share) & free & ~limiting
            if not joining.any() and tolerance == _TIGHT:
                return fastest, lower, upper
            # Who limits shows early; the proof is for the last.
            tolerance = _LOOSE if joining.any() else _TIGHT
            limiting = limiting | joining
            start = fastest.sizes

    def _first_goal(self) -> Goal:
        if self.wishes.width is None:
            return Fastest()
        return Budget(self.wishes.width * self.cost_today)

    def _bounds(self, limiting: BoolArray) -> tuple[FloatArray, FloatArray]:
        """Return the bounds of all sizes when some are on limiting paths.

        Those move freely. The others may grow where the scope is the block, and shrink only where
        that is asked for.
        """
        free, wishes = self.model.variables.free, self.wishes
        return self._box(
            limiting | (free & wishes.reclaim), limiting | (free & (wishes.scope == "block"))
        )

    def _box(self, down: BoolArray, up: BoolArray) -> tuple[FloatArray, FloatArray]:
        """Return the bounds when some sizes may go down and some up."""
        variables = self.model.variables
        return np.where(down, variables.lower, 1.0), np.where(up, variables.upper, 1.0)

    def _problem(
        self, lower: FloatArray, upper: FloatArray, limits: Limits | None = None
    ) -> Problem:
        problem = self.model.problem(lower, upper, self.spend, limits or self.limits)
        return without_room(replace(problem, spend_fixed=self.spend_fixed))

    def _solve(
        self,
        goal: Goal,
        lower: FloatArray,
        upper: FloatArray,
        start: FloatArray,
        tolerance: float = _TIGHT,
    ) -> Solution:
        problem = self._problem(lower, upper)
        begin = np.clip(start, problem.lower, problem.upper)
        try:
            solution = solve(problem, goal, start=begin, tolerance=tolerance)
        except LimitOutOfReachError as error:
            raise self._limit_out_of_reach(error) from error
        except BudgetTooSmallError as error:
            raise self._budget_too_small(error) from error
        check(problem, goal, solution)
        return solution

    def _limit_out_of_reach(self, error: LimitOutOfReachError) -> InfeasibleError:
        """Say which input or which gate cannot keep its limit."""
        nets, circuit = self.limits.ceiling_net, self.model.circuit
        if error.limit_row < len(nets):
            name = circuit.devices.net_names[nets[error.limit_row]]
            ceiling = float(self.limits.ceiling[error.limit_row])
            return InfeasibleError(
                f"input '{name}' may show {engineering(ceiling, 'F')}, but the smallest widths "
                f"allowed there show {engineering(error.least * ceiling, 'F')}",
                code="input-over-ceiling",
            )
        row = self.model.transition_row(self.limits)
        gate = int(circuit.arcs.gate[np.flatnonzero(row == error.limit_row)[0]])
        limit = engineering(self.limits.transition, "s")
        return InfeasibleError(
            f"gate '{circuit.gate_name(gate)}' cannot keep the transition limit of {limit}: "
            f"within the widths allowed its edges take {error.least:.3g} times as long",
            code="transition-out-of-reach",
        )

    def _budget_too_small(self, error: BudgetTooSmallError) -> InfeasibleError:
        """Say what the smallest widths come to."""
        what, unit = ("total width", "m") if self.wishes.spend == "width" else ("capacitance", "F")
        return InfeasibleError(
            f"a {what} of {engineering(error.asked, unit, 4)} is out of reach: the smallest widths "
            f"allowed come to {engineering(error.least, unit, 4)}",
            code="budget-too-small",
        )

    def _limiting(self, solution: Solution, share: float = _ON_LIMITING_PATH) -> BoolArray:
        """Tell which sizes carry flow: those of gates on limiting paths."""
        graph, model = self.model.graph, self.model
        flow = solution.flow[len(solution.flow) - len(graph.arc) :]
        gates = model.circuit.arcs.gates_along(graph.arc[flow > share])
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

    def _slower_than(self, delay: float) -> BoolArray:
        """Tell which sizes lie today on paths whose charged delay exceeds one (s)."""
        timing, graph, model = self.today, self.model.graph, self.model
        rest = np.full(len(graph), -np.inf)
        rest[graph.end] = end_offsets(graph) + timing.end_charged_wire
        for some, _, _ in reversed(graph.levels):
            later = rest[graph.target[some]] + timing.charged[some]
            np.maximum.at(rest, graph.source[some], later)
        through = timing.charged_arrival[graph.source] + timing.charged + rest[graph.target]
        gates = model.circuit.arcs.gates_along(graph.arc[through > delay * (1 + _AGREES)])
        found = np.zeros(len(model.variables), bool)
        found[model.variables.partition.of_gate[gates]] = True
        return found

    def _beyond_limits(self) -> BoolArray:
        """Tell which sizes load an input over its ceiling, or make too slow an edge, today."""
        model, limits = self.model, self.limits
        circuit, parts = model.circuit, model.variables.partition
        over = limits.ceiling_net[circuit.net_cap[limits.ceiling_net] > limits.ceiling * (1 + 1e-9)]
        gates = circuit.pins.gate[np.isin(circuit.pins.net, over)]
        if limits.strict:
            slow = self.today.transition[model.graph.target] > limits.transition
            gates = np.concatenate([gates, circuit.arcs.gates_along(model.graph.arc[slow])])
        found = np.zeros(len(parts), bool)
        found[parts.of_gate[gates]] = True
        return found

    def _blame(self, solution: Solution) -> str:
        """Say which limits hold the fastest answer back."""
        variables, nets = self.model.variables, self.limits.ceiling_net
        limiting, full = self._limiting(solution), self._full(solution)
        circuit, row = self.model.circuit, self.model.transition_row(self.limits)
        pins, gates = circuit.pins, limiting[variables.partition.of_gate]
        on_path = np.zeros(len(circuit.devices.net_names), bool)
        on_path[pins.net[gates[pins.gate]]] = True
        inputs = nets[full[: len(nets)] & on_path[nets]]
        arcs = gates[circuit.arcs.gate] & (row >= 0) & full[row]
        at_top = limiting & variables.free & (solution.sizes > variables.upper * (1 - 1e-6))
        stuck = int((limiting & ~variables.free).sum())
        held = []
        if len(inputs):
            name = circuit.devices.net_names[inputs[0]]
            held.append(f"the input capacitance allowed on '{name}'")
        if arcs.any():
            held.append("the transition limit")
        if at_top.any():
            held.append(f"the largest widths allowed ({int(at_top.sum())} sizes)")
        if stuck:
            held.append(f"{stuck} sizes on the limiting paths that are fixed")
        if self.wishes.width is not None and solution.spend_price > 0:
            held.append("the budget")
        return "it is held by " + (", ".join(held) or "the topology: no limit is active")

    def _full(self, solution: Solution) -> BoolArray:
        """Tell which limits a solution leaves no room, shape (limits,)."""
        every = np.ones(len(solution.sizes))
        problem = self.model.problem(every, every, self.spend, self.limits)
        used: BoolArray = problem.limit.sums(np.log(solution.sizes), problem.limits) > 1 - _FULL
        return used


def worst_charged(timing: Timing) -> float:
    """Return the worst charged arrival at any path end, required times counted in, s."""
    offset = timing.lateness - timing.end_arrival
    return float((timing.end_charged_arrival + offset).max())


def _sizes_on_path(model: Model, arrival: FloatArray, delay: FloatArray) -> list[int]:
    """Return the sizes along the path that makes the latest arrival under some arc delays."""
    graph = model.graph
    node = int(graph.end[int(arrival[graph.end].argmax())])
    heads = np.searchsorted(graph.target, np.arange(len(graph) + 1))
    found: list[int] = []
    while heads[node] < heads[node + 1]:
        some = np.arange(heads[node], heads[node + 1])
        arc = int(some[int((arrival[graph.source[some]] + delay[some]).argmax())])
        found.append(arc)
        node = int(graph.source[arc])
    gates = model.circuit.arcs.gates_along(graph.arc[found])
    sizes: list[int] = model.variables.partition.of_gate[gates].tolist()
    return sizes
