"""Spend against delay: against every point of a fine grid, and laws of its shape."""

from __future__ import annotations

from itertools import pairwise, product
from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings

from evenstage.sizing.limiting import worst_charged
from evenstage.sizing.trade_off import deadlines, knee, trade_off
from evenstage.sizing.wishes import Wishes
from evenstage.timing.analyse import analyse
from evenstage.timing.sweep import sweep
from support.blocks import block, circuit_of, inverter, plain_process
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.sizing.results import TradeOff

PROCESS = plain_process(slope=0.2, slope_power=0.8)
CARDS = [inverter(f"i{k}", f"x{k}", f"x{k + 1}", 1.0, 2.0) for k in range(3)]
CHAIN = block("\n".join([*CARDS, "cl x3 vss 300f"]), "x0 x3 vdd vss")


def curve_of(text: str, wishes: Wishes | None = None) -> TradeOff:
    return trade_off(analyse(circuit_of(text, PROCESS)), wishes=wishes)


class TestTradeOff:
    def test_no_sizes_on_a_grid_are_cheaper_and_some_come_near(self) -> None:
        analysis = analyse(circuit_of(CHAIN, PROCESS))
        timing = analysis.timing
        assert timing is not None
        circuit = timing.circuit
        tried = []
        for second, third in product(np.geomspace(1, 40, 50), repeat=2):
            factor = np.repeat([1.0, second, third], 2)
            sized = circuit.resized(factor)
            found = sweep(sized, timing.graph, timing.unit)
            tried.append((worst_charged(found), sized.total_width))
        delay, width = np.array(tried).T
        points = trade_off(analysis).points
        assert len(points) > 8
        for point in points:
            least = width[delay <= point.charged_delay * (1 + 1e-9)].min(initial=np.inf)
            assert point.spend <= least * (1 + 1e-6)
            loose = width[delay <= point.charged_delay * 1.03].min()
            assert loose <= point.spend * 1.08

    def test_todays_point_is_no_dearer_than_today(self) -> None:
        curve = curve_of(CHAIN)
        assert curve.points[0].charged_delay <= curve.today_charged_delay * (1 + 1e-9)
        assert curve.points[0].spend <= curve.today_spend * (1 + 1e-9)

    def test_the_price_is_the_slope(self) -> None:
        """Delay is convex in the logarithm of spend: a secant lies between the slopes."""
        for slow, fast in pairwise(curve_of(CHAIN).points):
            secant = (slow.charged_delay - fast.charged_delay) / np.log(fast.spend / slow.spend)
            assert fast.one_percent_buys is not None
            assert 100 * fast.one_percent_buys <= secant * (1 + 1e-4)
            if slow.one_percent_buys is not None:
                assert 100 * slow.one_percent_buys >= secant * (1 - 1e-4)

    def test_energy(self) -> None:
        curve = curve_of(CHAIN, Wishes(spend="energy"))
        analysis = analyse(circuit_of(CHAIN, PROCESS))
        assert curve.today_spend == pytest.approx(analysis.switched_cap, rel=1e-9)

    @settings(max_examples=8, deadline=None)
    @given(random_blocks())
    def test_speed_costs_ever_more(self, some: RandomBlock) -> None:
        points = curve_of(some.text(), Wishes(scope="block", reclaim=True)).points
        x = np.log([point.charged_delay for point in points])
        y = np.log([point.spend for point in points])
        assert (np.diff(x) < 0).all()
        assert (np.diff(y) > 0).all()
        slopes = np.diff(y) / np.diff(x)
        assert (np.diff(slopes) <= 1e-3 * np.abs(slopes[1:])).all()
        assert all(point.bound <= point.spend * (1 + 1e-9) for point in points)
        assert all(point.gap <= 1e-4 for point in points)


class TestKnee:
    def test_of_a_hyperbola_in_logarithms(self) -> None:
        x = np.linspace(3.0, 0.1, 30)
        found = knee(np.exp(x), np.exp(1 / x))
        # The line from (3, 1/3) to (1/10, 10) has slope -1/0.3: there x^2 = 0.3.
        assert found is not None
        assert x[found] == pytest.approx(0.3**0.5, abs=0.06)

    def test_a_straight_line_has_none(self) -> None:
        x = np.linspace(2, 1, 5)
        assert knee(x, 1 / x**2) is None

    def test_one_point_has_none(self) -> None:
        assert knee(np.array([1.0]), np.array([1.0])) is None


def test_deadlines_reach_from_today_to_the_least() -> None:
    found = deadlines(2e-9, 1e-9)
    assert found[0] == pytest.approx(2e-9, rel=1e-12)
    assert found[-1] == pytest.approx(1.001e-9, rel=1e-12)
    assert (np.diff(found, 2) > 0).all()
