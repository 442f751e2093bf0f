"""Many sums of monomials that share their parts, with first and second derivatives.

All arcs of a gate, rising and falling, see the same load through the same transistor: their delays
and their transition limits are multiples of one *form*, the load per unit of drive. So each form is
worked out once, and with ``x = exp(y)`` all sums are linear in ``z = (form, 1/x, x)``:

=========  =======================================================  ==================
symbol     meaning                                                  shape
=========  =======================================================  ==================
``f_g``    form ``(sum_m c_m x_p(m) + base_g) / x_i(g)``            ``(forms,)``
``C``      what each sum takes of z                                 ``(rows, forms + 2n)``
``r_m``    part ``c_m x_p(m) / x_i(g)`` of a form                   ``(parts,)``
``u``      ``C' w``: weight of each entry of z                      ``(forms + 2n,)``
=========  =======================================================  ==================

For a direction v, ``df_g = sum_m r_m v_p - f_g v_i``. With row weights w the gradient of ``w @ s``
gets ``u_g r_m`` at p and ``-u_g f_g`` at i, and its Hessian maps v to ``u_g r_m (v_p - v_i)`` at p
and minus the sum of these at i; the entries of 1/x and x are alike.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np
from scipy.sparse import csc_array, csr_array

from evenstage.circuit.arcs import ranges
from evenstage.sizing.problem import totals

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.sizing.problem import FloatArray, IntArray, Monomials

    Index = NDArray[np.intp]

#: Relative difference of coefficients that is rounding: the forms are multiples of one another.
_SAME: Final = 1e-12


@dataclass(frozen=True, kw_only=True)
class Sums:
    """Sums of monomials, factored; see the module's docstring.

    Parameters
    ----------
    sizes : int
        Number n of sizes.
    first : IntArray, shape (forms + 1,)
        Where each form's parts begin.
    plus, coefficient : IntArray and FloatArray, shape (parts,)
        Numerator and coefficient of each part.
    driver, base : IntArray and FloatArray, shape (forms,)
        Denominator and constant of each form.
    of_part : IntArray, shape (parts,)
        Form of each part.
    take : csr_array, shape (rows, forms + 2 n)
        C.
    constant : FloatArray, shape (rows,)
    """

    sizes: int
    first: IntArray
    plus: IntArray
    coefficient: FloatArray
    driver: IntArray
    base: FloatArray
    of_part: IntArray
    take: csr_array[np.float64]
    constant: FloatArray

    @cached_property
    def row_driver(self) -> IntArray:
        """A size each row falls with, -1 where there is none, shape (rows,)."""
        g, n = self.forms, self.sizes
        column = self.take.indices
        size = np.append(self.driver, np.arange(n))[np.minimum(column, g + n - 1)]
        falls = column < g + n
        found = np.full(self.take.shape[0], -1, np.int32)
        found[self.entry_row[falls]] = size[falls]
        return found

    @cached_property
    def entry_row(self) -> IntArray:
        """Row of each entry of C."""
        rows = np.arange(self.take.shape[0], dtype=np.int32)
        return np.repeat(rows, np.diff(self.take.indptr))

    @cached_property
    def taken(self) -> csc_array[np.float64]:
        """C, transposed."""
        return csc_array(self.take.T)

    @cached_property
    def squared(self) -> csc_array[np.float64]:
        """C with its entries squared, transposed."""
        take = self.taken
        return csc_array((take.data**2, take.indices, take.indptr), shape=take.shape)

    @property
    def forms(self) -> int:
        """Number of forms."""
        return len(self.driver)

    @classmethod
    def of(cls, terms: Monomials, rows: int, sizes: int) -> Sums:
        """Factor sums of monomials; index `sizes` stands for the constant 1."""
        row, plus, minus = terms.row, terms.plus, terms.minus
        up, down = plus < sizes, minus < sizes
        still = plus == minus
        constant = totals(row[still], terms.coefficient[still], rows)
        found = _Forms(terms, np.flatnonzero(up & down & ~still))
        inverse = np.flatnonzero(~up & down)
        base, left = found.shared(row[inverse], minus[inverse], terms.coefficient[inverse], sizes)
        rising = np.flatnonzero(up & ~down)
        kept = inverse[left > 0.0]
        n, g = sizes, len(found.driver)
        take = csr_array(
            (
                np.concatenate([found.multiple, left[left > 0.0], terms.coefficient[rising]]),
                (
                    np.concatenate([found.row, row[kept], row[rising]]),
                    np.concatenate([found.form, g + minus[kept], g + n + plus[rising]]),
                ),
            ),
            shape=(rows, g + 2 * n),
        )
        return cls(
            sizes=n,
            first=found.first,
            plus=found.plus,
            coefficient=found.coefficient,
            driver=found.driver,
            base=base,
            of_part=np.repeat(np.arange(g, dtype=np.int32), np.diff(found.first)),
            take=take,
            constant=constant,
        )

    def at(self, y: FloatArray) -> SumsAt:
        """Work the sums out at log sizes, shape (n,)."""
        x = np.exp(y)
        inverse = 1.0 / x
        drive = inverse[self.driver]
        part = self.coefficient * x[self.plus]
        part *= drive[self.of_part]
        form = self.added(part) + self.base * drive
        values = self.take @ np.concatenate([form, inverse, x]) + self.constant
        return SumsAt(self, x, inverse, part, form, values)

    def added(self, part: FloatArray) -> FloatArray:
        """Return what parts of forms add up to, shape (forms,)."""
        return np.add.reduceat(part, self.first[:-1]) if len(part) else np.zeros(self.forms)


@dataclass(frozen=True)
class SumsAt:
    """Sums at one point, and their derivatives.

    Parameters
    ----------
    sums : Sums
    x, inverse : FloatArray, shape (n,)
        Sizes and what 1 is over them.
    part, form : FloatArray
        r and f.
    values : FloatArray, shape (rows,)
        The sums.
    """

    sums: Sums
    x: FloatArray
    inverse: FloatArray
    part: FloatArray
    form: FloatArray
    values: FloatArray

    def moved(self, v: FloatArray) -> Moved:
        """Return how everything moves along v, shape (n,)."""
        sums, behind = self.sums, v[self.sums.driver]
        form = sums.added(self.part * v[sums.plus]) - self.form * behind
        rows = sums.take @ np.concatenate([form, -self.inverse * v, self.x * v])
        return Moved(rows, form, behind)

    def weights(self, w: FloatArray) -> FloatArray:
        """Return u for row weights w, shape (forms + 2 n,)."""
        weights: FloatArray = np.asarray(self.sums.taken @ w)
        return weights

    def pulled(self, weight: FloatArray) -> FloatArray:
        """Return the parts at the size each grows with, times their forms' weights, shape (n,)."""
        sums = self.sums
        return totals(sums.plus, self.part * weight[sums.of_part], sums.sizes)

    def gradient(self, u: FloatArray) -> FloatArray:
        """Return the gradient of the weighted sum, shape (n,)."""
        sums, g, n = self.sums, self.sums.forms, self.sums.sizes
        result = self.pulled(u[:g]) - totals(sums.driver, u[:g] * self.form, n)
        result += self.x * u[g + n :] - self.inverse * u[g : g + n]
        return result

    def bent(
        self,
        alone: FloatArray,
        weight: FloatArray,
        v: FloatArray,
        moved: Moved,
        rows: FloatArray | None,
    ) -> FloatArray:
        """Return what :meth:`Curvature.product` is, shape (n,).

        Parameters
        ----------
        alone : FloatArray, shape (n,)
            Second derivatives in each size with all forms' drivers held.
        weight : FloatArray, shape (forms,)
            Weight of each form.
        v, moved : FloatArray and Moved
            A direction, and how the sums move along it.
        rows : FloatArray, shape (rows,), optional
            Row weights.
        """
        sums, g, n = self.sums, self.sums.forms, self.sums.sizes
        pull, push = -weight * moved.behind, weight * moved.form
        result: FloatArray = alone * v
        if rows is not None:
            u = self.weights(rows)
            pull += u[:g]
            push += u[:g] * self.form
            result += self.x * u[g + n :] - self.inverse * u[g : g + n]
        result += self.pulled(pull)
        result -= totals(sums.driver, push, n)
        return result

    def falling(self) -> FloatArray:
        """Return what of each sum falls with the row's driver: minus its derivative."""
        part = np.concatenate([self.form, self.inverse, np.zeros(self.sums.sizes)])
        falling: FloatArray = self.sums.take @ part
        return falling

    def squares(self, w: FloatArray, falling: FloatArray) -> FloatArray:
        """Return the weighted sum of the rows' squared derivatives, nearly, shape (n,).

        A row is taken to fall with one size only, and to grow with each size by one entry.

        Parameters
        ----------
        w : FloatArray, shape (rows,)
            Weights.
        falling : FloatArray, shape (rows,)
            From the method of that name.
        """
        sums, g, n = self.sums, self.sums.forms, self.sums.sizes
        u = np.asarray(sums.squared @ w)
        growing = totals(sums.plus, self.part**2 * u[sums.of_part], n) + u[g + n :] * self.x**2
        some = sums.row_driver >= 0
        fall = w[some] * falling[some] ** 2
        result: FloatArray = growing + totals(sums.row_driver[some], fall, n)
        return result


class Moved(NamedTuple):
    """How sums move along a direction: the rows, the forms, and the direction at their drivers."""

    rows: FloatArray
    form: FloatArray
    behind: FloatArray


class Curvature:
    """The Hessian of a weighted sum.

    Parameters
    ----------
    at : SumsAt
    u : FloatArray, shape (forms + 2 n,)
        Weights, from :meth:`SumsAt.weights`.
    """

    def __init__(self, at: SumsAt, u: FloatArray) -> None:
        sums, g, n = at.sums, at.sums.forms, at.sums.sizes
        self.at, self.form = at, u[:g]
        self.alone = at.pulled(self.form)
        self.alone += at.x * u[g + n :] + at.inverse * u[g : g + n]
        self.diagonal: FloatArray = self.alone + totals(sums.driver, self.form * at.form, n)

    def product(self, v: FloatArray, moved: Moved, rows: FloatArray | None = None) -> FloatArray:
        """Return the Hessian times v, shape (n,), plus the gradient for row weights, if given."""
        return self.at.bent(self.alone, self.form, v, moved, rows)


class _Forms:
    """The distinct forms among crossing monomials ``c x_plus / x_minus``.

    Attributes: `row`, `form`, `multiple` say what each row takes of which form; `first`, `plus`,
    `coefficient`, `driver` are the forms.
    """

    def __init__(self, terms: Monomials, crossing: Index) -> None:
        order = np.lexsort((terms.plus[crossing], terms.minus[crossing], terms.row[crossing]))
        order = crossing[order].astype(np.int32)
        row, coefficient = terms.row[order], terms.coefficient[order]
        plus, minus = terms.plus[order], terms.minus[order]
        new = np.ones(len(row), bool)
        new[1:] = (row[1:] != row[:-1]) | (minus[1:] != minus[:-1])
        begin = np.flatnonzero(new)
        count = np.diff(np.append(begin, len(row)))
        total = np.add.reduceat(coefficient, begin) if len(begin) else np.zeros(0)
        leader = _alike(begin, count, coefficient, plus, minus[begin], total)
        leading = np.flatnonzero(leader == np.arange(len(begin)))
        number = np.zeros(len(begin), np.int32)
        number[leading] = np.arange(len(leading))
        self.row, self.form = row[begin], number[leader]
        self.multiple = total / total[leader]
        entry = ranges(begin[leading], count[leading])
        self.plus, self.coefficient = plus[entry].astype(np.int32), coefficient[entry]
        self.driver = minus[begin[leading]].astype(np.int32)
        self.first = np.concatenate([[0], np.cumsum(count[leading])]).astype(np.int32)

    def shared(
        self, row: IntArray, minus: IntArray, coefficient: FloatArray, sizes: int
    ) -> tuple[FloatArray, FloatArray]:
        """Fold constants over a driver into the forms, as far as all rows of a form have them.

        Returns each form's constant and what is left of each coefficient, shape (k,).
        """
        base = np.full(len(self.driver), np.inf)
        key = self.row.astype(np.int64) * sizes + self.driver[self.form]
        wanted = row.astype(np.int64) * sizes + minus
        by_key = np.argsort(wanted, kind="stable")
        place = np.searchsorted(wanted[by_key], key)
        left = coefficient.copy()
        if not len(by_key):
            return np.zeros(len(base)), left
        entry = by_key[np.minimum(place, len(by_key) - 1)]
        has = wanted[entry] == key
        np.minimum.at(base, self.form, np.where(has, coefficient[entry] / self.multiple, 0.0))
        np.subtract.at(left, entry[has], (self.multiple * base[self.form])[has])
        left[left < _SAME * coefficient] = 0.0
        return base, left


def _alike(
    begin: Index,
    count: Index,
    coefficient: FloatArray,
    plus: IntArray,
    minus: IntArray,
    total: FloatArray,
) -> Index:
    """Return for each form the first one it is a multiple of, shape (forms,)."""
    if not len(begin):
        return np.zeros(0, np.intp)
    rng = np.random.default_rng(1985)
    marks = rng.integers(0, 2**63, int(plus.max()) + 1, dtype=np.uint64)
    weight = rng.uniform(1.0, 2.0, int(plus.max()) + 1)
    mark = np.add.reduceat(marks[plus], begin)
    mean = np.add.reduceat(coefficient * weight[plus], begin) / total
    order = np.lexsort((np.arange(len(begin)), mean, mark, count, minus))
    differs = np.zeros(len(order), bool)
    for key in (minus[order], count[order]):
        differs[1:] |= key[1:] != key[:-1]
    differs[1:] |= np.diff(mark[order]) != 0
    differs[1:] |= np.diff(mean[order]) > _SAME * mean[order][1:]
    differs[0] = True
    leader = np.empty(len(order), np.intp)
    leader[order] = order[np.maximum.accumulate(np.where(differs, np.arange(len(order)), 0))]
    # Marks may collide: compare part by part before anything is taken for equal.
    its = ranges(begin[leader], count)
    off = np.repeat(total / total[leader], count)
    off *= coefficient[its]
    off -= coefficient
    differ = np.abs(off, out=off) > 8 * _SAME * coefficient
    differ |= plus != plus[its]
    alone = np.logical_or.reduceat(differ, begin)
    return np.where(alone, np.arange(len(begin)), leader)
