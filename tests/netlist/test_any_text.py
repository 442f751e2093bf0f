"""Whatever a file holds, reading it ends in a block or in an error that says what is wrong."""

from __future__ import annotations

from pathlib import Path

from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.errors import EvenstageError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes
from evenstage.netlist.rewriting.edits import rewrite

WORDS = [
    *(
        ".subckt s a b",
        ".ends",
        ".ends s",
        ".param",
        ".model nch nmos",
        ".global a",
        ".end",
        ".lib x",
    ),
    *(".option scale=5n", ".if", ".elseif", ".else", ".endif", ".func f(x)", ".control", ".endc"),
    *(
        "m1",
        "m2 a b 0 0 nch",
        "x1 a b s",
        "r1 a b",
        "c1",
        "v1",
        "d1",
        "nch",
        "w=1u",
        "l=60n",
        "m=2",
    ),
    *(
        "a",
        "b",
        "0",
        "(",
        ")",
        "{",
        "}",
        "'",
        '"',
        "=",
        ",",
        ":",
        "/",
        "//",
        "$",
        ";",
        "*",
        "+",
        ".",
    ),
    *(
        "off",
        "1e999",
        "-1",
        "'1/0'",
        "{w*2}",
        "f(x)",
        "w='w'",
        "l={l}",
        "params:",
        "\xff",
        "\ufeff",
    ),
]
GAPS = [" ", " ", "\n", "\n", "\n+ ", "\r\n", "\t", "\n* c\n+", "", "\r", "\x0c"]

texts = st.lists(st.tuples(st.sampled_from(WORDS), st.sampled_from(GAPS)), max_size=30).map(
    lambda pairs: "".join(word + gap for word, gap in pairs).encode("latin-1", "replace")
)


@settings(deadline=None, max_examples=100)
@given(st.one_of(texts, texts.map(lambda text: b"* t\n" + text), st.binary(max_size=200)))
def test_any_text_is_read_or_refused(data: bytes) -> None:
    try:
        netlist = read_bytes(data, "any.sp", Path("absent"))
        assert rewrite(netlist, ()) == {}
        devices = elaborate(netlist)
    except EvenstageError as error:
        shown = str(error)
    else:
        shown = " ".join(map(str, devices.notices)) + devices.top
    shown.encode()
