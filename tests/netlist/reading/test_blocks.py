"""Blocks: small whatever stands between cards, and together the whole text."""

from __future__ import annotations

import random
from pathlib import Path

import pytest

from evenstage.errors import NetlistError
from evenstage.netlist.reading import blocks as module
from evenstage.netlist.reading.blocks import Blocks
from evenstage.netlist.reading.canonical import canonical
from evenstage.netlist.reading.read import read_bytes
from evenstage.source import SourceText

FIRST, LAST = b"m1 a b 0 0 nch w=1u l=1u", b"m2 a b 0 0 nch w=1u l=1u\n"
SIZE, LONGEST = 100, 500

IDLE = {
    "blank lines": b"\n" * 5000,
    "lines of blanks": b" \t \r\n" * 2000,
    "comments": b"* c\n// d\n$ e\n" * 500,
    "one comment": b"* " + b"c" * 5000 + b"\n",
    "a remark": b"$" * 5000 + b"\n",
    "comments and one long": b"* c\n" * 200 + b"; " + b"c" * 5000 + b"\n\n",
}


@pytest.fixture(autouse=True)
def small_blocks(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "_SIZE", SIZE)
    monkeypatch.setattr(module, "_LONGEST", LONGEST)


def made(data: bytes) -> Blocks:
    return Blocks(SourceText(Path("a.sp"), data, "a.sp"))


@pytest.mark.parametrize("idle", IDLE.values(), ids=IDLE)
@pytest.mark.parametrize("end", [b"\n", b" $ "])
def test_what_stands_between_cards_may_be_endless(idle: bytes, end: bytes) -> None:
    data = b"* t\n" + FIRST + end + idle + LAST
    netlist = read_bytes(data, "a.sp", Path())
    assert [netlist.card(number).span.text for number in range(len(netlist))] == [
        FIRST.decode(),
        LAST.decode().rstrip(),
    ]
    blocks, position = made(data), 4
    while position < len(data):
        _, text, position = blocks.at(position)
        assert len(text) <= SIZE + LONGEST


@pytest.mark.parametrize("idle", [b"\n" * 5000, b"* c\n" * 2000, b"+\n" * 2000, b"+ a=1\n" * 900])
def test_a_card_does_not_go_on_behind_an_endless_gap(idle: bytes) -> None:
    with pytest.raises(NetlistError) as caught:
        read_bytes(b"* t\n" + LAST + FIRST + b"\n" + idle + b"+ m=2\n" + LAST, "a.sp", Path())
    assert str(caught.value) == (
        "a.sp:3:1: this card is longer than 500 bytes (too-large)\n"
        "    m1 a b 0 0 nch w=1u l=1u\n"
        "    ^"
    )


def test_the_whole_is_the_canonical_text_but_for_blanks() -> None:
    pick = random.Random(4)
    for _ in range(200):
        pieces = [pick.choice([FIRST, b"+ m=1", b"* c", b"", b" ", b".x"]) for _ in range(40)]
        data = b"".join(piece + pick.choice([b"\n", b"\r\n", b" $ r\n"]) for piece in pieces)
        data = LAST + data + pick.choice([b"", b"\n" * 700]) + LAST
        try:
            whole = made(data).whole
        except NetlistError:
            continue
        assert len(whole) == len(data)
        assert whole.split() == canonical(data).split()
