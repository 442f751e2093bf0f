"""Cards to columns: hierarchy, the block meant, resistors, supplies, other cards."""

from __future__ import annotations

from pathlib import Path

import pytest

from evenstage.brief import Brief
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.elaboration.nets import endings
from evenstage.netlist.reading.read import read_bytes
from support.laid_out import INVERTER, block, microns, paths, pins


class TestHierarchy:
    TEXT = (
        """.global VDD!
.subckt buf a y VDD! vss
x1 a n VDD! vss inv
x2 n y VDD! vss inv
.ends
.subckt pair p q
xb p Q VDD! 0 buf
mk q p 0 VDD! nch w=1u l=0.1u
.ends
"""
        + INVERTER
    )

    def test_names_of_nets_and_cards(self) -> None:
        devices = block(self.TEXT, "pair")
        assert paths(devices) == ["mk", "xb.x1.mn", "xb.x1.mp", "xb.x2.mn", "xb.x2.mp"]
        assert pins(devices)[:3] == [
            ("q", "p", "0", "VDD!"),
            ("xb.n", "p", "0", "0"),
            ("xb.n", "p", "VDD!", "VDD!"),
        ]

    def test_ports_instances_and_subcircuits(self) -> None:
        devices = block(self.TEXT, "PAIR")
        assert [devices.net_names[n] for n in devices.ports] == ["p", "q"]
        assert {devices.net_names[n] for n in devices.global_nets} == {"0", "VDD!"}
        assert devices.top == "pair"
        assert devices.instance_parent.tolist() == [-1, 0, 1, 1]
        names = [devices.subcircuits[i] for i in devices.instance_subcircuit]
        assert names == ["pair", "buf", "inv", "inv"]
        assert [devices.instance_path(i) for i in range(4)] == ["", "xb", "xb.x1", "xb.x2"]

    def test_a_port_hides_the_global_net_of_its_name(self) -> None:
        devices = block(".global v\n.subckt t v\nm1 v v v v nch w=1u l=1u\n.ends\nx1 other t")
        assert pins(devices) == [("other",) * 4]

    def test_a_port_of_the_block_is_the_global_net_of_its_name(self) -> None:
        text = (
            ".global v\n.subckt in a\nm1 a a v v nch w=1u l=1u\n.ends\n.subckt t v\nx1 v in\n.ends"
        )
        devices = block(text, "t")
        assert pins(devices) == [("v",) * 4]
        assert set(devices.ports) == devices.global_nets

    def test_names_ignore_case(self) -> None:
        devices = block("M1 Out IN vss VSS NCH W=1U L=1U\nm2 OUT in VSS vss nch w=1u l=1u")
        assert pins(devices) == [("Out", "IN", "vss", "vss")] * 2
        assert len(devices.models) == 1

    def test_all_columns_are_read_only(self) -> None:
        devices = block(INVERTER)
        with pytest.raises(ValueError, match="read-only"):
            devices.width[0] = 1

    def test_no_transistor_at_all(self) -> None:
        devices = block(".subckt t a b\nc1 a b 1f\n.ends")
        assert (len(devices), len(devices.capacitance)) == (0, 1)

    def test_deep_hierarchy(self) -> None:
        levels = "".join(f".subckt s{i} a\nx a s{i + 1}\n.ends\n" for i in range(1500))
        text = levels + ".subckt s1500 a\nm1 a b a a nch w=1u l=1u\n.ends"
        devices = block(text)
        assert paths(devices)[0].count(".") == 1500
        assert devices.net_names[:] == ("a", "x." * 1500 + "b")


class TestTop:
    def test_the_top_level_comes_before_uncalled_subcircuits(self) -> None:
        assert block(INVERTER + "x1 a b c d inv").top == ""

    def test_sources_alone_do_not_make_a_top_level(self) -> None:
        assert block(INVERTER + "v1 vdd 0 1.2").top == "inv"

    def test_the_one_nobody_calls(self) -> None:
        assert block(INVERTER + ".subckt t a b c d\nx1 a b c d INV\n.ends").top == "t"

    def test_empty_subcircuits_do_not_count(self) -> None:
        assert block(INVERTER + ".subckt fill vdd vss\n.ends").top == "inv"

    def test_the_brief_names_it_and_an_argument_overrules_the_brief(self) -> None:
        netlist = read_bytes(f"* t{INVERTER}.subckt t a\n.ends".encode(), "t.sp", Path())
        assert elaborate(netlist, brief=Brief(top="T")).top == "t"
        assert elaborate(netlist, "inv", brief=Brief(top="T")).top == "inv"


class TestResistors:
    def test_their_ends_become_one_net(self) -> None:
        text = "r1 a n1 10\nr2 n1 n1:2 5\nm1 y n1:2 0 0 nch w=1u l=1u\nc1 n1 0 1f"
        devices = block(f".subckt t a y\n{text}\n.ends")
        assert pins(devices) == [("y", "a", "0", "0")]
        assert devices.net_names[int(devices.capacitor_nets[0, 0])] == "a"
        notice = devices.notices[0]
        assert (notice.code, notice.names) == ("resistor-joined", ("t.r1", "t.r2"))

    @pytest.mark.parametrize("ends", ["vdd p:1", "p:1 vdd", "vdd! p:1"])
    def test_a_supply_keeps_its_name(self, ends: str) -> None:
        devices = block(f"r1 {ends} 10\nm1 y a p:1 0 pch w=1u l=1u")
        assert pins(devices)[0][2] in {"vdd", "vdd!"}

    def test_a_plain_name_is_kept_before_a_part_of_a_net(self) -> None:
        assert pins(block("r1 a:1 a 10\nm1 y a:1 0 0 nch w=1u l=1u"))[0][1] == "a"

    def test_across_the_hierarchy(self) -> None:
        text = (
            ".subckt wire p q\nr1 p q 3\n.ends\nx1 a b wire\nx2 b c wire\nm1 c c 0 0 nch w=1u l=1u"
        )
        assert pins(block(text)) == [("a", "a", "0", "0")]

    def test_two_supplies_are_never_joined(self) -> None:
        devices = block("r1 vdd n 10\nr2 n vss 10\nm1 n a vss vss nch w=1u l=1u")
        assert pins(devices) == [("n", "a", "vss", "vss")]
        assert [n.code for n in devices.notices] == ["resistor-left-out"]


class TestOtherCards:
    def test_values_of_capacitors(self) -> None:
        text = """.param k=2
c1 a 0 1.5f
c2 a 0 'k*1f' m=3
c3 a 0 c=4f
c4 a 0 cmod w=1u l=1u
c5 a 0 k
m1 a a 0 0 nch w=1u l=1u"""
        devices = block(text)
        assert devices.capacitance.tolist() == pytest.approx([1.5e-15, 6e-15, 4e-15, 2], rel=1e-12)
        assert [n.names for n in devices.notices] == [("c4",)]
        assert devices.netlist.card(int(devices.capacitor_card[2])).name == "c3"

    @pytest.mark.parametrize(
        ("card", "volts"),
        [
            ("v1 vdd 0 1.2", 1.2),
            ("v1 vdd 0 dc 1.2", 1.2),
            ("v1 vdd 0 dc=1.2 ac=1", 1.2),
            ("v1 vdd 0 ac 1 dc 0.9 pulse(0 1 1n)", 0.9),
            ("v1 vdd 0 'sup*2'", 1.6),
            ("v1 vdd 0 sup", 0.8),
            ("v1 vdd 0 pulse(0 1 0 1n 1n)", 0.0),
            ("v1 vdd 0", 0.0),
        ],
    )
    def test_sources_of_the_block(self, card: str, volts: float) -> None:
        devices = block(f".param sup=0.8\n{card}\nm1 a b vdd vdd pch w=1u l=1u")
        plus, minus, value = devices.source_nets[0]
        assert (devices.net_names[plus], devices.net_names[minus]) == ("vdd", "0")
        assert value == pytest.approx(volts, rel=1e-12)

    def test_unknown_elements_are_told_once_per_kind(self) -> None:
        text = "d1 a 0 dmod\nd2 b 0 dmod\nq1 a b c npn\nm1 a b 0 0 nch w=1u l=1u\ne1 x 0 a b 10"
        notices = block(text).notices
        assert [n.names for n in notices] == [("d1", "d2"), ("e1",), ("q1",)]
        assert notices[0].message == "2 diodes left out, not understood ('d1', 'd2')"

    def test_cards_that_share_a_name_are_told(self) -> None:
        text = "m1 a b 0 0 nch w=1u l=1u\nM1 a c 0 0 nch w=1u l=1u"
        devices = block(text)
        assert len(devices) == 2
        assert [(n.code, n.names) for n in devices.notices] == [("duplicate-name", ("m1",))]


def test_the_same_definition_twice_is_one() -> None:
    netlist = read_bytes(f"* t{INVERTER}{INVERTER}".encode(), "t.sp", Path())
    assert netlist.notices == ()
    assert len(elaborate(netlist)) == 2


def test_of_two_different_definitions_the_later_counts() -> None:
    other = ".SUBCKT inv a y\nm1 y a 0 0 nch w=9u l=1u\n.ends\n"
    netlist = read_bytes(f"* t{INVERTER}{other}".encode(), "t.sp", Path())
    assert microns(elaborate(netlist)) == [9]
    assert [(n.code, n.place) for n in netlist.notices] == [("duplicate-subcircuit", "t.sp:6:9")]
    assert "t.sp:2:9" in netlist.notices[0].message


def test_names_of_all_nets_at_once_are_those_one_by_one() -> None:
    text = [
        *(".global VDD!", ".subckt inv a Y", "m1 Y a VDD! VDD! pch w=1u l=1u"),
        *(
            "m2 Y a n.Gnd 0 nch w=1u l=1u",
            ".ends",
            "x:1 in Mid inv",
            "x2 MID out inv",
            "r1 mid m2 1",
        ),
    ]
    names = elaborate(read_bytes("\n".join(["* t", *text, ""]).encode(), "t.sp", Path())).net_names
    assert list(names) == [names[net] for net in range(len(names))] == list(names[:])
    texts, place = endings(names)
    assert [texts[i] for i in place] == [name.rpartition(".")[2].lower() for name in names]
    assert [texts[i] for i in place] == [
        endings(list(names))[0][i] for i in endings(list(names))[1]
    ]
