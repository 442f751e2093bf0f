"""Areas and perimeters after a change of width, against the geometry of a rectangle."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.netlist.rewriting.diffusion import edge_factor

quick = settings(max_examples=60, deadline=None)
micron = st.floats(0.05e-6, 20e-6)


class TestEdgeFactor:
    @quick
    @given(micron, micron, micron, st.sampled_from([0, 1, 2]))
    def test_is_that_of_a_rectangle_of_constant_extension(
        self, old: float, new: float, extension: float, sides: int
    ) -> None:
        def edge(width: float) -> float:
            return 2 * extension + sides * width

        factor = edge_factor(extension * old, edge(old), old, new)
        assert factor * edge(old) == pytest.approx(edge(new), rel=1e-9, abs=0)

    def test_without_an_area_the_edge_grows_like_the_width(self) -> None:
        assert edge_factor(float("nan"), 2e-6, 1e-6, 3e-6) == pytest.approx(3, rel=1e-12)

    def test_a_lumped_area_never_makes_an_edge_negative(self) -> None:
        # E = 2 um but only 1 um of edge: k = -3, and at twice the width nothing would be left.
        assert edge_factor(2e-12, 1e-6, 1e-6, 3e-6) == pytest.approx(3, rel=1e-12)
