"""The latest arrival of each run, against a plain loop."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from evenstage.timing.knockout import latest, rounds_of

RUNS = st.lists(st.lists(st.integers(-3, 3), min_size=1, max_size=12), max_size=12)


@given(RUNS)
def test_the_first_of_the_latest_wins(runs: list[list[int]]) -> None:
    rounds = rounds_of(np.array([len(run) for run in runs], int))
    found, place = latest(np.array([float(x) for run in runs for x in run]), rounds)
    begins = np.cumsum([0, *(len(run) for run in runs)])[:-1].tolist()
    assert found.tolist() == [max(run) for run in runs]
    assert place.tolist() == [b + run.index(max(run)) for b, run in zip(begins, runs, strict=True)]


def test_blocks_side_by_side_are_told_apart() -> None:
    candidate = np.array([[1.0, 5.0], [2.0, 4.0], [0.0, 0.0], [3.0, 3.0]])
    found, place = latest(candidate, rounds_of(np.array([2, 1, 1])))
    assert found.tolist() == [[2.0, 5.0], [0.0, 0.0], [3.0, 3.0]]
    assert place.tolist() == [[1, 0], [2, 2], [3, 3]]


@pytest.mark.parametrize(("longest", "count"), [(1, 0), (2, 1), (3, 2), (64, 6), (65, 7)])
def test_rounds_grow_with_the_logarithm_of_the_longest_run(longest: int, count: int) -> None:
    assert len(rounds_of(np.array([1, longest, 1]))) == count
