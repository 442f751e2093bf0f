"""The convex programme of a block against the block itself, resized and timed again."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.brief import Brief, InputBrief, OutputBrief
from evenstage.pattern import Pattern
from evenstage.sizing.limiting import worst_charged
from evenstage.sizing.model import Limits, Model
from evenstage.sizing.problem import FloatArray, Problem, worst_delay
from evenstage.timing.sweep import Timing, sweep
from support.blocks import inverter, plain_process
from support.models import model_of
from support.pass_networks import bus, rotator, tree
from support.random_blocks import RandomBlock, random_blocks

PROCESS = plain_process(
    r_fixed=60.0, c_gate_fixed=0.2e-15, c_drain_fixed=0.1e-15, stack=0.7,
    slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2,
)  # fmt: skip
BRIEF = Brief(
    inputs=(InputBrief(nets=(Pattern("i*"),), arrival=2e-11, drive=900.0),),
    outputs=(OutputBrief(nets=(Pattern("n*"),), required=2e-10),),
)
NO_LIMITS = Limits(ceiling_net=np.zeros(0, np.int32), ceiling=np.zeros(0), transition=np.inf)


def problem_of(model: Model, limits: Limits = NO_LIMITS) -> Problem:
    count = len(model.variables)
    return model.problem(np.full(count, 0.1), np.full(count, 10.0), np.ones(count), limits)


def timed(model: Model, sizes: FloatArray) -> Timing:
    """Time the block with its widths really multiplied, recognition's tables built anew."""
    circuit = model.circuit.resized(model.variables.factors(sizes))
    return sweep(circuit, model.graph, model.unit)


def drawn_sizes(model: Model, data: st.DataObject) -> FloatArray:
    count = len(model.variables)
    return np.array([data.draw(st.floats(0.2, 5)) for _ in range(count)])


class TestDelays:
    @given(random_blocks(), st.sampled_from([None, BRIEF]))
    @settings(max_examples=40, deadline=None)
    def test_as_drawn(self, block: RandomBlock, brief: Brief | None) -> None:
        model = model_of(block.text(), PROCESS, brief)
        today = np.ones(len(model.variables))
        delay = worst_delay(problem_of(model), today)
        assert delay == pytest.approx(worst_charged(timed(model, today)), rel=1e-12)

    @given(random_blocks(), st.sampled_from([None, BRIEF]), st.data())
    @settings(max_examples=80, deadline=None)
    def test_at_any_sizes(
        self, block: RandomBlock, brief: Brief | None, data: st.DataObject
    ) -> None:
        model = model_of(block.text(), PROCESS, brief)
        sizes = drawn_sizes(model, data)
        delay = worst_delay(problem_of(model), sizes)
        assert delay == pytest.approx(worst_charged(timed(model, sizes)), rel=1e-9)

    @given(random_blocks(), st.data())
    @settings(max_examples=40, deadline=None)
    def test_every_arc(self, block: RandomBlock, data: st.DataObject) -> None:
        model = model_of(block.text(), PROCESS)
        sizes = drawn_sizes(model, data)
        delays = problem_of(model).arc_delays(sizes)
        assert delays == pytest.approx(timed(model, sizes).charged, rel=1e-9)

    @pytest.mark.parametrize(
        "text",
        [tree(2), tree(2, driven=False), rotator(1), bus(3)],
        ids=["tree", "bare", "rotator", "bus"],
    )
    @given(data=st.data())
    @settings(max_examples=10, deadline=None)
    def test_every_arc_through_passes(self, text: str, data: st.DataObject) -> None:
        """Resistances and capacitances of one arc belong to several sizes."""
        brief = Brief(inputs=(InputBrief(nets=(Pattern("d*"),), arrival=2e-11, drive=900.0),))
        model = model_of(text, PROCESS, brief)
        sizes = drawn_sizes(model, data)
        delays = problem_of(model).arc_delays(sizes)
        after = timed(model, sizes)
        assert delays[len(delays) - len(after.charged) :] == pytest.approx(after.charged, rel=1e-9)

    def test_a_card_that_repeats_along_the_path(self) -> None:
        """A row of four calls of one pair: the same size drives and loads."""
        cell = ".subckt pair a y\n" + inverter("i", "a", "m", 1, 2)
        cell += "\n" + inverter("j", "m", "y", 3, 6) + "\n.ends\n"
        calls = "\n".join(f"x{k} n{k} n{k + 1} pair" for k in range(4))
        text = f"* t\n.global vdd vss\n{cell}.subckt top n0 n4\n{calls}\ncl n4 vss 50f\n.ends\n"
        model = model_of(text, PROCESS)
        assert len(model.variables) == 2
        for sizes in (np.array([0.5, 2.0]), np.array([3.0, 0.7])):
            delay = worst_delay(problem_of(model), sizes)
            assert delay == pytest.approx(worst_charged(timed(model, sizes)), rel=1e-9)


class TestLimits:
    @given(random_blocks(), st.data())
    @settings(max_examples=40, deadline=None)
    def test_ceilings_are_shares_of_the_capacitance_allowed(
        self, block: RandomBlock, data: st.DataObject
    ) -> None:
        model = model_of(block.text(), PROCESS)
        nets = np.unique(model.graph.net[model.graph.start]).astype(np.int32)
        ceiling = np.linspace(1, 2, len(nets)) * 10e-15
        limits = Limits(ceiling_net=nets, ceiling=ceiling, transition=np.inf)
        sizes = drawn_sizes(model, data)
        expected = timed(model, sizes).circuit.net_cap[nets] / ceiling
        problem = problem_of(model, limits)
        assert problem.limit_sums(sizes) == pytest.approx(expected, rel=1e-8)

    @given(random_blocks(), st.data())
    @settings(max_examples=40, deadline=None)
    def test_stages_within_the_transition_limit_keep_every_edge_within_it(
        self, block: RandomBlock, data: st.DataObject
    ) -> None:
        model = model_of(block.text(), PROCESS)
        sizes = drawn_sizes(model, data)
        timing = timed(model, sizes)
        inputs = timing.graph.start_transition.max()
        limit = max(data.draw(st.floats(0.5, 1.5)) * timing.worst_transition, inputs)
        limits = Limits(
            ceiling_net=NO_LIMITS.ceiling_net, ceiling=NO_LIMITS.ceiling, transition=limit,
            strict=True,
        )  # fmt: skip
        kept = problem_of(model, limits).limit_sums(sizes).max() <= 1
        assert timing.worst_transition <= limit * (1 + 1e-8) or not kept

    def test_a_stage_beyond_the_limit_may_stay_unless_it_is_strict(self) -> None:
        text = f"* t\n.global vdd vss\n{inverter('i', 'a', 'y', 1, 2)}\ncl y vss 90f\n"
        model, today = model_of(text, PROCESS), np.ones(1)
        for strict, most in ((True, 2.0), (False, 1.0)):
            limits = Limits(
                ceiling_net=NO_LIMITS.ceiling_net,
                ceiling=NO_LIMITS.ceiling,
                transition=timed(model, today).worst_transition / 2,
                strict=strict,
            )
            used = problem_of(model, limits).limit_sums(today).max()
            assert used == pytest.approx(most, rel=0.05)

    def test_without_a_transition_limit_there_is_no_row(self) -> None:
        model = model_of(f"* t\n.global vdd vss\n{inverter('i', 'a', 'y', 1, 2)}\n", PROCESS)
        assert problem_of(model).limits == 0
        assert model.transition_row(NO_LIMITS).tolist() == [-1, -1]
