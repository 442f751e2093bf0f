"""Newton's linear system for the perturbed optimality conditions, assembled and solved.

With ``theta = price / slack`` per row, a Newton step solves

    [ H + d + J_n' theta_n J_n    J_w'         ] [ dz      ]   [ r                        ]
    [ J_w                         -1 / theta_w ] [ dprice_w ] = [ -push_w / theta_w        ]

where H is the Hessian of the Lagrangian, d the diagonal part of bounds, objective and tie term, and
J the Jacobian of the rows. Of narrow rows (n) slacks and multipliers are eliminated. Wide rows (w),
such as a spending limit, would fill the matrix with their outer product and keep an unknown of
their own. The matrix is quasi-definite, so that elimination needs no pivoting in any symmetric
order (Vanderbei, SIAM J. Optimization 5(1), 1995, from memory).

All patterns are worked out once; assembling is one weighted count per matrix.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np
from scipy.sparse import csc_array, csr_array
from scipy.sparse.linalg import splu

from evenstage.sizing.problem import totals

if TYPE_CHECKING:
    from numpy.typing import NDArray
    from scipy.sparse.linalg import SuperLU

    from evenstage.sizing.problem import FloatArray
    from evenstage.sizing.programme import Programme

    Index = NDArray[np.intp]

#: Rows with more entries than this keep their own unknown; their outer product has its square.
_WIDE: Final = 40

#: Relative residual of a solution above which it is refined.
_REFINE: Final = 1e-10


class SingularError(ArithmeticError):
    """The matrix cannot be solved with: rounding has eaten what was left to gain."""


class Pattern:
    """Where the entries of a sparse matrix go, row by row; repeated places add up."""

    def __init__(self, row: Index, column: Index, shape: tuple[int, int]) -> None:
        keys, self.place = np.unique(row * shape[1] + column, return_inverse=True)
        self.indices = (keys % shape[1]).astype(np.int32)
        self.indptr = np.searchsorted(keys, np.arange(shape[0] + 1) * shape[1]).astype(np.int32)

    def gather(self, values: FloatArray) -> FloatArray:
        """Return the matrix entries, in the order of `indices`."""
        return totals(self.place, values, len(self.indices))


@dataclass(frozen=True, kw_only=True)
class Linearisation:
    """A programme's optimality conditions, linear around a point.

    Parameters
    ----------
    jacobian : csr_array, shape (rows, variables)
        Of the constraints.
    narrow : array of bool, shape (rows,)
        Rows that were eliminated.
    theta : FloatArray, shape (rows,)
        Price over slack.
    matrix : csc_array
        Newton's matrix.
    factors : SuperLU
        Its factors.
    """

    jacobian: csr_array[np.float64]
    narrow: NDArray[np.bool_]
    theta: FloatArray
    matrix: csc_array[np.float64]
    factors: SuperLU

    def solve(self, right: FloatArray, push: FloatArray) -> FloatArray:
        """Return the step of the variables, refined once if need be.

        Parameters
        ----------
        right : FloatArray, shape (variables,)
            Right side, rows apart.
        push : FloatArray, shape (rows,)
            What each row's multiplier would become by, did the variables stay.
        """
        wide = ~self.narrow
        upper = right - self.jacobian.T @ np.where(self.narrow, push, 0.0)
        b = np.concatenate([upper, -push[wide] / self.theta[wide]])
        x = self.factors.solve(b)
        left = b - self.matrix @ x
        if not np.all(np.isfinite(left)):
            raise SingularError
        if np.abs(left).max() > _REFINE * np.abs(b).max():
            x += self.factors.solve(left)
        step: FloatArray = x[: len(right)]
        return step


class NewtonSystem:
    """The patterns of one programme's derivatives, and what fills them."""

    def __init__(self, programme: Programme) -> None:
        self.programme = p = programme
        terms = p.terms
        self.up = np.flatnonzero(terms.plus < p.sizes)
        self.down = np.flatnonzero(terms.minus < p.sizes)
        self.cross = np.flatnonzero((terms.plus < p.sizes) & (terms.minus < p.sizes))
        row = np.concatenate([terms.row[self.up], terms.row[self.down], p.linear.row])
        column = np.concatenate([terms.plus[self.up], terms.minus[self.down], p.linear.column])
        self.slope = Pattern(row.astype(np.intp), column, (p.rows, p.variables))
        self._lay_out_matrix()

    def _lay_out_matrix(self) -> None:
        p, terms = self.programme, self.programme.terms
        width = np.diff(self.slope.indptr)
        row = np.repeat(np.arange(p.rows), width)
        column = self.slope.indices.astype(np.intp)
        self.narrow = width <= _WIDE
        self.left, self.right = _pairs(self.slope.indptr, width, self.narrow)
        self.pair_row = row[self.left]
        self.wide_entry = np.flatnonzero(~self.narrow[row])
        own = p.variables + (np.cumsum(~self.narrow) - 1)[row[self.wide_entry]]
        self.size = p.variables + int(np.count_nonzero(~self.narrow))
        up, down = terms.plus[self.up], terms.minus[self.down]
        plus, minus = terms.plus[self.cross], terms.minus[self.cross]
        every, wide = np.arange(self.size), column[self.wide_entry]
        self.newton = Pattern(
            np.concatenate([up, down, plus, minus, every, column[self.left], wide, own]),
            np.concatenate([up, down, minus, plus, every, column[self.right], own, wide]),
            (self.size, self.size),
        )

    def linearise(
        self, z: FloatArray, room: FloatArray, price: FloatArray, tie: float
    ) -> Linearisation:
        """Assemble and factor Newton's matrix at a point.

        Parameters
        ----------
        z, room, price : FloatArray
            The point, as in :mod:`evenstage.sizing.central_path`.
        tie : float
            Curvature of the tie term.

        Raises
        ------
        SingularError
            If the matrix has no factors in floating point.
        """
        p = self.programme
        n, y = p.sizes, z[: p.sizes]
        values = p.terms.values(y)
        slopes = np.concatenate([values[self.up], -values[self.down], p.linear.value])
        entries = self.slope.gather(slopes)
        theta, low, high = np.split(price / room, [p.rows, p.rows + n])
        diagonal = np.zeros(self.size)
        diagonal[:n] = p.weight * np.exp(y) + low + high + tie
        diagonal[p.variables :] = -1.0 / theta[~self.narrow]
        matrix = self._matrix(price[p.terms.row] * values, entries, theta, diagonal)
        shape = (p.rows, p.variables)
        return Linearisation(
            jacobian=csr_array((entries, self.slope.indices, self.slope.indptr), shape=shape),
            narrow=self.narrow,
            theta=theta,
            matrix=matrix,
            factors=_factors(matrix),
        )

    def _matrix(
        self, curved: FloatArray, entries: FloatArray, theta: FloatArray, diagonal: FloatArray
    ) -> csc_array[np.float64]:
        outer = entries[self.left] * entries[self.right] * theta[self.pair_row]
        cross, wide = -curved[self.cross], entries[self.wide_entry]
        parts = [curved[self.up], curved[self.down], cross, cross, diagonal, outer, wide, wide]
        values = self.newton.gather(np.concatenate(parts))
        shape = (self.size, self.size)
        return csc_array((values, self.newton.indices, self.newton.indptr), shape=shape)


def _factors(matrix: csc_array[np.float64]) -> SuperLU:
    """Factor a quasi-definite matrix in an order that fills it little, without pivoting."""
    if not np.all(np.isfinite(matrix.data)):
        raise SingularError
    try:
        return splu(
            matrix,
            permc_spec="MMD_AT_PLUS_A",
            diag_pivot_thresh=0.0,
            options={"SymmetricMode": True},
        )
    except RuntimeError as error:
        raise SingularError from error


def _pairs(
    indptr: NDArray[np.int32], width: NDArray[np.int32], chosen: NDArray[np.bool_]
) -> tuple[Index, Index]:
    """Return all ordered pairs of entries of one row, for the chosen rows."""
    left, right = [np.zeros(0, dtype=np.intp)], [np.zeros(0, dtype=np.intp)]
    for count in np.unique(width[chosen]).tolist():
        first = indptr[:-1][chosen & (width == count)].astype(np.intp)[:, None, None]
        step = np.arange(count)
        shape = (len(first), count, count)
        left.append(np.broadcast_to(first + step[:, None], shape).ravel())
        right.append(np.broadcast_to(first + step, shape).ravel())
    return np.concatenate(left), np.concatenate(right)
