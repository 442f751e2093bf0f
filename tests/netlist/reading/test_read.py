"""Texts as they are met: what becomes of each word, and where it stands."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import pytest
from hypothesis import given
from hypothesis import strategies as st

from evenstage.errors import EvenstageError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes

if TYPE_CHECKING:
    from evenstage.netlist.netlist import Card, Netlist


def text_of(*lines: str, end: str = "\n") -> bytes:
    return end.join(["* title", *lines, ""]).encode()


def net(*lines: str, end: str = "\n") -> Netlist:
    return read_bytes(text_of(*lines, end=end), "t.sp", Path())


def words(card: Card) -> tuple[object, ...]:
    """Return everything a card says."""
    value = None if card.value is None else card.value.text
    pairs = {p.name: p.text for p in card.parameters}
    return card.name, card.nodes, card.target, value, pairs


@pytest.mark.parametrize(
    ("line", "expected"),
    [
        (
            "M1 d g s b nch W=1u l='2*a'",
            ("M1", ("d", "g", "s", "b"), "nch", None, {"w": "1u", "l": "'2*a'"}),
        ),
        ("x1 a b inv", ("x1", ("a", "b"), "inv", None, {})),
        (
            "xI<3>/u a#1 b%2 net[0] n:1 VDD! / NOR3 w = 2",
            ("xI<3>/u", ("a#1", "b%2", "net[0]", "n:1", "VDD!"), "NOR3", None, {"w": "2"}),
        ),
        ("x1 1 2 3 inv PARAMS: w={k * 2}", ("x1", ("1", "2", "3"), "inv", None, {"w": "{k * 2}"})),
        ("x1 inv", ("x1", (), "inv", None, {})),
        ("r1 a b 1k", ("r1", ("a", "b"), "", "1k", {})),
        ("r1 a b rmod 2.5", ("r1", ("a", "b"), "", "2.5", {})),
        (
            "rr1 n_1.x \\a\\ r=3 tc1=0",
            ("rr1", ("n_1.x", "\\a\\"), "", None, {"r": "3", "tc1": "0"}),
        ),
        ("c1 a 0 'c0*2' m=3", ("c1", ("a", "0"), "", "'c0*2'", {"m": "3"})),
        ("c1 a 0 6.3e-19", ("c1", ("a", "0"), "", "6.3e-19", {})),
        ("vdd vdd! 0 dc 1.2", ("vdd", ("vdd!", "0"), "", "1.2", {})),
        ("v1 a 0 pulse(0 1 1n)", ("v1", ("a", "0"), "", None, {})),
        ("d1 a k dmod area=2", ("d1", ("a", "k"), "dmod", None, {"area": "2"})),
        (
            "m1 d g s b nch w=max(1u, 2*(a+b)) m=(n)",
            ("m1", ("d", "g", "s", "b"), "nch", None, {"w": "max(1u, 2*(a+b))", "m": "(n)"}),
        ),
        (
            "m1 d g s b nch ic=0,1,2 w=1",
            ("m1", ("d", "g", "s", "b"), "nch", None, {"ic": "0,1,2", "w": "1"}),
        ),
        ("m1 d g s b nch w=1,l=2", ("m1", ("d", "g", "s", "b"), "nch", None, {"w": "1", "l": "2"})),
        ("m1 d g s b nch w=1 $X=0.1 $Y=2", ("m1", ("d", "g", "s", "b"), "nch", None, {"w": "1"})),
        ("m1 d g s b nch w=1 ; w=2", ("m1", ("d", "g", "s", "b"), "nch", None, {"w": "1"})),
        ("m1 d$1 g;2 s b nch", ("m1", ("d$1", "g;2", "s", "b"), "nch", None, {})),
        ("x1 @a -b inv-x_1.2", ("x1", ("@a", "-b"), "inv-x_1.2", None, {})),
        ("\t m1\td  g s b nch\tw=1", ("m1", ("d", "g", "s", "b"), "nch", None, {"w": "1"})),
    ],
)
def test_card(line: str, expected: tuple[object, ...]) -> None:
    assert words(net(line).card(0)) == expected
    # Once more for the card that is read by its learned shape.
    assert words(net(line, line, line, line, line).card(4)) == expected


CONTINUED = (
    "M1 d g",
    "* it's a comment",
    "",
    "+ s b $ remark",
    "  +\tnch W",
    "+ = 'a +",
    "+ b' $ 'quoted'",
    "+l=2u",
)


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_a_card_over_many_lines(end: str) -> None:
    card = net(*CONTINUED, "r1 a b 1", end=end).card(0)
    assert words(card) == ("M1", ("d", "g", "s", "b"), "nch", None, {"w": "'a +  b'", "l": "2u"})
    width = card.parameter("w")
    assert width is not None
    assert width.span.text == f"'a +{end}+ b'"
    assert (width.name_span.text, width.span.place) == ("W", "t.sp:7:5")
    assert card.span.text.endswith("l=2u")
    assert card.target_span is not None
    assert card.target_span.text == "nch"


def test_the_last_line_needs_no_end() -> None:
    assert words(read_bytes(b"* t\nr1 a b 1k", "t.sp", Path()).card(0))[3] == "1k"


def test_of_a_repeated_parameter_the_last_counts() -> None:
    card = net("m1 d g s b nch w=1 w=2").card(0)
    parameter = card.parameter("w")
    assert parameter is not None
    assert parameter.text == "2"


def test_a_comment_that_is_continued_itself() -> None:
    netlist = net(
        "r1 a b 1", "*.GLOBAL gnd!", "* and more", "+ vdd!", "r2 a b 1", "*.PININFO A:I", "r3 a b 1"
    )
    assert [words(netlist.card(i))[1] for i in range(3)] == [("a", "b")] * 3
    assert netlist.global_names == ()


def test_bytes_that_are_not_utf8_survive() -> None:
    netlist = read_bytes(b"* \xff\nr\xe9 a\xff \xc3\xa9 1k $ \xfe\n", "t.sp", Path())
    card = netlist.card(0)
    assert card.name.encode("utf-8", "surrogateescape") == b"r\xe9"
    assert card.nodes[1] == "\u00e9"
    assert card.value is not None
    assert card.value.span.place == "t.sp:2:9"


def test_a_byte_order_mark_is_no_part_of_the_text() -> None:
    netlist = read_bytes(b"\xef\xbb\xbf.subckt inv a y\n.ends\n", "t.sp", Path())
    subcircuit = netlist.subcircuits["inv"]
    assert subcircuit.header is not None
    assert subcircuit.header.text == ".subckt inv a y"


class TestDotCards:
    def test_a_definition_and_its_places(self) -> None:
        netlist = net(
            "r0 a b 1",
            " .SUBCKT Inv A y",
            "+ VDD params: W = 2u",
            "r1 a b 1",
            ".ENDS Inv $ write",
            "r2 a b 1",
        )
        subcircuit = netlist.subcircuits["inv"]
        assert (subcircuit.name, subcircuit.ports) == ("Inv", ("A", "y", "VDD"))
        assert [(p.name, p.text) for p in subcircuit.defaults] == [("w", "2u")]
        assert [netlist.card(i).name for i in subcircuit.cards] == ["r1"]
        assert [netlist.card(i).name for i in netlist.top.cards] == ["r0", "r2"]
        spans = (subcircuit.header, subcircuit.name_span, subcircuit.end_name_span, subcircuit.body)
        assert [span.text for span in spans if span is not None] == [
            ".SUBCKT Inv A y\n+ VDD params: W = 2u",
            "Inv",
            "Inv",
            " .SUBCKT Inv A y\n+ VDD params: W = 2u\nr1 a b 1\n.ENDS Inv $ write\n",
        ]

    @pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
    def test_a_body_ends_with_its_line_end(self, end: str) -> None:
        body = net(".subckt a x", ".ends $ x", "r1 a b 1", end=end).subcircuits["a"].body
        assert body is not None
        assert body.text == f".subckt a x{end}.ends $ x{end}"

    def test_a_body_at_the_end_of_the_file(self) -> None:
        body = read_bytes(b".subckt a x\n.ends", "t.sp", Path()).subcircuits["a"].body
        assert body is not None
        assert body.text == ".subckt a x\n.ends"

    def test_nested_definitions(self) -> None:
        netlist = net(
            ".subckt a x", "r1 x y 1", ".subckt b z", "r2 z q 1", ".ends b", "r3 x y 1", ".ends a"
        )
        cards = {
            name: [netlist.card(i).name for i in s.cards] for name, s in netlist.subcircuits.items()
        }
        assert cards == {"b": ["r2"], "a": ["r1", "r3"]}
        assert [netlist.card(i).scope for i in range(3)] == ["a", "b", "a"]

    def test_models(self) -> None:
        netlist = net(
            ".param k=2",
            ".MODEL NCH nmos(level=1",
            "+ VTO = 0.5 kp='k*50u' tox=4n)",
            ".model pch pmos level=1 type=p bad=zork",
        )
        assert {k: (m.name, m.kind, dict(m.values)) for k, m in netlist.models.items()} == {
            "nch": ("NCH", "nmos", {"level": 1, "vto": 0.5, "kp": 1e-4, "tox": 4e-9}),
            "pch": ("pch", "pmos", {"level": 1}),
        }

    def test_globals_and_options(self) -> None:
        netlist = net(
            ".global VDD! gnd!",
            ".GLOBAL vdd!",
            ".option scale=5n post",
            ".OPTIONS defw = '2*3u' list=x",
        )
        assert netlist.global_names == ("VDD!", "gnd!")
        assert dict(netlist.options) == pytest.approx({"scale": 5e-9, "defw": 6e-6})

    def test_nothing_after_the_end(self) -> None:
        assert len(net("r1 a b 1", ".END", "r2 a b 1 (((")) == 1

    def test_what_is_not_understood_is_told_once_per_kind_with_its_count(self) -> None:
        netlist = net(
            ".tran 1n 2n", ".MEASURE tran x it's (odd", "+ {", ".measure y", ".print v(a) $ x"
        )
        assert [(n.code, n.message, n.place) for n in netlist.notices] == [
            ("not-understood", "1 '.tran' card kept, but not understood", "t.sp:2:1"),
            ("not-understood", "2 '.measure' cards kept, but not understood", "t.sp:3:1"),
            ("not-understood", "1 '.print' card kept, but not understood", "t.sp:6:1"),
        ]

    def test_blocks_in_other_languages_are_passed_over(self) -> None:
        netlist = net(
            "r1 a b 1",
            ".control",
            "run it's {",
            "5 x",
            " .endc",
            "r2 a b 1",
            ".data d x",
            "1 2",
            ".enddata",
            "r3 a b 1",
        )
        assert [netlist.card(i).name for i in range(len(netlist))] == ["r1", "r2", "r3"]
        assert [n.names for n in netlist.notices] == [(".control",), (".data",)]

    def test_alternative_runs_are_passed_over(self) -> None:
        netlist = net("r1 a b 1", ".alter slow", "r1 a b 2", ".end")
        assert len(netlist) == 1
        assert [n.names for n in netlist.notices] == [(".alter",)]


@given(st.binary(max_size=200))
def test_any_bytes_are_read_or_refused_with_a_message(raw: bytes) -> None:
    try:
        elaborate(read_bytes(raw, "t.sp", Path("absent")))
    except EvenstageError as error:
        str(error).encode()


PIECES = st.sampled_from(
    [
        "m1 a b c d nch w=1u l=1u",
        ".subckt s a",
        ".ends",
        "x1 a s",
        "+ w=2",
        "*.x",
        "r1 a b 1",
        ".param w='w+1'",
        "m2 d g s b pch w='q' l={1}",
        ".end",
        ".lib x",
        ".endl",
        "c1 a b",
        "x2 a b c d nmos w=1",
        "v1 a b",
        ".global a",
        " ",
        "* c",
        ".model nch nmos (",
        "x1 a b s / q m=2",
        ".control",
        "m1 a b",
        "'",
    ]
)


@given(st.lists(PIECES, max_size=12), st.sampled_from(["\n", "\r\n", "\r", "\n\n"]))
def test_any_order_of_cards_is_elaborated_or_refused_with_a_message(
    lines: list[str], end: str
) -> None:
    try:
        devices = elaborate(net(*lines, end=end))
    except EvenstageError as error:
        str(error).encode()
    else:
        assert len(devices.net_names[:]) == len(devices.net_names)


@given(st.lists(PIECES, max_size=12))
def test_every_word_of_a_card_is_where_its_span_says(lines: list[str]) -> None:
    try:
        netlist = net(*lines)
    except EvenstageError:
        return
    for card in map(netlist.card, range(len(netlist))):
        assert card.span.text.startswith(card.name)
        for parameter in card.parameters:
            assert parameter.span.text == parameter.text
            assert card.span.start < parameter.name_span.start < parameter.span.end <= card.span.end
