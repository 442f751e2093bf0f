"""The contents of a block, as text, as JSON and as a graph, from one invented block."""

from __future__ import annotations

import io
import json
from typing import TYPE_CHECKING

import networkx as nx
import pytest

from evenstage.circuit.inventory import Inventory, take_inventory
from evenstage.report.graph_document import graph_document
from evenstage.report.machine import inventory_document, to_json
from evenstage.report.terminal import inventory_report
from support.blocks import circuit_of, inverter, nand, nor, transistor

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.circuit.circuit import Circuit

CELLS = "\n".join([
    ".subckt inv a y", inverter("", "a", "y", 1, 2), ".ends",
    ".subckt buf a y", inverter("1", "a", "b", 1, 2), inverter("2", "b", "y", 3, 6), ".ends",
])  # fmt: skip
BLOCK = "\n".join([
    "x0 a p inv", "x1 b q inv", "x2 p s0 buf",
    nand("g", ["p", "q"], "u", 2, 2), nor("h", ["u", "c"], "y", 1, 4),
    transistor("n", "t", "d", "e", 1, "odd"),
])  # fmt: skip


def circuit() -> Circuit:
    text = f"* t\n.global vdd vss\n{CELLS}\n.subckt top a b c d e y s0\n{BLOCK}\n.ends\n"
    return circuit_of(text)


@pytest.fixture(scope="module")
def inventory() -> Inventory:
    return take_inventory(circuit())


@pytest.mark.parametrize("width", [80, 100, 160])
def test_text(inventory: Inventory, golden: Callable[[str, str], None], width: int) -> None:
    golden(f"inventory_{width}", inventory_report(inventory, width=width))


def test_every_transistor_is_in_a_gate_or_not_understood(inventory: Inventory) -> None:
    in_gates = sum(entry.count * entry.devices for entry in inventory.entries)
    left = sum(some.devices for some in inventory.not_understood)
    assert in_gates + left == inventory.devices


def test_copies_of_a_subcircuit_are_one_entry(inventory: Inventory) -> None:
    found = [
        (entry.subcircuit, entry.count, entry.output, entry.function) for entry in inventory.entries
    ]
    assert found == [
        ("top", 1, "u", "!(p & q)"),
        ("top", 1, "y", "!(u | c)"),
        ("inv", 2, "y", "!a"),
        ("buf", 2, "b", "!a"),
    ]


def test_json_names_every_gate_and_what_is_left(inventory: Inventory) -> None:
    document = json.loads(to_json(inventory_document(inventory)))
    assert document["kind"] == "circuit"
    assert [gate["instance"] for gate in document["gates"]] == [
        "mgn0", "mhp0", "x0", "x1", "x2.m1n", "x2.m2n",
    ]  # fmt: skip
    assert document["gates"][1]["inputs"] == ["u", "c"]
    assert document["gates"][4]["output"] == "x2.b"
    (left,) = document["not_understood"]
    assert left["names"] == ["modd"]
    assert left["reason"] == "no node is pulled both up and down"


def test_the_graph_is_read_back_as_the_gates_and_their_nets() -> None:
    block = circuit()
    text = graph_document(block)
    assert text == graph_document(circuit())
    back = nx.read_graphml(io.BytesIO(text.encode()), node_type=int)
    assert back.number_of_nodes() == len(block)
    assert back.nodes[0]["function"] == "!(p & q)"
    edges = {(a, b): facts["net"] for a, b, facts in back.edges(data=True)}
    assert edges == {(0, 1): "u", (2, 0): "p", (2, 4): "p", (3, 0): "q", (4, 5): "x2.b"}


def test_names_that_xml_cannot_hold_are_escaped() -> None:
    cards = inverter("i", "a\ufffe", "y", 1, 2)
    text = graph_document(circuit_of(f"* t\n.global vdd vss\n.subckt top y\n{cards}\n.ends\n"))
    back = nx.read_graphml(io.BytesIO(text.encode()), node_type=int)
    assert back.nodes[0]["function"] == "!a\\xfffe"
