"""Resistors to nodes of nets, and what hangs on them."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes

if TYPE_CHECKING:
    from evenstage.netlist.devices import Devices, Wires


def block(text: str) -> Devices:
    return elaborate(read_bytes(f"* t\n{text}".encode(), "t.sp", Path()))


def wires_of(text: str) -> Wires:
    wires = block(text).wires
    assert wires is not None
    return wires


INVERTER = "mn y:2 a:1 vss vss nch w=1u l=1u\nmp y:3 a:2 vdd vdd pch w=1u l=1u\n"


class TestNodes:
    def test_everything_hangs_where_it_is_drawn(self) -> None:
        devices = block(
            f"{INVERTER}ra a a:1 3\nrb a:1 a:2 5\nry1 y y:2 7\nry2 y:2 y:3 11\nc1 y:3 0 1f\n"
            "c2 a:2 y 2f"
        )
        wires = devices.wires
        assert wires is not None
        names = devices.net_names
        assert sorted(names[net] for net in wires.net) == ["a"] * 3 + ["y"] * 3
        pairs = zip(wires.ends.T.tolist(), wires.resistance.tolist(), strict=True)
        ends = {frozenset(pair): r for pair, r in pairs}
        a, a1 = int(wires.head[devices.gate[0]]), int(wires.gate[0])
        a2, y2, y3 = int(wires.gate[1]), int(wires.drain[0]), int(wires.drain[1])
        y = int(wires.head[devices.drain[0]])
        assert ends == {
            frozenset({a, a1}): 3, frozenset({a1, a2}): 5,
            frozenset({y, y2}): 7, frozenset({y2, y3}): 11,
        }  # fmt: skip
        assert wires.source.tolist() == [-1, -1]
        assert wires.capacitor.tolist() == [[y3, a2], [-1, y]]

    def test_values_are_evaluated_and_shared_by_copies(self) -> None:
        text = (
            ".param k=2\n.subckt w a b r=1\nr1 a b 'r*k'\nr2 a b r=30 m=3\n.ends\n"
            "x1 p p:1 w r=4 m=2\nm1 p:1 p 0 0 nch w=1u l=1u"
        )
        assert sorted(wires_of(text).resistance.tolist()) == [4, 5]

    def test_no_resistance_is_no_node(self) -> None:
        devices = block("r1 a a:1 0\nm1 y a:1 vss vss nch w=1u l=1u")
        assert devices.wires is None
        wires = wires_of("r1 a a:1 0\nr2 a:1 a:2 5\nm1 y a:1 a:2 vss nch w=1u l=1u")
        assert len(wires.net) == 2
        assert wires.head[int(wires.net[0])] == wires.gate[0]

    def test_loops_of_one_node_are_left_out(self) -> None:
        wires = wires_of("r1 a a:1 0\nr2 a a:1 9\nr3 a a:2 5\nm1 y a:2 0 0 nch w=1u l=1u")
        assert wires.resistance.tolist() == [5]

    @pytest.mark.parametrize("value", ["rpoly w=1u", "-5", "3 m=0", "nan"])
    def test_what_has_no_value_is_told(self, value: str) -> None:
        devices = block(f"r1 a a:1 {value}\nr2 a a:2 5\nm1 y a:1 a:2 0 nch w=1u l=1u")
        assert [n.names for n in devices.notices if n.code == "resistor-unknown"] == [("r1",)]
        assert devices.wires is not None
        assert devices.wires.resistance.tolist() == [5]

    def test_beyond_all_wires_it_is_as_good_as_open(self) -> None:
        wires = wires_of("r1 a a:2 1e300\nm1 y a:2 0 0 nch w=1u l=1u")
        assert wires.resistance.tolist() == [1e15]

    @pytest.mark.parametrize("text", ["r1 a b 10\n", ""])
    def test_a_block_without_wires_has_none(self, text: str) -> None:
        devices = block(
            f"{text}r2 vdd vss 5\nm1 y c vss vss nch w=1u l=1u\nmp z c vdd vdd pch w=1u l=1u"
        )
        assert (devices.wires is None) == (not text)
