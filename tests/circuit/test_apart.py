"""Transistors outside all logic: what each is called, what it loads, and what it holds."""

from __future__ import annotations

import pytest

from evenstage.timing.analyse import analyse
from support.blocks import UNIT_CAP, block, circuit_of, inverter, nand, transistor

INV = inverter("i", "a", "y", 1, 2)


def roles(cards: str, ports: str = "a y") -> dict[str, str]:
    """Return the role of each transistor set apart, beside an inverter from a to y."""
    circuit = circuit_of(block(f"{INV}\n{cards}", ports))
    devices = circuit.devices
    return {
        devices.card_path(int(devices.card[d]), int(devices.instance[d])): some.role
        for some in circuit.apart
        for d in some.devices.tolist()
    }


@pytest.mark.parametrize(
    ("cards", "role"),
    [
        (["n", "vss", "vdd", "vss"], "decoupling"),
        (["p", "vdd", "vss", "vdd"], "decoupling"),
        (["n", "vss", "vss", "vss"], "dummy"),
        (["p", "vdd", "vdd", "vdd"], "dummy"),
        (["n", "vdd", "vss", "vss"], "dummy"),
        (["n", "vss", "y", "vss"], "gate as a capacitor"),
        (["p", "vdd", "a", "vdd"], "gate as a capacitor"),
        (["n", "a", "vss", "vss"], "held off"),
        (["p", "y", "vdd", "a"], "held off"),
        (["n", "y", "a", "y"], "channel shorted"),
        (["p", "vdd", "a", "vss"], "between supplies"),
        (["p", "k", "vss", "vdd"], "tie"),
    ],
)
def test_role(cards: list[str], role: str) -> None:
    kind, drain, gate, source = cards
    assert roles(transistor(kind, drain, gate, source, 1, "x")) == {"mx": role}


def test_a_dummy_between_two_gates_does_not_join_them() -> None:
    cards = "\n".join(
        [INV, inverter("j", "b", "z", 1, 2), transistor("n", "y", "vss", "z", 3, "x")]
    )
    circuit = circuit_of(block(cards, "a b y z"))
    assert len(circuit) == 2
    assert not circuit.not_understood


def test_an_unused_input_of_a_gate_stays_in_the_gate() -> None:
    circuit = circuit_of(block(nand("g", ["a", "vdd"], "y", 2, 2), "a y"))
    assert circuit.apart == ()
    assert len(circuit.gate_devices(0)) == 4


def test_a_dummy_loads_what_it_touches() -> None:
    """Its drain of 3 um and a capacitor's gate of 5 um, at 1 fF a micron each."""
    cards = [transistor("n", "y", "vss", "k", 3, "x"), transistor("n", "vss", "y", "vss", 5, "c")]
    bare, loaded = (
        circuit_of(block("\n".join([INV, *more, inverter("j", "y", "z", 1, 2)]), "a z"))
        for more in ([], cards)
    )
    y = bare.net_id("y")
    assert y is not None
    assert loaded.net_cap[y] - bare.net_cap[y] == pytest.approx(8 * UNIT_CAP)
    (path,) = analyse(loaded).paths
    told = {(branch.instance, branch.pin): branch.cap for branch in path.stages[0].side_branches}
    assert told == {
        ("mx", "drain"): pytest.approx(3 * UNIT_CAP),
        ("mc", "gate"): pytest.approx(5 * UNIT_CAP),
    }
    assert path.stages[0].load_cap == pytest.approx(loaded.net_cap[y])


def test_a_dummy_on_an_inner_node_belongs_to_the_gate() -> None:
    stack = nand("g", ["a", "b"], "y", 2, 2)
    bare, loaded = (
        circuit_of(block(f"{stack}\n{more}", "a b y"))
        for more in ("", transistor("n", "gn1", "vss", "k", 4, "x"))
    )
    # Rising by b charges the inner node too: 4 fF through a p transistor of 1 kohm.
    paths = [analyse(circuit, start="b").paths[0] for circuit in (bare, loaded)]
    assert [path.edge for path in paths] == ["rise", "rise"]
    assert paths[1].charged_delay - paths[0].charged_delay == pytest.approx(4e-12)


class TestTies:
    LOW = "\n".join([
        transistor("n", "k", "k", "vss", 1, "t1"),
        transistor("p", "m", "k", "vdd", 1, "t2"),
        transistor("n", "lo", "m", "vss", 1, "t3"),
    ])  # fmt: skip

    def test_a_chain_from_a_diode(self) -> None:
        assert roles(self.LOW) == dict.fromkeys(["mt1", "mt2", "mt3"], "tie")

    def test_what_a_tie_holds_is_no_input(self) -> None:
        """A NAND with one input tied high inverts the other."""
        tie = transistor("p", "hi", "vss", "vdd", 1, "t")
        circuit = circuit_of(block(f"{tie}\n{nand('g', ['a', 'hi'], 'y', 2, 2)}", "a y"))
        assert circuit.gate_function(0) == "!a"
        assert {circuit.devices.net_names[net] for net in circuit.pins.net} == {"a"}

    def test_a_pull_up_on_an_input_is_no_tie(self) -> None:
        assert roles(transistor("p", "a", "vss", "vdd", 1, "t")) == {}

    def test_a_diode_on_a_port_is_no_tie(self) -> None:
        assert roles(transistor("n", "q", "q", "vss", 1, "t"), "a y q") == {}

    def test_what_is_pulled_both_ways_is_no_tie(self) -> None:
        cards = [
            transistor("p", "k", "vss", "vdd", 1, "t"),
            transistor("n", "k", "a", "vss", 4, "d"),
        ]
        assert roles("\n".join(cards)) == {}


def test_a_self_biased_pair_is_decoupling() -> None:
    cards = [transistor("n", "k", "m", "vss", 1, "1"), transistor("p", "m", "k", "vdd", 1, "2")]
    assert roles("\n".join(cards)) == {"m1": "decoupling", "m2": "decoupling"}
    assert roles("\n".join([*cards, inverter("j", "k", "z", 1, 2)]), "a y z") == {}
