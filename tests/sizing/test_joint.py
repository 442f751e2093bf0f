"""Several corners as one programme, against each corner resized and timed, and a general solver."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from evenstage.brief import Brief
from evenstage.errors import NotConvergedError
from evenstage.sizing import cooling, interior_point
from evenstage.sizing.certificate import check
from evenstage.sizing.goals import Cheapest, Fastest
from evenstage.sizing.joint import Joint
from evenstage.sizing.limits import limits_of
from evenstage.sizing.problem import worst_delay
from evenstage.sizing.wishes import Original
from support.blocks import block, inverter, plain_process
from support.convex_reference import reference_objective
from support.models import in_corners, in_picoseconds
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.process.process import Process
    from evenstage.sizing.problem import FloatArray, Problem

BASE = plain_process(slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2, stack=0.7)


def corner(name: str, n: float, p: float, gate: float = 1.0) -> Process:
    """Return a process whose types have other resistances and gate capacitances."""
    one, other = BASE.transistors
    types = (
        replace(one, r_w=n * one.r_w, c_gate=gate * one.c_gate),
        replace(other, r_w=p * other.r_w, c_gate=gate * other.c_gate),
    )
    return replace(BASE, name=name, transistors=types)


CHAIN = block(
    "\n".join(
        [inverter(f"i{k}", f"x{k}", f"x{k + 1}", 1, 2) for k in range(3)] + ["cl x3 vss 60f"]
    ),
    "x0 x3 vdd vss",
)
CORNERS = (corner("even", 1, 1), corner("slow p", 0.8, 1.7, 1.1), corner("slow n", 1.8, 0.9))


def joint_of(text: str) -> Joint:
    return in_corners(text, CORNERS)


def problem_of(joint: Joint, reach: float = 8.0) -> Problem:
    """Return the programme in ps with today's ceilings and transitions as limits."""
    count = len(joint.variables)
    limits = [
        limits_of(timing, Brief(), Original(), joint.variables) for timing in joint.today.corners
    ]
    question = joint.problem(
        np.full(count, 1 / reach), np.full(count, reach), np.ones(count), limits
    )
    return in_picoseconds(question)


def drawn_sizes(joint: Joint, data: st.DataObject) -> FloatArray:
    return np.array([data.draw(st.floats(0.2, 5)) for _ in range(len(joint.variables))])


class TestProblem:
    @given(random_blocks(), st.data())
    @settings(max_examples=15, deadline=None)
    def test_worst_delay_is_that_of_the_worst_corner(
        self, drawn: RandomBlock, data: st.DataObject
    ) -> None:
        joint = joint_of(drawn.text())
        sizes = drawn_sizes(joint, data)
        after = joint.timed(joint.variables.factors(sizes))
        assert worst_delay(problem_of(joint), sizes) == pytest.approx(
            1e12 * after.charged, rel=1e-9
        )

    @given(random_blocks(), st.data())
    @settings(max_examples=15, deadline=None)
    def test_limits_are_those_of_each_corner_in_turn(
        self, drawn: RandomBlock, data: st.DataObject
    ) -> None:
        joint = joint_of(drawn.text())
        sizes = drawn_sizes(joint, data)
        limits = [
            limits_of(timing, Brief(), Original(), joint.variables)
            for timing in joint.today.corners
        ]
        sums = problem_of(joint).limit_sums(sizes)
        every = zip(
            joint.corners(limits), joint.timed(joint.variables.factors(sizes)).corners, strict=True
        )
        for corner, timing in every:
            nets = corner.limits.ceiling_net
            use = timing.circuit.net_cap[nets] / corner.limits.ceiling
            assert sums[corner.rows][: len(nets)] == pytest.approx(use, rel=1e-8)
        assert corner.rows.stop == len(sums)

    def test_flows_are_cut_by_corner(self) -> None:
        joint = joint_of(CHAIN)
        answer = interior_point.solve(problem_of(joint), Fastest())
        shares = joint.shares(answer)
        assert sum(shares) == pytest.approx(1, abs=1e-9)
        for model, flow, share in zip(joint.models, joint.flows(answer), shares, strict=True):
            last = np.isin(model.graph.target, model.graph.end)
            assert flow[last].sum() == pytest.approx(share, abs=1e-9)


class TestOptimum:
    @given(random_blocks(most=10))
    @settings(max_examples=8, deadline=None)
    def test_agrees_with_a_general_solver(self, drawn: RandomBlock) -> None:
        question = problem_of(joint_of(drawn.text()))
        found = interior_point.solve(question, Fastest())
        check(question, Fastest(), found)
        optimum = reference_objective(question, Fastest())
        assert_allclose(found.delay, optimum, rtol=1e-5, atol=0)
        cheap = Cheapest(1.05 * found.delay)
        least = interior_point.solve(question, cheap)
        check(question, cheap, least)
        assert_allclose(least.spend, reference_objective(question, cheap), rtol=1e-5, atol=0)

    @given(random_blocks(most=10))
    @settings(max_examples=10, deadline=None)
    def test_is_no_better_than_any_corner_alone(self, drawn: RandomBlock) -> None:
        """The bound of the joint programme is above the optimum of each of its corners."""
        joint = joint_of(drawn.text())
        bound = interior_point.solve(problem_of(joint), Fastest()).bound
        for model in joint.models:
            alone = interior_point.solve(problem_of(Joint((model,))), Fastest()).delay
            assert bound >= alone * (1 - 1e-8)

    @given(random_blocks(most=10))
    @settings(max_examples=5, deadline=None)
    def test_cooling_brackets_the_interior_point(self, drawn: RandomBlock) -> None:
        question = problem_of(joint_of(drawn.text()))
        exact = interior_point.solve(question, Fastest()).delay
        cooled = cooling.solve(question, Fastest(), start=np.ones(len(question.lower)))
        check(question, Fastest(), cooled)
        assert cooled.bound <= exact * (1 + 1e-9) <= cooled.delay * (1 + 2e-9)


class TestCertificate:
    """What is right in one corner only must not pass for all."""

    JOINT = in_corners(CHAIN, CORNERS)

    def refused(self, **wrong: object) -> str:
        question = problem_of(self.JOINT)
        answer = interior_point.solve(question, Fastest())
        with pytest.raises(NotConvergedError) as caught:
            check(question, Fastest(), replace(answer, **wrong))  # type: ignore[arg-type]
        return caught.value.message

    def test_arrivals_of_a_faster_corner(self) -> None:
        question = problem_of(self.JOINT)
        answer = interior_point.solve(question, Fastest())
        times, nodes = answer.arrivals.copy(), question.nodes // len(CORNERS)
        times[2 * nodes :] = times[:nodes]
        delay = float((times[question.end_node] + question.end_offset).max())
        told = self.refused(arrivals=times, delay=delay, bound=delay, gap=0.0)
        assert told == "not confirmed that no arrival is too early"

    def test_a_flow_that_changes_corners_on_its_way(self) -> None:
        question = problem_of(self.JOINT)
        flow = interior_point.solve(question, Fastest()).flow.copy()
        first = slice(0, len(flow) // len(CORNERS))
        flow[first] = flow[2 * (len(flow) // len(CORNERS)) :]
        assert self.refused(flow=flow) == "not confirmed that the flow is conserved"

    def test_the_bound_of_a_corner_that_does_not_limit_is_too_low_for_the_gap(self) -> None:
        fast = problem_of(Joint(self.JOINT.models[:1]))
        assert self.refused(bound=interior_point.solve(fast, Fastest()).delay * 3) == (
            "not confirmed that the bound holds"
        )

    def test_a_wrong_gap(self) -> None:
        lazy = interior_point.solve(problem_of(self.JOINT), Cheapest(1000.0))
        told = self.refused(
            sizes=lazy.sizes, arrivals=lazy.arrivals, delay=lazy.delay, spend=lazy.spend
        )
        assert told == "not confirmed that the gap is as stated"
