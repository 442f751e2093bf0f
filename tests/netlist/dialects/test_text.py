"""How texts are written: lines, names, definitions, files.

Habits that netlists in the wild have: read, or refused with one clear message. One test or more
for each habit; the docstring says which habit it is.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from evenstage.errors import EvenstageError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read, read_bytes
from evenstage.netlist.rewriting.edits import Edit, rewrite
from support.dialects import INV, TAIL, codes, laid, microns, only_card, refusal, text_of


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
