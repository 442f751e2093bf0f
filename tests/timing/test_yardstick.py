"""The unit inverter, best stage effort and best number of stages."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal

from evenstage.timing.yardstick import (
    arc_charges,
    best_stage_count,
    best_stage_effort,
    yardstick,
)
from support.blocks import block, circuit_of, inverter, nand, plain_process


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


class TestArcCharges:
    """A stack is charged what its own edge costs an inverter behind it."""

    PROCESS = plain_process(
        slope=0.4, slope_power=0.7, shape=2.0, shape_carry=0.3, stack=0.9, shape_stack=0.4
    )
    TEXT = block(inverter("i", "a", "x", 1, 2) + "\n" + nand("g", ["a", "b"], "y", 1, 2), "a b x y")

    def test_of_the_unit_inverter_it_is_the_charge_of_the_edge(self) -> None:
        circuit, unit = circuit_of(self.TEXT, self.PROCESS), yardstick(self.PROCESS)
        charge = arc_charges(circuit.arcs, circuit.process, unit)
        single = circuit.arcs.shape == 2.0
        rising = circuit.arcs.rising
        assert single.sum() == 4
        assert_allclose(charge[single & rising], unit.charge_rise, rtol=1e-14, atol=0)
        assert_allclose(charge[single & ~rising], unit.charge_fall, rtol=1e-14, atol=0)

    def test_of_a_stack_it_is_worked_out_as_the_next_stage_pays(self) -> None:
        """With the inverter's Elmore delays before, in and behind the stack."""
        circuit, unit = circuit_of(self.TEXT, self.PROCESS), yardstick(self.PROCESS)
        charge = arc_charges(circuit.arcs, circuit.process, unit)
        stack = circuit.arcs.shape != 2.0
        shape = 2.0 * (1 + 0.4 * 0.9) / (1 + 0.9)
        assert_allclose(circuit.arcs.shape[stack], shape, rtol=1e-14, atol=0)
        elmore = 1e3 * 15e-15
        leaving = math.hypot(shape * elmore, 0.3 * unit.transition_rise)
        paid = elmore + 0.4 * leaving**0.7 * elmore**0.3
        assert_allclose(charge[stack], paid / elmore, rtol=1e-12, atol=0)
        assert (charge[stack] < unit.charge_fall).all()

    def test_without_transitions_every_arc_counts_once(self) -> None:
        process = plain_process()
        circuit = circuit_of(self.TEXT, process)
        assert_array_equal(arc_charges(circuit.arcs, process, yardstick(process)), 1.0)
