"""Sense amplifiers: enabled, timed by regeneration, and where the paths of their inputs end."""

from __future__ import annotations

import math

import pytest

from evenstage.circuit.sensing import REGENERATION
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, network, transistor

CLOCKED = block("\n".join([
    network("n", "x", [
        ("q", "qb", "l", 2), ("qb", "q", "r", 2), ("l", "a", "t", 2), ("r", "b", "t", 2),
        ("t", "ck", "vss", 4),
    ]),
    network("p", "x", [
        ("q", "qb", "vdd", 2), ("qb", "q", "vdd", 2), ("q", "ck", "vdd", 1), ("qb", "ck", "vdd", 1),
    ]),
    inverter("o", "q", "y", 1, 2), inverter("u", "qb", "z", 1, 2),
]), "a b ck y z")  # fmt: skip
ISOLATED = block("\n".join([
    network("n", "s", [("s", "sb", "t", 2), ("sb", "s", "t", 2), ("t", "en", "vss", 4)]),
    network("p", "s", [("s", "sb", "u", 2), ("sb", "s", "u", 2), ("u", "enb", "vdd", 4)]),
    inverter("e", "en", "enb", 1, 2), transistor("n", "bl", "iso", "s", 1, "i1"),
    transistor("n", "blb", "iso", "sb", 1, "i2"), inverter("o", "s", "q", 1, 2),
]), "bl blb iso en q")  # fmt: skip


def test_the_law_from_a_tenth_of_the_supply() -> None:
    assert pytest.approx(math.log(5) / math.log(2)) == REGENERATION


@pytest.mark.parametrize(("text", "enable"), [(CLOCKED, "ck"), (ISOLATED, "en")])
def test_it_is_one_element_with_its_enable(text: str, enable: str) -> None:
    found = circuit_of(text)
    assert not found.not_understood
    (element,) = found.storage.elements
    assert element.kind == "sense amplifier"
    names = found.devices.net_names
    assert [(names[net], level) for net, level in element.clocks] == [(enable, True)]


def test_an_output_falls_through_pair_input_and_tail() -> None:
    """Half a kohm each for the pair and the input, a quarter for the tail, times the law."""
    found = circuit_of(CLOCKED)
    arcs = found.arcs
    mine = (arcs.output == found.net_id("q")) & (arcs.input == found.net_id("ck")) & ~arcs.rising
    assert arcs.output_resistance[mine].max() == pytest.approx(1250 * REGENERATION)


def test_inputs_end_and_the_enable_runs_on() -> None:
    analysis = analyse(circuit_of(CLOCKED), count=99)
    ends = {(path.start, path.end) for path in analysis.paths}
    assert ends == {(x, n) for x in "ab" for n in ("q", "qb")} - {("a", "qb"), ("b", "q")} | {
        ("ck", "y"), ("ck", "z"),
    }  # fmt: skip
    assert {one.net for one in analysis.precharges} == {"q", "qb"}


def test_its_size_is_free_and_it_loads_what_drives_it() -> None:
    found = circuit_of(CLOCKED)
    for name, width in (("a", 2), ("ck", 4 + 1 + 1)):
        net = found.net_id(name)
        assert net is not None
        assert found.net_cap[net] == pytest.approx(width * 1e-15)


def column(rows: int) -> str:
    """Return memory cells between two bit lines, with precharge and a gate that reads one."""
    cards = [
        inverter("o", "bl", "y", 1, 2), transistor("p", "bl", "pc", "vdd", 1, "p"),
        transistor("p", "blb", "pc", "vdd", 1, "q"), transistor("p", "bl", "pc", "blb", 1, "e"),
    ]  # fmt: skip
    for k in range(rows):
        cards += [
            inverter(f"1_{k}", f"t{k}", f"f{k}", 2, 1), inverter(f"2_{k}", f"f{k}", f"t{k}", 2, 1),
            transistor("n", "bl", f"wl{k}", f"t{k}", 1, f"a{k}"),
            transistor("n", "blb", f"wl{k}", f"f{k}", 1, f"b{k}"),
        ]  # fmt: skip
    return block("\n".join(cards), " ".join(f"wl{k}" for k in range(rows)) + " pc y")


@pytest.mark.parametrize("rows", [2, 40])
def test_memory_cells_are_read_through_their_word_lines(rows: int) -> None:
    """A pass of 1 kohm and half a kohm of the cell; the bit lines are precharged apart."""
    found = circuit_of(column(rows))
    assert not found.not_understood
    assert [one.kind for one in found.storage.elements] == ["latch"] * rows
    arcs = found.arcs
    read = (arcs.output == found.net_id("bl")) & (arcs.input == found.net_id("wl0"))
    assert not arcs.rising[read].any()
    assert arcs.output_resistance[read].max() == pytest.approx(1500.0)
    analysis = analyse(found, count=99)
    assert {one.net for one in analysis.precharges} == {"bl", "blb"}
    assert ("wl0", "y") in {(path.start, path.end) for path in analysis.paths}
