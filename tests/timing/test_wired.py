"""Wires in the analysis, against exact responses of what a linear driver makes of them."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.brief import Brief, InputBrief, OutputBrief
from evenstage.pattern import Pattern
from evenstage.timing.analyse import analyse, time
from evenstage.timing.sweep import Timing, sweep
from support.blocks import circuit_of, inverter, plain_process
from support.wires import Driven, Net, random_tree, wire_cards, wired_block

if TYPE_CHECKING:
    from evenstage.timing.results import Analysis

LN2 = math.log(2)
#: No slopes: the delay of a gate is that of its resistance under a step.
LINEAR = plain_process()
CURVED = plain_process(
    slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2, r_fixed=40.0, c_drain_fixed=0.2e-15
)
STEP = InputBrief(nets=(Pattern("*"),), transition=1e-18)


def brief(load: float = 0.0) -> Brief:
    return Brief(inputs=(STEP,), outputs=(OutputBrief(nets=(Pattern("*"),), load=load),))


def text(cards: list[str], ports: str) -> str:
    return f"* t\n.global vdd vss\n.subckt top {ports}\n" + "\n".join(cards) + "\n.ends\n"


def timing_of(cards: list[str], ports: str, told: Brief | None = None) -> Timing:
    told = told or brief()
    return time(circuit_of(text(cards, ports), LINEAR, told), told)


def analysis_of(source: str, told: Brief | None = None) -> Analysis:
    told = told or brief()
    return analyse(circuit_of(source, LINEAR, told), told, count=50)


def end_delays(analysis: Analysis) -> dict[str, float]:
    return {end.net: end.delay for end in analysis.ends}


class TestAgainstExactResponses:
    @pytest.mark.parametrize("seed", range(25))
    def test_an_inverter_and_a_tree(self, seed: int) -> None:
        """Arrivals at receiving gates and at the port, each within 6 % of the latest."""
        rng = np.random.default_rng(seed)
        tree = random_tree(rng, 14)
        width = float(10 ** rng.uniform(-0.5, 1.2))
        net = Net(tree.ends, 300 * tree.resistance, 6e-15 * tree.capacitance)
        far = len(net.capacitance) - 1
        cards = [inverter("d", "a", "n", width, 2 * width)]
        cards += [*wire_cards("n", net), f"rp n:{far} y 1e-3", inverter("s", f"n:{far}", "z", 1, 2)]
        found = timing_of(cards, "a y z", brief(load=2e-15))
        # The port y gives the net its name; 1 mohm from its node the receiving gate hangs.
        loaded = net.capacitance.copy()
        loaded[0] += 3e-15 * width
        loaded[far] += 3e-15 + 2e-15
        resistance = 1e-3 / (width * 1e-6) / LN2
        driven = Driven(Net(net.ends, net.resistance, loaded), resistance)
        exact, late = driven.delay(far), max(map(driven.delay, range(far + 1)))
        names = found.circuit.devices.net_names
        at_end = dict(
            zip(
                [names[n] for n in found.graph.net[found.graph.end]], found.end_arrival, strict=True
            )
        )
        assert_allclose(at_end["y"], exact, rtol=0, atol=0.06 * late)
        follower = found.circuit.net_id("z")
        behind = np.flatnonzero(found.circuit.arcs.output[found.graph.arc] == follower)
        reached = found.arrival[found.graph.source[behind]] + found.wire[behind]
        assert_allclose(reached, exact, rtol=0, atol=0.06 * late)

    def test_sinks_arrive_one_after_the_other(self) -> None:
        cards = [inverter("d", "a", "n", 4, 8)]
        for k in range(5):
            near, here = (f"n:{k}" if k else "n"), f"n:{k + 1}"
            cards += [f"r{k} {near} {here} 300", f"c{k} {here} vss 5f"]
            cards.append(inverter(f"s{k}", here, f"y{k}", 1, 2))
        delays = end_delays(analysis_of(text(cards, "a y0 y1 y2 y3 y4"), brief(load=1e-15)))
        in_order = [delays[f"y{k}"] for k in range(5)]
        assert in_order == sorted(in_order)
        assert in_order[-1] > 1.3 * in_order[0]

    def test_transitions_get_slower_along_the_wire(self) -> None:
        process = plain_process(shape=1.8, slope=0.2)
        cards = [inverter("d", "a", "n", 4, 8), "r1 n n:1 900", "c1 n:1 vss 9f"]
        cards += [inverter("s", "n:1", "y", 1, 2), inverter("t", "n", "z", 1, 2)]
        told = brief(load=1e-15)
        found = time(circuit_of(text(cards, "a y z"), process, told), told)
        output = found.circuit.arcs.output[found.graph.arc]
        y, z = (found.sink_transition[output == found.circuit.net_id(name)] for name in ("y", "z"))
        assert (y > 1.2 * z).all()


class TestLimits:
    def test_next_to_no_resistance_is_none(self) -> None:
        """The same block with milliohms and with nets that are one."""
        for seed in range(6):
            source = wired_block(seed)
            lines = source.split("\n")
            thin = [
                " ".join([*line.split()[:3], "1e-6"]) if line.startswith("r") else line
                for line in lines
            ]
            none = [
                " ".join([*line.split()[:3], "0"]) if line.startswith("r") else line
                for line in lines
            ]
            one, other = (analysis_of("\n".join(part), brief(load=1e-15)) for part in (thin, none))
            assert other.timing is not None
            assert other.timing.wired is None
            assert_allclose(
                list(end_delays(one).values()), list(end_delays(other).values()), rtol=1e-5, atol=0
            )

    def test_scaling_resistance_and_drive_together_scales_time(self) -> None:
        source = wired_block(3)
        half = "\n".join(
            " ".join([*line.split()[:3], f"{float(line.split()[3]) / 2:.17g}"])
            if line.startswith("r")
            else line
            for line in source.split("\n")
        )
        told = brief(load=1e-15)
        fast = plain_process(r_w=0.5e-3)
        one = time(circuit_of(source, LINEAR, told), told).worst
        other = time(circuit_of(half, fast, told), told).worst
        assert_allclose(one, 2 * other, rtol=1e-9, atol=0)

    def test_wires_of_supplies_count_for_nothing(self) -> None:
        """The rails in pieces: the same gate, the same delay."""
        plain = [inverter("d", "a", "y", 1, 2), "c1 y vss 3f"]
        split = [
            "mn y a vss:1 vss nx w=1u l=0.1u\nmp y a vdd:1 vdd px w=2u l=0.1u",
            "r1 vss vss:1 40\nr2 vdd vdd:1 40\nc1 y vss:1 3f",
        ]
        assert end_delays(analysis_of(text(plain, "a y"))) == end_delays(
            analysis_of(text(split, "a y"))
        )

    def test_each_edge_starts_where_its_transistors_hang(self) -> None:
        """The p transistor at the far end: a rise comes sooner to the far gate than a fall."""
        cards = ["mn n a vss vss nx w=4u l=0.1u", "mp n:1 a vdd vdd px w=8u l=0.1u"]
        cards += ["r1 n n:1 800", "c1 n vss 9f", "c2 n:1 vss 9f", inverter("s", "n:1", "y", 1, 2)]
        found = timing_of(cards, "a y", brief(load=1e-15))
        behind = np.flatnonzero(
            found.circuit.arcs.output[found.graph.arc] == found.circuit.net_id("y")
        )
        rises = found.circuit.arcs.input_rising[found.graph.arc[behind]]
        assert found.wire[behind[rises]].max() == 0.0
        assert found.wire[behind[~rises]].min() > 1e-12

    def test_the_wire_from_an_input_counts(self) -> None:
        near = [inverter("d", "a", "y", 1, 2), "c1 y vss 3f"]
        far = [inverter("d", "a:1", "y", 1, 2), "c1 y vss 3f", "r1 a a:1 1k", "c2 a:1 vss 4f"]
        one, other = (end_delays(analysis_of(text(c, "a y")))["y"] for c in (near, far))
        # An ideal source, one resistor, one capacitor.
        assert_allclose(other - one, LN2 * 1e3 * 7e-15, rtol=1e-3, atol=0)


class TestStages:
    def source(self) -> str:
        cards = [inverter("d", "a", "n", 3, 6), "r1 n n:1 700", "c1 n:1 vss 20f"]
        cards += [inverter("s", "n:1", "m", 2, 4), "r2 m y 500", "c2 y vss 15f"]
        return text(cards, "a y")

    def test_delays_and_efforts_add_up(self) -> None:
        found = analyse(circuit_of(self.source(), CURVED, Brief()), count=2)
        for path in found.paths:
            assert path.delay == pytest.approx(
                path.start_arrival + sum(stage.delay for stage in path.stages), rel=1e-12
            )
            for stage in path.stages:
                charged = found.yardstick.tau * (stage.stage_effort + stage.parasitic_delay)
                assert stage.charged_delay == pytest.approx(charged, rel=1e-12)
                assert 0 < stage.wire_delay < stage.delay
                assert stage.effective_cap is not None
                assert 0 < stage.effective_cap < stage.load_cap
        assert found.paths[0].delay == found.ends[0].delay

    def test_wire_capacitance(self) -> None:
        stages = analyse(circuit_of(self.source(), CURVED, Brief())).paths[0].stages
        assert [stage.wire_cap for stage in stages] == pytest.approx([20e-15, 15e-15])

    @pytest.mark.parametrize("factor", [0.0, 1.0, 2.0])
    def test_coupling(self, factor: float) -> None:
        """Only capacitors between two signals count more or less."""
        cards = [inverter("d", "a", "y", 1, 2), inverter("e", "b", "z", 1, 2)]
        cards += ["c1 y z 5f", "c2 y vss 3f", "c3 vdd y 1f"]
        circuit = circuit_of(text(cards, "a b y z"), LINEAR, replace(brief(), coupling=factor))
        net = circuit.net_id("y")
        assert circuit.wire_cap[net] == pytest.approx((4 + 5 * factor) * 1e-15)


class TestResized:
    @pytest.mark.parametrize("seed", range(8))
    def test_it_is_the_block_drawn_anew(self, seed: int) -> None:
        """Wires found once serve all widths."""
        source = wired_block(seed)
        timing = time(circuit_of(source, CURVED, Brief()))
        factor = np.full(len(timing.circuit.devices), 2.5)
        resized = sweep(timing.circuit.resized(factor), timing.graph, timing.unit)
        lines = [
            " ".join(
                f"w={2.5 * float(word[2:-1]):.9g}u" if word.startswith("w=") else word
                for word in line.split(" ")
            )
            for line in source.split("\n")
        ]
        drawn = circuit_of("\n".join(lines), CURVED, Brief())
        anew = sweep(replace(drawn, process=timing.circuit.process), timing.graph, timing.unit)
        assert_allclose(resized.end_arrival, anew.end_arrival, rtol=1e-7, atol=0)
        assert_allclose(resized.end_charged_arrival, anew.end_charged_arrival, rtol=1e-7, atol=0)
