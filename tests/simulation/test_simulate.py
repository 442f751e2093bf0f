"""Whole paths, from a netlist to estimated and simulated delays."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.brief import Brief, InputBrief
from evenstage.errors import SimulationError
from evenstage.pattern import Pattern
from evenstage.process.infer import infer_process
from evenstage.process.process import Channel
from evenstage.simulation.simulate import simulate
from evenstage.simulation.strength import fo4, strength
from evenstage.timing.analyse import analyse
from evenstage.timing.yardstick import yardstick
from support.blocks import block, circuit_of, devices_of, inverter, nand, plain_process

if TYPE_CHECKING:
    from evenstage.process.process import Process
    from evenstage.simulation.results import SimulatedPath, Simulation

#: Equal inverters, each loaded by three more of itself.
CHAIN = block(
    "\n".join(
        inverter(f"{name}{i}", f"s{i}", f"s{i + 1}" if name == "a" else f"t{name}{i}", 1.0, 2.0)
        for i in range(6)
        for name in "abcd"
    ),
    "s0",
)


def process(**channel: float) -> Process:
    """Return a process with slopes, and channels as told."""
    plain = plain_process(p_inv=0.7, slope=0.2, shape=1.8)
    kinds = tuple(replace(kind, channel=Channel(**channel)) for kind in plain.transistors)
    return replace(plain, transistors=kinds)


def simulated(text: str, some: Process, brief: Brief | None = None, **ends: str) -> Simulation:
    return simulate(analyse(circuit_of(text, some, brief), brief, end=ends.get("end")))


def delays(path: SimulatedPath) -> list[float]:
    return [stage.delay for stage in path.stages]


class TestStrength:
    def test_fo4_is_that_of_the_estimate(self) -> None:
        some = process()
        unit = yardstick(some)
        found = strength(some, unit)
        assert_allclose(fo4(some, unit, found), unit.fo4, rtol=2e-3, atol=0)
        assert abs(fo4(some, unit, 1.1 * found) / unit.fo4 - 1) > 0.05

    def test_known_currents_stay(self) -> None:
        some = process(current=100.0, threshold=0.25, alpha=1.3)
        # Resistances are 1e-3 and 2e-3 ohm m.
        assert_allclose(strength(some, yardstick(some)), 0.15, rtol=1e-12, atol=0)

    def test_one_known_current_is_kept_and_the_other_found(self) -> None:
        plain = process(threshold=0.25, alpha=1.3)
        unit = yardstick(plain)
        n = replace(plain.transistors[0], channel=Channel(current=700.0, threshold=0.25, alpha=1.3))
        some = replace(plain, transistors=(n, plain.transistors[1]))
        assert_allclose(fo4(some, unit, strength(some, unit)), unit.fo4, rtol=5e-3, atol=0)


class TestChain:
    def test_stages_in_the_middle_take_one_fo4(self) -> None:
        found = simulated(CHAIN, process(), end="s5")
        path, unit = found.before.paths[0], found.before.analysis.yardstick
        middle = delays(path)[2:4]
        assert_allclose(sum(middle) / 2, unit.fo4, rtol=0.02, atol=0)

    def test_stages_sum_to_the_path(self) -> None:
        path = simulated(CHAIN, process()).before.paths[0]
        assert_allclose(sum(delays(path)), path.delay, rtol=1e-9, atol=0)
        assert path.traces.voltage.shape == (len(path.traces.nets), len(path.traces.time))

    def test_twice_the_current_is_half_the_time(self) -> None:
        slow, fast = (
            simulated(CHAIN, process(current=current, threshold=0.25, alpha=1.5), end="s5")
            for current in (300.0, 600.0)
        )
        # The input's ramp stays, so the first stages do not follow.
        late = [delays(some.before.paths[0])[3:] for some in (slow, fast)]
        assert_allclose(sum(late[0]) / sum(late[1]), 2.0, rtol=0.02, atol=0)

    def test_side_gates_and_side_capacitances_load_alike(self) -> None:
        analysis = analyse(circuit_of(CHAIN, process()), end="s5")
        gates, caps = (simulate(analysis, side_branches=how) for how in ("gates", "capacitances"))
        assert gates.before.paths[0].side_gates > 0
        assert caps.before.paths[0].side_gates == 0
        # A capacitance stays where it is; the output of a gate moves against the path.
        ratio = caps.before.paths[0].delay / gates.before.paths[0].delay
        assert 0.95 < ratio < 0.99

    def test_a_process_without_transitions_gets_a_step(self) -> None:
        path = simulated(CHAIN, plain_process()).before.paths[0]
        assert path.delay > 0
        assert len(path.stages) == 6

    def test_both_edges_are_simulated(self) -> None:
        found = simulated(CHAIN, process()).before
        assert found.other_edge is not None
        first, other = found.paths[0].estimate, found.other_edge.estimate
        assert first.start == other.start
        assert first.start_edge != other.start_edge
        assert [s.output for s in first.stages] == [s.output for s in other.stages]

    def test_an_outside_driver_is_a_resistor(self) -> None:
        briefs = [
            Brief(inputs=(InputBrief(nets=(Pattern("s0"),), drive=drive),)) for drive in (0.0, 2e3)
        ]
        none, some = (simulated(CHAIN, process(), brief).before.paths[0] for brief in briefs)
        assert some.nodes > none.nodes
        assert some.traces.voltage[0].max() > 0.9


class TestLevel1:
    def test_cards_decide_alone(self) -> None:
        # KP W/L is 2 mA/V^2 for the n channel; a step into it discharges 100 fF as D1 has it.
        text = (
            "* cards\n.global vdd vss\n"
            ".model nx nmos level=1 vto=0.2 kp=100u tox=1e-7\n"
            ".model px pmos level=1 vto=-0.2 kp=100u tox=1e-7\n"
            ".subckt top a y\n"
            "mn y a vss vss nx w=20u l=1u\nmp y a vdd vdd px w=20u l=1u\ncl y vss 100p\n.ends\n"
        )
        facts = [
            (card.name, card.kind, card.values)
            for card in devices_of(text, plain_process()).netlist.models.values()
        ]
        some = replace(infer_process(facts, 1.0, 1e-6), unit_width=20e-6, unit_ratio=1.0)
        brief = Brief(inputs=(InputBrief(nets=(Pattern("a"),), transition=1e-12),))
        path = simulated(text, some, brief).before.paths[0]
        assert_allclose(path.delay, 1.61057 * 100e-12 / 2e-3, rtol=2e-3, atol=0)
        assert not simulated(text, some, brief).scaled


class TestWires:
    def test_a_line_takes_its_share_of_r_c(self) -> None:
        # A distributed line behind an ideal source: 0.379 R C to 50 % (series solution).
        sections, resistance, cap = 25, 20e3, 200e-15
        nodes = ["p", *(f"p{i}" for i in range(1, sections)), "q"]
        cards = [inverter("big", "a", "p", 2000.0, 4000.0), inverter("end", "q", "y", 0.1, 0.2)]
        for i, (here, there) in enumerate(pairwise(nodes)):
            cards.append(f"r{i} {here} {there} {resistance / sections:.9g}")
            cards += [
                f"c{i}{side} {node} vss {cap / sections / 2:.9g}"
                for side, node in (("a", here), ("b", there))
            ]
        brief = Brief(inputs=(InputBrief(nets=(Pattern("a"),), transition=1e-13),))
        path = simulated(block("\n".join(cards), "a y"), process(), brief).before.paths[0]
        assert path.nodes > sections
        assert_allclose(path.stages[0].delay, 0.379 * resistance * cap, rtol=0.03, atol=0)
        # The estimate knows such lines: delay, and how slow the edge gets on them.
        wire = path.stages[0]
        assert_allclose(wire.estimate.delay, wire.delay, rtol=0.06, atol=0)
        assert_allclose(wire.estimate.transition, wire.transition or 0.0, rtol=0.06, atol=0)

    def test_an_input_is_driven_where_its_name_stands(self) -> None:
        cards = [inverter("i", "far", "y", 1.0, 2.0), "r1 a far 50k", "c1 y vss 1f"]
        brief = Brief(inputs=(InputBrief(nets=(Pattern("a"),), transition=1e-13),))
        slow = simulated(block("\n".join(cards), "a y"), process(), brief).before.paths[0]
        cards[1] = "r1 a far 1"
        fast = simulated(block("\n".join(cards), "a y"), process(), brief).before.paths[0]
        # The gate's 3 fF behind 50 kohm are 150 ps; it switches near half of that.
        assert 70e-12 < slow.delay - fast.delay < 150e-12


class TestInnerNodes:
    def test_the_input_next_to_the_output_is_the_fastest(self) -> None:
        text = block(nand("g", ["a", "b", "c"], "y", 3.0, 2.0) + "\ncl y vss 5f", "a b c y")
        some = process()
        found = []
        for start in ("a", "c"):
            analysis = analyse(circuit_of(text, some), start=start)
            block_ = simulate(analysis).before
            paths = [path for path in (block_.paths[0], block_.other_edge) if path]
            found.append(next(p.delay for p in paths if p.estimate.edge == "fall"))
        assert found[0] < found[1]


class TestNotices:
    def test_say_what_was_assumed(self) -> None:
        codes = [notice.code for notice in simulated(CHAIN, process()).notices]
        assert codes == ["channel-assumed", "current-scaled"]

    def test_are_none_where_all_is_known(self) -> None:
        some = process(
            current=400.0, threshold=0.25, alpha=1.3, overlap_source=1e-10, overlap_drain=1e-10
        )
        found = simulated(CHAIN, some)
        assert found.notices == ()
        assert not found.scaled


class TestPassing:
    def test_no_path_that_switches_is_an_error(self) -> None:
        text = block(
            "\n".join([inverter("i", "a", "p", 1, 2), nand("g", ["p", "a"], "q", 2, 2)]), "a"
        )
        with pytest.raises(SimulationError) as caught:
            simulated(text, process())
        assert caught.value.code == "false-path"

    def test_times_are_finite_and_ordered(self) -> None:
        traces = simulated(CHAIN, process()).before.paths[0].traces
        assert (np.diff(traces.time) > 0).all()
        assert np.isfinite(traces.voltage).all()
