"""Fingers and fins."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.netlist.rewriting.fingers import (
    Drawing,
    drawable,
    fingers_needed,
    widest,
    written_ratio,
)
from support.sized import process

quick = settings(max_examples=60, deadline=None)

TOTAL = process(finger_width_max=2e-6).first("n")
FINGER = process(finger_width_max=2e-6, width_is="finger").first("n")
FINS = process(finger_width_max=2e-6, width_is="fins").first("n")
FREE = process().first("n")


class TestFingersNeeded:
    @pytest.mark.parametrize(
        ("width", "fingers", "expected"),
        [(2e-6, 1, 1), (2.005e-6, 1, 2), (6e-6, 1, 3), (6e-6, 5, 5), (3 * 0.1 * 2e-5, 1, 3)],
    )
    def test_is_the_least_number_that_fits_but_never_less_than_today(
        self, width: float, fingers: float, expected: float
    ) -> None:
        assert fingers_needed(width, fingers, TOTAL) == expected

    def test_without_a_limit_and_for_fins_it_stays(self) -> None:
        assert fingers_needed(1e-3, 2, FREE) == 2
        assert fingers_needed(1e-3, 2, FINS) == 2


class TestWidest:
    def test_is_all_fingers_at_their_limit_or_what_is_drawn(self) -> None:
        assert widest(Drawing(3e-6, 2), TOTAL) == pytest.approx(4e-6, rel=1e-12)
        assert widest(Drawing(5e-6, 2), TOTAL) == 5e-6
        assert widest(Drawing(5e-6, 2), FREE) is None


class TestWrittenRatio:
    def test_a_total_grows_like_the_width_and_a_finger_less(self) -> None:
        now, then = Drawing(2e-6, 1), Drawing(6e-6, 3)
        assert written_ratio(now, then, TOTAL) == pytest.approx(3, rel=1e-12)
        assert written_ratio(now, then, FINGER) == pytest.approx(1, rel=1e-12)


class TestDrawable:
    @quick
    @given(st.floats(1e-8, 1e-4), st.integers(1, 5))
    def test_is_on_the_grid_and_near(self, width: float, fingers: int) -> None:
        for kind in (TOTAL, FINGER):
            now = Drawing(1e-6, fingers)
            got = drawable(width, now, kind, 5e-9)
            each = fingers_needed(width, fingers, kind) if kind is FINGER else 1
            steps = got / (5e-9 * each)
            assert steps == pytest.approx(round(steps), rel=0, abs=1e-6)
            assert steps >= 1 - 1e-9
            assert abs(got - width) <= 0.5 * 5e-9 * each * (1 + 1e-9) or round(steps) == 1
