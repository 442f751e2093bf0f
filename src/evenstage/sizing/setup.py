"""A problem made ready for the optimiser: reduced, its graph ready to be swept, and a question.

Large problems are worked out by compiled loops where numba is installed
(``pip install evenstage[fast]``); numpy gives the same answers. Numba takes a second to load, which
small problems do not win back.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from importlib.util import find_spec
from typing import TYPE_CHECKING, Final

from evenstage.sizing.conjugate import by_products
from evenstage.sizing.levelled import Levelled
from evenstage.sizing.neighbours import Neighbours
from evenstage.sizing.reduced import Reduced

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.sizing.hessian import Hessian
    from evenstage.sizing.problem import FloatArray, Problem
    from evenstage.sizing.softmax import Sweeps

    Solver = Callable[
        [Hessian, FloatArray, FloatArray, FloatArray, float, int], tuple[FloatArray, int]
    ]

#: Arcs from which compiled loops are worth loading.
_COMPILED_FROM: Final = 800


@dataclass(frozen=True, kw_only=True)
class Question:
    """A goal in the units of a reduced problem; both None: the fastest.

    Parameters
    ----------
    deadline : float, optional
        Least cost for this worst delay.
    budget : float, optional
        Least worst delay for this cost.
    """

    deadline: float | None = None
    budget: float | None = None

    @property
    def constrained(self) -> bool:
        """Whether the goal has a constraint of its own."""
        return self.deadline is not None or self.budget is not None


@dataclass(frozen=True, kw_only=True)
class Setup:
    """A question about a reduced problem, with what works it out.

    Parameters
    ----------
    reduced : Reduced
    sweeps : Sweeps
        Of its graph.
    neighbours : Neighbours
        Of its arcs.
    solve : callable
        Solves Newton's systems: :func:`evenstage.sizing.conjugate.by_products`, or the same in
        compiled loops.
    question : Question
    """

    reduced: Reduced
    sweeps: Sweeps
    neighbours: Neighbours
    solve: Solver
    question: Question

    @classmethod
    def of(cls, problem: Problem, sizes: FloatArray) -> Setup:
        """Return a setup for the fastest; sizes that cannot move are taken from `sizes`."""
        if worth_compiling(len(problem.arc_source)):
            return _compiled(problem, sizes)
        reduced = Reduced.of(problem, sizes, by_level=True)
        return cls(
            reduced=reduced,
            sweeps=Levelled(reduced.graph),
            neighbours=Neighbours(reduced),
            solve=by_products,
            question=Question(),
        )

    def asking(self, question: Question) -> Setup:
        """Return the setup for another question."""
        return replace(self, question=question)


def worth_compiling(arcs: int) -> bool:
    """Tell whether compiled loops are there and worth loading for a graph of so many arcs."""
    return arcs >= _COMPILED_FROM and find_spec("numba") is not None


def _compiled(problem: Problem, sizes: FloatArray) -> Setup:
    # Numba is slow to load.
    from evenstage.sizing.compiled import Compiled
    from evenstage.sizing.compiled_directions import by_loops
    from evenstage.sizing.compiled_sums import CompiledSums

    reduced = Reduced.of(problem, sizes, by_level=False)
    plain = {field.name: getattr(reduced.sums, field.name) for field in fields(reduced.sums)}
    reduced = replace(reduced, sums=CompiledSums(**plain))
    return Setup(
        reduced=reduced,
        sweeps=Compiled(reduced.graph),
        neighbours=Neighbours(reduced),
        solve=by_loops,
        question=Question(),
    )
