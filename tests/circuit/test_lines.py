"""Lines that very many passes or pull networks share, and dynamic nodes among them."""

from __future__ import annotations

import numpy as np
import pytest

from evenstage.circuit.stage_plan import crowded
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, network, transistor
from support.pass_networks import crossbar


def chain(bits: int) -> str:
    """Return a Manchester carry chain, precharged while its clock is low."""
    cards = [transistor("p", "c0", "ck", "vdd", 1, "p"), inverter("o", f"c{bits}", "y", 1, 2)]
    cards.append(network("n", "i", [("c0", "cin", "f", 2), ("f", "ck", "vss", 2)]))
    for k in range(bits):
        cards += [
            transistor("p", f"c{k + 1}", "ck", "vdd", 1, f"p{k}"),
            transistor("n", f"c{k}", f"p{k}", f"c{k + 1}", 2, f"t{k}"),
            network("n", f"g{k}", [(f"c{k + 1}", f"g{k}", f"f{k}", 2), (f"f{k}", "ck", "vss", 2)]),
        ]
    controls = " ".join(f"p{k} g{k}" for k in range(bits))
    return block("\n".join(cards), f"cin {controls} ck y")


def bit_line(rows: int) -> str:
    """Return a precharged line with one stack of two for each row, and the gate that reads it."""
    cards = [transistor("p", "bl", "pc", "vdd", 2, "pc"), inverter("s", "bl", "q", 1, 3)]
    for k in range(rows):
        edges = [("bl", f"w{k}", f"x{k}", 1.0), (f"x{k}", f"d{k}", "vss", 1.0)]
        cards += [network("n", f"r{k}", edges)]
    return block("\n".join(cards), " ".join(f"w{k} d{k}" for k in range(rows)) + " pc q")


def multiplexer(inputs: int) -> str:
    """Return pass transistors from one inverter each into one net."""
    cards = [inverter("o", "w", "y", 1, 2)]
    for k in range(inputs):
        cards.append(inverter(f"d{k}", f"d{k}", f"x{k}", 1, 2))
        cards.append(transistor("n", f"x{k}", f"s{k}", "w", 1, f"a{k}"))
    return block("\n".join(cards), " ".join(f"d{k} s{k}" for k in range(inputs)) + " y")


class TestDynamicNodesAmongPasses:
    def test_a_carry_chain_evaluates_and_its_precharge_stands_apart(self) -> None:
        found = circuit_of(chain(3))
        assert not found.not_understood
        analysis = analyse(found, count=99)
        assert {path.edge for path in analysis.paths} == {"rise"}
        starts = {path.start for path in analysis.paths}
        assert starts == {"cin", "ck", *(f"{x}{k}" for x in "pg" for k in range(3))}
        assert {one.net for one in analysis.precharges} == {"c0", "c1", "c2", "c3"}
        kinds = [found.gate_kind(gate) for gate in range(len(found))]
        assert kinds.count("precharge device") == 4

    def test_the_precharge_of_a_node_counts_what_hangs_on_it(self) -> None:
        """2 kohm of a micron of p; 3 fF of the listener, 1 + 2 + 2 on the node, 4 behind g."""
        found = {one.net: one for one in analyse(circuit_of(chain(1))).precharges}
        assert found["c1"].delay == pytest.approx(2e3 * (3 + 5 + 4) * 1e-15)
        assert found["c1"].devices == ("mp0",)

    def test_the_carry_ripples_through_the_passes(self) -> None:
        """From cin: two of 0.5 kohm, then one more for each pass; the worst case charges all."""
        found = circuit_of(chain(2))
        arcs = found.arcs
        to_end = (arcs.output == found.net_id("c2")) & (arcs.input == found.net_id("cin"))
        assert arcs.output_resistance[to_end].max() == pytest.approx(4 * 500.0)

    def test_a_static_pull_up_is_not_taken_for_precharge(self) -> None:
        """A pass while s is high, the supply while it is low: an AND gate, both edges count."""
        cards = [
            transistor("n", "a", "s", "x", 1, "t"), transistor("p", "x", "s", "vdd", 1, "u"),
            inverter("o", "x", "y", 1, 2), inverter("i", "b", "a", 1, 2),
        ]  # fmt: skip
        analysis = analyse(circuit_of(block("\n".join(cards), "b s y")), count=99)
        assert analysis.precharges == ()
        assert {path.edge for path in analysis.paths} == {"rise", "fall"}


class TestLongLines:
    @pytest.mark.parametrize("make", [bit_line, multiplexer])
    def test_256_on_one_line(self, make: object) -> None:
        text = bit_line(256) if make is bit_line else multiplexer(256)
        found = circuit_of(text)
        assert not found.not_understood
        (notice,) = (n for n in found.notices if n.code == "one-at-a-time")
        assert "at most 256 of them" in notice.message
        assert notice.names == ("bl" if make is bit_line else "w",)
        starts = {path.start for path in analyse(found, count=2000).paths}
        assert len(starts) == 512

    def test_arcs_and_charges_grow_with_the_line_not_with_its_square(self) -> None:
        sizes = []
        for inputs in (100, 200, 400):
            arcs = circuit_of(multiplexer(inputs)).arcs
            sizes.append((len(arcs), len(arcs.charges.net), len(arcs.own.resistance)))
        small, middle, large = np.array(sizes)
        assert (large - middle == 2 * (middle - small)).all()

    def test_the_line_weighs_the_same_on_either_side_of_the_limit(self) -> None:
        """Counted as pins or as own capacitance: a pass of 1 um puts 1 fF on the line."""
        delays = []
        for inputs in (63, 64, 65, 66):
            found = circuit_of(multiplexer(inputs))
            (stage,) = (s for s in found.stages if len(s.form.parts) > 1)
            assert bool(crowded(stage.form)) == (inputs > 64)
            arcs = found.arcs
            data = (arcs.input == found.net_id("d0")) & (arcs.output == found.net_id("w"))
            delays.append(arcs.elmore(found.net_cap)[data & arcs.rising].max())
        # Rising, the pass counts twice: 1 + 2 kohm.
        assert np.diff(delays) == pytest.approx(3e3 * 1e-15)

    def test_a_line_that_no_gate_listens_to_is_no_input(self) -> None:
        """Seventy passes into a line, one more from there to where a gate listens."""
        more = transistor("n", "w", "e", "v", 1, "v") + "\n" + inverter("o", "v", "y", 1, 2)
        text = multiplexer(70).replace(inverter("o", "w", "y", 1, 2), more)
        found = analyse(circuit_of(text.replace(" y\n", " e y\n", 1)), count=400)
        assert "w" not in {path.start for path in found.paths}
        assert "w" not in {path.end for path in found.paths}

    def test_a_crossbar_of_32(self) -> None:
        found = circuit_of(crossbar(32))
        assert not found.not_understood
        assert len(found) == 32 * 32 + 3 * 32
        (notice,) = (n for n in found.notices if n.code == "one-at-a-time")
        assert len(notice.names) == 64
