"""From transistors to gates: stages, fingers, taps, leaves, complements, ends and notices."""

from __future__ import annotations

from dataclasses import replace

import pytest

from evenstage.brief import Brief, OutputBrief
from evenstage.circuit.circuit import NET, OUTPUT, Circuit
from evenstage.circuit.recognise import recognise
from evenstage.errors import CircuitError, SettingsError
from evenstage.pattern import Pattern
from evenstage.timing.analyse import analyse
from support.blocks import (
    SHIFTING_BLOCK,
    block,
    circuit_of,
    devices_of,
    inverter,
    nand,
    network,
    nor,
    plain_process,
)

HEAD = "* t\n.global vdd vss\n"
INV = ".subckt inv a y\n" + inverter("", "a", "y", 1, 2) + "\n.ends\n"


def functions(circuit: Circuit) -> dict[str, str]:
    """Return the function of each gate by its output."""
    names = circuit.devices.net_names
    return {
        names[net]: circuit.gate_function(gate)
        for gate, net in enumerate(circuit.gate_output.tolist())
    }


def codes(circuit: Circuit) -> set[str]:
    return {notice.code for notice in circuit.notices}


class TestGates:
    def test_several_stages_in_one_subcircuit(self) -> None:
        cards = [
            nand("n", ["a", "b"], "p", 2, 2),
            inverter("i", "p", "q", 2, 4),
            nor("r", ["q", "c"], "y", 1, 4),
        ]
        circuit = circuit_of(block("\n".join(cards), "a b c y vdd vss"))
        assert functions(circuit) == {"p": "!(a & b)", "q": "!p", "y": "!(q | c)"}
        assert not circuit.gate_is_leaf.any()
        assert [circuit.gate_name(gate) for gate in range(3)] == ["mnn0", "min", "mrp0"]

    def test_parallel_fingers_are_one_gate(self) -> None:
        """A NAND drawn as two stacks side by side, the second turned upside down."""
        cards = [
            network("n", "f", [("y", "a", "m1", 2), ("m1", "b", "vss", 2)]),
            network("n", "g", [("vss", "b", "m2", 2), ("m2", "a", "y", 2)]),
            network("p", "f", [("y", "a", "vdd", 1), ("vdd", "a", "y", 1), ("y", "b", "vdd", 2)]),
        ]
        circuit = circuit_of(block("\n".join(cards), "a b y vdd vss"))
        assert functions(circuit) == {"y": "!(a & b)"}
        whole = circuit_of(block(nand("n", ["a", "b"], "y", 4, 2), "a b y vdd vss"))
        assert circuit.pins.cap.today.sum() == pytest.approx(whole.pins.cap.today.sum())
        slow, plain = (circuit.arcs.output_resistance.max() for circuit in (circuit, whole))
        assert slow == pytest.approx(plain)

    def test_an_and_or_invert_from_real_inverters_is_an_exclusive_or(self) -> None:
        cards = [
            inverter("i1", "a", "an", 1, 2),
            inverter("i2", "b", "bn", 1, 2),
            network("n", "x", [
                ("y", "a", "m", 2), ("m", "b", "vss", 2), ("y", "an", "k", 2), ("k", "bn", "vss", 2)
            ]),
            network("p", "x", [
                ("y", "a", "q", 4), ("q", "bn", "vdd", 4), ("y", "an", "r", 4), ("r", "b", "vdd", 4)
            ]),
        ]  # fmt: skip
        circuit = circuit_of(block("\n".join(cards), "a b y vdd vss"))
        assert functions(circuit)["y"] == "!(a & b | an & bn)"
        assert not circuit.not_understood

    def test_the_same_networks_without_inverters_can_float(self) -> None:
        cards = [
            network("n", "x", [
                ("y", "a", "m", 2), ("m", "b", "vss", 2), ("y", "c", "k", 2), ("k", "d", "vss", 2)
            ]),
            network("p", "x", [
                ("y", "a", "q", 4), ("q", "d", "vdd", 4), ("y", "c", "r", 4), ("r", "b", "vdd", 4)
            ]),
            inverter("i", "y", "z", 1, 2),
        ]  # fmt: skip
        circuit = circuit_of(block("\n".join(cards), "a b c d z vdd vss"))
        kinds = [circuit.gate_kind(gate) for gate in range(len(circuit))]
        assert kinds == ["tri-state gate", "static gate"]

    def test_a_tapped_inner_node_makes_a_stage_of_one_gate(self) -> None:
        cards = nand("n", ["a", "b"], "y", 2, 2) + "\n" + inverter("i", "nn1", "z", 1, 2)
        circuit = circuit_of(block(cards, "a b y z vdd vss"))
        assert functions(circuit) == {"y": "!(a & b)", "z": "!nn1"}
        assert not circuit.not_understood
        (stage,) = circuit.stages
        assert stage.gates.shape == (1, 1)
        driven = {circuit.devices.net_names[net] for net in circuit.driven.tolist()}
        assert driven == {"y", "nn1", "z"}

    def test_only_the_tapped_one_of_equal_gates_is_a_stage(self) -> None:
        leaf = ".subckt g a b y t\nmn1 y a t vss nx w=2u l=0.1u\nmn2 t b vss vss nx w=2u l=0.1u\n"
        leaf += "mp1 y a vdd vdd px w=2u l=0.1u\nmp2 y b vdd vdd px w=2u l=0.1u\n.ends\n"
        calls = "x1 a b y1 t1 g\nx2 a b y2 t2 g\n" + inverter("i", "t2", "z", 1, 2)
        circuit = circuit_of(f"{HEAD}{leaf}.subckt top a b y1 y2 z\n{calls}\n.ends\n")
        assert set(functions(circuit)) == {"y1", "y2", "z"}
        assert [len(stage.gates) for stage in circuit.stages] == [1]

    def test_a_gate_no_input_moves_is_none(self) -> None:
        """Its p network leads nowhere, so that the output is always low."""
        cards = network("n", "x", [("y", "a", "vss", 1), ("y", "vdd", "vss", 1)])
        cards += "\n" + network("p", "x", [("y", "a", "k", 1)])
        circuit = circuit_of(block(cards + "\n" + inverter("i", "b", "z", 1, 2), "a b y z"))
        assert set(functions(circuit)) == {"z"}
        assert [some.reason for some in circuit.not_understood] == ["no input moves its output"]


class TestNotices:
    def test_every_transistor_in_no_gate_is_named(self) -> None:
        cards = [
            inverter("i", "a", "b", 1, 2),
            "mt1 b en c vss nx w=1u l=0.1u\nmt2 b enb c vdd px w=1u l=0.1u",
            "mk d b d2 vss nx w=1u l=0.1u",
            inverter("j", "c", "z", 1, 2),
        ]
        circuit = circuit_of(block("\n".join(cards), "a en enb z d d2 vdd vss"))
        named = {
            name
            for notice in circuit.notices
            if notice.code == "not-understood"
            for name in notice.names
        }
        assert named == {"mk"}
        gated = (circuit.gate_of_device >= 0).sum()
        assert gated + len(named) == len(circuit.devices)

    def test_groups_with_one_reason_share_a_notice(self) -> None:
        cards = "\n".join(f"mk{k} d{k} a e{k} vss nx w=1u l=0.1u" for k in range(3))
        circuit = circuit_of(block(cards + "\n" + inverter("i", "a", "z", 1, 2), "a z"))
        (notice,) = (n for n in circuit.notices if n.code == "not-understood")
        assert notice.message.startswith(
            "3 groups of transistors not understood, no node is pulled"
        )
        assert notice.names == ("mk0", "mk1", "mk2")

    def test_what_is_not_understood_still_loads_its_driver(self) -> None:
        cards = inverter("i", "a", "b", 1, 2) + "\nmk d b e vss nx w=7u l=0.1u"
        circuit = circuit_of(block(cards, "a d e vdd vss"))
        net = circuit.net_id("b")
        assert net is not None
        assert circuit.net_cap[net] == pytest.approx(7e-15)
        assert circuit.ends == {net: "enters what was not understood"}

    def test_no_transistor(self) -> None:
        with pytest.raises(CircuitError, match="'top' holds no transistors"):
            circuit_of(block("c1 a 0 1f", "a"))

    def test_no_gate(self) -> None:
        cards = "mn y a vss vss nx w=1u l=0.1u\nmp z b vdd vdd px w=1u l=0.1u"
        circuit = circuit_of(block(cards, "a b y z"))
        assert len(circuit) == 0
        with pytest.raises(CircuitError, match="no gate found; no node is"):
            analyse(circuit)


class TestOwnership:
    def test_a_leaf_is_named_by_its_call(self) -> None:
        row = ".subckt row a y\nx1 a m inv\nx2 m y inv\n.ends\n"
        circuit = circuit_of(
            f"{HEAD}{INV}{row}.subckt top a b y z\nxr1 a y row\nxr2 b z row\n.ends\n"
        )
        names = [circuit.gate_name(gate) for gate in range(4)]
        assert names == ["xr1.x1", "xr1.x2", "xr2.x1", "xr2.x2"]
        assert circuit.gate_is_leaf.all()
        assert {circuit.gate_subcircuit(gate) for gate in range(4)} == {"inv"}
        assert circuit.gate_function(2) == "!a"

    def test_a_subcircuit_with_a_further_transistor_is_no_leaf(self) -> None:
        leaf = INV.replace(".ends", "md vss a vss vss nx w=1u l=0.1u\n.ends")
        circuit = circuit_of(f"{HEAD}{leaf}.subckt top a y\nx1 a y inv\n.ends\n")
        assert not circuit.gate_is_leaf.any()
        assert circuit.gate_name(0) == "x1.mn"

    def test_a_gate_across_instances_belongs_to_the_one_around_both(self) -> None:
        pull = ".subckt up a y\nmp y a vdd vdd px w=2u l=0.1u\n.ends\n"
        pull += ".subckt down a y\nmn y a vss vss nx w=1u l=0.1u\n.ends\n"
        pair = ".subckt pair a y\nxu a y up\nxd a y down\n.ends\n"
        circuit = circuit_of(f"{HEAD}{pull}{pair}.subckt top a y\nxp a y pair\n.ends\n")
        assert circuit.gate_is_leaf.all()
        assert circuit.gate_name(0) == "xp"

    def test_wrapped_transistors(self) -> None:
        wraps = ".subckt nw d g s b\nm1 d g s b nx w=1u l=0.1u\n.ends\n"
        wraps += ".subckt pw d g s b\nm1 d g s b px w=2u l=0.1u\n.ends\n"
        cell = ".subckt cell a y\nxn y a vss vss nw\nxp y a vdd vdd pw\n.ends\n"
        circuit = circuit_of(f"{HEAD}{wraps}{cell}.subckt top a y\nxc a y cell\n.ends\n")
        assert circuit.gate_name(0) == "xc"


class TestEnds:
    CARDS = inverter("i", "a", "b", 1, 2) + "\n" + inverter("j", "b", "z", 1, 2)

    def test_a_port_ends_paths_even_where_it_drives_on(self) -> None:
        circuit = circuit_of(block(self.CARDS, "a b z vdd vss"))
        assert sorted(circuit.devices.net_names[net] for net in circuit.ends) == ["b", "z"]

    def test_the_default_load_is_four_unit_inverters(self) -> None:
        circuit = circuit_of(block(self.CARDS, "a z vdd vss"))
        net = circuit.net_id("z")
        assert net is not None
        assert circuit.net_cap[net] == pytest.approx(4 * 3e-15)
        (notice,) = (n for n in circuit.notices if n.code == "default-load")
        assert notice.message == "nothing loads one output; it gets 4 unit inverters"
        assert notice.names == ("z",)

    def test_the_default_load_of_several(self) -> None:
        cards = inverter("i", "a", "b", 1, 2) + "\n" + inverter("j", "a", "z", 1, 2)
        circuit = circuit_of(block(cards, "a b z vdd vss"))
        (notice,) = (n for n in circuit.notices if n.code == "default-load")
        assert notice.message == "nothing loads 2 outputs; each gets 4 unit inverters"

    def test_a_load_from_the_brief(self) -> None:
        brief = Brief(outputs=(OutputBrief(nets=(Pattern("z"),), load=5e-15),))
        circuit = circuit_of(block(self.CARDS, "a z vdd vss"), brief=brief)
        net = circuit.net_id("z")
        assert net is not None
        assert circuit.net_cap[net] == 5e-15
        assert "default-load" not in codes(circuit)

    def test_an_output_of_the_brief_may_lie_inside(self) -> None:
        brief = Brief(outputs=(OutputBrief(nets=(Pattern("b"),)),))
        circuit = circuit_of(block(self.CARDS, "a z vdd vss"), brief=brief)
        assert circuit.net_id("b") in circuit.ends

    def test_an_output_of_the_brief_must_be_driven(self) -> None:
        brief = Brief(outputs=(OutputBrief(nets=(Pattern("a"),)),))
        with pytest.raises(SettingsError, match="no driven net fits 'a'"):
            circuit_of(block(self.CARDS, "a z vdd vss"), brief=brief)


def test_the_graph_joins_each_driver_to_what_it_drives() -> None:
    cards = [
        inverter("i", "a", "b", 1, 2),
        inverter("j", "b", "c", 1, 2),
        nand("k", ["b", "c"], "z", 2, 2),
    ]
    circuit = circuit_of(block("\n".join(cards), "a z vdd vss"), plain_process())
    graph, names = circuit.graph(), circuit.devices.net_names
    edges = {(a, b): names[graph.edges[a, b][NET]] for a, b in graph.edges}
    assert edges == {(0, 1): "b", (0, 2): "b", (1, 2): "c"}
    outputs = [names[graph.nodes[gate][OUTPUT]] for gate in range(3)]
    assert outputs == ["b", "c", "z"]


class TestWithoutAProcess:
    NAMES = (("nx", "nmos"), ("px", "pmos"))

    def text(self) -> str:
        text = SHIFTING_BLOCK
        for plain, usual in self.NAMES:
            text = text.replace(f" {plain} ", f" {usual} ")
        return text

    def test_the_structure_is_the_same(self) -> None:
        given, bare = circuit_of(SHIFTING_BLOCK), recognise(devices_of(self.text(), None))
        assert functions(bare) == functions(given)
        kinds = [[some.gate_kind(i) for i in range(len(some))] for some in (bare, given)]
        assert kinds[0] == kinds[1]
        assert bare.storage.elements == given.storage.elements
        assert "generic-process" in codes(bare)
        assert bare.electrical.gate.today.min() > 0

    def test_types_that_only_a_process_told_are_not_guessed(self) -> None:
        plain = plain_process()
        odd = replace(plain, transistors=plain.transistors[::-1])
        devices = devices_of(SHIFTING_BLOCK, odd)
        assert len(recognise(devices, odd)) == len(circuit_of(SHIFTING_BLOCK))
        with pytest.raises(CircuitError, match="give recognise that process too") as caught:
            recognise(devices)
        assert caught.value.code == "process-wanted"
