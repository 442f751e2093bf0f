"""Preconditioned conjugate gradients for a matrix known by its products alone.

Stops early: a step of Newton's method need not be exact (Dembo, Eisenstat and Steihaug, SIAM J.
Numerical Analysis 19(2), 1982).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.sizing.problem import FloatArray


def conjugate_gradients(
    product: Callable[[FloatArray], FloatArray],
    preconditioned: Callable[[FloatArray], FloatArray],
    right: FloatArray,
    *,
    residual: float = 0.1,
    most: int = 80,
) -> tuple[FloatArray, int]:
    """Return an inexact solution of a positive definite system, and the products it took.

    Parameters
    ----------
    product, preconditioned : callable
        The matrix, and what nearly is its inverse, times a vector.
    right : FloatArray, shape (n,)
    residual : float
        Relative residual, in the preconditioner's norm, to stop at.
    most : int
        Most products.
    """
    x, left = np.zeros(len(right)), right.copy()
    z = preconditioned(left)
    p, rho = z, float(left @ z)
    goal = residual**2 * rho
    for count in range(most):
        if rho <= goal or rho == 0.0:
            return x, count
        image = product(p)
        bend = float(p @ image)
        if bend <= 0.0:
            return (x if count else p), count + 1
        length = rho / bend
        x += length * p
        left -= length * image
        z = preconditioned(left)
        rho, before = float(left @ z), rho
        p = z + (rho / before) * p
    return x, most
