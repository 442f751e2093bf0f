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
from evenstage.sizing.blame import blame, budget_too_small, limit_out_of_reach, used_up
from evenstage.sizing.certificate import check
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.infeasible import BudgetTooSmallError, LimitOutOfReachError
from evenstage.sizing.limiting import (
    AGREES,
    ON_LIMITING_PATH,
    beyond_limits,
    limiting,
    on_slowest_path,
    slower_than,
)
from evenstage.sizing.optimum import solve
from evenstage.sizing.presolve import with_guard, without_room
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.joint import Corner, Joint
    from evenstage.sizing.model import Limits, Model
    from evenstage.sizing.problem import Problem
    from evenstage.sizing.solution import Solution
    from evenstage.sizing.timed import Timed
    from evenstage.sizing.variables import Variables
    from evenstage.sizing.wishes import Wishes

_NEAR_LIMITING_PATH = 1e-4
"""The same on the way to the answer, where the flow still spreads over paths close to limiting."""
_SHARES = (1.0, 0.9, 0.7, 0.4, 0.0)
"""Parts of the transition limit that stages are given in turn."""
_LOOSE, _TIGHT = 1e-3, 1e-9
"""Gaps at which programmes on the way, and the one that is shown, may stop."""


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
    limits : tuple of Limits
        As the programme had them, corner by corner.
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
    limits: tuple[Limits, ...]
    least_delay: float
    fastest: Solution
    deadline: float


@dataclass(frozen=True)
class Engine:
    """A block in its corners with limits and costs, ready for goals.

    Parameters
    ----------
    joint : Joint
    limits : tuple of Limits
        For each corner.
    spend : FloatArray, shape (sizes,)
        Cost of one unit of each size.
    spend_fixed : float
        Cost of everything that has no size.
    wishes : Wishes
    cost_today : float
        Total cost that ``wishes.width`` multiplies.
    """

    joint: Joint
    limits: tuple[Limits, ...]
    spend: FloatArray
    spend_fixed: float
    wishes: Wishes
    cost_today: float

    @property
    def model(self) -> Model:
        """The model of the first corner, for what is the same in all: cards, gates, sizes."""
        return self.joint.first

    @property
    def variables(self) -> Variables:
        """The sizes."""
        return self.joint.variables

    @cached_property
    def corners(self) -> list[Corner]:
        """Every corner with its limits and its rows of the programme."""
        return self.joint.corners(self.limits)

    @property
    def today(self) -> Timed:
        """The block as drawn."""
        return self.joint.today

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
            engine = replace(self, limits=tuple(replace(one, share=share) for one in self.limits))
            answer = engine._run()  # noqa: SLF001 -- the same engine with less room
            if self._edges_kept(engine.timed(answer.sizes)):
                break
        return answer

    def _edges_kept(self, block: Timed) -> bool:
        """Tell whether no edge is slower than its corner's limit, or than the slowest of today."""
        every = zip(self.limits, self.today.corners, block.corners, strict=True)
        return all(
            limits.strict
            or after.worst_transition
            <= max(limits.transition, before.worst_transition) * (1 + AGREES / 10)
            for limits, before, after in every
        )

    def _run(self) -> Continuous:
        """Find the continuous answer for the limits as they are."""
        fastest, lower, upper = self.least_delay()
        least, drawn = fastest.delay, self.today.charged
        if self.wishes.delay is not None:
            return self._for_delay(fastest, lower, upper)
        deadline = least * (1 + max(self.wishes.margin, AGREES))
        if self.wishes.width is None:
            deadline = min(deadline, max(drawn, least * (1 + AGREES)))
        late = self.today.lateness
        for _ in range(6):
            answer = self.within(deadline, fastest, lower, upper)
            reached = self.timed(answer.sizes).lateness
            tighter = max(least * (1 + AGREES), deadline * late / reached * (1 - 10 * AGREES))
            # No faster in charged delay than today must not mean slower in arrivals.
            if reached <= late or tighter >= deadline:
                break
            deadline = tighter
        return answer

    def within(
        self,
        deadline: float,
        fastest: Solution,
        lower: FloatArray,
        upper: FloatArray,
        start: FloatArray | None = None,
    ) -> Continuous:
        """Find the least spend for a deadline.

        At the least delay itself sizes on the limiting paths have no room: they stay as they are.

        Parameters
        ----------
        deadline : float
            s; worst charged delay.
        fastest : Solution
            The least delay, from which the search starts where no ``start`` is given.
        lower, upper, start : FloatArray, shape (sizes,)
            Bounds, and sizes near the answer.
        """
        exact = (deadline < fastest.delay * (1 + 2 * AGREES)) & limiting(self.joint, fastest)
        solution = self._solve(
            Cheapest(deadline),
            np.where(exact, fastest.sizes, lower),
            np.where(exact, fastest.sizes, upper),
            fastest.sizes if start is None else start,
        )
        return Continuous(
            sizes=solution.sizes,
            active=lower < upper,
            lower=lower,
            upper=upper,
            solution=solution,
            full=used_up(self._unbounded(), solution),
            limits=self.limits,
            least_delay=fastest.delay,
            fastest=fastest,
            deadline=deadline,
        )

    def _for_delay(self, fastest: Solution, lower: FloatArray, upper: FloatArray) -> Continuous:
        """Find the least spend whose 50 % arrivals meet the wished delay."""
        wanted = self.wishes.delay or 0.0
        quickest = self.timed(fastest.sizes)
        possible = quickest.lateness
        if possible > wanted * (1 + AGREES):
            held = blame(self, self._unbounded(), fastest)
            raise InfeasibleError(
                f"a delay of {engineering(wanted, 's', 4)} cannot be met: the least possible "
                f"within the limits is {engineering(possible, 's', 4)}{self._where(quickest)}, "
                f"{engineering(possible - wanted, 's')} more; {held}",
                code="delay-out-of-reach",
            )
        floor = fastest.delay * (1 + AGREES)
        deadline, best = max(floor, wanted * fastest.delay / possible), None
        for _ in range(12):
            answer = self.within(deadline, fastest, lower, upper)
            reached = self.timed(answer.sizes).lateness
            best = answer if reached <= wanted else best
            following = max(floor, deadline * wanted * (1 - AGREES / 4) / reached)
            if wanted * (1 - AGREES) < reached <= wanted or following == deadline:
                break
            deadline = following
        return best or answer

    def _where(self, block: Timed) -> str:
        """Return the corner that limits, in words; nothing where there is but one."""
        limiting = block.corners[block.limiting].circuit.process.name
        return f" in {limiting}" if len(block.corners) > 1 else ""

    def guarded(self, answer: Continuous, guard: float) -> FloatArray | None:
        """Return sizes that miss deadline and limits by a share, for the grid to use up.

        None where there are none: the least delay leaves no room.
        """
        problem = with_guard(self.problem(answer.lower, answer.upper, answer.limits), guard)
        goal = Cheapest(answer.deadline * (1 - guard))
        try:
            return solve(problem, goal, start=answer.sizes, tolerance=_LOOSE).sizes
        except (InfeasibleError, NotConvergedError):
            return None

    def timed(self, sizes: FloatArray) -> Timed:
        """Time the block with some sizes, by the full arc model."""
        return self.joint.timed(self.variables.factors(sizes))

    def least_delay(self) -> tuple[Solution, FloatArray, FloatArray]:
        """Find the least delay, and the bounds within which sizes may move for it.

        Raises
        ------
        InfeasibleError
            Where a limit cannot be kept.
        NotConvergedError
            Where the proof fails.
        """
        free = self.variables.free
        start = np.ones(len(free))
        everything = self._solve(
            self._first_goal(), *self._box(free, free), start, tolerance=_LOOSE
        )
        # No path that is slower today than the least delay of all can stay as it is.
        moving = free & (
            on_slowest_path(self.joint, self.today)
            | beyond_limits(self.joint, self.limits, self.today)
            | slower_than(self.joint, self.today, everything.delay)
        )
        if self.wishes.scope == "block":
            moving |= free & limiting(self.joint, everything)
        tolerance = _LOOSE
        while True:
            lower, upper = self._bounds(moving)
            fastest = self._solve(self._first_goal(), lower, upper, start, tolerance)
            share = ON_LIMITING_PATH if tolerance == _TIGHT else _NEAR_LIMITING_PATH
            joining = limiting(self.joint, fastest, share) & free & ~moving
            if not joining.any() and tolerance == _TIGHT:
                return fastest, lower, upper
            # Who limits shows early; the proof is for the last.
            tolerance = _LOOSE if joining.any() else _TIGHT
            moving = moving | joining
            start = fastest.sizes

    def quickest(self, lower: FloatArray, upper: FloatArray, start: FloatArray) -> Solution:
        """Find the least delay within other bounds, to a loose gap.

        Raises
        ------
        InfeasibleError
            Where a limit or the budget cannot be kept.
        NotConvergedError
            Where the proof fails.
        """
        return self._solve(self._first_goal(), lower, upper, start, _LOOSE)

    def _first_goal(self) -> Goal:
        if self.wishes.width is None:
            return Fastest()
        return Budget(self.wishes.width * self.cost_today)

    def _bounds(self, limiting: BoolArray) -> tuple[FloatArray, FloatArray]:
        """Return the bounds of all sizes when some are on limiting paths.

        Those move freely. The others may grow where the scope is the block, and shrink only where
        that is asked for.
        """
        free, wishes = self.variables.free, self.wishes
        return self._box(
            limiting | (free & wishes.reclaim), limiting | (free & (wishes.scope == "block"))
        )

    def _box(self, down: BoolArray, up: BoolArray) -> tuple[FloatArray, FloatArray]:
        """Return the bounds when some sizes may go down and some up."""
        variables = self.variables
        return np.where(down, variables.lower, 1.0), np.where(up, variables.upper, 1.0)

    def problem(
        self, lower: FloatArray, upper: FloatArray, limits: Sequence[Limits] = ()
    ) -> Problem:
        """Return the programme for some bounds."""
        problem = self.joint.problem(lower, upper, self.spend, limits or self.limits)
        return without_room(replace(problem, spend_fixed=self.spend_fixed))

    def _unbounded(self) -> Problem:
        """Return the programme with all its limits, whatever the bounds."""
        every = np.ones(len(self.variables))
        return self.joint.problem(every, every, self.spend, self.limits)

    def _solve(
        self,
        goal: Goal,
        lower: FloatArray,
        upper: FloatArray,
        start: FloatArray,
        tolerance: float = _TIGHT,
    ) -> Solution:
        problem = self.problem(lower, upper)
        begin = np.clip(start, problem.lower, problem.upper)
        try:
            solution = solve(problem, goal, start=begin, tolerance=tolerance)
        except LimitOutOfReachError as error:
            raise limit_out_of_reach(self, error) from error
        except BudgetTooSmallError as error:
            raise budget_too_small(self.wishes.spend, error) from error
        check(problem, goal, solution)
        return solution
