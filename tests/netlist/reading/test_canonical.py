"""The text with one card per line keeps every byte in its place."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from evenstage.netlist.reading.canonical import canonical

TEXTS = st.one_of(
    st.binary(max_size=80).filter(lambda raw: b"\0" not in raw),
    st.lists(
        st.sampled_from(
            [
                b"\n",
                b"\r",
                b"\r\n",
                b"+",
                b"*",
                b"*.x",
                b"$",
                b";",
                b"/",
                b"//",
                b"'",
                b"{",
                b"}",
                b" ",
                b"\t",
                b"Mn",
                b"=",
                b'"',
            ]
        ),
        max_size=25,
    ).map(b"".join),
)


@given(TEXTS)
def test_every_byte_is_itself_in_lower_case_or_blank(raw: bytes) -> None:
    text = canonical(raw)
    assert len(text) == len(raw)
    lowered = raw.lower().replace(b"\r", b"\n")
    assert all(a in (b, 32) for a, b in zip(text, lowered, strict=True))


@given(TEXTS)
def test_nothing_is_left_to_do(raw: bytes) -> None:
    once = canonical(raw)
    assert canonical(once) == once


@pytest.mark.parametrize(
    ("raw", "text"),
    [
        (b"M1 A\n+ B\nR1", b"m1 a   b\nr1"),
        (b"m1 a\r\n  + b\r\n", b"m1 a" + b" " * 6 + b"b\n\n"),
        (b"m1 a $ x\n* y\n\n+ b", b"m1 a" + b" " * 12 + b"b"),
        (b"m1 a\n*.pin x\n+ b\nr", b"m1 a\n       \n   \nr"),
        (b"m1 w='a $ b' $ c\n", b"m1 w='a $ b'    \n"),
        (b"m1 w='a\n+ $ b' ; c", b"m1 w='a   $ b'    "),
        (b"m1 a$b c;d $e\n", b"m1 a$b c;d   \n"),
        (b"+ a\nm1\n+$ b\n+c", b"+ a\nm1       c"),
        (b"m1 a // x\n// y\n+ b//c\n", b"m1 a" + b" " * 13 + b"b//c\n"),
        (b"m1 w='a // b' //c\n+//d", b"m1 w='a // b'" + b" " * 9),
        (b"\xef\xbb\xbf* A\nM", b"      \nm"),
    ],
)
def test_remarks_and_joints_become_blanks(raw: bytes, text: bytes) -> None:
    assert canonical(raw) == text


def test_what_stands_before_the_start_is_blank() -> None:
    assert canonical(b"it's $ +\nM1 a\n+ b", 9) == b"         m1 a   b"
