"""Truth tables as numbers."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from evenstage.circuit.truth import ones, packed, unpacked

TABLES = st.lists(st.booleans(), min_size=1, max_size=300)


@given(TABLES)
def test_a_table_comes_back_from_its_number(values: list[bool]) -> None:
    table = np.array(values, bool)
    assert unpacked(packed(table), len(table)).tolist() == values


@given(TABLES)
def test_ones_are_the_vectors_where_a_table_is_1(values: list[bool]) -> None:
    assert list(ones(packed(np.array(values, bool)))) == np.flatnonzero(values).tolist()
