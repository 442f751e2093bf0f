"""Convex programmes with exponentials, in the form the interior point works on.

Over ``z = (y, w)``, logarithms ``y`` of n sizes first and further variables ``w`` after,

    minimise    cost @ z + weight @ exp(y)
    subject to  f(z) = linear z + constant + terms(y) <= 0      one entry per row
                lower <= y <= upper

with `terms` sums of monomials ``coefficient * exp(y[plus] - y[minus])``, index n standing for 0.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import csr_array

if TYPE_CHECKING:
    from evenstage.sizing.problem import FloatArray, IntArray, Monomials


@dataclass(frozen=True, kw_only=True)
class Entries:
    """The entries of a sparse matrix, shape ``(k,)`` each; places may repeat and then add up."""

    row: IntArray
    column: IntArray
    value: FloatArray


@dataclass(frozen=True, kw_only=True)
class Programme:
    """A convex programme; see the module's docstring.

    Parameters
    ----------
    cost : FloatArray, shape (variables,)
        Linear part of the objective.
    weight : FloatArray, shape (n,)
        Weights of ``exp(y)`` in the objective, >= 0.
    lower, upper : FloatArray, shape (n,)
        Bounds of ``y``; lower < upper.
    linear : Entries
        Linear part of the constraints.
    constant : FloatArray, shape (rows,)
        Constant part of the constraints.
    terms : Monomials
        Convex part of the constraints.
    """

    cost: FloatArray
    weight: FloatArray
    lower: FloatArray
    upper: FloatArray
    linear: Entries
    constant: FloatArray
    terms: Monomials

    @property
    def sizes(self) -> int:
        """Number n of log sizes among the variables."""
        return len(self.weight)

    @property
    def variables(self) -> int:
        """Number of all variables."""
        return len(self.cost)

    @property
    def rows(self) -> int:
        """Number of constraints, bounds apart."""
        return len(self.constant)

    @cached_property
    def _linear(self) -> csr_array[np.float64]:
        part = self.linear
        shape = (self.rows, self.variables)
        return csr_array((part.value, (part.row, part.column)), shape=shape)

    def constraints(self, z: FloatArray) -> FloatArray:
        """Return ``f(z)``, shape (rows,)."""
        value: FloatArray = self._linear @ z + self.constant
        return value + self.terms.sums(z[: self.sizes], self.rows)

    def scale(self, z: FloatArray) -> float:
        """Return the size of the objective.

        A linear objective may pass through zero; there the size of the variables beside the sizes
        counts.
        """
        paid = self.weight @ np.exp(z[: self.sizes])
        if paid:
            return float(paid)
        return max(abs(float(self.cost @ z)), float(np.abs(z[self.sizes :]).max()))
