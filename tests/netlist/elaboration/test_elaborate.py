"""Cards to columns: parameters, hierarchy, wrapped transistors, resistors, supplies."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from evenstage.brief import Brief
from evenstage.errors import ElaborationError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.elaboration.nets import endings
from evenstage.netlist.reading.read import read_bytes
from evenstage.pattern import Pattern
from evenstage.process.generic import generic

if TYPE_CHECKING:
    from evenstage.netlist.devices import Devices
    from evenstage.process.process import Process

INVERTER = """
.subckt inv a y vdd vss wn=1u wp='2*wn'
mn y a vss vss nch w=wn l=0.1u
mp y a vdd vdd pch w=wp l=0.1u
.ends
"""


def block(text: str, top: str | None = None, process: Process | None = None) -> Devices:
    """Elaborate a text that has no title."""
    return elaborate(read_bytes(f"* t\n{text}".encode(), "t.sp", Path()), top, process)


def pins(devices: Devices) -> list[tuple[str, str, str, str]]:
    """Return the net names of each transistor: drain, gate, source, bulk."""
    columns = (devices.drain, devices.gate, devices.source, devices.bulk)
    names = devices.net_names
    return [(names[d], names[g], names[s], names[b]) for d, g, s, b in zip(*columns, strict=True)]


def paths(devices: Devices) -> list[str]:
    """Return the name of each transistor's card with its instance path."""
    rows = zip(devices.card.tolist(), devices.instance.tolist(), strict=True)
    return [devices.card_path(card, instance) for card, instance in rows]


def microns(devices: Devices) -> list[float]:
    return [round(width * 1e6, 9) for width in devices.width.tolist()]


class TestParameters:
    def test_defaults_use_their_siblings(self) -> None:
        assert microns(block(INVERTER)) == [1, 2]

    def test_a_caller_overrides_a_default_and_siblings_follow(self) -> None:
        text = ".subckt top a b v g\nx1 a b v g inv wn=3u\nx2 a b v g inv wp=5u\n.ends"
        assert microns(block(INVERTER + text)) == [3, 6, 1, 5]

    def test_a_value_is_worked_out_where_the_caller_stands(self) -> None:
        text = """.param wn=7u
.subckt top a b v g wn=4u
x1 a b v g inv wn='wn/2'
.ends"""
        assert microns(block(INVERTER + text)) == [2, 4]

    def test_globals_are_seen_inside_and_masked_by_the_subcircuits_own(self) -> None:
        text = """.param k=2 w0=1u
.subckt t d g s b k=3
.param w1='k*w0'
m1 d g s b nch w=w1 l=0.1u
m2 d g s b nch w='k*w0' l=0.1u
m3 d g s b nch w={w0} l=0.1u
.ends"""
        assert microns(block(text)) == [3, 3, 1]

    def test_a_default_that_names_itself_takes_the_global(self) -> None:
        text = ".param w=3u\n.subckt t d g s b w=w\nm1 d g s b nch w=w l=0.1u\n.ends"
        assert microns(block(text)) == [3]

    def test_a_later_assignment_counts(self) -> None:
        assert microns(block(".param w=1u\nm1 a b c 0 nch w=w l=1u\n.param w=2u")) == [2]

    def test_params_keyword_and_order_of_definition_do_not_matter(self) -> None:
        inner = ".subckt inv2 a y v g params: wn=1u\nmn y a g g nch w=wn l=1u\n.ends"
        text = f"x1 a b v g inv2 params: wn=2u\n{inner}"
        assert microns(block(text)) == [2]

    def test_a_chain_of_five_hundred_parameters(self) -> None:
        chain = "\n".join(f".param p{i}='p{i - 1}+0.01u'" for i in range(1, 500))
        text = f".param p0=1u\n{chain}\nm1 a b c 0 nch w=p499 l=1u"
        assert microns(block(text)) == [5.99]


class TestMultipliers:
    def test_of_card_and_of_all_enclosing_instances(self) -> None:
        text = """.param two=2
.subckt leaf a y v g
m1 y a g g nch w=1u l=0.1u m='two+1'
c1 y g 1f m=2
.ends
.subckt mid a y v g
x1 a y v g leaf m=5
.ends
x1 a y v 0 mid m=two
x2 a y v 0 mid"""
        devices = block(text)
        assert devices.multiplier.tolist() == [30, 15]
        assert devices.capacitance.tolist() == pytest.approx([20e-15, 10e-15], rel=1e-12)

    def test_m_that_the_subcircuit_declares_and_uses_is_its_own_affair(self) -> None:
        text = ".subckt t d g s b m=1\nm1 d g s b nch w='m*1u' l=1u\n.ends\nx1 a b c 0 t m=4"
        devices = block(text)
        assert (microns(devices), devices.multiplier.tolist()) == ([4], [1])

    def test_m_that_the_subcircuit_declares_but_ignores_multiplies(self) -> None:
        text = ".subckt t d g s b m=1\nm1 d g s b nch w=1u l=1u\n.ends\nx1 a b c 0 t m=4"
        assert block(text).multiplier.tolist() == [4]

    def test_mult_beside_m(self) -> None:
        assert block("m1 a b c 0 nch w=1u l=1u m=3 mult=1").multiplier.tolist() == [3]


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


class TestWrappedTransistors:
    WRAPPER = ".subckt nwrap d s g b w=1u l=0.1u\nm1 s g d b nch w=w l=l nf=2\n.ends\n"

    def test_a_call_nobody_defines(self) -> None:
        devices = block(
            "XM1 d g s b my_nfet_lv w=2u l=0.1u nf=2 m=3 ad=1p sa=0.1 topography=normal"
        )
        assert pins(devices) == [("d", "g", "s", "b")]
        assert paths(devices) == ["XM1"]
        assert (microns(devices), devices.multiplier.tolist()) == ([2], [3])
        assert devices.models[0].name == "my_nfet_lv"
        assert devices.models[0].polarity == "n"

    def test_a_wrapper_that_passes_its_width_on_is_the_callers_card(self) -> None:
        devices = block(self.WRAPPER + ".subckt t a b c e\nx1 a b c e nwrap w=3u m=2\n.ends", "t")
        assert paths(devices) == ["x1"]
        assert pins(devices) == [("b", "c", "a", "e")]
        assert (microns(devices), devices.multiplier.tolist()) == ([3], [2])
        assert len(devices.instance_parent) == 1

    def test_a_wrapper_whose_width_is_its_own_is_an_instance(self) -> None:
        devices = block(self.WRAPPER + ".subckt t a b c e\nx1 a b c e nwrap\n.ends", "t")
        assert paths(devices) == ["x1.m1"]
        assert len(devices.instance_parent) == 2

    def test_a_wrapper_of_a_wrapper(self) -> None:
        outer = ".subckt outer d s g b w=1u\nx0 s d g b nwrap w='w*2'\n.ends\n"
        devices = block(self.WRAPPER + outer + "x1 a b c e outer w=3u")
        assert (paths(devices), microns(devices)) == (["x1"], [6])
        assert pins(devices) == [("a", "c", "b", "e")]

    @pytest.mark.parametrize("inside", ["m1 d g s b nch w=w l=l", "x1 d g s b nch w=w l=l"])
    def test_a_wrapper_named_like_what_it_wraps(self, inside: str) -> None:
        text = f".subckt nch d g s b w=1u l=0.1u\n{inside}\n.ends\n"
        devices = block(text + ".subckt t a b c e\nx1 a b c e nch w=3u\n.ends", "t")
        assert (paths(devices), microns(devices)) == (["x1"], [3])

    def test_a_wrapper_known_to_the_process_by_its_own_name_only(self) -> None:
        known = generic()
        zz = replace(known.first("p"), models=(Pattern("zz*"),))
        process = replace(known, transistors=(zz, known.first("n")))
        text = (
            ".subckt zzwrap d g s b w=1u\nm1 d g s b inner w=w l=1u\n.ends\nx1 a b c e zzwrap w=2u"
        )
        assert [model.polarity for model in block(text, None, process).models] == ["p"]

    def test_other_things_drawn_as_calls_are_left_out_with_a_notice(self) -> None:
        devices = block(
            INVERTER + ".subckt t a b v g\nx1 a b v g inv\nxd g a zdio w=1u l=1u\n.ends"
        )
        assert len(devices) == 2
        assert [(n.code, n.names) for n in devices.notices] == [("not-understood", ("t.xd",))]


class TestPolarity:
    @pytest.mark.parametrize(
        ("model", "card", "bulk", "polarity"),
        [
            ("nch", "", "x", "n"),
            ("p", "", "x", "p"),
            ("modp", "", "x", "p"),
            ("zork", ".model zork pmos level=54", "vss", "p"),
            ("zork", "", "vss", "n"),
            ("zork", "", "VDD!", "p"),
            ("zork", "", "0", "n"),
        ],
    )
    def test_card_name_or_bulk_tell(self, model: str, card: str, bulk: str, polarity: str) -> None:
        devices = block(f"{card}\nm1 a b c {bulk} {model} w=1u l=0.1u")
        assert [m.polarity for m in devices.models] == [polarity]

    def test_an_assumption_is_told(self) -> None:
        notices = block("m1 a b c vss zork w=1u l=0.1u").notices
        assert [(n.code, n.names) for n in notices] == [("type-assumed", ("zork",))]


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


def test_a_parameter_that_does_not_converge_is_the_callers_error() -> None:
    with pytest.raises(ElaborationError) as caught:
        block(INVERTER + "x1 a b c d inv wn='1u/0'")
    assert caught.value.code == "bad-expression"
    assert caught.value.span is not None
    assert caught.value.span.text == "'1u/0'"


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
