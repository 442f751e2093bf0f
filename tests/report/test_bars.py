"""The time axis and its bars."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.report.bars import TimeAxis
from evenstage.report.paper import Paper
from evenstage.report.scale import Scale

TIMES = st.floats(0, 1e-6)


def make_axis(start: float, end: float, width: int, *, unicode: bool = False) -> TimeAxis:
    return TimeAxis(start, end, width, Scale.of([end], "s"), Paper(100, unicode))


class TestAxis:
    @pytest.mark.parametrize(
        ("start", "end", "labels", "ruler"),
        [
            (0.0, 612e-12, "0         200       400 ps", "+---------+---------+--------+"),
            (0.0, 1.02e-9, "0              0.5           1", "+--------------+-------------+"),
            (230e-12, 420e-12, "   250     300     350     400", "---+-------+-------+-------+--"),
            (0.0, 0.0, "0 s", "+-----------------------------"),
        ],
    )
    def test_ticks_are_round_numbers(
        self, start: float, end: float, labels: str, ruler: str
    ) -> None:
        axis = make_axis(start, end, 30)
        assert (axis.labels(), axis.ruler()) == (labels, ruler)

    @given(TIMES, TIMES, st.integers(16, 60), st.booleans())
    @settings(max_examples=100, deadline=None)
    def test_all_fits(
        self,
        one: float,
        other: float,
        width: int,
        unicode: bool,  # noqa: FBT001
    ) -> None:
        axis = make_axis(min(one, other), max(one, other), width, unicode=unicode)
        assert len(axis.labels()) <= width
        assert len(axis.ruler()) == width
        assert set(axis.ruler()) <= set("-+─┬")


class TestBar:
    @pytest.mark.parametrize(
        ("unicode", "thin", "bar"),
        [
            (False, False, "  ==="),
            (False, True, "  ---"),
            (True, False, "  ▐██▌"),
            (True, True, "  ╺━━╸"),
        ],
    )
    def test_begins_and_ends_to_scale(self, *, unicode: bool, thin: bool, bar: str) -> None:
        axis = make_axis(0.0, 100e-12, 10, unicode=unicode)
        assert axis.bar(24.9e-12, 54.9e-12, thin=thin) == bar

    @pytest.mark.parametrize(("unicode", "mark"), [(False, "|"), (True, "▏")])
    def test_short_one_is_a_mark_in_its_place(self, *, unicode: bool, mark: str) -> None:
        axis = make_axis(0.0, 100e-12, 10, unicode=unicode)
        assert axis.bar(50e-12, 50.1e-12) == "     " + mark
        assert axis.bar(100e-12, 100e-12) == "         " + mark

    @given(st.lists(st.floats(1e-12, 1e-9), min_size=1, max_size=30), st.integers(16, 60))
    @settings(max_examples=60, deadline=None)
    def test_stages_in_a_row_tile_the_axis(self, delays: list[float], width: int) -> None:
        axis = make_axis(0.0, sum(delays), width)
        covered, begin = [0] * width, 0.0
        for delay in delays:
            for cell, sign in enumerate(axis.bar(begin, begin + delay)):
                covered[cell] += sign == "="
            begin += delay
        assert covered == [1] * width
