"""How the gates of a block drive its wires."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from numpy.testing import assert_allclose

from support.blocks import circuit_of, inverter
from support.wires import wired_block

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.wiring import Wiring

LN2 = float(np.log(2))


def circuit(cards: list[str], ports: str = "a y") -> Circuit:
    return circuit_of("* t\n.global vdd vss\n.subckt top " + "\n".join([ports, *cards, ".ends"]))


def wiring_of(block: Circuit) -> Wiring:
    assert block.wiring is not None
    return block.wiring


class TestDrives:
    def test_one_for_each_set_of_nodes(self) -> None:
        """n and p transistors at both ends of a wire, an input's wire, and none for the rails."""
        block = circuit(
            [
                "mn y:1 a:1 vss:1 vss nx w=1u l=0.1u", "mp y:2 a:2 vdd vdd px w=2u l=0.1u",
                "ra a a:1 10", "rb a:1 a:2 20", "rc y y:1 30", "rd y:1 y:2 40", "re vss vss:1 50",
            ]
        )  # fmt: skip
        wiring, names = wiring_of(block), block.devices.net_names
        assert sorted(names[net] for net in wiring.net) == ["a", "y", "y"]
        y, none = np.array([block.net_id("y")] * 2), np.zeros(2, np.int32)
        rise, fall = wiring.drives(none, y, np.array([True, False])).tolist()
        assert rise != fall
        assert block.wire_loads is not None
        first = block.wire_loads.first
        # The port holds four unit inverters. Falling, its wire starts at y:1 and the p drain
        # hangs behind 40 ohm; rising, all but the p drain does.
        for drive, latest in ((fall, 30 * 12e-15), (rise, 40 * 13e-15 + 30 * 12e-15)):
            part = first[wiring.head[drive] : wiring.head[drive + 1]]
            assert_allclose(part.max(), LN2 * latest, rtol=1e-9, atol=0)

    def test_equal_sets_are_one(self) -> None:
        block = circuit([inverter("d", "a", "n", 1, 2), "r1 n y 50"])
        wiring = wiring_of(block)
        net, gate = np.array([block.net_id("y")] * 2), np.zeros(2, np.int32)
        assert len(set(wiring.drives(gate, net, np.array([True, False])).tolist())) == 1

    def test_a_block_without_resistance_has_none(self) -> None:
        assert circuit([inverter("d", "a", "y", 1, 2)]).wiring is None
        split = "mn y a vss:1 vss nx w=1u l=0.1u\nmp y a vdd vdd px w=2u l=0.1u\nr1 vss vss:1 5"
        assert circuit([split]).wiring is None

    def test_inner_nodes_count_as_one(self) -> None:
        """A contact's resistance inside a stack is not counted; the gate is still one."""
        stack = [
            "ma y a x1 vss nx w=2u l=0.1u", "mb x2 b vss vss nx w=2u l=0.1u", "r1 x1 x2 5",
            "mc y a vdd vdd px w=2u l=0.1u", "md y b vdd vdd px w=2u l=0.1u",
        ]  # fmt: skip
        block = circuit(stack, "a b y")
        assert len(block) == 1
        assert (
            wiring_of(block).drives(np.zeros(1, int), block.gate_output, np.ones(1, bool)) < 0
        ).all()


class TestSinks:
    def test_the_farther_finger_counts(self) -> None:
        cards = [inverter("d", "a", "n", 1, 2), "r1 n n:1 50", "r2 n:1 n:2 70"]
        cards += ["mn1 y n:1 vss vss nx w=1u l=0.1u", "mn2 y n:2 vss vss nx w=1u l=0.1u"]
        cards += ["mp1 y n vdd vdd px w=2u l=0.1u"]
        block = circuit(cards)
        wiring, wires = wiring_of(block), block.devices.wires
        assert wires is not None
        gate = np.array([1, 1])
        net = np.array([block.net_id("n")] * 2)
        place = wiring.sinks(gate, net, np.array([True, False]))
        drive = wiring.drives(np.zeros(2, int), net, np.array([True, True]))
        node = wiring.node[wiring.sink[wiring.sink_head[drive] + place]]
        assert node.tolist() == [wires.gate[3], wires.gate[4]]


class TestNames:
    def test_parts_of_a_net_are_known_by_their_names(self) -> None:
        cards = [inverter("d", "a", "n", 1, 2), "r1 n n:1 50", "r2 n:1 y 0"]
        block = circuit(cards)
        assert block.net_id("n:1") == block.net_id("N") == block.net_id("y")

    def test_a_leaf_behind_a_wire_names_its_own_pins(self) -> None:
        cards = ["xd a n inv", "r1 n n:1 50", "xe n:1 y inv"]
        text = (
            "* t\n.global vdd vss\n.subckt inv i o\n"
            + inverter("d", "i", "o", 1, 2)
            + "\n.ends\n.subckt top a y\n"
            + "\n".join(cards)
            + "\n.ends\n"
        )
        block = circuit_of(text)
        assert [block.gate_function(gate) for gate in range(2)] == ["!i", "!i"]


class TestLoads:
    @pytest.mark.parametrize("seed", range(5))
    def test_all_capacitance_of_a_net_lies_on_its_nodes(self, seed: int) -> None:
        """Of each net: pins, wires and outside, and the drains of its driver."""
        block = circuit_of(wired_block(seed))
        wiring, loads, devices = wiring_of(block), block.wire_loads, block.devices
        assert loads is not None
        own = np.bincount(devices.drain, block.electrical.drain.today, len(devices.net_names))
        own += np.bincount(devices.source, block.electrical.source.today, len(devices.net_names))
        held = np.bincount(wiring.drive, loads.capacitance)
        assert_allclose(held, (block.net_cap + own)[wiring.net], rtol=1e-9, atol=0)
