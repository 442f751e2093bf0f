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


def test_a_memory_cell_is_none() -> None:
    cell = [
        inverter("1", "t", "f", 1, 1), inverter("2", "f", "t", 1, 1),
        transistor("n", "bl", "wl", "t", 1, "a"), transistor("n", "blb", "wl", "f", 1, "b"),
        inverter("o", "bl", "y", 1, 2), transistor("p", "bl", "pc", "vdd", 1, "p"),
        transistor("p", "blb", "pc", "vdd", 1, "q"), transistor("p", "bl", "pc", "blb", 1, "e"),
    ]  # fmt: skip
    found = circuit_of(block("\n".join(cell), "wl pc y"))
    assert "sense amplifier" not in {one.kind for one in found.storage.elements}
