"""How well constants are known: standard errors, and what measurements cannot tell apart.

Around the solution the residuals change by ``J dx``. Along a right-singular vector of J with
singular value sigma the unknowns can move by ``s/sigma``, s the standard deviation of a residual,
before the fit is worse by what chance would make it; the covariance is ``s^2 (J^T J)^-1`` (Golub
and Van Loan, Matrix Computations, section 5.5, from memory). Where that move is large and several
constants take part in it, only one combination of them is known.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.fitting.results import Confusion

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.network import BoolArray
    from evenstage.fitting.constants import Unknown
    from evenstage.netlist.devices import FloatArray

#: A move of this much, in parts of a constant's own scale, is more than its users can live with.
_LOOSE: Final = 0.25

#: A constant takes part in a move if it makes at least this part of it.
_PART: Final = 0.3

#: A column this small against the largest belongs to something nobody measured.
_NOTHING: Final = 1e-9

#: This near to a bound, in parts of its room, an unknown stands at it.
_AT_BOUND: Final = 1e-4


def is_measured(jacobian: FloatArray) -> BoolArray:
    """Tell which unknowns anything measured depends on, shape (unknowns,)."""
    size = np.linalg.norm(jacobian, axis=0)
    result: BoolArray = size > _NOTHING * size.max(initial=0.0)
    return result


def at_bound(unknowns: Sequence[Unknown], at: FloatArray) -> BoolArray:
    """Tell which unknowns stand at one of their bounds, shape (unknowns,)."""
    least = np.array([unknown.least for unknown in unknowns])
    most = np.array([unknown.most for unknown in unknowns])
    place = (at - least) / (most - least)
    result: BoolArray = (place < _AT_BOUND) | (place > 1 - _AT_BOUND)
    return result


def standard_errors(jacobian: FloatArray, variance: float, free: BoolArray) -> FloatArray:
    """Return the standard errors of the unknowns, infinity where nothing holds them.

    Parameters
    ----------
    jacobian : FloatArray, shape (residuals, unknowns)
    variance : float
        Of a residual.
    free : BoolArray, shape (unknowns,)
        Those that may move; the others get zero.
    """
    _, sigma, directions = np.linalg.svd(jacobian[:, free], full_matrices=False)
    held = sigma > _NOTHING * sigma.max(initial=0.0)
    parts = directions**2
    loose = (parts[~held] > _NOTHING).any(axis=0)
    spread = np.sqrt(variance * (parts[held] / sigma[held, None] ** 2).sum(axis=0))
    found = np.zeros(len(free))
    found[free] = np.where(loose, np.inf, spread)
    return found


def find_confusions(
    jacobian: FloatArray,
    variance: float,
    free: BoolArray,
    names: Sequence[tuple[str, str]],
) -> tuple[Confusion, ...]:
    """Return the moves that the measurements hardly feel, the freest first.

    Parameters
    ----------
    jacobian, variance, free
        As for `standard_errors`.
    names : sequence of (str, str)
        Polarity and key of each unknown.
    """
    _, sigma, directions = np.linalg.svd(jacobian[:, free], full_matrices=False)
    mine = [name for name, is_free in zip(names, free.tolist(), strict=True) if is_free]
    found = []
    for length, direction in zip(sigma[::-1].tolist(), directions[::-1], strict=True):
        spread = np.sqrt(variance) / length if length > 0 else np.inf
        if spread < _LOOSE:
            break
        part = np.abs(direction)
        order = np.argsort(-part, kind="stable")
        taking = tuple(mine[i] for i in order.tolist() if part[i] >= _PART)
        found.append(Confusion(taking, float(min(spread, 1e3))))
    return tuple(found)
