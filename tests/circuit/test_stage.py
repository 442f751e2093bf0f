"""Stages of drivers and passes: what they compute, and how long every arc takes.

Functions are held against switches simulated one vector at a time, delays against a plain loop over
the RC tree that conducts then.
"""

from __future__ import annotations

import math
from itertools import pairwise, product
from typing import TYPE_CHECKING

import networkx as nx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.brief import Brief, InputBrief
from evenstage.circuit.stage_tables import WEAK, stage_arcs
from evenstage.pattern import Pattern
from evenstage.timing.analyse import analyse, time
from support.blocks import block, circuit_of, inverter, nand, plain_process, transistor
from support.logic import all_vectors, values
from support.pass_networks import (
    bus,
    crossbar,
    rotator,
    transmission_gate,
    tree,
    tri_state,
)
from support.switch_level import settled

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit

PASS_XOR = block(
    "\n".join([
        inverter("a", "a", "an", 1, 2),
        "m1 b an y vss nx w=1u l=0.1u\nm2 b a y vdd px w=1u l=0.1u",
        "m3 y b a vdd px w=1u l=0.1u\nm4 y b an vss nx w=1u l=0.1u",
        inverter("o", "y", "q", 1, 2),
    ]),
    "a b q vdd vss",
)  # fmt: skip
BUFFER_APART = block(
    "\n".join([
        inverter("e", "en", "eb", 1, 2),
        transistor("n", "n", "eb", "vss", 1, "1"), transistor("n", "n", "i", "vss", 1, "2"),
        transistor("p", "p", "en", "vdd", 2, "3"), transistor("p", "p", "i", "vdd", 2, "4"),
        transmission_gate("t", "p", "n", "en", "eb"),
        transistor("n", "z", "n", "vss", 2, "5"), transistor("p", "z", "p", "vdd", 4, "6"),
    ]),
    "i en z vdd vss",
)  # fmt: skip
BRIDGE_TAPPED = block(
    nand("g", ["a", "b", "c"], "y", 3, 2) + "\n" + inverter("i", "gn2", "q", 1, 2),
    "a b c y q vdd vss",
)


def inputs_of(circuit: Circuit) -> list[int]:
    """Return the block's inputs, by id."""
    free = [net for net in circuit.devices.ports if circuit.driver_of_net[net] < 0]
    return [net for net in free if not circuit.supplies.is_supply[net]]


class TestFunctions:
    @pytest.mark.parametrize(
        "text",
        [tree(1), tree(2), rotator(2), crossbar(2), bus(2), PASS_XOR, BUFFER_APART, BRIDGE_TAPPED],
        ids=["tree1", "tree2", "rotator", "crossbar", "bus", "xor", "buffer", "tapped"],
    )
    def test_every_sink_is_what_its_switches_make_it(self, text: str) -> None:
        """Where no two drivers fight; a node that nothing drives is neither high nor low."""
        circuit = circuit_of(text)
        assert not circuit.not_understood
        names, seen = inputs_of(circuit), set()
        for vector in product([False, True], repeat=len(names)):
            truth = settled(circuit, dict(zip(names, vector, strict=True)))
            for some in circuit.stages:
                for sink, nets in product(some.form.sinks, some.nets):
                    expected = truth[int(nets[sink.node])]
                    high, low = (
                        any(all(truth[int(nets[n])] == v for n, v in cube) for cube in cubes)
                        for cubes in (sink.high, sink.low)
                    )
                    if expected != "fights":
                        assert (high, low) == (expected is True, expected is False)
                    seen.add(expected)
        assert seen >= {True, False}

    @settings(max_examples=25, deadline=None)
    @given(st.data())
    def test_random_trees_of_passes(self, data: st.DataObject) -> None:
        """Trees of transmission gates and single transistors with controls drawn at random."""
        cards, nodes, ports = [], [], ["y"]
        for k in range(data.draw(st.integers(2, 4))):
            ports.append(f"d{k}")
            nodes.append(f"x{k}" if data.draw(st.booleans()) else f"d{k}")
            if nodes[-1] == f"x{k}":
                cards.append(inverter(f"d{k}", f"d{k}", f"x{k}", 1, 2))
        cards += [inverter(f"s{k}", f"s{k}", f"b{k}", 1, 2) for k in range(3)]
        ports += ["s0", "s1", "s2"]
        while len(nodes) > 1:
            first, second, *nodes = nodes
            both, k = f"w{len(cards)}", data.draw(st.integers(0, 2))
            if data.draw(st.booleans()):
                cards.append(transmission_gate(f"a{len(cards)}", first, both, f"s{k}", f"b{k}"))
            else:
                cards.append(f"ma{len(cards)} {first} s{k} {both} vss nx w=1u l=0.1u")
            cards.append(transmission_gate(f"b{len(cards)}", second, both, f"b{k}", f"s{k}"))
            nodes.append(both)
        cards.append(inverter("o", nodes[0], "y", 1, 2))
        circuit = circuit_of(block("\n".join(cards), " ".join([*ports, "vdd", "vss"])))
        assert not circuit.not_understood
        vectors = all_vectors([p for p in ports if p != "y"])
        ids = {name: circuit.net_id(name) for name in vectors}
        found = values(circuit, {ids[name] or 0: value for name, value in vectors.items()})
        out = circuit.net_id("y")
        assert out is not None
        for index in range(0, len(vectors["s0"]), 5):
            one = {ids[name] or 0: bool(value[index]) for name, value in vectors.items()}
            assert settled(circuit, one)[out] == found[out][index]


def plain_elmore(circuit: Circuit, before: dict[int, bool | str], after: dict[int, bool | str],
                 sink: int) -> float:  # fmt: skip
    """Return the Elmore delay of the tree that conducts to a sink, s; counted device by device.

    Loads on nets are those of the pins; every channel end counts 1 fF a micron, as in the plain
    process.
    """
    devices, value, rising = circuit.devices, after[sink], after[sink] is True
    supply = next(
        net for net in range(len(devices.net_names))
        if (circuit.supplies.is_high if rising else circuit.supplies.is_low)[net]
    )  # fmt: skip
    graph: nx.Graph[int] = nx.Graph()
    cap: dict[int, float] = {}
    for d in range(len(devices)):
        n = devices.models[int(devices.model[d])].polarity == "n"
        ends, width = (int(devices.drain[d]), int(devices.source[d])), float(devices.width[d])
        for end in ends:
            cap[end] = cap.get(end, 0.0) + width * 1e-9
        if after[int(devices.gate[d])] == n:
            # 1 kohm of a micron of n, 2 of p; twice as much against the level it passes well.
            ohm = (1e-3 if n else 2e-3) / width * (WEAK if n == rising else 1)
            old = graph.get_edge_data(*ends, {"siemens": 0.0})["siemens"]
            graph.add_edge(*ends, siemens=old + 1 / ohm)
    part = graph.subgraph(n for n in graph if n == supply or n not in supplies_of(circuit))
    tree_of = nx.bfs_tree(part, supply)

    def steps(node: int) -> list[tuple[int, int]]:
        path = nx.shortest_path(tree_of, supply, node)
        return list(pairwise(path))

    main, total = steps(sink), 0.0
    around = nx.node_connected_component(
        graph.subgraph(n for n in graph if n not in supplies_of(circuit)), sink
    )
    for node in around:
        if before[node] != value:
            shared = set(main) & set(steps(node))
            ohm = math.fsum(1 / graph.edges[step]["siemens"] for step in sorted(shared))
            total += ohm * (cap[node] + float(circuit.net_cap[node]))
    return total


def supplies_of(circuit: Circuit) -> set[int]:
    return set(np.flatnonzero(circuit.supplies.is_supply).tolist())


class TestDelays:
    @pytest.mark.parametrize(
        "text", [tree(1), tree(2), rotator(2), bus(2)], ids=["tree1", "tree2", "rotator", "bus"]
    )
    def test_the_slowest_arc_is_the_slowest_of_all_vectors(self, text: str) -> None:
        """For every input of a stage and both edges, against a plain loop over RC trees.

        The stage alone: what controls that come one after the other add is tested elsewhere.
        """
        circuit = circuit_of(text)
        (stage,) = circuit.stages
        sinks = [int(stage.nets[0, sink.node]) for sink in stage.form.sinks]
        names = inputs_of(circuit)
        worst: dict[tuple[int, int, bool | str], float] = {}
        states = [
            settled(circuit, dict(zip(names, vector, strict=True)))
            for vector in product([False, True], repeat=len(names))
        ]
        for index, after in enumerate(states):
            for bit in range(len(names)):
                before = states[index ^ (1 << (len(names) - 1 - bit))]
                for sink in sinks:
                    if {before[sink], after[sink]} == {True, False}:
                        key = names[bit], sink, after[sink]
                        delay = plain_elmore(circuit, before, after, sink)
                        worst[key] = max(worst.get(key, 0.0), delay)
        assert worst
        found: dict[tuple[int, int, bool | str], float] = {}
        arcs = stage_arcs(stage, circuit.electrical, circuit.drive)
        elmore = arcs.elmore(circuit.net_cap)
        for arc in range(len(arcs)):
            key = int(arcs.input[arc]), int(arcs.output[arc]), bool(arcs.rising[arc])
            found[key] = max(found.get(key, 0.0), float(elmore[arc]))
        for key, delay in worst.items():
            assert found[key] == pytest.approx(delay, rel=1e-9)

    def test_what_a_route_charges_on_the_way_counts_by_its_part(self) -> None:
        """Driver 1 kohm, two gates of 1 kohm rising: 1 C1 + 2 C2 + 3 C3, counted by hand."""
        cards = [
            inverter("d", "a", "x", 1, 2),
            transmission_gate("1", "x", "w", "s", "b"),
            transmission_gate("2", "w", "v", "s", "b"),
            inverter("s", "s", "b", 1, 2), inverter("o", "v", "y", 1, 2),
            inverter("p", "w", "q", 2, 4),
            "cw w 0 5f\ncx x 0 7f",
        ]  # fmt: skip
        circuit = circuit_of(block("\n".join(cards), "a s y q vdd vss"))
        arcs, names = circuit.arcs, circuit.devices.net_names
        slowest = max(
            float(value)
            for value, a, v, up in zip(
                arcs.elmore(circuit.net_cap), arcs.input, arcs.output, arcs.rising, strict=True
            )
            if names[a] == "a" and names[v] == "v" and up
        )
        x, w, v = 7 + 3 + 2, 5 + 6 + 4, 3 + 2
        assert slowest == pytest.approx((x + 2 * w + 3 * v) * 1e-12, rel=1e-12)

    def test_a_single_transistor_is_slower_for_the_level_it_passes_weakly(self) -> None:
        cards = [
            inverter("d", "a", "x", 1, 2), "mt x s w vss nx w=1u l=0.1u",
            inverter("o", "w", "y", 1, 2),
        ]  # fmt: skip
        circuit = circuit_of(block("\n".join(cards), "a s y vdd vss"))
        arcs = circuit.arcs
        to_w = arcs.output == circuit.net_id("w")
        rise, fall = (arcs.output_resistance[to_w & (arcs.rising == up)] for up in (True, False))
        assert rise == pytest.approx((1 + WEAK) * 1e3)
        assert fall == pytest.approx(2e3)
        (notice,) = (n for n in circuit.notices if n.code == "weak-level")
        assert notice.names == ("w",)

    def test_the_drive_of_an_input_charges_what_lies_behind_its_passes(self) -> None:
        cards = [
            transmission_gate("t", "d", "w", "s", "b"), inverter("s", "s", "b", 1, 2),
            inverter("o", "w", "y", 1, 2),
        ]  # fmt: skip
        text = block("\n".join(cards), "d s y vdd vss")
        brief = Brief(inputs=(InputBrief(nets=(Pattern("d"),), drive=1e4),))
        circuit = circuit_of(text, None, brief)
        plain = circuit_of(text)
        net, arcs = circuit.net_id("d"), circuit.arcs
        data = arcs.input == net
        more = arcs.elmore(circuit.net_cap)[data] - plain.arcs.elmore(plain.net_cap)[data]
        assert more == pytest.approx(1e4 * 5e-15)
        # The channels on the input itself are its own load.
        assert net is not None
        assert circuit.net_cap[net] == pytest.approx(2e-15)

    @pytest.mark.parametrize(
        "more",
        ["", transmission_gate("t", "x", "w", "s", "sb") + "\n" + inverter("i", "w", "y", 1, 2)],
        ids=["gate", "stage"],
    )
    def test_what_a_weak_level_charges_counts_in_part(self, more: str) -> None:
        """Rising by b, the inner node of two 3 um ends hangs on x through a's n transistor.

        A quarter of its 6 fF is left, at the 2 kohm um of a p transistor of 2 um.
        """
        text = block(nand("g", ["a", "b"], "x", 3, 2) + "\n" + more, "a b s sb x y vdd vss")
        whole, part = (circuit_of(text, plain_process(weak_swing=share)) for share in (1.0, 0.25))
        arcs = part.arcs
        less = whole.arcs.elmore(whole.net_cap) - arcs.elmore(part.net_cap)
        through = (arcs.input == part.net_id("b")) & arcs.rising
        assert through.any()
        assert less[through] == pytest.approx(0.75 * 6e-15 * 1e3)
        assert less[~through] == pytest.approx(0.0, abs=1e-20)


class TestWhatIsSaid:
    def test_controls_that_nothing_makes_complements(self) -> None:
        cards = transmission_gate("t", "d", "w", "s", "sb") + "\n" + inverter("o", "w", "y", 1, 2)
        circuit = circuit_of(block(cards, "d s sb y vdd vss"))
        (notice,) = (n for n in circuit.notices if n.code == "assumed-complement")
        assert set(notice.names) == {"s", "sb"}

    def test_complements_are_followed_through_chains_of_inverters(self) -> None:
        cards = [
            inverter("1", "s", "n", 1, 2), inverter("2", "n", "m", 1, 2),
            inverter("3", "m", "sb", 1, 2), inverter("4", "s", "k", 1, 2),
            inverter("5", "k", "sp", 1, 2), inverter("o", "w", "y", 1, 2),
            transmission_gate("t", "d", "w", "sp", "sb"),
        ]  # fmt: skip
        circuit = circuit_of(block("\n".join(cards), "d s y vdd vss"))
        assert not [n for n in circuit.notices if n.code == "assumed-complement"]

    def test_open_ends_that_nothing_tells_apart(self) -> None:
        cards = [
            transmission_gate("a", "p", "r", "s", "b"), transmission_gate("b", "q", "r", "b", "s"),
            inverter("s", "s", "b", 1, 2),
        ]  # fmt: skip
        text = block("\n".join(cards), "p q r s vdd vss")
        circuit = circuit_of(text)
        assert "name the block's inputs in the brief" in circuit.not_understood[0].reason
        brief = Brief(inputs=(InputBrief(nets=(Pattern("p"), Pattern("q"))),))
        told = circuit_of(text, None, brief)
        assert not told.not_understood
        assert {told.devices.net_names[net] for net in told.ends} == {"r"}

    def test_passes_that_signals_may_take_both_ways(self) -> None:
        cards = [
            inverter("a", "a", "x", 1, 2), inverter("b", "b", "v", 1, 2),
            *(inverter(f"s{k}", f"s{k}", f"n{k}", 1, 2) for k in range(3)),
            transmission_gate("1", "x", "l", "s0", "n0"),
            transmission_gate("2", "l", "r", "s1", "n1"),
            transmission_gate("3", "r", "v", "s2", "n2"),
            inverter("p", "l", "y", 1, 2), inverter("q", "r", "z", 1, 2),
        ]  # fmt: skip
        circuit = circuit_of(block("\n".join(cards), "a b s0 s1 s2 y z vdd vss"))
        (notice,) = (n for n in circuit.notices if n.code == "both-ways")
        assert set(notice.names) <= {"l", "r"}
        ends = analyse(circuit).ends
        assert {end.net for end in ends} == {"y", "z"}

    def test_a_bus_of_many_drivers_needs_no_truth_table(self) -> None:
        circuit = circuit_of(bus(24))
        assert not circuit.not_understood
        kinds = [circuit.gate_kind(gate) for gate in range(len(circuit))]
        assert kinds.count("tri-state gate") == 24
        assert circuit.gate_function(kinds.index("tri-state gate")) == "!d0 when e0"
        (notice,) = (n for n in circuit.notices if n.code == "upper-bound")
        assert notice.names == ("w",)

    def test_wide_networks_are_found(self) -> None:
        """A tree of 16, a rotator of 8 in three ranks, and one of 8 by 8 gates."""
        for text, gates in ((tree(4), 51), (rotator(3), 67), (crossbar(8), 88)):
            circuit = circuit_of(text)
            assert not circuit.not_understood
            assert len(circuit) == gates

    def test_each_pass_is_a_gate_with_cards_of_its_own(self) -> None:
        circuit = circuit_of(tree(1))
        kinds = {circuit.gate_name(g): circuit.gate_kind(g) for g in range(len(circuit))}
        assert kinds["mt0_0n"] == "transmission gate"
        assert circuit.gate_function(list(kinds).index("mt0_0n")) == "m0_0 when b0"
        path = analyse(circuit).paths[0]
        assert path.stages[0].through == ("mt0_0n",)

    def test_stages_drawn_alike_are_one_form(self) -> None:
        leaf = ".subckt mux a b s z vdd vss\n" + "\n".join([
            inverter("a", "a", "an", 1, 2), inverter("b", "b", "bn", 1, 2),
            inverter("s", "s", "sn", 1, 2),
            transmission_gate("1", "an", "w", "sn", "s"),
            transmission_gate("2", "bn", "w", "s", "sn"),
            inverter("o", "w", "z", 1, 2),
        ]) + "\n.ends\n"  # fmt: skip
        calls = "\n".join(f"x{k} a{k} b{k} s z{k} vdd vss mux" for k in range(5))
        ports = " ".join(f"a{k} b{k} z{k}" for k in range(5))
        circuit = circuit_of(f"* t\n.global vdd vss\n{leaf}.subckt top {ports} s\n{calls}\n.ends\n")
        (stage,) = circuit.stages
        assert stage.gates.shape == (5, 4)
        timing = time(circuit)
        assert len({float(t) for t in timing.arrival[timing.graph.end]}) <= 2


@pytest.mark.parametrize("gamma", [1.0, 2.0, 3.0])
def test_tri_state_inverter_has_logical_effort_2(gamma: float) -> None:
    """The data input of a leg of two in series (reference value G10: 2, whatever gamma)."""
    process = plain_process(gamma)
    cards = tri_state("u", "d", "e", "f", "w").replace("w=4u", f"w={2 * gamma:.12g}u")
    circuit = circuit_of(
        block(cards + "\n" + inverter("e", "e", "f", 1, gamma), "d e w vdd vss"), process
    )
    arcs, net = circuit.arcs, circuit.net_id("d")
    unit = 1e3 * (1 + gamma) * 1e-15
    assert net is not None
    cap = circuit.net_cap[net]
    efforts = arcs.output_resistance[arcs.input == net] * cap / unit
    assert efforts == pytest.approx(2)
