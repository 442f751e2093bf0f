"""Distinct rows, against the general-purpose library."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as arrays

from evenstage.circuit.rows import distinct_rows

TABLES = st.tuples(st.integers(1, 40), st.integers(0, 6)).flatmap(
    lambda shape: arrays.arrays(np.int32, shape, elements=st.integers(-3, 3))
)


@given(TABLES)
def test_rows_are_those_of_the_library(
    table: np.ndarray[tuple[int, int], np.dtype[np.int32]],
) -> None:
    kinds, inverse = distinct_rows(table)
    if table.shape[1]:
        expected, places = np.unique(table, axis=0, return_inverse=True)
        assert (kinds == expected).all()
        assert (inverse == places).all()
    assert (kinds[inverse] == table).all()


def test_rows_of_truth_values() -> None:
    kinds, inverse = distinct_rows(np.array([[True, False], [False, True], [True, False]]))
    assert kinds.tolist() == [[0, 1], [1, 0]]
    assert inverse.tolist() == [1, 0, 1]
