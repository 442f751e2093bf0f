"""Limits that leave no room, taken out before the optimiser meets them.

A limit is a sum of monomials that must stay at most 1. It is least where the sizes it grows with
are at their lower bounds and those it falls with at their upper ones. Where even that least value
is 1 (an input drawn with its smallest widths and allowed no more capacitance than it shows), the
limit forces all its sizes there. An interior point cannot live on such a point, so the sizes are
fixed; one limit may force the next, hence the repetition.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.problem import totals

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.sizing.problem import FloatArray, Problem

_ROOM = 1e-7
"""Relative room below which a limit counts as having none."""
_HAIR = 1e-9
"""Relative room that a limit without room is given."""
_BROKEN = 1e-6
"""Relative excess of the least value beyond which a limit is left for the optimiser to refuse."""


def without_room(problem: Problem) -> Problem:
    """Return a problem in which sizes that limits leave no room are fixed."""
    while True:
        least = _least(problem)
        tight = (least > 1 - _ROOM) & (least < 1 + _BROKEN)
        tighter = _fixed(problem, tight)
        if (tighter.lower == problem.lower).all() and (tighter.upper == problem.upper).all():
            return _kept(problem, least, tight)
        problem = tighter


def _kept(problem: Problem, least: FloatArray, tight: BoolArray) -> Problem:
    """Return the problem with tight limits kept by a hair, so that no rounding breaks them."""
    scale = np.where(tight, (1 - _HAIR) / np.where(tight, least, 1.0), 1.0)
    limit = problem.limit
    return replace(problem, limit=replace(limit, coefficient=limit.coefficient * scale[limit.row]))


def with_guard(problem: Problem, guard: float) -> Problem:
    """Return a problem whose limits are tighter by a share, where the box leaves room for it."""
    room = _least(problem) * (1 + guard) < 1 - _ROOM
    limit = problem.limit
    scale = np.where(room, 1 + guard, 1.0)[limit.row]
    return replace(problem, limit=replace(limit, coefficient=limit.coefficient * scale))


def _least(problem: Problem) -> FloatArray:
    """Return the least value of each limit in the box, shape (limits,)."""
    low, high = np.append(problem.lower, 1.0), np.append(problem.upper, 1.0)
    limit = problem.limit
    value = limit.coefficient * low[limit.plus] / high[limit.minus]
    return totals(limit.row, value, problem.limits)


def _fixed(problem: Problem, tight: BoolArray) -> Problem:
    """Return the problem with the sizes of tight limits fixed where these are least."""
    n, limit = len(problem.lower), problem.limit
    entries = tight[limit.row]
    lower, upper = problem.lower.copy(), problem.upper.copy()
    down = np.unique(limit.plus[entries & (limit.plus < n)])
    up = np.unique(limit.minus[entries & (limit.minus < n)])
    upper[down] = lower[down]
    lower[up] = upper[up]
    return replace(problem, lower=lower, upper=upper)
