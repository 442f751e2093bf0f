"""Vectors for paths and false paths, against exhaustive tables and a published false path."""

from __future__ import annotations

import json
from itertools import islice, pairwise
from typing import TYPE_CHECKING
from unittest import mock

import numpy as np
import pytest
from hypothesis import given, settings

from evenstage import flow
from evenstage.logic import relations
from evenstage.logic.clauses import Clauses
from evenstage.logic.relations import Relation
from evenstage.logic.switches import UNKNOWN
from evenstage.logic.ways import Channel, WideRelation
from evenstage.timing import vectors
from evenstage.timing.analyse import analyse
from evenstage.timing.search import slowest_paths
from evenstage.timing.stages import describe
from evenstage.timing.vectors import path_logic, with_vectors
from support.blocks import block, circuit_of, inverter, nand, network
from support.logic import all_vectors, values
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.timing.results import Analysis

Edges = list[tuple[str, bool]]
"""Nets of a path from its start, and whether each rises."""


def verdict(drawn: RandomBlock, nets: dict[str, np.ndarray], path: Edges) -> str:
    """Return the verdict by the textbook: every vector, gate by gate, controlling values."""
    gate_of = {output: (kind, inputs) for kind, inputs, output, _ in drawn.gates}
    start = drawn.inputs.index(path[0][0])
    after = np.flatnonzero(np.logical_and.reduce([nets[net] == rises for net, rises in path]))
    before = after ^ (1 << start)
    on_path = {net for net, _ in path}
    works = np.logical_and.reduce([nets[net][before] != rises for net, rises in path])
    lets = np.ones(len(after), bool)
    for (entry, _), (net, rises) in pairwise(path):
        kind, inputs = gate_of[net]
        for side in set(inputs) - on_path:
            works &= nets[side][before] == nets[side][after]
        controlling = kind == "nor"
        if kind != "inv" and rises == (kind == "nand"):
            lets &= nets[entry][after] == controlling
    return "switches" if works.any() else "together" if lets.any() else "false"


class TestRandomBlocks:
    @settings(max_examples=25, deadline=None)
    @given(random_blocks(most=10))
    def test_verdicts_are_those_of_exhaustive_tables(self, drawn: RandomBlock) -> None:
        circuit = circuit_of(drawn.text())
        table = all_vectors(list(drawn.inputs))
        known = values(circuit, {circuit.net_id(n) or 0: v for n, v in table.items()})
        nets = {circuit.devices.net_names[net]: value for net, value in known.items()}
        analysis = analyse(circuit)
        assert analysis.timing is not None
        logic = path_logic(circuit)
        for arcs in islice(slowest_paths(analysis.timing), 12):
            path = describe(analysis.timing, arcs)
            edges: Edges = [(path.start, path.start_edge == "rise")]
            edges += [(stage.output, stage.edge == "rise") for stage in path.stages]
            numbered = tuple((circuit.net_id(net) or 0, rises) for net, rises in edges)
            found = logic.vector(numbered, 10_000)
            assert found.verdict == verdict(drawn, nets, edges)
            if found.verdict == "switches":
                fits = np.logical_and.reduce(
                    [nets[net] == level for net, level in (*found.held, edges[0])]
                )
                assert all((nets[net][fits] == rises).all() for net, rises in edges)


class TestWays:
    @settings(max_examples=15, deadline=None)
    @given(random_blocks(most=8))
    def test_groups_without_tables_say_the_same(self, drawn: RandomBlock) -> None:
        circuit = circuit_of(drawn.text())
        table = all_vectors(list(drawn.inputs))
        known = values(circuit, {circuit.net_id(n) or 0: v for n, v in table.items()})
        nets = {circuit.devices.net_names[net]: value for net, value in known.items()}
        analysis = analyse(circuit)
        assert analysis.timing is not None
        with mock.patch.object(relations, "INPUTS_MOST", 0):
            logic = path_logic(circuit)
            for arcs in islice(slowest_paths(analysis.timing), 8):
                path = describe(analysis.timing, arcs)
                edges: Edges = [(path.start, path.start_edge == "rise")]
                edges += [(stage.output, stage.edge == "rise") for stage in path.stages]
                numbered = tuple((circuit.net_id(net) or 0, rises) for net, rises in edges)
                found, expected = logic.vector(numbered, 10_000), verdict(drawn, nets, edges)
                assert (found.verdict == "switches") == (expected == "switches")
                # Of many inputs any may matter anywhere: fewer paths are proved false.
                assert found.verdict != "false" or expected == "false"

    @pytest.mark.parametrize("count", [16, 40])
    def test_a_wide_selector_gets_its_vector(self, count: int) -> None:
        cards = [inverter("o", "m", "y", 4, 8)]
        for i in range(count):
            cards += [
                inverter(f"d{i}", f"i{i}", f"b{i}", 2, 4),
                inverter(f"s{i}", f"s{i}", f"t{i}", 1, 2),
            ]
            cards += [network("n", f"g{i}", [(f"b{i}", f"s{i}", "m", 1)])]
            cards += [network("p", f"h{i}", [(f"b{i}", f"t{i}", "m", 2)])]
        ports = " ".join(f"i{i} s{i}" for i in range(count))
        circuit = circuit_of(block("\n".join(cards), f"{ports} y"))
        (path,) = with_vectors(analyse(circuit, start="i3", end="y")).paths
        assert path.vector is not None
        assert path.vector.verdict == "switches"
        held = dict(path.vector.held)
        assert [name for name, level in held.items() if name[0] == "s" and level] == ["s3"]

    def test_two_transistors_of_a_gate_are_one_way(self) -> None:
        channels = [Channel(0, 3, 1, closes=True), Channel(0, 4, 1, closes=False)]
        ends, alone = {1: UNKNOWN}, {4: (3, True)}
        for before, count in (({}, 2), (alone, 1)):
            found = WideRelation(0, (1, 3, 4), channels, ends, {}, before)
            assert found.ways is not None
            assert len(found.ways) == count

    def test_a_mesh_with_too_many_ways_may_be_anything(self) -> None:
        side = 7
        channels = [
            Channel(
                side * r + c,
                100 + 2 * (side * r + c) + down,
                side * (r + down) + c + 1 - down,
                closes=True,
            )
            for r in range(side)
            for c in range(side)
            for down in (0, 1)
            if (r if down else c) < side - 1
        ]
        assert WideRelation(0, (), channels, {side**2 - 1: 1}, {}).ways is None


def carry_skip(bits: int = 4) -> str:
    """Return a block of a carry-skip adder.

    The carry ripples through ``c = g | p c``; when all bits propagate, it skips them. So the ripple
    from end to end is never what decides: the classical false path (Lehman and Burla, "Skip
    techniques for high-speed carry-propagation in binary arithmetic units", IRE Transactions on
    Electronic Computers EC-10(4), 1961, for the circuit; from memory).
    """
    cards = []
    for k in range(bits):
        cards += [
            inverter(f"g{k}", f"g{k}", f"gb{k}", 1, 2),
            nand(f"t{k}", [f"c{k}", f"p{k}"], f"t{k}", 2, 2),
            nand(f"c{k}", [f"gb{k}", f"t{k}"], f"c{k + 1}", 2, 2),
        ]
    every = [f"p{k}" for k in range(bits)]
    cards += [
        nand("s", every, "sb", 4, 2),
        inverter("s", "sb", "s", 1, 2),
        nand("m", [f"c{bits}", "sb"], "m", 2, 2),
        nand("k", ["c0", "s"], "k", 2, 2),
        nand("o", ["m", "k"], "co", 2, 2),
    ]
    ports = ["c0", *every, *(f"g{k}" for k in range(bits)), "co"]
    return block("\n".join(cards), " ".join(ports))


@pytest.fixture(scope="module")
def adder() -> Analysis:
    return analyse(circuit_of(carry_skip()), start="c0", count=3)


class TestCarrySkip:
    def test_a_carry_never_ripples_from_end_to_end(self, adder: Analysis) -> None:
        """A rising one is no path at all; a falling one may still decide if skipping is late."""
        ripple = {path.start_edge: path for path in adder.paths if len(path.stages) == 10}
        assert set(ripple) == {"rise", "fall"}
        found = with_vectors(adder)
        false = {(path.start_edge, len(path.stages)) for path in found.false_paths}
        assert false == {("rise", 10)}
        (falling,) = (path for path in found.paths if len(path.stages) == 10)
        assert falling.vector is not None
        assert falling.vector.verdict == "together"

    def test_the_next_paths_take_its_place(self, adder: Analysis) -> None:
        found = with_vectors(adder)
        assert len(found.paths) == len(adder.paths)
        skipping = [path for path in found.paths if len(path.stages) == 2]
        for path in skipping:
            assert path.vector is not None
            assert path.vector.verdict == "switches"
            held = dict(path.vector.held)
            assert {name: held[name] for name in ("p0", "p1", "p2", "p3")} == dict.fromkeys(
                ("p0", "p1", "p2", "p3"), True
            )
        assert skipping

    def test_paths_are_as_they_were_where_nobody_asks(self, adder: Analysis) -> None:
        assert with_vectors(adder, 0) is adder

    def test_the_missing_library_is_told(
        self, adder: Analysis, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        monkeypatch.setattr(vectors, "has_solver", lambda: False)
        found = with_vectors(adder)
        assert found.paths == adder.paths
        assert found.notices[-1].code == "no-solver"

    def test_large_blocks_are_left_alone(
        self, adder: Analysis, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        monkeypatch.setattr(vectors, "DEVICES_MOST", 10)
        assert with_vectors(adder).notices[-1].code == "no-vectors"


class TestReport:
    @pytest.fixture
    def netlist(self, tmp_path: Path) -> Path:
        path = tmp_path / "adder.sp"
        path.write_text(carry_skip().replace(" nx ", " nmos ").replace(" px ", " pmos "))
        return path

    def test_false_paths_stand_apart(self, netlist: Path) -> None:
        result = flow.analyse(netlist, flow.Question(start="c0", count=3))
        text = flow.text(result)
        assert "False paths, passed over" in text
        assert "  c0 rising to co rising" in text
        assert "none for c0 1 to 0 alone; the path may switch together with others" in text
        assert "  vector    c0 0 to 1 with " in text
        document = json.loads(flow.json(result))
        assert [path["vector"]["verdict"] for path in document["false_paths"]] == ["false"]
        assert document["paths"][0]["vector"]["verdict"] == "together"
        assert {"net": "p0", "level": 1} in document["paths"][-1]["vector"]["held"]

    def test_resizing_counts_a_false_path_and_says_so(self, netlist: Path) -> None:
        sizing = flow.resize(netlist, flow.Question(start="c0"))
        assert (sizing.before.paths[0].start_edge, len(sizing.before.paths[0].stages)) == (
            "rise",
            10,
        )
        (told,) = (notice for notice in sizing.notices if notice.code == "false-path")
        assert "no input vector lets the slowest path switch, from 'c0' to 'co'" in told.message

    def test_nothing_is_said_where_nobody_asks(self, netlist: Path) -> None:
        text = flow.text(flow.analyse(netlist, flow.Question(start="c0", conflicts=0)))
        assert "vector" not in text
        assert "False paths" not in text


class TestClauses:
    def test_the_search_is_given_up_after_some_conflicts(self) -> None:
        """Seven pigeons in six holes: no place for all, and a long way to see it."""
        nor = np.array([0, 1, 1, 1], np.int8)
        clauses, holes = Clauses({}, np.zeros(100, bool)), 6
        somewhere = np.zeros(1 << holes, bool)
        somewhere[0] = True
        for pigeon in range(7):
            inputs = tuple(10 * pigeon + hole for hole in range(holes))
            clauses.forbid(Relation(inputs, np.zeros(1 << holes, np.int8)), somewhere)
            for other in range(pigeon):
                for hole in range(holes):
                    pair = (10 * pigeon + hole, 10 * other + hole)
                    clauses.forbid(Relation(pair, nor), np.array([0, 0, 0, 1], bool))
        assert clauses.solve(10) is None
        assert clauses.solve(100_000) is False
