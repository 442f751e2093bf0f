"""The grammars are unambiguous, and what they say about single lines."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from lark.exceptions import UnexpectedInput

from evenstage.netlist.grammar import ENCODING, build, grammar_text, parser, terminal
from evenstage.netlist.reading.read import read_bytes


@pytest.mark.parametrize("name", ["netlist", "expression"])
def test_every_grammar_is_free_of_conflicts(name: str) -> None:
    build(name, strict=True)


@pytest.mark.parametrize("name", ["netlist", "expression"])
def test_the_grammar_in_use_is_that_of_the_top_folder(name: str) -> None:
    file = Path(__file__).parents[2] / "grammar" / f"{name}.lark"
    assert grammar_text(name) == file.read_text("utf-8")


TITLES = [
    "Row decoder with 64 word lines",
    "Carry chain 32 bits",
    "Inverter chain test 2",
    "Version for corner 2",
    "Mux tree four to one, drawn flat",
    "X-wrapped row decoder in microns",
    "decoder.sp",
    "3 stage pad driver",
    "D1 latch",
    "'quoted title'",
    "$ remark-like? no: a title begins with a letter"[9:],
]

CARDS = [
    "* a comment",
    ".subckt inv a y",
    ".param w=1u",
    "  .global vdd",
    "M1 d g s b nch w=1u l=0.1u",
    "mn<3>\ty  a vss vss nch l = 1u",
    "x1 a b vdd vss inv wn=1u",
    "X1 a b / inv",
    "R1 a b 1k",
    "C1 a 0 1.5f",
    "C1 a 0 c=2",
    "Vdd vdd 0 dc 1.2",
    "vdd vdd 0 1.2",
    "$ remark",
    "; remark",
]


def is_title(line: str) -> bool:
    return re.match(terminal("TITLE"), line, re.IGNORECASE) is not None


@pytest.mark.parametrize("line", TITLES)
def test_prose_in_the_first_line_is_a_title(line: str) -> None:
    assert is_title(line)
    assert len(read_bytes(f"{line}\nr1 a b 1k\n".encode(), "t.sp", Path())) == 1


@pytest.mark.parametrize("line", CARDS)
def test_what_is_plainly_a_card_is_no_title(line: str) -> None:
    assert not is_title(line)


def test_a_first_line_that_could_be_both_is_a_title_with_a_notice() -> None:
    netlist = read_bytes(b"Row decoder version 2\n", "t.sp", Path())
    assert [(n.code, n.place) for n in netlist.notices] == [("title", "t.sp:1:1")]


def test_a_first_line_that_calls_a_subcircuit_of_the_file_is_a_card() -> None:
    netlist = read_bytes(b"X1 a b inv\n.subckt inv a y\n.ends\n", "t.sp", Path())
    assert netlist.card(0).target == "inv"
    assert netlist.notices == ()


def test_a_title_may_hold_anything() -> None:
    title = b"\xef\xbb\xbfIt's {a} test = with \xff (bytes"
    netlist = read_bytes(title + b"\r\nr1 a b 1k", "t.sp", Path())
    assert [netlist.card(i).name for i in range(len(netlist))] == ["r1"]


REFUSED = [
    "m1 a b c d",
    "m1 a b c d e f g h i",
    "r1 a",
    "x1",
    "m1 a b c d e w=",
    "r1 a b =",
    ".include",
]


@pytest.mark.parametrize("line", REFUSED)
def test_lark_refuses_incomplete_cards(line: str) -> None:
    with pytest.raises(UnexpectedInput):
        parser("netlist").parse(line, start="statement")


def test_positions_are_byte_offsets_whatever_the_bytes() -> None:
    line = b"x\xff\xc3\xa9 n\x85 \xa0b sub w=1"
    tree = parser("netlist").parse(line.decode(ENCODING), start="statement")
    tokens = list(tree.scan_values(lambda _: True))
    assert [line[t.start_pos : t.end_pos] for t in tokens[:4]] == [
        b"x\xff\xc3\xa9",
        b"n\x85",
        b"\xa0b",
        b"sub",
    ]
