"""The contents of a block, as text, as JSON and as a graph, from one invented block."""

from __future__ import annotations

import io
import json
from typing import TYPE_CHECKING

import networkx as nx
import pytest

from evenstage.circuit.inventory import Inventory, take_inventory
from evenstage.report.document.convert import document as document_of
from evenstage.report.document.convert import to_json
from evenstage.report.graph_document import graph_document
from evenstage.report.paper import Paper
from evenstage.report.terminal import inventory_report
from support.blocks import (
    SHIFTING_BLOCK,
    circuit_of,
    inverter,
    nand,
    network,
    nor,
    transistor,
)

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.circuit.circuit import Circuit

CELLS = "\n".join([
    ".subckt inv a y", inverter("", "a", "y", 1, 2), ".ends",
    ".subckt latch d ck q", inverter("c", "ck", "cb", 1, 2),
    network("n", "i", [("s", "ck", "n1", 2), ("n1", "d", "vss", 2)]),
    network("p", "i", [("s", "cb", "p1", 4), ("p1", "d", "vdd", 4)]),
    network("n", "k", [("s", "q", "vss", 0.2)]), network("p", "k", [("s", "q", "vdd", 0.4)]),
    inverter("o", "s", "q", 1, 2), ".ends",
    ".subckt buf a y", inverter("1", "a", "b", 1, 2), inverter("2", "b", "y", 3, 6), ".ends",
])  # fmt: skip
BLOCK = "\n".join([
    "x0 a p inv", "x1 b q inv", "x2 p s0 buf",
    nand("g", ["p", "q"], "u", 2, 2), nor("h", ["u", "c"], "y", 1, 4),
    transistor("n", "t", "d", "e", 1, "odd"),
    "x3 a e l0 latch", "x4 b e l1 latch", transistor("n", "w", "c", "vss", 2, "r"),
    transistor("p", "w", "vss", "vdd", 0.9, "l"), inverter("w", "w", "z", 1, 2),
    transistor("n", "vss", "vdd", "vss", 5, "d1"), transistor("n", "vss", "vdd", "vss", 5, "d2"),
])  # fmt: skip


def circuit() -> Circuit:
    text = f"* t\n.global vdd vss\n{CELLS}\n.subckt top a b c d e y z s0 l0 l1\n{BLOCK}\n.ends\n"
    return circuit_of(text)


@pytest.fixture(scope="module")
def inventory() -> Inventory:
    return take_inventory(circuit())


@pytest.mark.parametrize("width", [80, 100, 160])
def test_text(inventory: Inventory, golden: Callable[[str, str], None], width: int) -> None:
    golden(f"inventory_{width}", inventory_report(inventory, Paper(width)))


def test_every_transistor_is_in_a_gate_or_not_understood(inventory: Inventory) -> None:
    in_gates = sum(entry.count * entry.devices for entry in inventory.entries)
    left = sum(some.devices for some in inventory.not_understood)
    outside = sum(some.devices for some in inventory.outside)
    assert in_gates + left + outside == inventory.devices


def test_copies_of_a_subcircuit_are_one_entry(inventory: Inventory) -> None:
    found = [
        (entry.subcircuit, entry.kind, entry.count, entry.function)
        for entry in inventory.entries
        if entry.subcircuit in {"inv", "latch"}
    ]
    assert found == [
        ("inv", "static gate", 2, "!a"),
        ("latch", "static gate", 4, "!ck"),
        ("latch", "tri-state gate, kept", 2, "!d when ck"),
    ]


def test_storage_is_told_in_the_names_of_its_subcircuit(inventory: Inventory) -> None:
    (stored,) = inventory.stored
    assert (stored.subcircuit, stored.kind, stored.count) == ("latch", "latch", 2)
    assert (stored.clocks, stored.data, stored.nets) == ((("ck", True),), ("d",), ("s",))


def test_json_names_every_gate_and_what_is_left(inventory: Inventory) -> None:
    document = json.loads(to_json(document_of(inventory)))
    assert document["kind"] == "circuit"
    gates = {gate["instance"]: gate for gate in document["gates"]}
    assert len(gates) == len(document["gates"]) == document["counts"]["gates"] == 14
    assert gates["mhp0"]["inputs"] == ["u", "c"]
    assert gates["x2.m1n"]["output"] == "x2.b"
    assert gates["mr"]["kind"] == "ratioed gate"
    assert document["storage"][0]["clocks"] == [{"net": "ck", "level": 1}]
    assert document["outside_logic"][0]["names"] == ["md1", "md2"]
    (left,) = document["not_understood"]
    assert left["names"] == ["modd"]
    assert left["reason"] == "no node is pulled both up and down"


def test_the_graph_is_read_back_as_the_gates_and_their_nets() -> None:
    block = circuit()
    text = graph_document(block)
    assert text == graph_document(circuit())
    back = nx.read_graphml(io.BytesIO(text.encode()), node_type=int)
    assert back.number_of_nodes() == len(block)
    outputs = {facts["output"]: node for node, facts in back.nodes(data=True)}
    assert back.nodes[outputs["u"]]["function"] == "!(p & q)"
    edges = {(a, b): facts["net"] for a, b, facts in back.edges(data=True)}
    assert edges[outputs["u"], outputs["y"]] == "u"
    assert edges[outputs["x2.b"], outputs["s0"]] == "x2.b"
    # The output of a latch keeps its own stored net.
    assert edges[outputs["l0"], outputs["x3.s"]] == "l0"


def test_names_that_xml_cannot_hold_are_escaped() -> None:
    cards = inverter("i", "a\ufffe", "y", 1, 2)
    text = graph_document(circuit_of(f"* t\n.global vdd vss\n.subckt top y\n{cards}\n.ends\n"))
    back = nx.read_graphml(io.BytesIO(text.encode()), node_type=int)
    assert back.nodes[0]["function"] == "!a\\xfffe"


class TestTwoSupplies:
    @pytest.mark.parametrize("width", [80, 100])
    def test_text(self, golden: Callable[[str, str], None], width: int) -> None:
        shifting = take_inventory(circuit_of(SHIFTING_BLOCK))
        golden(f"inventory_two_supplies_{width}", inventory_report(shifting, Paper(width)))

    def test_json_counts_by_supplies(self) -> None:
        shifting = take_inventory(circuit_of(SHIFTING_BLOCK))
        document = json.loads(to_json(document_of(shifting)))
        kinds = {some["name"]: some["kinds"] for some in document["subcircuits"]}
        assert [(one["supplies"]["high"], one["count"]) for one in kinds["inv"]] == [
            (["vdd"], 4),
            (["vddh"], 3),
        ]
        gates = {gate["instance"]: gate["supplies"] for gate in document["gates"]}
        assert gates["x3.x1"] == {"high": ["vdd"], "low": ["vss"]}
        assert gates["x3.x2"] == {"high": ["vddh"], "low": ["vss"]}
        assert gates["mt"] == {"high": [], "low": []}
        assert [one["supplies"]["high"] for one in document["storage"]] == [["vddh"], ["vddh"]]

    def test_tables_and_nodes_say_them(self) -> None:
        block = circuit_of(SHIFTING_BLOCK)
        rows = take_inventory(block).tables()["gates"]
        inverters = [one for one in rows if one["subcircuit"] == "inv"]
        assert [(one["high"], one["low"]) for one in inverters] == [("vdd", "vss"), ("vddh", "vss")]
        back = nx.read_graphml(io.BytesIO(graph_document(block).encode()), node_type=int)
        nodes = {facts["instance"]: facts for _, facts in back.nodes(data=True)}
        assert (nodes["x3.x1"]["high"], nodes["x3.x1"]["low"]) == ("vdd", "vss")
        assert nodes["x3.x2"]["high"] == "vddh"


def test_one_supply_has_no_column(inventory: Inventory) -> None:
    assert "supplies  " not in inventory_report(inventory)
    assert {entry.supplies.nets for entry in inventory.entries} <= {
        ("vdd", "vss"), ("vdd",), ("vss",), (),
    }  # fmt: skip
