"""Sums of products: right, and without a product too many."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from evenstage.logic.cover import Cube, cover


def held(cubes: tuple[Cube, ...], size: int) -> list[bool]:
    return [
        any(all(bool(place >> at & 1) == level for at, level in cube) for cube in cubes)
        for place in range(size)
    ]


class TestCover:
    @given(
        st.integers(0, 5).flatmap(
            lambda n: st.lists(st.booleans(), min_size=1 << n, max_size=1 << n)
        )
    )
    def test_holds_exactly_where_wanted_and_needs_each_cube(self, wanted: list[bool]) -> None:
        cubes = cover(np.array(wanted))
        assert held(cubes, len(wanted)) == wanted
        for index in range(len(cubes)):
            assert held((*cubes[:index], *cubes[index + 1 :]), len(wanted)) != wanted

    def test_uses_what_is_allowed(self) -> None:
        assert cover(np.array([0, 1, 0, 0], bool), np.array([0, 0, 0, 1], bool)) == (((0, True),),)
