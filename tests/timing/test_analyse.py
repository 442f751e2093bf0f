"""Laws every analysis keeps, and which paths count."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.brief import Brief, IgnoreBrief, InputBrief, OutputBrief
from evenstage.errors import NoPathError
from evenstage.pattern import Pattern
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, nand, plain_process
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    import random

    from evenstage.timing.results import Analysis

PROCESS = plain_process(slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2, stack=0.7)
CHAIN = "\n".join(inverter(f"i{k}", f"x{k}", f"x{k + 1}", 2.0**k, 2 * 2.0**k) for k in range(4))


def analysis(
    text: str,
    brief: Brief | None = None,
    *,
    start: str | None = None,
    end: str | None = None,
    count: int = 1,
) -> Analysis:
    circuit = circuit_of(text, PROCESS, brief)
    return analyse(circuit, brief, start=start, end=end, count=count)


def pats(*names: str) -> tuple[Pattern, ...]:
    return tuple(Pattern(name) for name in names)


class TestLaws:
    @given(random_blocks(), st.sampled_from([0.25, 3.0, 17.0]))
    @settings(max_examples=40, deadline=None)
    def test_scaling_widths_and_loads_leaves_delays(self, drawn: RandomBlock, k: float) -> None:
        one, many = analysis(drawn.text()), analysis(drawn.text(k))
        assert many.paths[0].delay == pytest.approx(one.paths[0].delay, rel=1e-9)
        assert many.total_width == pytest.approx(k * one.total_width, rel=1e-9)

    @given(random_blocks(), st.randoms(use_true_random=False))
    @settings(max_examples=40, deadline=None)
    def test_order_of_cards_changes_nothing(self, drawn: RandomBlock, dice: random.Random) -> None:
        cards = drawn.cards()
        dice.shuffle(cards)
        ports = " ".join([*drawn.inputs, *drawn.outputs, "vdd", "vss"])
        one, other = analysis(drawn.text()), analysis(block("\n".join(cards), ports))
        assert other.paths[0].delay == pytest.approx(one.paths[0].delay, rel=1e-12)
        assert {e.net: e.edge for e in other.ends}.keys() == {
            e.net: e.edge for e in one.ends
        }.keys()

    @given(random_blocks())
    @settings(max_examples=40, deadline=None)
    def test_renaming_nets_changes_nothing(self, drawn: RandomBlock) -> None:
        renamed = RandomBlock(
            tuple((k, tuple("q" + i for i in ins), "q" + o, w) for k, ins, o, w in drawn.gates),
            tuple(("q" + net, cap) for net, cap in drawn.wires),
            tuple("q" + net for net in drawn.inputs),
            tuple("q" + net for net in drawn.outputs),
        )
        one, other = analysis(drawn.text()), analysis(renamed.text())
        assert other.paths[0].delay == one.paths[0].delay
        assert other.paths[0].end == "q" + one.paths[0].end

    @given(random_blocks(), st.integers(0, 13))
    @settings(max_examples=40, deadline=None)
    def test_more_load_never_speeds_up(self, drawn: RandomBlock, which: int) -> None:
        net = drawn.gates[which % len(drawn.gates)][2]
        loaded = RandomBlock(drawn.gates, (*drawn.wires, (net, 11.0)), drawn.inputs, drawn.outputs)
        before = {end.net: end.delay for end in analysis(drawn.text()).ends}
        for end in analysis(loaded.text()).ends:
            assert end.delay >= before[end.net] * (1 - 1e-12)

    @given(random_blocks())
    @settings(max_examples=40, deadline=None)
    def test_stages_add_up_and_efforts_multiply(self, drawn: RandomBlock) -> None:
        found = analysis(drawn.text(), count=5)
        tau = found.yardstick.tau
        for path in found.paths:
            assert sum(s.delay for s in path.stages) == pytest.approx(path.delay, rel=1e-12)
            product = math.prod(s.stage_effort for s in path.stages)
            gbh = path.logical_effort * path.branching_effort * path.electrical_effort
            assert path.path_effort == pytest.approx(product, rel=1e-9)
            assert path.path_effort == pytest.approx(gbh, rel=1e-9)
            for stage in path.stages:
                effort = stage.stage_effort + stage.parasitic_delay
                assert stage.charged_delay == pytest.approx(tau * effort, rel=1e-9)
                branches = sum(branch.cap for branch in stage.side_branches)
                assert stage.load_cap == pytest.approx(stage.on_path_cap + branches, rel=1e-9)
            n = len(path.stages)
            least = tau * (n * path.path_effort ** (1 / n) + path.parasitic_delay)
            assert path.charged_delay >= least * (1 - 1e-9)


class TestWhichPathsCount:
    TEXT = block(
        "\n".join(
            [
                inverter("a", "in1", "p", 1, 2),
                nand("b", ["p", "in2"], "q", 2, 2),
                inverter("c", "q", "out1", 2, 4),
                inverter("d", "p", "out2", 1, 2),
            ]
        ),
        "in1 in2 out1 out2 vdd vss",
    )

    def test_from_and_to(self) -> None:
        assert {e.net for e in analysis(self.TEXT, start="in1").ends} == {"out1", "out2"}
        assert {e.net for e in analysis(self.TEXT, start="in2").ends} == {"out1"}
        found = analysis(self.TEXT, start="in2", end="q").paths[0]
        assert (found.start, found.end, len(found.stages)) == ("in2", "q", 1)

    def test_a_path_may_start_inside(self) -> None:
        assert len(analysis(self.TEXT, start="q").paths[0].stages) == 1

    def test_no_such_path(self) -> None:
        with pytest.raises(NoPathError, match="no path from 'in2' to 'out2'"):
            analysis(self.TEXT, start="in2", end="out2")

    def test_unknown_net(self) -> None:
        with pytest.raises(NoPathError, match=r"no net 'zz' in [^;]*$"):
            analysis(self.TEXT, end="zz")

    def test_misspelt_net_is_told_the_nearest(self) -> None:
        with pytest.raises(NoPathError, match=r"no net 'oot1' .*; did you mean 'out1'"):
            analysis(self.TEXT, end="oot1")

    def test_ignored_from_to_leaves_the_rest(self) -> None:
        brief = Brief(ignores=(IgnoreBrief(start=pats("in1"), end=pats("out1")),))
        found = analysis(self.TEXT, brief, count=20)
        pairs = {(path.start, path.end) for path in found.paths}
        assert pairs == {("in2", "out1"), ("in1", "out2")}

    def test_ignored_through(self) -> None:
        brief = Brief(ignores=(IgnoreBrief(through=pats("p"), end=pats("out1")),))
        pairs = {(path.start, path.end) for path in analysis(self.TEXT, brief, count=20).paths}
        assert pairs == {("in2", "out1"), ("in1", "out2")}

    def test_arrival_drive_and_required(self) -> None:
        brief = Brief(
            inputs=(InputBrief(nets=pats("in2"), arrival=1e-9, drive=1e3),),
            outputs=(OutputBrief(nets=pats("out1"), load=30e-15, required=2e-9),),
        )
        found = analysis(self.TEXT, brief)
        path = found.paths[0]
        cap = dict(found.input_caps)["in2"]
        assert path.start == "in2"
        assert path.start_arrival == pytest.approx(1e-9 + 1e3 * cap)
        assert path.required == 2e-9
        assert path.stages[-1].on_path_cap == pytest.approx(30e-15)

    def test_unloaded_output_gets_four_unit_inverters_and_a_notice(self) -> None:
        found = analysis(self.TEXT)
        assert "default-load" in {notice.code for notice in found.notices}
        assert found.paths[0].stages[-1].load_cap == pytest.approx(12e-15)


def test_a_path_of_very_many_stages_stays_finite() -> None:
    """2^1500 is beyond the range of floats, but nothing else about such a chain is."""
    cards = []
    for k in range(1500):
        cards.append(inverter(f"i{k}", f"x{k}", f"x{k + 1}", 1, 2))
        cards.append(f"cw{k} x{k + 1} vss 3f")
    path = analysis(block("\n".join(cards), "x0 x1500 vdd vss")).paths[0]
    assert math.isfinite(path.path_effort)
    assert path.least_delay == pytest.approx(path.charged_delay, rel=1e-2)
    assert path.best_stage_count == 1500


class TestLoops:
    def test_a_ring_that_can_be_stopped_is_cut_with_a_notice(self) -> None:
        ring = nand("g", ["en", "x2"], "x0", 2, 2)
        for k in range(2):
            ring += "\n" + inverter(f"i{k}", f"x{k}", f"x{k + 1}", 1, 2)
        found = analysis(block(ring, "en x2 vdd vss"))
        notice = next(notice for notice in found.notices if notice.code == "loop-cut")
        assert notice.names == ("x2 -> x0",)

    def test_a_ring_has_no_way_in(self) -> None:
        ring = "\n".join(inverter(f"i{k}", f"x{k}", f"x{(k + 1) % 3}", 1, 2) for k in range(3))
        with pytest.raises(NoPathError, match="loops without a way in"):
            analysis(block(ring, "x0 vdd vss"))

    def test_a_ring_beside_a_path_is_named(self) -> None:
        ring = "\n".join(inverter(f"r{k}", f"r{k}", f"r{(k + 1) % 3}", 1, 2) for k in range(3))
        found = analysis(block(CHAIN + "\n" + ring, "x0 x4 vdd vss"))
        notice = next(notice for notice in found.notices if notice.code == "not-on-a-path")
        assert len(notice.names) == 3


class TestUndrivenNets:
    """A net inside the block that nothing drives starts paths, and that is told."""

    TWO = f"{nand('g', ['a', 'q'], 'y', 1, 1)}\n"

    def told(self, text: str, brief: Brief | None = None) -> list[tuple[str, ...]]:
        return [n.names for n in analysis(text, brief).notices if n.code == "undriven-net"]

    def test_are_told(self) -> None:
        assert self.told(block(self.TWO, "a y vdd vss")) == [("q",)]

    def test_ports_are_none(self) -> None:
        assert self.told(block(self.TWO, "a q y vdd vss")) == []

    def test_the_brief_can_say_that_they_are_meant(self) -> None:
        brief = Brief(inputs=(InputBrief(nets=pats("q")),))
        assert self.told(block(self.TWO, "a y vdd vss"), brief) == []

    def test_at_the_top_level_only_those_of_instances(self) -> None:
        text = f".global vdd vss\n.subckt two a y\n{self.TWO}.ends\nx1 a y two\n"
        assert self.told(text) == [("x1.q",)]
        assert self.told(f".global vdd vss\n{self.TWO}") == []
