"""Where in a stack an input enters, and what conducts beside it."""

from __future__ import annotations

import numpy as np
import pytest

from evenstage.brief import Brief, InputBrief
from evenstage.pattern import Pattern
from evenstage.timing.analyse import time
from support.blocks import block, circuit_of, nand, network, nor, plain_process

NAMES = ["a", "b", "c"]


def late(name: str) -> Brief:
    """Return a brief in which one input comes long after the others."""
    return Brief(inputs=(InputBrief(nets=(Pattern(name),), arrival=1e-9),))


class TestOrder:
    """A late input goes on the transistor nearest to the output (common practice, no source)."""

    @pytest.mark.parametrize("kind", [nand, nor])
    @pytest.mark.parametrize("slope", [0.0, 0.2])
    def test_the_nearer_the_output_the_sooner(self, kind: object, slope: float) -> None:
        assert callable(kind)
        process = plain_process(slope=slope, shape=1.7)
        circuit = circuit_of(block(kind("g", NAMES, "y", 3, 6), "a b c y"), process)
        worst = [time(circuit, late(name)).worst for name in NAMES]
        assert worst == sorted(worst)
        assert worst[2] - 1e-9 > 1.1 * (worst[0] - 1e-9)


class TestSideBySide:
    def arc_resistance(self, cards: str, name: str) -> float:
        """Return the resistance of the fall that an input makes, in units of 1 um of nMOS."""
        circuit = circuit_of(block(cards, "a b c y"))
        arcs = circuit.arcs
        which = np.flatnonzero((arcs.input == circuit.net_id(name)) & ~arcs.rising)
        return float(arcs.output_resistance[which].max()) / 1e3

    def or_and(self, second: str) -> str:
        down = [("y", "c", "x", 1.0), ("x", "a", "vss", 1.0), ("x", second, "vss", 1.0)]
        up = [("y", "c", "vdd", 1.0), ("y", "a", "z", 1.0), ("z", second, "vdd", 1.0)]
        return network("n", "d", down) + "\n" + network("p", "u", up)

    def test_two_that_may_conduct_together_count_as_one_that_does(self) -> None:
        """``!((a|b)&c)``: c may find only one of a and b on."""
        assert self.arc_resistance(self.or_and("b"), "c") == pytest.approx(2.0)

    def test_two_that_always_conduct_together_count_as_both(self) -> None:
        assert self.arc_resistance(self.or_and("a"), "c") == pytest.approx(1.5)
