"""The fast way to read cards must be the grammar's way, to the byte."""

from __future__ import annotations

import random
from typing import TYPE_CHECKING

import pytest

from evenstage.netlist.reading import blocks, cards, stored
from evenstage.netlist.reading import reader as reader_module
from evenstage.netlist.reading.shapes import _compiled
from support.random_cards import edited_card, few_cards, random_bracket, random_card, tame_card
from support.two_readings import by_grammar, by_program, compare, compare_brackets

if TYPE_CHECKING:
    from collections.abc import Callable

MAKERS = [(tame_card, 0.7), (few_cards, 0.4), (edited_card, 0.3), (random_card, 0.2)]
#: Cases read together, and how often: 20,000 in all, a quarter of them of three cards.
_LOT, _LOTS = 250, 10
#: Bytes of a block so small that edges of blocks fall everywhere.
_SMALL = 100


@pytest.fixture(autouse=True)
def quick_learner(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(reader_module, "_LEARNED_AT", 1)


@pytest.mark.parametrize("size", [blocks._SIZE, _SMALL])
@pytest.mark.parametrize(("make", "least"), MAKERS)
def test_fast_reading_is_the_grammars_reading(
    make: Callable[[random.Random], str],
    least: float,
    size: int,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(blocks, "_SIZE", size)
    if size == _SMALL:
        monkeypatch.setattr(cards, "_LOT", 1)
        monkeypatch.setattr(stored, "_MANY", 1)
    pick = random.Random(20261 + size)
    accepted = 0
    for _ in range(_LOTS):
        tally = compare([make(pick) for _ in range(_LOT)])
        assert tally.differences == ()
        accepted += tally.accepted
    assert least * _LOTS * _LOT < accepted


def test_fast_reading_of_brackets_is_the_grammars_reading() -> None:
    pick = random.Random(31)
    tally = compare_brackets(random_bracket(pick) for _ in range(2000))
    assert tally.differences == ()
    assert tally.accepted > 300


def test_a_card_that_is_read_otherwise_is_noticed() -> None:
    right, wrong = b".fence\nm1 a b c d nch w=1u\n", b".fence\nm1 a b c d\n"
    assert by_grammar(wrong) is None
    assert by_program([right, wrong]) is None
    cards = by_grammar(right)
    assert cards
    assert by_program([right, right]) == [cards, cards]
    assert by_program([right.replace(b"1u", b"2u")]) != [cards]
    assert by_program([right.replace(b"w", b" w")]) != [cards]


def test_a_shape_that_reads_too_much_is_noticed(monkeypatch: pytest.MonkeyPatch) -> None:
    _compiled.cache_clear()
    monkeypatch.setattr("evenstage.netlist.reading.shapes.END", r"[^\n]*+\n*+")
    wrong = ["m1 a b c d nch )\n"]
    assert compare(wrong).differences == (b".fence\n" + wrong[0].encode() + b"\n",)
    assert compare(["m1 a b c d nch\n"]).differences == ()
    _compiled.cache_clear()


def test_a_name_behind_a_comma_may_stand_before_a_continuation() -> None:
    cards = [f"m1 a b c d nch w=1u,l{gap}=2u\n" for gap in ("", " ", "\n+ ", " $ it\n+")]
    assert compare([*cards, *cards]).differences == ()
    assert compare_brackets(card.replace("m1", ".subckt") for card in cards).differences == ()


def test_a_slash_that_begins_a_word_is_no_sign() -> None:
    cases = ["x1 a b / inv\n", "x1 a b /inv\n", "x1 / inv\n", "x1 /inv\n", "x1 (a) /inv\n"]
    tally = compare([*cases, *cases])
    assert (tally.accepted, tally.differences) == (2 * len(cases), ())


@pytest.mark.parametrize("remark", ["$ b)", "; b)", "//x b)"])
def test_a_remark_may_begin_inside_the_parentheses_of_an_expression(remark: str) -> None:
    cases = [f"c1 a b (a {remark}\n", f"m1 a b c d nch w=f(1, {remark}\n+ 2) l=1u\n"]
    cases += [f"m1 a b c d nch w=f(g( 1 ),{remark[:-1]}) l=1u\n"]
    assert compare([*cases, *cases]).differences == ()


@pytest.mark.parametrize("quote", ["'", '"'])
def test_a_sign_behind_a_continuation_is_no_remark_while_a_quote_is_open(quote: str) -> None:
    case = f"d3 it{quote}s a b\n+$ m = {quote}a $ b{quote} $ end\n"
    assert compare([case, case]) == (2, 0, ())
