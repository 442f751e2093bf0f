"""Preconditioned conjugate gradients for a matrix known by its products alone.

Stops early: a step of Newton's method need not be exact (Dembo, Eisenstat and Steihaug, SIAM J.
Numerical Analysis 19(2), 1982).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.sizing.hessian import Hessian
    from evenstage.sizing.problem import FloatArray


def by_products(
    hessian: Hessian,
    damping: FloatArray,
    scale: FloatArray,
    right: FloatArray,
    residual: float,
    most: int,
) -> tuple[FloatArray, int]:
    """Return an inexact solution of Newton's system on free sizes, and the products it took.

    Parameters
    ----------
    hessian : Hessian
    damping : FloatArray, shape (n,)
        Added to its diagonal.
    scale : FloatArray, shape (n,)
        1 over the sum of both; 0 for sizes that stay.
    right : FloatArray, shape (n,)
        0 for sizes that stay.
    residual, most : float and int
        See :func:`conjugate_gradients`.
    """
    free = scale > 0.0

    def product(v: FloatArray) -> FloatArray:
        result: FloatArray = np.where(free, hessian.product(v) + damping * v, 0.0)
        return result

    return conjugate_gradients(product, lambda r: scale * r, right, residual=residual, most=most)


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
