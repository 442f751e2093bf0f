"""Storage elements: found, named, with their clocks, data, sets and resets."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest

from evenstage.brief import Brief, ClockBrief
from evenstage.circuit.storage.phases import phases
from evenstage.pattern import Pattern
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, nand, network, nor, transistor

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.circuit.circuit import Circuit


def clocked(name: str, a: str, clock: str, complement: str, y: str, width: float = 2) -> str:
    """Return the cards of a clocked inverter that conducts while its clock is high."""
    n = [(y, clock, f"{name}n", width), (f"{name}n", a, "vss", width)]
    p = [(y, complement, f"{name}p", 2 * width), (f"{name}p", a, "vdd", 2 * width)]
    return network("n", name, n) + "\n" + network("p", name, p)


def gate(name: str, a: str, clock: str, complement: str, y: str) -> str:
    """Return the cards of a transmission gate."""
    n, p = f"{name}n", f"{name}p"
    return transistor("n", a, clock, y, 1, n) + "\n" + transistor("p", a, complement, y, 2, p)


CLOCK = inverter("c", "ck", "ckb", 1, 2)
LATCH = "\n".join([
    CLOCK, clocked("i", "d", "ck", "ckb", "s"), clocked("f", "q", "ckb", "ck", "s", 0.5),
    inverter("o", "s", "q", 1, 2), inverter("b", "q", "y", 1, 2),
])  # fmt: skip
FLIP_FLOP = "\n".join([
    CLOCK, inverter("d", "d", "db", 1, 2), gate("t1", "db", "ckb", "ck", "m"),
    inverter("m", "m", "mq", 1, 2), clocked("f1", "mq", "ck", "ckb", "m", 0.5),
    gate("t2", "mq", "ck", "ckb", "s"), inverter("s", "s", "q", 1, 2),
    clocked("f2", "q", "ckb", "ck", "s", 0.5),
])  # fmt: skip


def circuit(cards: str, ports: str) -> Circuit:
    return circuit_of(block(cards, ports))


def told(found: Circuit) -> list[tuple[str, str, str, str, str]]:
    """Return kind, nets, clocks, data and writes of each element; active low ones with a bar."""
    names = found.devices.net_names

    def levels(some: tuple[tuple[int, bool], ...]) -> str:
        return " ".join(sorted(names[net] if high else f"/{names[net]}" for net, high in some))

    return [
        (
            one.kind,
            " ".join(sorted(names[net] for loop in one.loops for net in loop.nets)),
            levels(one.clocks),
            " ".join(sorted(names[net] for net in one.data)),
            levels(one.writes),
        )
        for one in found.storage.elements
    ]


def routes(found: Circuit) -> set[tuple[str, ...]]:
    """Return start, outputs along the path, each with a sign for its edge."""
    return {
        (path.start, *(f"{s.output}{'+' if s.edge == 'rise' else '-'}" for s in path.stages))
        for path in analyse(found, count=99).paths
    }


class TestKinds:
    def test_latch(self) -> None:
        assert told(circuit(LATCH, "d ck y")) == [("latch", "s", "ck", "d", "")]

    def test_latch_that_its_input_overpowers(self) -> None:
        cards = [
            CLOCK, clocked("i", "d", "ck", "ckb", "s"), inverter("f", "q", "s", 0.2, 0.4),
            inverter("o", "s", "q", 1, 2), inverter("b", "q", "y", 1, 2),
        ]  # fmt: skip
        found = circuit("\n".join(cards), "d ck y")
        assert told(found) == [("latch", "s", "ck", "d", "")]
        assert "tri-state gate, kept" in {found.gate_kind(g) for g in range(len(found))}

    def test_latch_that_a_transmission_gate_overpowers(self) -> None:
        cards = [
            CLOCK, inverter("d", "d", "db", 1, 2), gate("t", "db", "ck", "ckb", "s"),
            inverter("s", "s", "q", 1, 2), inverter("f", "q", "s", 0.2, 0.4),
        ]  # fmt: skip
        found = circuit("\n".join(cards), "d ck q")
        assert told(found) == [("latch", "s", "ck", "d", "")]
        assert routes(found) == {
            ("d", "s-"), ("d", "s+"), ("ck", "s+", "q-"), ("ck", "s-", "q+"),
        }  # fmt: skip

    def test_memory_cell(self) -> None:
        cards = [
            inverter("1", "a", "b", 1, 1), inverter("2", "b", "a", 1, 1),
            transistor("n", "bl", "wl", "a", 1, "p1"), transistor("n", "blb", "wl", "b", 1, "p2"),
        ]  # fmt: skip
        (found,) = told(circuit("\n".join(cards), "bl blb wl"))
        assert found[:3] == ("latch", "a b", "wl")

    def test_a_level_restorer_stores_nothing_where_one_of_two_passes(self) -> None:
        cards = [
            inverter("s", "s", "sb", 1, 2), transistor("n", "a", "s", "x", 1, "p1"),
            transistor("n", "b", "sb", "x", 1, "p2"), transistor("p", "x", "y", "vdd", 0.2, "k"),
            inverter("o", "x", "y", 1, 2), inverter("i", "c", "a", 1, 2),
            inverter("j", "d", "b", 1, 2),
        ]  # fmt: skip
        found = circuit("\n".join(cards), "c d s y")
        assert [one[0] for one in told(found)] == ["loop that never holds"]
        (keeper,) = np.flatnonzero(found.devices.gate == found.net_id("y")).tolist()
        assert found.gate_of_device[keeper] >= 0
        assert found.net_cap[found.net_id("y") or 0] == pytest.approx(0.2e-15)

    def test_flip_flop(self) -> None:
        assert told(circuit(FLIP_FLOP, "d ck q")) == [("flip-flop", "m mq s", "ck", "d", "")]

    def test_flip_flop_of_the_other_edge(self) -> None:
        cards = FLIP_FLOP.replace(CLOCK, inverter("c", "ckb", "ck", 1, 2))
        assert told(circuit(cards, "d ckb q")) == [("flip-flop", "m mq s", "/ckb", "d", "")]

    @pytest.mark.parametrize(("make", "active"), [(nand, "/r /s"), (nor, "r s")])
    def test_set_reset_pair(self, make: Callable[..., str], active: str) -> None:
        cards = make("a", ["s", "qb"], "q", 2, 2) + "\n" + make("b", ["r", "q"], "qb", 2, 2)
        assert told(circuit(cards, "s r q qb")) == [("set-reset pair", "q qb", "", "", active)]

    def test_bus_keeper(self) -> None:
        cards = inverter("a", "z", "k", 1, 2) + "\n" + inverter("b", "k", "z", 0.2, 0.4)
        assert told(circuit(cards, "z")) == [("bus keeper", "k z", "", "", "")]

    def test_sense_amplifier(self) -> None:
        """Two cross-coupled inverters over a differential pair, precharged while ck is low."""
        cards = [
            network("n", "x", [
                ("q", "qb", "l", 2), ("qb", "q", "r", 2), ("l", "a", "t", 2), ("r", "b", "t", 2),
                ("t", "ck", "vss", 4),
            ]),
            network("p", "x", [
                ("q", "qb", "vdd", 2), ("qb", "q", "vdd", 2), ("q", "ck", "vdd", 1),
                ("qb", "ck", "vdd", 1),
            ]),
            inverter("o", "q", "y", 1, 2),
        ]  # fmt: skip
        (found,) = told(circuit("\n".join(cards), "a b ck y"))
        assert found[:2] == ("sense amplifier", "q qb")

    def test_a_ring_oscillates_and_is_named(self) -> None:
        ring = "\n".join(inverter(f"r{k}", f"r{k}", f"r{(k + 1) % 3}", 1, 2) for k in range(3))
        found = circuit(f"{ring}\n{inverter('i', 'a', 'y', 1, 2)}", "a y")
        (notice,) = (notice for notice in found.notices if notice.code == "loop-oscillates")
        assert set(notice.names) == {"r0", "r1", "r2"}

    def test_a_multiplexer_back_to_itself_is_no_storage_without_a_loop(self) -> None:
        assert told(circuit(nand("g", ["a", "b"], "y", 2, 2), "a b y")) == []

    def test_a_register_is_two_flip_flops(self) -> None:
        leaf = f".subckt ff d ck q\n{FLIP_FLOP}\n.ends\n"
        text = (
            f"* t\n.global vdd vss\n{leaf}.subckt top d ck q\nx1 d ck k ff\nx2 k ck q ff\n.ends\n"
        )
        found = circuit_of(text)
        assert [one[0] for one in told(found)] == ["flip-flop", "flip-flop"]
        assert [one[3] for one in told(found)] == ["d", "x1.s"]


class TestDynamicLatches:
    """A transmission gate or a clocked inverter into a gate, and no feedback."""

    GATES = "\n".join([
        CLOCK, inverter("d", "d", "db", 1, 2), gate("t1", "db", "ckb", "ck", "m"),
        inverter("m", "m", "mq", 1, 2), gate("t2", "mq", "ck", "ckb", "s"),
        inverter("s", "s", "q", 1, 2),
    ])  # fmt: skip

    def test_transmission_gates(self) -> None:
        assert told(circuit(self.GATES, "d ck q")) == [
            ("dynamic latch", "m", "/ck", "d", ""),
            ("dynamic latch", "s", "ck", "m", ""),
        ]

    def test_data_end_on_the_net_and_the_clock_leaves_it(self) -> None:
        found = routes(circuit(self.GATES, "d ck q"))
        assert {route[0] for route in found if route[-1][0] == "q"} == {"ck"}
        assert {route for route in found if route[0] == "d"} == {("d", "m+"), ("d", "m-")}

    def test_a_clocked_inverter(self) -> None:
        cards = [CLOCK, clocked("i", "d", "ck", "ckb", "s"), inverter("o", "s", "q", 1, 2)]
        assert told(circuit("\n".join(cards), "d ck q")) == [("dynamic latch", "s", "ck", "d", "")]

    def test_a_multiplexer_and_a_port_store_nothing(self) -> None:
        mux = [
            CLOCK, inverter("a", "a", "an", 1, 2), inverter("b", "b", "bn", 1, 2),
            gate("1", "an", "ck", "ckb", "w"), gate("2", "bn", "ckb", "ck", "w"),
            inverter("o", "w", "y", 1, 2),
        ]  # fmt: skip
        assert told(circuit("\n".join(mux), "a b ck y")) == []
        port = CLOCK + "\n" + clocked("i", "d", "ck", "ckb", "s")
        assert told(circuit(port, "d ck s")) == []

    def test_only_clocks_that_the_brief_names(self) -> None:
        for name, count in (("ck", 2), ("d", 0)):
            brief = Brief(clocks=(ClockBrief(nets=(Pattern(name),)),))
            found = circuit_of(block(self.GATES, "d ck q"), None, brief)
            assert len(found.storage.elements) == count


class TestPaths:
    def test_data_end_at_the_latch_and_the_clock_goes_on(self) -> None:
        assert routes(circuit(LATCH, "d ck y")) == {
            ("d", "s-"), ("d", "s+"),
            ("ck", "s-", "q+", "y-"), ("ck", "ckb-", "s+", "q-", "y+"),
        }  # fmt: skip

    def test_a_set_reset_pair_passes_each_edge_once_around(self) -> None:
        cards = nand("a", ["s", "qb"], "q", 2, 2) + "\n" + nand("b", ["r", "q"], "qb", 2, 2)
        found = routes(circuit(cards, "s r q qb"))
        assert found == {
            ("s", "q-"), ("s", "q+"), ("s", "q-", "qb+"), ("s", "q+", "qb-"),
            ("r", "qb-"), ("r", "qb+"), ("r", "qb-", "q+"), ("r", "qb+", "q-"),
        }  # fmt: skip

    def test_a_loop_through_a_flip_flop_is_not_cut(self) -> None:
        """A divider by two is a ring of two latches: either may count as its first."""
        cards = FLIP_FLOP.replace(inverter("d", "d", "db", 1, 2), inverter("d", "q", "db", 1, 2))
        found = circuit(f"{cards}\n{inverter('b', 'q', 'y', 1, 2)}", "ck y")
        assert [one[:2] for one in told(found)] == [("flip-flop", "m mq s")]
        analysis = analyse(found, count=99)
        assert "loop-cut" not in {notice.code for notice in analysis.notices}
        whys = {end.net: end.why for end in analysis.ends}
        assert whys == {"y": "output", "s": "stored", "m": "stored"}


class TestPhases:
    def test_chains_follow_their_first_net(self) -> None:
        found = phases(np.array([1, 2, 4]), np.array([0, 1, 2]), 5)
        assert found.root.tolist() == [0, 0, 0, 3, 0]
        assert found.inverted.tolist() == [False, True, False, False, True]

    def test_rings_follow_nobody_and_what_hangs_on_them_does(self) -> None:
        found = phases(np.array([1, 0, 2]), np.array([0, 1, 1]), 3)
        assert found.root.tolist() == [0, 1, 1]
        assert found.inverted.tolist() == [False, False, True]
