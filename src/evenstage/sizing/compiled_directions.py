"""Newton's directions as one compiled loop: conjugate gradients, products and all.

The same as :func:`evenstage.sizing.conjugate.by_products` on a
:class:`~evenstage.sizing.hessian.Hessian`, whose formulas these are: a product goes once over the
forms, once forward and once backward over the arcs, and once more over the forms.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numba import njit

if TYPE_CHECKING:
    from evenstage.sizing.hessian import Hessian
    from evenstage.sizing.problem import FloatArray, IntArray

#: Flows below this are nothing beside rounding, but products with them underflow slowly.
_LEAST_FLOW = 1e-40


@njit(cache=True, nogil=True)
def _ahead(
    forms: tuple[IntArray, IntArray, IntArray, FloatArray, FloatArray],
    entries: tuple[IntArray, IntArray, FloatArray],
    growing: FloatArray,
    falling: FloatArray,
    v: FloatArray,
    moved_form: FloatArray,
    moved: FloatArray,
) -> None:
    first, plus, driver, part, form = forms
    pointer, column, take = entries
    count, sizes = len(driver), len(v)
    for g in range(count):
        total = -form[g] * v[driver[g]]
        for m in range(first[g], first[g + 1]):
            total += part[m] * v[plus[m]]
        moved_form[g] = total
    for row in range(len(moved)):
        total = 0.0
        for k in range(pointer[row], pointer[row + 1]):
            c = column[k]
            if c < count:
                total += take[k] * moved_form[c]
            elif c < count + sizes:
                total -= take[k] * falling[c - count] * v[c - count]
            else:
                total += take[k] * growing[c - count - sizes] * v[c - count - sizes]
        moved[row] = total


@njit(cache=True, nogil=True)
def _bent(
    graph: tuple[IntArray, IntArray],
    flows: tuple[FloatArray, FloatArray],
    cold: float,
    stiff: FloatArray,
    later: FloatArray,
    through: FloatArray,
    rows: FloatArray,
) -> None:
    first, source = graph
    share, flow = flows
    nodes = len(later)
    arcs = len(share)
    later[0] = 0.0
    for node in range(1, nodes):
        mean = 0.0
        for arc in range(first[node], first[node + 1]):
            rows[arc] += later[source[arc]]
            mean += share[arc] * rows[arc]
        later[node] = mean
    through[:] = 0.0
    for node in range(nodes - 1, 0, -1):
        here, mean = through[node], later[node]
        for arc in range(first[node], first[node + 1]):
            bent = flow[arc] * (rows[arc] - mean) * cold + here * share[arc]
            if abs(bent) < _LEAST_FLOW:
                rows[arc] = 0.0
            else:
                rows[arc] = bent
                through[source[arc]] += bent
    for k in range(len(stiff)):
        rows[arcs + k] *= stiff[k]


@njit(cache=True, nogil=True)
def _back(
    forms: tuple[IntArray, IntArray, IntArray, FloatArray, FloatArray],
    entries: tuple[IntArray, IntArray, FloatArray],
    growing: FloatArray,
    falling: FloatArray,
    weight: FloatArray,
    v: FloatArray,
    moved_form: FloatArray,
    rows: FloatArray,
    given: FloatArray,
    result: FloatArray,
) -> None:
    first, plus, driver, part, form = forms
    pointer, column, take = entries
    count, sizes = len(driver), len(v)
    given[:] = 0.0
    for row in range(len(rows)):
        some = rows[row]
        if some == 0.0:
            continue
        for k in range(pointer[row], pointer[row + 1]):
            c = column[k]
            if c < count:
                given[c] += take[k] * some
            elif c < count + sizes:
                result[c - count] -= falling[c - count] * take[k] * some
            else:
                result[c - count - sizes] += growing[c - count - sizes] * take[k] * some
    for g in range(count):
        pull = given[g] - weight[g] * v[driver[g]]
        result[driver[g]] -= given[g] * form[g] + weight[g] * moved_form[g]
        for m in range(first[g], first[g + 1]):
            result[plus[m]] += part[m] * pull


@njit(cache=True, nogil=True)
def _dot(one: FloatArray, other: FloatArray) -> float:
    total = 0.0
    for i in range(len(one)):
        total += one[i] * other[i]
    return total


@njit(cache=True, nogil=True)
def _held(scale: FloatArray, p: FloatArray, image: FloatArray) -> float:
    bend = 0.0
    for i in range(len(p)):
        if scale[i] == 0.0:
            image[i] = 0.0
        bend += p[i] * image[i]
    return bend


@njit(cache=True, nogil=True)
def _advanced(
    length: float,
    scale: FloatArray,
    p: FloatArray,
    image: FloatArray,
    solution: FloatArray,
    left: FloatArray,
) -> float:
    rho = 0.0
    for i in range(len(p)):
        solution[i] += length * p[i]
        left[i] -= length * image[i]
        rho += left[i] * scale[i] * left[i]
    return rho


@njit(cache=True, nogil=True)
def _solved(
    graph: tuple[IntArray, IntArray],
    flows: tuple[FloatArray, FloatArray],
    cold: float,
    stiff: FloatArray,
    forms: tuple[IntArray, IntArray, IntArray, FloatArray, FloatArray],
    entries: tuple[IntArray, IntArray, FloatArray],
    growing: FloatArray,
    falling: FloatArray,
    weight: FloatArray,
    own: FloatArray,
    normal: FloatArray,
    goal_stiff: float,
    scale: FloatArray,
    right: FloatArray,
    residual: float,
    most: int,
    solution: FloatArray,
) -> int:
    nodes = len(graph[0]) - 1
    moved_form, given = np.empty(len(weight)), np.empty(len(weight))
    rows = np.empty(len(entries[0]) - 1)
    later, through = np.empty(nodes), np.empty(nodes)
    left, p, image = right.copy(), scale * right, np.empty(len(right))
    rho = _dot(left, p)
    goal = residual**2 * rho
    for count in range(most):
        if rho <= goal or rho == 0.0:
            return count
        _ahead(forms, entries, growing, falling, p, moved_form, rows)
        _bent(graph, flows, cold, stiff, later, through, rows)
        along = goal_stiff * _dot(normal, p) if goal_stiff > 0.0 else 0.0
        for i in range(len(p)):
            image[i] = own[i] * p[i] + along * normal[i]
        _back(forms, entries, growing, falling, weight, p, moved_form, rows, given, image)
        bend = _held(scale, p, image)
        if bend <= 0.0:
            if count == 0:
                solution[:] = p
            return count + 1
        before, rho = rho, _advanced(rho / bend, scale, p, image, solution, left)
        for i in range(len(p)):
            p[i] = scale[i] * left[i] + (rho / before) * p[i]
    return most


def by_loops(
    hessian: Hessian,
    damping: FloatArray,
    scale: FloatArray,
    right: FloatArray,
    residual: float,
    most: int,
) -> tuple[FloatArray, int]:
    """Return what :func:`evenstage.sizing.conjugate.by_products` does, by compiled loops."""
    point, curvature = hessian.point, hessian.curvature
    at, soft, graph = curvature.at, point.soft, point.reduced.graph
    sums = at.sums
    take = sums.take
    own = curvature.alone + damping
    if hessian.cost:
        own += hessian.cost * point.bill
    solution = np.zeros(len(right))
    count = _solved(
        (graph.first, graph.source),
        (soft.share, soft.flow),
        hessian.delay / point.weights.temperature,
        hessian.stiff,
        (sums.first, sums.plus, sums.driver, at.part, at.form),
        (take.indptr, take.indices, take.data),
        at.x,
        at.inverse,
        curvature.form,
        own,
        hessian.normal if hessian.goal_stiff else scale,
        hessian.goal_stiff,
        scale,
        right,
        residual,
        most,
        solution,
    )
    return solution, int(count)
