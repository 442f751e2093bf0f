"""What is kept of cards as numbers says the same as the cards."""

from __future__ import annotations

import random
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
import pytest

from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading import reader as reader_module
from evenstage.netlist.reading.read import read_bytes
from evenstage.source import Span
from support.columns_said import both_said

if TYPE_CHECKING:
    from evenstage.netlist.netlist import Netlist


def check(netlist: Netlist) -> None:
    """Compare all cards with their columns."""
    by_columns, by_cards = both_said(netlist)
    assert by_columns == by_cards


def random_lines(pick: random.Random, count: int) -> list[str]:
    """Return cards of all kinds in any order."""
    nets = ["a", "B", "net:1", "n[3]", "VDD", "0"]
    sizes = ["1u", "'2*k'", "0.5", "{x}", "1e-6", "2meg", "max(1,2)", "1e999", ".5p", "5."]

    def some(count: int) -> str:
        return " ".join(pick.choice(nets) for _ in range(count))

    def pairs(names: str) -> str:
        return "".join(f" {name}={pick.choice(sizes)}" for name in names)

    makers = [
        lambda i: f"M{i} {some(4)} nch{pairs('wl')}",
        lambda i: f"m{i} {some(4)} Pch{pairs('lwm')}",
        lambda i: f"m{i} ({some(4)}) pch{pairs('w')} off",
        lambda i: f"r{i} {some(2)} {pick.choice(sizes)}",
        lambda i: f"C{i} {some(2)} {pick.choice(sizes)}",
        lambda i: f"c{i} {some(2)} cmod {pick.choice(sizes)}{pairs('m')}",
        lambda i: f"l{i} {some(2)} {pick.choice(sizes)}",
        lambda i: f"x{i} {some(pick.randint(1, 5))} inv{pairs(pick.choice(['', 'w', 'ww']))}",
        lambda i: f"x{i} {some(2)} / Inv{pairs('k')}",
        lambda i: f"v{i} {some(2)} dc 1.8",
    ]
    return [pick.choice(makers)(i) for i in range(count)]


def test_cards_may_have_no_nets() -> None:
    lines = ["* t", ".subckt inv", ".ends", *(f"x{i} () inv" for i in range(5)), ""]
    netlist = read_bytes("\n".join(lines).encode(), "t.sp", Path())
    check(netlist)
    assert len(elaborate(netlist)) == 0


@pytest.mark.parametrize("name", ["µ", "É", "\udc85x"])
def test_names_of_parameters_may_hold_any_letters(name: str) -> None:
    calls = [f"x{i} a b s {name}={i + 2}u" for i in range(5)]
    leaf = [f".subckt s a b {name}=1u", f"m1 a b 0 0 nch w='{name}' l=1u", ".ends"]
    text = "\n".join(["* t", *leaf, *calls, ""])
    netlist = read_bytes(text.encode("utf-8", "surrogateescape"), "t.sp", Path())
    check(netlist)
    for columns in netlist.cards.columns(range(1, 6)):
        assert set(columns.values) == {name.lower()}


@pytest.mark.parametrize("seed", range(6))
def test_columns_say_what_the_cards_say(seed: int) -> None:
    lines = random_lines(random.Random(seed), 400)
    check(read_bytes("\n".join(["* t", *lines, ""]).encode(), "t.sp", Path()))


def test_columns_say_what_the_cards_say_across_blocks(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("evenstage.netlist.reading.blocks._SIZE", 100)
    pick = random.Random(3)
    lines = [
        line.replace(" ", pick.choice([" ", "\n+ ", " $ it's\n* c\n\n+ "]), 1)
        for line in random_lines(pick, 300)
    ]
    small = read_bytes("\n".join(["* t", *lines, ""]).encode(), "t.sp", Path())
    check(small)
    monkeypatch.undo()
    large = read_bytes("\n".join(["* t", *lines, ""]).encode(), "t.sp", Path())
    assert [small.card(n).span.text for n in range(len(small))] == [
        large.card(n).span.text for n in range(len(large))
    ]


def test_a_card_of_another_kind_ends_a_run(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(reader_module, "_LEARNED_AT", 1)
    lines = ["* t", "m1 a b 0 0 nch w=1u l=1u", "r1 a b 1k", "c1 a 0 1f", "r2 b 0 2k", "c2 b 0 2f"]
    netlist = read_bytes("\n".join(lines).encode(), "t.sp", Path())
    check(netlist)
    np.testing.assert_allclose(elaborate(netlist).capacitance, [1e-15, 2e-15], rtol=1e-12, atol=0)


@pytest.mark.parametrize(
    "spelling", ["{:.4f}", "{:.3e}", "{:.4f}u", "{:.2f}k", ".{:.0f}p", "{:.0f}.f"]
)
def test_values_converted_together_are_worth_the_same(spelling: str) -> None:
    pick = random.Random(1)
    texts = [spelling.format(pick.uniform(1, 99)) for _ in range(300)]
    lines = [f"c{i} a b {text}" for i, text in enumerate(texts)]
    check(read_bytes("\n".join(["* t", *lines, ""]).encode(), "t.sp", Path()))


def test_places_of_a_parameter_of_many_cards() -> None:
    lines = random_lines(random.Random(9), 300)
    lines[150:200] = [".subckt sub a b", *lines[150:200], ".ends"]
    netlist = read_bytes("\n".join(["* t", *lines, ""]).encode(), "t.sp", Path())
    found = [
        (number, Span(places.source, start, end))
        for places in netlist.cards.value_places(range(len(netlist)), "w")
        for number, start, end in zip(places.numbers, places.starts, places.ends, strict=True)
    ]
    asked = [(number, netlist.card(number).parameter("w")) for number in range(len(netlist))]
    assert found == [(number, one.span) for number, one in asked if one is not None]


def test_names_of_many_cards() -> None:
    lines = ["* t", "M1 a b c d nch", ".subckt Inv a b", "Mx a b c d nch", ".ends", "r2 a b 1"]
    netlist = read_bytes("\n".join(lines).encode(), "t.sp", Path())
    assert list(netlist.cards.full_names([0, 1, 2])) == ["M1", "inv.Mx", "r2"]
    assert list(netlist.cards.full_names([2, 1])) == ["r2", "inv.Mx"]


@pytest.mark.parametrize("kinds", [3, 100_000])
def test_equal_parameters_are_read_at_once_and_others_apart(kinds: int) -> None:
    pick = random.Random(5)
    lines = [
        f"m{i} a b 0 0 nch w={pick.randrange(1, kinds)}.{i % 2}u l='2*{i % 3}' off ad = 1p m=2"
        for i in range(3000)
    ]
    check(read_bytes("\n".join(["* t", *lines, ""]).encode(), "t.sp", Path()))


def test_parameters_that_stop_being_alike(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("evenstage.netlist.reading.tails._MOST", 50)
    lines = [f"m{i} a b 0 0 nch w={i if i > 2000 else 1}u l=1u" for i in range(6000)]
    check(read_bytes("\n".join(["* t", *lines, ""]).encode(), "t.sp", Path()))


@pytest.mark.parametrize("kinds", [1, 7, 1000])
def test_of_parameters_with_one_name_the_last_counts(kinds: int) -> None:
    """However many cards are alike, and whether their parameters are read together or apart."""
    lines = [f"m{i} a b c d nch W={i % kinds}u w={i % kinds + 1}u l=1u" for i in range(6000)]
    netlist = read_bytes("\n".join(["* t", *lines, ""]).encode(), "t.sp", Path())
    check(netlist)
