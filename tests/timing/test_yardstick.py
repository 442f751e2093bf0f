"""The unit inverter, best stage effort and best number of stages."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from evenstage.timing.yardstick import best_stage_count, best_stage_effort, yardstick
from support.blocks import plain_process


class TestBestStageEffort:
    """``p_inv + rho (1 - ln rho) = 0``; Sutherland, Sproull and Harris 1999, 3.3, from memory."""

    @pytest.mark.parametrize(
        ("p_inv", "rho"),
        [
            (0, 2.718282), (0.2, 2.911567), (0.5, 3.180966), (0.6, 3.266400), (1.0, 3.591121),
            (1.5, 3.967315), (2.0, 4.319137), (3.0, 4.970626),
        ],
    )  # fmt: skip
    def test_recomputed_table(self, p_inv: float, rho: float) -> None:
        assert best_stage_effort(p_inv) == pytest.approx(rho, abs=1e-6)

    @given(st.floats(0, 20))
    def test_least_delay_per_log_effort_is_rho_itself(self, p_inv: float) -> None:
        rho = best_stage_effort(p_inv)
        assert (rho + p_inv) / math.log(rho) == pytest.approx(rho, rel=1e-9)


class TestBestStageCount:
    """Boundaries between N and N + 2 stages follow from those between N and N + 1."""

    @pytest.mark.parametrize(
        ("effort", "stages", "best"),
        [
            (5.8, 1, 1),
            (60.0, 1, 3),
            (22.2, 2, 2),
            (100.0, 2, 4),
            (1e4, 3, 7),
            (1e4, 2, 8),
            (1.0, 3, 3),
        ],
    )
    def test_inverters(self, effort: float, stages: int, best: int) -> None:
        delays = {n: n * effort ** (1 / n) + n for n in range(stages, 30, 2)}
        assert min(delays, key=lambda n: (delays[n], n)) == best
        assert best_stage_count(math.log(effort), stages, float(stages), 1.0) == best

    @pytest.mark.parametrize(
        ("count", "boundary"),
        [(1, 5.82843), (2, 22.2951), (3, 82.2103), (4, 299.567), (5, 1085.78), (6, 3924.21)],
    )
    def test_boundaries_for_p_inv_one(self, count: int, boundary: float) -> None:
        """Here N and N + 1 stages are equally fast (recomputed; printed 5.83 ... 3920)."""

        def delay(n: int) -> float:
            return n * math.pow(boundary, 1 / n) + n

        assert delay(count) == pytest.approx(delay(count + 1), rel=1e-5)


class TestYardstick:
    @given(
        slope_n=st.floats(0, 0.5), slope_p=st.floats(0, 0.5), shape_n=st.floats(0, 3),
        shape_p=st.floats(0, 3),
    )  # fmt: skip
    def test_linear_charges(
        self, slope_n: float, slope_p: float, shape_n: float, shape_p: float
    ) -> None:
        """Without carry, with power 1: q is 1 plus slope of one type times shape of the other."""
        process = plain_process()
        n, p = process.transistors
        types = (
            replace(n, slope=slope_n, shape=shape_n),
            replace(p, slope=slope_p, shape=shape_p),
        )
        unit = yardstick(replace(process, transistors=types))
        assert unit.charge_rise == pytest.approx(1 + slope_n * shape_p)
        assert unit.charge_fall == pytest.approx(1 + slope_p * shape_n)

    @given(carry=st.floats(0, 0.9), power=st.floats(0.45, 1))
    def test_transitions_repeat(self, carry: float, power: float) -> None:
        process = plain_process(slope=0.2, slope_power=power, shape=1.5, shape_carry=carry)
        unit = yardstick(process)
        elmore = 1e3 * 15e-15
        expected = math.hypot(1.5 * elmore, carry * unit.transition_rise)
        assert unit.transition_fall == pytest.approx(expected)
