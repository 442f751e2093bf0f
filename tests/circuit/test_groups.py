"""Channel-connected groups against a plain search, and which of them are recognised together."""

from __future__ import annotations

import random
from typing import TYPE_CHECKING

import networkx as nx
import numpy as np
from hypothesis import given, settings

from evenstage.circuit.apart import set_apart
from evenstage.circuit.gate import recognise_network
from evenstage.circuit.groups import group
from evenstage.circuit.supplies import find_supplies
from support.blocks import block, circuit_of, devices_of, inverter, nand, plain_process
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.circuit.groups import AlikeGroups
    from evenstage.netlist.devices import Devices


def grouped(devices: Devices) -> tuple[AlikeGroups, ...]:
    """Return the groups of a block, as recognition makes them."""
    supplies = find_supplies(devices)
    apart, levels = set_apart(devices, supplies)
    logic = np.ones(len(devices), bool)
    for some in apart:
        logic[some.devices] = False
    return group(devices, supplies, logic, levels)


def groups(devices: Devices) -> set[frozenset[str]]:
    """Return the names of the transistors of each group."""
    return {
        frozenset(name(devices, device) for device in members)
        for some in grouped(devices)
        for members in some.devices.tolist()
    }


def name(devices: Devices, device: int) -> str:
    return devices.card_path(int(devices.card[device]), int(devices.instance[device]))


def searched(devices: Devices) -> set[frozenset[str]]:
    """Return the same by joining transistors that share a channel end, one by one."""
    supplies = find_supplies(devices)
    graph: nx.Graph[str | int] = nx.Graph()
    for device in range(len(devices)):
        for net in (int(devices.drain[device]), int(devices.source[device])):
            if not supplies.is_supply[net]:
                graph.add_edge(net, name(devices, device))
    return {
        frozenset(node for node in part if isinstance(node, str))
        for part in nx.connected_components(graph)
    }


class TestGroup:
    @given(random_blocks())
    @settings(max_examples=40, deadline=None)
    def test_groups_are_those_of_a_search(self, drawn: RandomBlock) -> None:
        devices = devices_of(drawn.text(), plain_process())
        assert groups(devices) == searched(devices)

    @given(random_blocks())
    @settings(max_examples=30, deadline=None)
    def test_the_order_of_cards_changes_no_group(self, drawn: RandomBlock) -> None:
        cards = drawn.cards()
        random.Random(5).shuffle(cards)
        ports = " ".join([*drawn.inputs, *drawn.outputs, "vdd", "vss"])
        other = devices_of(block("\n".join(cards), ports), plain_process())
        assert groups(other) == groups(devices_of(drawn.text(), plain_process()))

    @given(random_blocks())
    @settings(max_examples=30, deadline=None)
    def test_every_row_is_drawn_as_its_network_says(self, drawn: RandomBlock) -> None:
        devices = devices_of(drawn.text(), plain_process())
        supplies = find_supplies(devices)
        for some in grouped(devices):
            for members, nets in zip(some.devices.tolist(), some.nets.tolist(), strict=True):
                for device, switch in zip(members, some.network, strict=True):
                    ends = (devices.drain, devices.gate, devices.source)
                    local = (switch.a, switch.gate, switch.b)
                    for column, net in zip(ends, local, strict=True):
                        actual = int(column[device])
                        assert (nets[net] == actual) if net >= 0 else supplies.is_supply[actual]

    def test_one_structure_is_recognised_once(self) -> None:
        leaf = ".subckt g a b y\n" + nand("g", ["a", "b"], "y", 2, 2) + "\n.ends\n"
        calls = "\n".join(f"x{k} a{k} a{k + 1} a{k + 2} g" for k in range(200))
        text = f"* rows\n.global vdd vss\n{leaf}.subckt top a0 a1 a201\n{calls}\n.ends\n"
        recognise_network.cache_clear()
        circuit = circuit_of(text)
        assert len(circuit) == 200
        assert recognise_network.cache_info().misses == 1
        assert len(circuit.alike) == 1

    def test_different_structures_are_kept_apart_in_their_order(self) -> None:
        cards = "\n".join(
            [
                inverter("i1", "a", "b", 1, 2),
                nand("n1", ["a", "b"], "c", 2, 2),
                inverter("i2", "c", "d", 3, 6),
            ]
        )
        devices = devices_of(block(cards, "a d"), plain_process())
        found = grouped(devices)
        assert [len(some.devices) for some in found] == [2, 1]
        assert found[0].devices[:, 0].tolist() == [0, 6]

    def test_a_transistor_between_supplies_is_in_no_group(self) -> None:
        cards = inverter("i", "a", "y", 1, 2) + "\nmc vdd vss vdd vdd px w=9u l=0.1u"
        devices = devices_of(block(cards, "a y"), plain_process())
        assert groups(devices) == {frozenset({"min", "mip"})}
