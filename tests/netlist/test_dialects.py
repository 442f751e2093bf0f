"""Every habit that netlists in the wild have: read, or refused with one clear message.

One class for each section of our list of habits, one test or more for each habit; the docstring
says which habit it is.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from evenstage.errors import EvenstageError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read, read_bytes
from evenstage.netlist.rewriting.edits import Edit, rewrite
from evenstage.pattern import Pattern
from support.sized import process

if TYPE_CHECKING:
    from evenstage.netlist.devices import Devices
    from evenstage.netlist.netlist import Card, Netlist

INV = """.subckt inv a y vdd vss
mn y a vss vss nch w=1u l=0.1u
mp y a vdd vdd pch w=2u l=0.1u
.ends
"""
TAIL = "w=1u l=0.1u"


def text_of(text: str | bytes) -> Netlist:
    """Read a netlist that begins after a comment line."""
    data = text if isinstance(text, bytes) else text.encode()
    return read_bytes(b"* t\n" + data, "top.sp", Path("absent"))


def laid(text: str | bytes, top: str | None = None) -> Devices:
    return elaborate(text_of(text), top)


def only_card(text: str) -> Card:
    netlist = text_of(text)
    assert len(netlist) == 1
    return netlist.card(0)


def refusal(text: str | bytes) -> str:
    """Return the first line of what is said to a netlist."""
    with pytest.raises(EvenstageError) as caught:
        laid(text)
    return str(caught.value).split("\n", maxsplit=1)[0]


def codes(devices: Devices) -> set[str]:
    return {notice.code for notice in (*devices.notices, *devices.netlist.notices)}


def microns(devices: Devices) -> list[float]:
    return [round(width * 1e6, 9) for width in devices.width.tolist()]


class TestText:
    @pytest.mark.parametrize(
        "joint", ["\n+ ", "\n+", "\n  +   ", "\n* note\n+ ", "\n\n+\t", "\n//n\n+"]
    )
    @pytest.mark.parametrize("place", [1, 6, 9])
    def test_continuations(self, joint: str, place: int) -> None:
        """A plus goes on with the card before, between a name and its value too, over comments."""
        words = ["m1", " ", "d g", " ", "s b nch", " ", "w", "=", "1u", " ", "l=0.1u"]
        words[place] = joint if words[place] == " " else words[place] + joint
        card = only_card("".join(words))
        assert (card.nodes, card.target) == (("d", "g", "s", "b"), "nch")
        assert [(p.name, p.text) for p in card.parameters] == [("w", "1u"), ("l", "0.1u")]

    def test_a_directive_in_a_comment_has_continuations_of_its_own(self) -> None:
        """A comment that begins with a star, a dot and a word is itself continued."""
        assert only_card(f"m1 d g s b nch {TAIL}\n*.GLOBAL gnd!\n+ vdd!\n").span.text.endswith("u")

    @pytest.mark.parametrize(
        "remark",
        [
            " $X=0.1 $Y=2 $D=1",
            " $T=320 -12800 0 0",
            " ; text",
            "\t$",
            " $it's",
            " // text",
            " $ w=9",
        ],
    )
    def test_trailing_remarks(self, remark: str) -> None:
        """A dollar, a semicolon or two slashes end a card where they stand at a blank."""
        devices = laid(f"m1 d g s b nch {TAIL}{remark}\n.END{remark}\n")
        assert microns(devices) == [1.0]

    @pytest.mark.parametrize("name", ["a$b", "a;b", "n$1", "a//b"])
    def test_signs_inside_a_name_begin_no_remark(self, name: str) -> None:
        """Elsewhere than at a blank they belong to the word."""
        assert only_card(f"m1 {name} g s b nch {TAIL}\n").nodes[0] == name

    def test_a_remark_behind_the_end_of_a_definition(self) -> None:
        """Remarks stand behind dot cards too."""
        assert list(text_of(".SUBCKT write a b\n.ENDS $ write\n").subcircuits) == ["write"]

    def test_comments_that_say_something(self) -> None:
        """Directions of pins, scales and globals in comments are comments to us."""
        text = "*.PININFO A:I Z:O VDD:P A:I\n*.SCALE METER\n*.GLOBAL vdd\n* y = !(a & b)\n"
        netlist = text_of(text + INV)
        assert (netlist.global_names, netlist.notices, len(netlist)) == ((), (), 2)

    @pytest.mark.parametrize(
        ("first", "cards"),
        [
            ("Decoder with 64 rows", 2),
            ("m1 d g s b nch w=1u l=1u", 3),
            (".global vdd", 2),
            ("* a comment", 2),
            ("// a comment", 2),
            ("$ a comment", 2),
            ("R1 a b 1k", 3),
            ("", 2),
        ],
    )
    def test_title(self, first: str, cards: int) -> None:
        """The first line of the main file is a title unless it is plainly something else."""
        netlist = read_bytes(f"{first}\n{INV}".encode(), "top.sp", Path())
        assert (len(netlist), netlist.notices) == (cards, ())

    def test_a_title_that_could_be_a_card_is_reported(self) -> None:
        """Where the first line could be either, the title wins and a notice says so."""
        netlist = read_bytes(f"m1 a b c d nch\n{INV}".encode(), "top.sp", Path())
        assert [notice.code for notice in netlist.notices] == ["title"]
        commented = read_bytes(f"*\nm1 a b c d nch\n{INV}".encode(), "top.sp", Path())
        assert len(commented) == 3

    @pytest.mark.parametrize("line", ["m1 a b c d nch", "R1 a b 1k", ".global vdd"])
    def test_what_the_first_line_is_can_be_set(self, line: str) -> None:
        """The brief can say that it is a title, or that it is a card, whatever it looks like."""
        data = f"{line}\n{INV}".encode()
        title = read_bytes(data, "top.sp", Path(), None, "title")
        assert (len(title), title.global_names, title.notices) == (2, (), ())
        card = read_bytes(data, "top.sp", Path(), None, "card")
        found = len(card) == 3 or card.global_names == ("vdd",)
        assert (found, card.notices) == (True, ())

    @pytest.mark.parametrize("change", ["\r\n", "\r", "\t\n", "   \n", "\n\n"])
    def test_line_ends_and_trailing_blanks(self, change: str) -> None:
        """Any line end, tabs and trailing blanks are read, and written back untouched."""
        data = f"* t\n{INV}".replace("\n", change).encode()
        netlist = read_bytes(data, "top.sp", Path())
        assert microns(elaborate(netlist)) == [1.0, 2.0]
        assert rewrite(netlist, [Edit(netlist.card(0).parameters[0].span, b"1u")]) == {}

    @pytest.mark.parametrize("wrap", ["\ufeff* t\n%s", "* caf\u00e9\n%s", "* t\n%s\n.end"])
    def test_marks_accents_and_a_missing_last_line_end(self, wrap: str) -> None:
        """Byte-order marks, odd bytes in comments and a last line without an end are read."""
        for encoding in ("utf-8", "latin-1"):
            data = (wrap % INV).encode(encoding, "ignore").rstrip(b"\n")
            assert len(read_bytes(data, "top.sp", Path())) == 2

    def test_bytes_that_are_not_utf8_stand_in_names(self) -> None:
        """A net's name may be any bytes."""
        netlist = text_of(b"m1 d\xe9 g s b nch w=1u l=1u\n")
        assert netlist.card(0).nodes[0].encode("utf-8", "surrogateescape") == b"d\xe9"

    @pytest.mark.parametrize(
        "text",
        [
            "(edif top\n  (status x))\n",
            "simulator lang=other\nm1 (d g s b) nch w=1\n",
            "subckt inv a y\nm1 (y a 0 0) nch w=1\nends inv\n",
            "parameters w=1u\nm1 (d g s b) nch w=w\n",
            "module inv (a, y);\nendmodule\n",
            "library (cells) {\n}\n",
            "<?xml version='1'?>\n",
            'ahdl_include "x.va"\n',
        ],
    )
    def test_other_languages(self, text: str) -> None:
        """Other languages behind the same ending get one clear message."""
        assert refusal(text).endswith("this does not look like a SPICE netlist (other-language)")

    @pytest.mark.parametrize(
        "name",
        [
            *(
                "a#1",
                "a%b",
                "a/b",
                "/a",
                "a[0]",
                "a<3>",
                "gnd!",
                "a.b",
                "a\\b",
                "net:1",
                "a@b",
                "a-b",
            ),
            *("12", "#", "n_net_m1_d", "a+b", "!a", "-a", "[0]", "<3>", "#vdd#", "a:b:c"),
        ],
    )
    def test_names(self, name: str) -> None:
        """Nets and instances have all kinds of signs in their names, or are numbers."""
        card = only_card(f"m1{name} {name} {name} {name} {name} nch {TAIL}\n")
        assert (card.name, card.nodes) == (f"m1{name}", (name,) * 4)
        assert only_card(f"x1{name} {name} {name} inv\n").nodes == (name, name)

    def test_names_in_any_case(self) -> None:
        """Case makes no difference in names, keywords and values."""
        text = INV.upper().replace("MN", "Mn") + "X1 A b VDD vss InV\nx2 a B vdd VSS inv\n"
        devices = laid(text)
        assert len(set(devices.gate.tolist())) == 1
        assert microns(devices) == [1.0, 2.0, 1.0, 2.0]

    CASES = f"m1 Q a 0 0 nch {TAIL}\nm2 q b 0 0 nch {TAIL}\nm3 q Q 0 0 nch {TAIL}\n"

    def test_nets_that_differ_by_case_alone_are_one_net_and_said(self) -> None:
        """Case makes no difference in names of nets; where that joins nets a notice says so."""
        devices = laid(self.CASES)
        assert len({*devices.drain.tolist(), int(devices.gate[2])}) == 1
        (said,) = [n for n in devices.netlist.notices if n.code == "case-of-nets"]
        assert said.message == (
            "nets whose names differ by case alone are one net: 'Q' and 'q'; "
            'case = "exact" in the brief keeps them apart'
        )
        assert said.place == "top.sp:3:1"

    def test_nets_that_differ_by_case_far_below_are_said(self) -> None:
        """A first look that finds too few to show is followed by a longer one."""
        between = "* nothing\n" * 10_000
        devices = laid(f"m1 P p 0 0 nch {TAIL}\n{between}{self.CASES.replace('m', 'mm')}")
        (said,) = [n for n in devices.netlist.notices if n.code == "case-of-nets"]
        assert said.names == ("'P' and 'p'", "'Q' and 'q'")

    def test_spellings_of_a_net_in_several_subcircuits_are_no_matter(self) -> None:
        """Nets of different subcircuits may be spelt as they like."""
        other = INV.upper().replace("INV", "BUF")
        assert "case-of-nets" not in codes(laid(f"{INV}{other}x1 a b c d inv\nx2 a b c d buf\n"))

    def test_case_can_be_made_to_count(self) -> None:
        """The brief can say that case counts."""
        netlist = read_bytes(f"* t\n{self.CASES}".encode(), "top.sp", Path(), "exact")
        devices = elaborate(netlist)
        names = [devices.net_names[int(net)] for net in (*devices.drain, devices.gate[2])]
        assert names == ["Q", "q", "q", "Q"]
        assert devices.drain[0] == devices.gate[2] != devices.drain[1] == devices.drain[2]
        assert "case-of-nets" not in codes(devices)

    EXACT = (
        f".subckt buf A a VDD vdd\nm1 A a vdd vdd nch {TAIL}\nm2 A a VDD VDD pch {TAIL}\n.ends\n"
        ".global G g\nx1 o i V v buf\nx2 O I V v buf\nm1 G g v V nch w=1u l=1u\n"
    )

    def test_ports_that_differ_by_case_alone_say_that_case_counts(self) -> None:
        """Two such ports would be one net otherwise, so case counts, with a notice."""
        devices = laid(self.EXACT)
        names = devices.net_names
        assert [names[int(n)] for n in devices.drain] == ["G", "o", "o", "O", "O"]
        assert [names[int(n)] for n in devices.gate] == ["g", "i", "i", "I", "I"]
        assert [names[int(n)] for n in devices.source] == ["v", "v", "V", "v", "V"]
        assert {names[n] for n in devices.global_nets} >= {"G", "g"}
        assert "case-of-nets" in codes(devices)

    def test_case_can_be_made_not_to_count(self) -> None:
        """If the brief says that case does not count, such ports are refused."""
        with pytest.raises(EvenstageError) as caught:
            read_bytes(f"* t\n{self.EXACT}".encode(), "top.sp", Path(), "any")
        assert str(caught.value).startswith(
            "top.sp:2:15: a port 'a' stands here twice, for 'case' is \"any\" in the brief"
        )

    def test_slash_before_the_subcircuit(self) -> None:
        """A slash may stand between the nets and the name of the subcircuit."""
        card = only_card("XI1 a b VDD VSS / NOR3 $T=0 0\n")
        assert (card.nodes, card.target) == (("a", "b", "VDD", "VSS"), "NOR3")

    @pytest.mark.parametrize("nodes", ["(d g s b)", "( d g s b )", "(d g\n+ s b)", "(d,g,s,b)"])
    def test_nets_in_brackets(self, nodes: str) -> None:
        """Nets may stand in brackets."""
        assert only_card(f"m1 {nodes} nch {TAIL}\n").nodes == ("d", "g", "s", "b")
        assert only_card(f"x1 {nodes} inv\n").target == "inv"
        assert only_card(f"x1 {nodes} / inv w=1\n").nodes == ("d", "g", "s", "b")
        value = only_card("r1 (a b) 1k\n").value
        assert value is not None
        assert value.text == "1k"

    @pytest.mark.parametrize("end", [".ends", ".ENDS inv", ".ends INV $ x"])
    def test_ends_bare_or_named(self, end: str) -> None:
        """The end of a definition may repeat its name."""
        assert list(text_of(INV.replace(".ends", end)).subcircuits) == ["inv"]

    def test_called_before_it_is_defined(self) -> None:
        """A subcircuit may be called above its definition."""
        assert len(laid("x1 a b vdd vss inv\n" + INV)) == 2

    def test_defined_twice(self) -> None:
        """Of two definitions of one name with other content the later counts, with a notice."""
        devices = laid(INV + INV.replace("w=1u", "w=3u") + "x1 a b c d inv\n")
        assert microns(devices) == [3.0, 2.0]
        assert "duplicate-subcircuit" in codes(devices)
        assert "duplicate-subcircuit" not in codes(laid(INV + INV + "x1 a b c d inv\n"))

    def test_names_that_differ_by_case_alone(self) -> None:
        """Where two different definitions differ in name by case alone, case counts for them."""
        text = INV + INV.replace("inv", "INV").replace("w=1u", "w=5u")
        devices = laid(f"{text}x1 a b c d inv\nx2 a b c d INV\nx3 a b c d Inv\n")
        assert microns(devices) == [1.0, 2.0, 5.0, 2.0, 5.0, 2.0]
        assert [(n.code, n.names) for n in devices.netlist.notices] == [
            ("case-counts", ("INV", "inv"))
        ]
        assert laid(text, "INV").top == "INV'"
        assert len(text_of(INV + INV.replace("inv", "INV")).subcircuits) == 1

    NESTED = (
        ".subckt outer a y\n.subckt inv a y\nm1 y a 0 0 nch w=7u l=1u\n.ends inv\n"
        "x1 a y inv\n.subckt deep a y\nx1 a y inv\n.ends deep\nx2 a y deep\n.ends outer\n"
    )

    def test_a_definition_inside_another_is_known_there_first(self) -> None:
        """Of two definitions of one name the one around the call counts."""
        text = f"{INV}{self.NESTED}x1 a y outer\nx2 a b c d inv\n"
        devices = laid(text)
        assert microns(devices) == [7.0, 7.0, 1.0, 2.0]
        assert set(devices.netlist.subcircuits) == {"inv", "outer", "outer.inv", "deep"}
        assert devices.netlist.notices == ()

    def test_a_definition_inside_another_is_found_elsewhere_if_it_is_the_only_one(self) -> None:
        """A nested definition whose name nothing else has is known everywhere."""
        devices = laid(self.NESTED + "x1 a b inv\n")
        assert (microns(devices), devices.subcircuits) == ([7.0], ("", "inv"))

    def test_an_end_without_a_name_ends_the_innermost_definition(self) -> None:
        """Inside another definition a bare end is reported, with how to say otherwise."""
        netlist = text_of(self.NESTED.replace(".ends inv", ".ends"))
        assert set(netlist.subcircuits) == {"inv", "deep", "outer"}
        assert [notice.code for notice in netlist.notices] == ["bare-ends"]

    def test_devices_of_one_name(self) -> None:
        """Two devices of one name are two devices, with a notice."""
        devices = laid(f"m1 a b 0 0 nch {TAIL}\nM1 c b 0 0 nch {TAIL}\n")
        assert (len(devices), "duplicate-name" in codes(devices)) == (2, True)

    def test_the_same_net_on_several_pins(self) -> None:
        """A net may stand on several pins of a call or a device."""
        devices = laid(INV + "x1 a a vdd vdd inv\n")
        assert devices.gate.tolist() == devices.drain.tolist()

    def test_a_port_twice_is_refused(self) -> None:
        """Two ports of one name would join nets of the caller."""
        assert "'s' has two ports named 'VSS' (duplicate-port)" in refusal(
            ".subckt s a VSS VSS\n.ends\n"
        )

    def test_files_beside_the_file_that_includes_them(self, tmp_path: Path) -> None:
        """Includes are relative to the file they stand in, inside subcircuits too."""
        (tmp_path / "lib").mkdir()
        (tmp_path / "lib" / "cells.sp").write_text(".inc 'inv.sp'\n")
        (tmp_path / "lib" / "inv.sp").write_text(INV)
        (tmp_path / "lib" / "all.lib").write_text(".lib tt\n.include cells.sp\n.endl tt\n")
        (tmp_path / "body.sp").write_text("x1 a b c d inv\n")
        top = "* t\n.lib 'lib/all.lib' TT\n.subckt top a b c d\n.include \"body.sp\"\n.ends\n"
        (tmp_path / "top.sp").write_text(top)
        assert len(elaborate(read(tmp_path / "top.sp"))) == 2

    @pytest.mark.parametrize("params", [" ", " params: ", " PARAMS: ", "\n+ params:\n+ "])
    def test_defaults(self, params: str) -> None:
        """Defaults of a subcircuit stand with or without a word before them."""
        text = f".subckt s a b{params}w=1u k='2*w'\nm1 a b 0 0 nch w=k l=1u\n.ends\n"
        assert microns(laid(f"{text}x1 a b s\nx2 a b s{params}w=2u\nx3 a b s k=9u\n")) == [2, 4, 9]

    def test_parameters_inside_and_outside(self) -> None:
        """Inside a subcircuit a parameter masks that of the top level."""
        text = ".param w=1u\n.subckt s a b\n.param w=2u\nm1 a b 0 0 nch w=w l=1u\n.ends\n"
        assert microns(laid(f"{text}x1 a b s\nm2 a b 0 0 nch w=w l=1u\n")) == [1.0, 2.0]

    @pytest.mark.parametrize("quotes", ["''", "{}", '""'])
    def test_expressions(self, quotes: str) -> None:
        """Expressions stand in quotes or braces and use parameters beside them."""
        area = f"{quotes[0]}int((nf+1)/2)*w/nf*0.29u{quotes[1]}"
        text = (
            f".subckt s a b w=4u nf=2\nm1 a b 0 0 nch w=w l=1u nf=nf ad={area}\n.ends\nx1 a b s\n"
        )
        assert laid(text).drain_area.tolist() == pytest.approx([0.58e-12], rel=1e-9)

    def test_quoted_numbers_and_multipliers_that_are_expressions(self) -> None:
        """A plain number may stand in quotes; a multiplier may be computed."""
        text = f"{INV}.param k=2\nm1 a b 0 0 nch w='1u' l='50n' m='k*3'\nx1 a b c d inv m={{k}}\n"
        assert laid(text).multiplier.tolist() == [6.0, 2.0, 2.0]

    def test_test_benches_are_kept_and_said_once(self) -> None:
        """What surrounds a design for simulation is kept, not understood, and said once."""
        text = (
            f"{INV}x1 a b vdd vss inv\nvdd vdd 0 1.2\n.tran 1n 10n\n"
            ".measure tran x trig v(a) val=1\n.measure tran y trig v(b) val=1\n"
            ".option post=2 accurate\n.control\nm1 not a card\n.endc\n"
            ".temp 25\n.ic v(a)=0\n.probe v(*)\n.alter\nm2 nor this\n.end\n"
        )
        notices = [n for n in text_of(text).notices if n.code == "not-understood"]
        assert {n.names[0] for n in notices} == {
            *(".tran", ".measure", ".control", ".temp", ".ic", ".probe", ".alter"),
        }
        assert len(laid(text)) == 2


class TestConditionsAndFunctions:
    """Habits beyond the list: parts under a condition, functions of the netlist's own."""

    TEXT = (
        ".param corner=%s\n.if (corner==1)\nm1 a b 0 0 nch w=1u l=1u\n.elseif corner==2 $ slow\n"
        ".if (corner>9)\nbroken (\n.else\nm1 a b 0 0 nch w=2u l=1u\n.endif\n.else\n.subckt s a\n"
        ".ends\nm1 a b 0 0 nch w=3u l=1u\n.endif\nm2 a b 0 0 nch w=9u l=1u\n"
    )

    @pytest.mark.parametrize("corner", [1, 2, 3])
    def test_parts_under_a_condition(self, corner: int) -> None:
        """Only the part whose condition holds is read."""
        assert microns(laid(self.TEXT % corner)) == [corner, 9.0]

    @pytest.mark.parametrize(
        "definition",
        [
            ".func grow(x,y) {x*y+off}",
            ".func grow(x,y) 'x*y+off'",
            ".FUNC Grow(X, Y) = 'x*y+off'",
            ".param k=1 grow(x,y)='x*y+off' j=2",
            ".func grow(x, y)\n+ {x*y +\n+ off}",
        ],
    )
    def test_functions(self, definition: str) -> None:
        """A netlist may define functions; other names in them are those of the top level."""
        text = f".param off=1u\n{definition}\n.subckt s a b off=5u\nm1 a b 0 0 nch w='grow(off,2)'"
        assert microns(laid(f"{text} l=1u\n.ends\nx1 a b s\n")) == [11.0]

    def test_a_function_that_is_there_already(self) -> None:
        """A function known anyway keeps its meaning, with a notice."""
        netlist = text_of(".func max(x,y) {1}\nm1 a b 0 0 nch w='max(1,3)' l=1u\n")
        assert [n.code for n in netlist.notices] == ["function-kept"]


class TestDevices:
    def test_undefined_subcircuits_that_are_transistors(self) -> None:
        """A call of something undefined that the process knows, with w and l, is a transistor."""
        kit = process(models=(Pattern("xx_nfet*"),))
        netlist = text_of("x1 d g s b xx_nfet_01v8 w=0.65 l=0.15\n")
        devices = elaborate(netlist, None, kit)
        assert (microns(devices), devices.models[0].name) == ([0.65], "xx_nfet_01v8")

    @pytest.mark.parametrize(
        ("name", "ports"), [("nmos1", "d g s b"), ("nmos1", "d s g b"), ("nch", "b s g d")]
    )
    def test_wrappers(self, name: str, ports: str) -> None:
        """A definition around one transistor is one, ports permuted, or named like its model."""
        text = f".subckt {name} {ports} w=1u l=1u\nm0 d g s b nch w=w l=l\n.ends\n"
        devices = laid(f"{text}x1 {ports.upper()} {name} w=3u\n")
        names = devices.net_names
        pins = (devices.drain, devices.gate, devices.source, devices.bulk)
        assert [names[int(pin[0])] for pin in pins] == ["D", "G", "S", "B"]
        assert microns(devices) == [3.0]

    def test_a_wrapper_with_a_net_of_its_own(self) -> None:
        """Where not all its nets are ports, a definition around one transistor is an instance."""
        text = ".subckt n3 d g s w=1u\nm0 d g s 0 nch w=w l=1u\n.ends\nx1 d g s n3 w=3u\n"
        devices = laid(text)
        assert (microns(devices), devices.card_path(int(devices.card[0]), 1)) == ([3.0], "x1.m0")

    def test_a_wrapper_around_a_call_of_its_own_name(self) -> None:
        """A wrapper that calls its own name means the model inside: it does not go on for ever."""
        text = ".subckt nfet d g s b w=1u l=1u\nx0 d g s b nfet w=w l=l\n.ends\n"
        assert microns(laid(f"{text}x1 d g s b nfet w=3u l=1u\n")) == [3.0]

    @pytest.mark.parametrize(
        ("names", "reason"),
        [
            (("nch", "pch"), "its name"),
            (("n", "p"), "its name"),
            (("nshort", "phighvt"), "its name"),
            (("modn", "modp"), "its bulk net"),
        ],
    )
    def test_model_names(self, names: tuple[str, str], reason: str) -> None:
        """What a model is follows from its name, else from the bulk net, and is said."""
        text = "".join(
            f"m{k} d g s {bulk} {name} {TAIL}\n"
            for k, (name, bulk) in enumerate(zip(names, ("vss", "vdd"), strict=True))
        )
        devices = elaborate(text_of(text), None, process(models=(Pattern("other"),)))
        assert [model.polarity for model in devices.models] == ["n", "p"]
        said = [n.message for n in devices.notices if n.code == "type-assumed"]
        assert [message.endswith(reason) for message in said] == [True, True]

    def test_the_model_card_comes_before_the_name(self) -> None:
        """The model card says the type, whatever the name."""
        text = f".model pfast nmos level=1\nm1 d g s vss pfast {TAIL}\n"
        assert [model.polarity for model in laid(text).models] == ["n"]

    LOCAL = (
        ".model sw nmos level=1 vto=0.5 kp=100u tox=4n\n"
        ".subckt a d g s b\n.model sw pmos level=1 vto=-0.5 kp=50u tox=4n\n"
        f"m1 d g s b sw {TAIL}\n.subckt deep d g s b\nm1 d g s b sw {TAIL}\n.ends deep\n"
        "x1 d g s b deep\n.ends a\n"
        f".subckt c d g s b\nm1 d g s b sw {TAIL}\n.ends\n"
    )

    def test_a_model_inside_a_subcircuit_is_known_there_alone(self) -> None:
        """A model card inside a subcircuit counts there and in what is defined inside it."""
        devices = laid(f"{self.LOCAL}x1 d g s b a\nx2 d g s b c\nm1 d g s b sw {TAIL}\n")
        polarity = [devices.models[k].polarity for k in devices.model.tolist()]
        assert polarity == ["n", "p", "p", "n"]
        assert {model.name for model in devices.models} == {"sw"}

    def test_a_model_inside_another_subcircuit_is_unknown(self) -> None:
        """A model that only another subcircuit holds says nothing about a card elsewhere."""
        text = f".subckt a d\n.model sw nmos\nm1 d d 0 0 sw {TAIL}\n.ends\nm1 d d x x sw {TAIL}\n"
        assert "no transistor type covers the model 'sw'" in refusal(text + "x1 d a\n")

    def test_a_process_file_covers_models_inside_subcircuits_by_their_own_name(self) -> None:
        """The process file says what a model is, wherever its card stands."""
        kit = process(models=(Pattern("sw"),))
        devices = elaborate(text_of(f"{self.LOCAL}x1 d g s b a\n"), None, kit)
        assert {model.type_index for model in devices.models} == {0}

    def test_a_bulk_on_the_wrong_rail(self) -> None:
        """The bulk net is only a second opinion."""
        assert [m.polarity for m in laid(f"m1 d g s vss pch {TAIL}\n").models] == ["p"]

    def test_drain_and_source_stand_as_written(self) -> None:
        """A rail may stand in the place of the drain."""
        devices = laid(f"m1 vss a y vss nch {TAIL}\n")
        assert devices.net_names[int(devices.drain[0])] == "vss"

    @pytest.mark.parametrize(
        ("width", "length", "meant"),
        [
            ("650000u", "150000u", 0.65),
            ("1.12e+06u", "150000u", 1.12),
            ("0.65", "0.15", 0.65),
            ("8.2e-07", "1.5e-07", 0.82),
            ("81.0n", "40n", 0.081),
            ("640.00n", "60n", 0.64),
            ("0.21U", "0.15U", 0.21),
            ("3.93um", "0.15um", 3.93),
            ("'0.5*1.3'", "0.15", 0.65),
            ("650", "150", 0.65),
        ],
    )
    def test_spellings_of_a_width(self, width: str, length: str, meant: float) -> None:
        """Widths come in metres, microns or nanometres; what makes sense is taken and said."""
        devices = laid(f"m1 d g s b nch w={width} l={length}\n")
        assert microns(devices) == pytest.approx([meant], rel=1e-9)

    def test_the_unit_that_was_taken_is_said_and_can_be_set(self) -> None:
        """A notice names the unit and how to set it; the process file overrules the guess."""
        text = "m1 d g s b nch w=0.65 l=0.15\n"
        (said,) = [n.message for n in laid(text).notices if n.code == "size-unit"]
        assert said.startswith("sizes of transistors given as numbers without a suffix are read in")
        assert said.endswith("width_unit in the process file overrules this")
        netlist = text_of(text)
        devices = elaborate(netlist, None, process(width_unit=2e-6))
        assert microns(devices) == [1.3]
        assert "size-unit" not in codes(devices)

    def test_integers_with_a_scale(self) -> None:
        """A scale option says what a bare number is worth."""
        assert microns(laid(".option scale=5n\nm1 d g s b nch w=130 l=30\n")) == [0.65]

    def test_no_width(self) -> None:
        """Without a width the option's default counts, else the card is refused."""
        assert microns(laid(".option defw=2u defl=1u\nm1 d g s b nch\n")) == [2.0]
        assert "'m1' has no width" in refusal("m1 d g s b nch l=1u\n")

    @pytest.mark.parametrize(
        ("size", "code", "read_as"),
        [
            ("w=1e-30 l=1u", "bad-width", "'1e-30', which is read as 1e-30 m"),
            ("w=1e30 l=1u", "bad-width", "'1e30', which is read as 1e+21 m"),
            ("w='1n*1n' l=1u", "bad-width", "''1n*1n'', which is read as 1e-18 m"),
            ("w=1u l=1e-15", "bad-length", "'1e-15', which is read as 1e-15 m"),
        ],
    )
    def test_sizes_that_cannot_be(self, size: str, code: str, read_as: str) -> None:
        """A size no transistor has is refused with how it was read and what sets the unit."""
        text = refusal(f"m1 d g s b nch {size}\n")
        assert f"must be between 0.2 nm and 1 km, got {read_as}; width_unit in" in text
        assert text.endswith(f"({code})")

    def test_a_unit_that_makes_no_sense(self) -> None:
        """A unit that was set and fits no card is seen from the first size it spoils."""
        text = refusal(".option scale=1e-20\nm1 d g s b nch w=1u l=1u\n")
        assert "got '1u', which is read as 1e-26 m" in text

    @pytest.mark.parametrize(
        ("card", "width", "copies", "fingers"),
        [
            ("w=4u m=2", 4.0, 2, 1),
            ("w=4u m=1 mult=1", 4.0, 1, 1),
            ("w=4u mult=3", 4.0, 3, 1),
            ("w=4u nf=2", 4.0, 1, 2),
            ("w=4u ng=2 m=1", 4.0, 1, 2),
        ],
    )
    def test_fingers_and_multipliers(
        self, card: str, width: float, copies: float, fingers: float
    ) -> None:
        """Multipliers multiply; a width is that of all fingers unless the process says other."""
        devices = laid(f"m1 d g s b nch {card} l=1u\n")
        assert microns(devices) == [width]
        assert (devices.multiplier[0], devices.fingers[0]) == (copies, fingers)

    def test_what_a_width_with_fingers_means_is_said_unless_the_process_says_it(self) -> None:
        """A notice tells what was taken and what overrules it."""
        text = "m1 d g s b nch w=4u nf=2 l=1u\n"
        (said,) = [n for n in laid(text).notices if n.code == "finger-width"]
        assert said.message == (
            "the width of cards with several fingers is taken as that of all fingers together; "
            "width_is in the process file overrules this"
        )
        assert said.place == "top.sp:2:1"
        told = elaborate(text_of(text), None, process(width_is_said=True))
        assert "finger-width" not in codes(told)
        assert "finger-width" not in codes(laid(text.replace("nf=2", "nf=1")))

    def test_both_multipliers_on_one_card_are_said(self) -> None:
        """Where both are more than one, both count, with a notice."""
        devices = laid("m1 d g s b nch w=4u m=2 mult=3 l=1u\n")
        assert devices.multiplier.tolist() == [6.0]
        assert "both-multipliers" in codes(devices)

    def test_the_width_of_a_finger_and_counts_of_fins(self) -> None:
        """The process says whether a width is of one finger, or counts fins."""
        netlist = text_of("m1 d g s b nch w=2u l=1u nf=3\n")
        assert microns(elaborate(netlist, None, process(width_is="finger"))) == [6.0]
        fins = process(width_is="fins", width_parameter="nfin", width_unit=50e-9)
        netlist = text_of("m1 d g s b nch nfin=4 l=1u\n")
        assert microns(elaborate(netlist, None, fins)) == [0.2]

    def test_fingers_drawn_as_cards(self) -> None:
        """Fingers drawn as parallel cards stay cards here; areas may stand on one of them only."""
        text = "m1 y a 0 0 nch w=1u l=1u ad=1p\nm1__2 y a 0 0 nch w=1u l=1u ad=0p\n"
        devices = laid(text)
        assert devices.drain_area.tolist() == pytest.approx([1e-12, 0.0], rel=1e-9)

    def test_foreign_parameters_are_kept(self) -> None:
        """Parameters we know nothing of stay where they are."""
        tail = "sa=1u sb=1u sd=0 nrd=0.1 nrs=0.1 area=2p perim=3u topography=normal ic=0,1,0.5"
        text = f"m1 d g s b nch w=1u l=1u {tail} off\n"
        netlist = text_of(text)
        after = rewrite(netlist, [Edit(netlist.card(0).parameters[0].span, b"2u")])
        assert list(after.values()) == [b"* t\n" + text.replace("w=1u", "w=2u").encode()]

    @pytest.mark.parametrize(
        "card", ["nch off w=1u l=1u", "nch w=1u OFF l=1u", "nch w=1u l=1u off"]
    )
    def test_a_word_that_stands_alone(self, card: str) -> None:
        """The word that starts a device switched off may stand among the parameters."""
        assert microns(laid(f"m1 d g s b {card}\n")) == [1.0]

    def test_odd_devices(self) -> None:
        """Decoupling and dummy devices, diodes of transistors, tie-offs, open ports are read."""
        text = (
            f"m1 0 vdd 0 0 nch {TAIL}\nm2 a a 0 0 nch {TAIL}\nm3 b c b 0 nch {TAIL}\n"
            "d1 0 a dn area=1p\nr1 vdd tie 0\n" + INV + "x1 a open vdd 0 inv\n"
        )
        devices = laid(text)
        assert len(devices) == 5
        assert "1 diode left out, not understood ('d1')" in {n.message for n in devices.notices}

    @pytest.mark.parametrize(
        "card",
        ["m1 d g s nch", "m1 g nch", "m1 (d g s) nch", "m1 a b c d e f g h nch"],
    )
    def test_a_net_missing_or_too_many(self, card: str) -> None:
        """A card with a net missing, or with more than any kit has, is refused with its line."""
        text = refusal(f"{card} {TAIL}\n")
        assert text.startswith("top.sp:2:")
        assert "'m1' needs four nets (drain, gate, source, bulk) and a model, got" in text

    @pytest.mark.parametrize("pins", ["d g s e b", "d g s e p b", "d g s e p b t", "(d g s e b)"])
    @pytest.mark.parametrize("tail", ["nch w=1u l=1u", "nch off w=1u l=1u", "nch\n+ w = 1u l=1u"])
    def test_transistors_with_further_pins(self, pins: str, tail: str) -> None:
        """Of more than four nets the first four are the usual ones; the others load nothing."""
        devices = laid("".join(f"m{k} {pins} {tail}\n" for k in range(5)))
        names = devices.net_names
        found = (devices.drain, devices.gate, devices.source, devices.bulk)
        assert [names[int(pin[4])] for pin in found] == ["d", "g", "s", "e"]
        assert microns(devices) == [1.0] * 5
        (said,) = [n for n in devices.notices if n.code == "further-pins"]
        assert said.message.startswith("5 transistors with more than four nets: the first four")
        assert (said.place, len(said.names)) == ("top.sp:2:1", 5)

    def test_wrapped_transistors_with_further_pins(self) -> None:
        """Calls of transistors that nobody defines may have further pins too."""
        devices = laid("x1 d g s e b nmos_soi w=1u l=1u\n")
        assert devices.net_names[int(devices.bulk[0])] == "e"
        assert "further-pins" in codes(devices)

    def test_a_net_missing_on_a_call(self) -> None:
        """A call must give as many nets as there are ports."""
        assert "'inv' has 4 ports, but 'x1' gives 3 nets" in refusal(INV + "x1 a b vdd inv\n")


class TestSuppliesAndParasitics:
    @pytest.mark.parametrize(
        "rail", ["vdd!", "vcc", "vpwr", "dd", "sup", "vpb", "gnd!", "ss", "vnb"]
    )
    def test_names_of_rails_are_nets_like_others(self, rail: str) -> None:
        """Rails have many names; this room keeps them as they are."""
        devices = laid(f".global {rail}\n{INV}x1 a b {rail} {rail} inv\n")
        assert devices.net_names[min(devices.global_nets)] == rail

    def test_a_rail_inside_that_nobody_declared(self) -> None:
        """A global rail reaches into subcircuits; one that is not declared is a net of its own."""
        text = f".subckt s a y\nm1 y a vss vss nch {TAIL}\n.ends\nx1 a b s\nx2 a b s\n"
        assert len(set(laid(text).source.tolist())) == 2
        assert len(set(laid(".global VSS\n" + text).source.tolist())) == 1
        assert len(set(laid(text.replace("vss", "0")).source.tolist())) == 1

    def test_wells_apart_from_rails_and_several_supplies(self) -> None:
        """Wells and several supplies are nets like all others."""
        text = (
            f"m1 y a vss vpw nch {TAIL}\nm2 y a vddh vnw pch {TAIL}\nm3 z y vddl vnw pch {TAIL}\n"
        )
        devices = laid(text)
        assert len(set(devices.bulk.tolist()) | set(devices.source.tolist())) == 5

    def test_rails_fed_by_sources(self) -> None:
        """Sources of the block's own level are kept with their value."""
        devices = laid(f"{INV}x1 a b vdd 0 inv\nvdd vdd 0 dc 1.8\nvneg vbb 0 '-0.5'\n")
        assert [value for *_, value in devices.source_nets] == [1.8, -0.5]

    def test_rails_that_differ_by_case(self) -> None:
        """Rails that differ by case are one net."""
        devices = laid(f"m1 y a VSS vss nch {TAIL}\nm2 y b vss Vss nch {TAIL}\n")
        assert len({*devices.source.tolist(), *devices.bulk.tolist()}) == 1

    @pytest.mark.parametrize("value", ["0.022f", "2.2e-17", "'0.022f'", "c=0.022f", "0.022ff"])
    def test_extracted_capacitors(self, value: str) -> None:
        """Values of parasitics have a suffix or none."""
        devices = laid(f"m1 a b 0 0 nch {TAIL}\nc1 a 0 {value}\n")
        assert devices.capacitance.tolist() == pytest.approx([2.2e-17], rel=1e-9)

    def test_a_supply_that_is_reached_through_resistors_only(self) -> None:
        """Nets in parts are joined by their resistors; supplies keep their names."""
        text = (
            f"m1 net:1 a vss:2 vss nch {TAIL}\nm2 n_net_m2_d a vdd:1 vdd pch {TAIL}\n"
            "r1 net net:1 5\nr2 net n_net_m2_d 7\nr3 vss vss:2 1\nr4 vdd vdd:1 1.5\n"
        )
        devices = laid(text)
        names = devices.net_names
        assert len(set(devices.drain.tolist())) == 1
        assert [names[int(n)] for n in devices.source] == ["vss", "vdd"]
        assert "resistor-joined" in codes(devices)

    def test_ports_in_any_order(self) -> None:
        """The order of ports is that of the definition, whatever it is elsewhere."""
        swapped = INV.replace("a y vdd vss", "vss vdd y a")
        one, other = laid(INV + "x1 a b c d inv\n"), laid(swapped + "x1 d c b a inv\n")
        for pins in ("drain", "gate", "source", "bulk"):
            assert [one.net_names[int(n)] for n in getattr(one, pins)] == [
                other.net_names[int(n)] for n in getattr(other, pins)
            ]
