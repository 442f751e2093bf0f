"""The interior point on programmes small enough for paper."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.sizing.central_path import Point, central_path
from evenstage.sizing.programme import Entries, Programme
from support.problems import Term, monomials


def programme(rows: list[list[Term]], sizes: int, box: float = 3.0) -> Programme:
    """Return: minimise exp(y_0) + w with each row's sum at most w."""
    count = len(rows)
    return Programme(
        cost=np.append(np.zeros(sizes), 1.0),
        weight=np.append(1.0, np.zeros(sizes - 1)),
        lower=np.full(sizes, -box),
        upper=np.full(sizes, box),
        linear=Entries(
            row=np.arange(count, dtype=np.int32),
            column=np.full(count, sizes, dtype=np.int32),
            value=-np.ones(count),
        ),
        constant=np.zeros(count),
        terms=monomials(rows, sizes),
    )


def last(p: Programme, z: list[float], anchor: list[float]) -> Point:
    """Return the end of the path."""
    return list(central_path(p, np.array(z), np.array(anchor), 1e-10))[-1]


@pytest.mark.parametrize("z", [[2.0, 0.1], [-2.5, 100.0], [0.0, -5.0]])
def test_sum_of_a_size_and_its_inverse(z: list[float]) -> None:
    # x + 4/x is least at x = 2; the row's multiplier is 1.
    found = last(programme([[(4.0, None, 0)]], 1), z, [0.0])
    assert_allclose(found.z, [np.log(2.0), 2.0], rtol=1e-8, atol=0)
    assert_allclose(found.price, [1.0, 0.0, 0.0], rtol=1e-8, atol=1e-8)


def test_two_rows_share_one_multiplier() -> None:
    # x + max(4/x, 2x) is least where the two meet, x = sqrt 2; there the gradient in log x,
    # x + 2x m_2 - 4/x m_1, vanishes for m = (3/4, 1/4).
    found = last(programme([[(4.0, None, 0)], [(2.0, 0, None)]], 1), [1.0, 9.0], [0.0])
    assert_allclose(found.z[0], np.log(2.0) / 2, rtol=1e-8, atol=0)
    assert_allclose(found.price[:2], [0.75, 0.25], rtol=1e-8, atol=0)


def test_bound_takes_over() -> None:
    found = last(programme([[(4.0, None, 0)]], 1, box=0.5), [0.0, 9.0], [0.0])
    assert_allclose(found.z[0], 0.5, rtol=1e-8, atol=0)
    # Gradient of x + 4/x in log x at the bound, taken up by the upper bound's multiplier.
    assert_allclose(found.price[2], 4 * np.exp(-0.5) - np.exp(0.5), rtol=1e-6, atol=0)


@pytest.mark.parametrize("anchor", [-1.0, 0.2, 1.4])
def test_variable_without_influence_stays_near_its_anchor(anchor: float) -> None:
    found = last(programme([[(4.0, None, 0)]], 2), [0.0, anchor, 5.0], [0.0, anchor])
    assert_allclose(found.z[1], anchor, rtol=0, atol=0.3)
    assert_allclose(found.z[0], np.log(2.0), rtol=1e-8, atol=0)
