"""The sums of :mod:`evenstage.sizing.sums` as compiled loops: one pass instead of ten."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numba import njit

from evenstage.sizing.sums import Moved, Sums, SumsAt

if TYPE_CHECKING:
    from evenstage.sizing.problem import FloatArray, IntArray


@njit(cache=True, nogil=True)
def _worked_out(
    first: IntArray,
    plus: IntArray,
    driver: IntArray,
    coefficient: FloatArray,
    base: FloatArray,
    x: FloatArray,
    inverse: FloatArray,
    part: FloatArray,
    form: FloatArray,
) -> None:
    for g in range(len(driver)):
        drive = inverse[driver[g]]
        total = base[g] * drive
        for m in range(first[g], first[g + 1]):
            part[m] = coefficient[m] * x[plus[m]] * drive
            total += part[m]
        form[g] = total


@njit(cache=True, nogil=True)
def _taken(
    pointer: IntArray,
    column: IntArray,
    take: FloatArray,
    form: FloatArray,
    falling: FloatArray,
    growing: FloatArray,
    rows: FloatArray,
) -> None:
    forms, sizes = len(form), len(falling)
    for row in range(len(rows)):
        total = rows[row]
        for k in range(pointer[row], pointer[row + 1]):
            c = column[k]
            if c < forms:
                total += take[k] * form[c]
            elif c < forms + sizes:
                total += take[k] * falling[c - forms]
            else:
                total += take[k] * growing[c - forms - sizes]
        rows[row] = total


@njit(cache=True, nogil=True)
def _moved(
    first: IntArray,
    plus: IntArray,
    driver: IntArray,
    part: FloatArray,
    form: FloatArray,
    v: FloatArray,
    moved: FloatArray,
    behind: FloatArray,
) -> None:
    for g in range(len(driver)):
        behind[g] = v[driver[g]]
        total = -form[g] * behind[g]
        for m in range(first[g], first[g + 1]):
            total += part[m] * v[plus[m]]
        moved[g] = total


@njit(cache=True, nogil=True)
def _weighted(
    pointer: IntArray, column: IntArray, take: FloatArray, rows: FloatArray, weight: FloatArray
) -> None:
    for row in range(len(rows)):
        some = rows[row]
        if some != 0.0:
            for k in range(pointer[row], pointer[row + 1]):
                weight[column[k]] += take[k] * some


@njit(cache=True, nogil=True)
def _slope(
    first: IntArray,
    plus: IntArray,
    driver: IntArray,
    part: FloatArray,
    form: FloatArray,
    x: FloatArray,
    inverse: FloatArray,
    weight: FloatArray,
    result: FloatArray,
) -> None:
    forms, sizes = len(driver), len(x)
    for i in range(sizes):
        result[i] = x[i] * weight[forms + sizes + i] - inverse[i] * weight[forms + i]
    for g in range(forms):
        some = weight[g]
        if some != 0.0:
            result[driver[g]] -= some * form[g]
            for m in range(first[g], first[g + 1]):
                result[plus[m]] += part[m] * some


@njit(cache=True, nogil=True)
def _falling(
    pointer: IntArray,
    column: IntArray,
    take: FloatArray,
    form: FloatArray,
    inverse: FloatArray,
    rows: FloatArray,
) -> None:
    forms, sizes = len(form), len(inverse)
    for row in range(len(rows)):
        for k in range(pointer[row], pointer[row + 1]):
            c = column[k]
            if c < forms:
                rows[row] += take[k] * form[c]
            elif c < forms + sizes:
                rows[row] += take[k] * inverse[c - forms]


@njit(cache=True, nogil=True)
def _squares(
    entries: tuple[IntArray, IntArray, FloatArray],
    forms: tuple[IntArray, IntArray, FloatArray],
    row_driver: IntArray,
    x: FloatArray,
    w: FloatArray,
    falling: FloatArray,
    result: FloatArray,
) -> None:
    pointer, column, take = entries
    first, plus, part = forms
    count, sizes = len(first) - 1, len(x)
    weight = np.zeros(count)
    for row in range(len(w)):
        some = w[row]
        if some == 0.0:
            continue
        if row_driver[row] >= 0:
            result[row_driver[row]] += some * falling[row] ** 2
        for k in range(pointer[row], pointer[row + 1]):
            c = column[k]
            if c < count:
                weight[c] += some * take[k] ** 2
            elif c >= count + sizes:
                grows = take[k] * x[c - count - sizes]
                result[c - count - sizes] += some * grows**2
    for g in range(count):
        if weight[g] != 0.0:
            for m in range(first[g], first[g + 1]):
                result[plus[m]] += weight[g] * part[m] ** 2


@njit(cache=True, nogil=True)
def _pulled(
    first: IntArray, plus: IntArray, part: FloatArray, weight: FloatArray, result: FloatArray
) -> None:
    for g in range(len(weight)):
        some = weight[g]
        if some != 0.0:
            for m in range(first[g], first[g + 1]):
                result[plus[m]] += part[m] * some


@njit(cache=True, nogil=True)
def _given(
    pointer: IntArray,
    column: IntArray,
    take: FloatArray,
    x: FloatArray,
    inverse: FloatArray,
    rows: FloatArray,
    weight: FloatArray,
    result: FloatArray,
) -> None:
    forms, sizes = len(weight), len(x)
    for row in range(len(rows)):
        for k in range(pointer[row], pointer[row + 1]):
            c, part = column[k], take[k] * rows[row]
            if c < forms:
                weight[c] += part
            elif c < forms + sizes:
                result[c - forms] -= inverse[c - forms] * part
            else:
                result[c - forms - sizes] += x[c - forms - sizes] * part


@njit(cache=True, nogil=True)
def _bent(
    first: IntArray,
    plus: IntArray,
    driver: IntArray,
    part: FloatArray,
    form: FloatArray,
    weight: FloatArray,
    moved: FloatArray,
    behind: FloatArray,
    given: FloatArray,
    result: FloatArray,
) -> None:
    for g in range(len(driver)):
        pull = given[g] - weight[g] * behind[g]
        result[driver[g]] -= given[g] * form[g] + weight[g] * moved[g]
        for m in range(first[g], first[g + 1]):
            result[plus[m]] += part[m] * pull


class CompiledSums(Sums):
    """Sums that are worked out by compiled loops."""

    def at(self, y: FloatArray) -> CompiledSumsAt:
        """Work the sums out at log sizes, shape (n,)."""
        x = np.exp(y)
        inverse = 1.0 / x
        part, form = np.empty(len(self.plus)), np.empty(self.forms)
        forms = (self.first, self.plus, self.driver)
        _worked_out(*forms, self.coefficient, self.base, x, inverse, part, form)
        take, values = self.take, self.constant.copy()
        _taken(take.indptr, take.indices, take.data, form, inverse, x, values)
        return CompiledSumsAt(self, x, inverse, part, form, values)


class CompiledSumsAt(SumsAt):
    """Sums at one point, by compiled loops."""

    def moved(self, v: FloatArray) -> Moved:
        """Return how everything moves along v, shape (n,)."""
        sums, take = self.sums, self.sums.take
        form, behind, rows = np.empty(sums.forms), np.empty(sums.forms), np.zeros(take.shape[0])
        _moved(sums.first, sums.plus, sums.driver, self.part, self.form, v, form, behind)
        falling, growing = -self.inverse * v, self.x * v
        _taken(take.indptr, take.indices, take.data, form, falling, growing, rows)
        return Moved(rows, form, behind)

    def weights(self, w: FloatArray) -> FloatArray:
        """Return u for row weights w, shape (forms + 2 n,)."""
        take, weights = self.sums.take, np.zeros(self.sums.take.shape[1])
        _weighted(take.indptr, take.indices, take.data, w, weights)
        return weights

    def pulled(self, weight: FloatArray) -> FloatArray:
        """Return the parts at the size each grows with, times their forms' weights, shape (n,)."""
        sums, result = self.sums, np.zeros(self.sums.sizes)
        _pulled(sums.first, sums.plus, self.part, weight, result)
        return result

    def gradient(self, u: FloatArray) -> FloatArray:
        """Return the gradient of the weighted sum, shape (n,)."""
        sums, result = self.sums, np.empty(self.sums.sizes)
        forms = (sums.first, sums.plus, sums.driver, self.part, self.form)
        _slope(*forms, self.x, self.inverse, u, result)
        return result

    def falling(self) -> FloatArray:
        """Return what of each sum falls with the row's driver: minus its derivative."""
        take, rows = self.sums.take, np.zeros(len(self.values))
        _falling(take.indptr, take.indices, take.data, self.form, self.inverse, rows)
        return rows

    def squares(self, w: FloatArray, falling: FloatArray) -> FloatArray:
        """Return the weighted sum of the rows' squared derivatives, nearly, shape (n,)."""
        sums, result = self.sums, np.zeros(self.sums.sizes)
        entries = (sums.take.indptr, sums.take.indices, sums.take.data)
        forms = (sums.first, sums.plus, self.part)
        _squares(entries, forms, sums.row_driver, self.x, w, falling, result)
        return result

    def bent(
        self,
        alone: FloatArray,
        weight: FloatArray,
        v: FloatArray,
        moved: Moved,
        rows: FloatArray | None,
    ) -> FloatArray:
        """Return what :meth:`evenstage.sizing.sums.Curvature.product` is, shape (n,)."""
        sums, take = self.sums, self.sums.take
        result, given = alone * v, np.zeros(sums.forms)
        if rows is not None:
            entries = (take.indptr, take.indices, take.data)
            _given(*entries, self.x, self.inverse, rows, given, result)
        forms = (sums.first, sums.plus, sums.driver, self.part, self.form)
        _bent(*forms, weight, moved.form, moved.behind, given, result)
        return result
