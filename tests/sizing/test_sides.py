"""Pull-up and pull-down apart: the programme against the block itself, resized and timed again."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.brief import Brief, InputBrief
from evenstage.pattern import Pattern
from evenstage.sizing.model import Limits, Model
from evenstage.sizing.sides import sharing, sides_of
from evenstage.timing.sweep import sweep
from support.blocks import block, circuit_of, inverter, nand, plain_process
from support.models import model_of
from support.pass_networks import rotator, tree
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.sizing.problem import FloatArray, Problem
    from evenstage.timing.sweep import Timing

PROCESS = plain_process(
    r_fixed=60.0, c_gate_fixed=0.2e-15, c_drain_fixed=0.1e-15, stack=0.7,
    slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2,
)  # fmt: skip
NO_LIMITS = Limits(ceiling_net=np.zeros(0, np.int32), ceiling=np.zeros(0), transition=np.inf)
WIRED = block(
    "\n".join(
        [
            inverter("i", "a", "m", 1, 2),
            *("ra m k 300", "rb k n 500", "ca k vss 3f", "cb n vss 2f"),
            inverter("j", "k", "y", 2, 4),
            nand("q", ["n", "a"], "z", 2, 2),
            *("cy y vss 20f", "cz z vss 9f"),
        ]
    ),
    "a y z vdd vss",
)


def problem_of(model: Model) -> Problem:
    count = len(model.variables)
    return model.problem(np.full(count, 0.1), np.full(count, 10.0), np.ones(count), NO_LIMITS)


def timed(model: Model, sizes: FloatArray) -> Timing:
    circuit = model.circuit.resized(model.variables.factors(sizes))
    return sweep(circuit, model.graph, model.unit)


def drawn_sizes(model: Model, data: st.DataObject) -> FloatArray:
    return np.array([data.draw(st.floats(0.2, 5)) for _ in range(len(model.variables))])


def own_arcs(model: Model, sizes: FloatArray) -> FloatArray:
    """Return the delays of the graph's arcs, the last of the programme's."""
    delays = problem_of(model).arc_delays(sizes)
    return delays[len(delays) - len(model.graph.arc) :]


class TestDelays:
    @given(random_blocks(), st.data())
    @settings(max_examples=30, deadline=None)
    def test_every_arc_at_any_sizes(self, drawn: RandomBlock, data: st.DataObject) -> None:
        model = model_of(drawn.text(), PROCESS, apart=True)
        assert len(model.variables) == 2 * len(model.circuit)
        sizes = drawn_sizes(model, data)
        assert own_arcs(model, sizes) == pytest.approx(timed(model, sizes).charged, rel=1e-9)

    @pytest.mark.parametrize("text", [tree(2), rotator(1)], ids=["tree", "rotator"])
    @given(data=st.data())
    @settings(max_examples=6, deadline=None)
    def test_every_arc_through_passes(self, text: str, data: st.DataObject) -> None:
        """What conducts both ways keeps one size; the inverters before it have two."""
        brief = Brief(inputs=(InputBrief(nets=(Pattern("d*"),), arrival=2e-11, drive=900.0),))
        model = model_of(text, PROCESS, brief, apart=True)
        assert len(model.circuit) < len(model.variables) < 2 * len(model.circuit)
        sizes = drawn_sizes(model, data)
        assert own_arcs(model, sizes) == pytest.approx(timed(model, sizes).charged, rel=1e-9)

    @given(data=st.data())
    @settings(max_examples=15, deadline=None)
    def test_every_arc_behind_wires(self, data: st.DataObject) -> None:
        model = model_of(WIRED, PROCESS, apart=True)
        sizes = drawn_sizes(model, data)
        assert own_arcs(model, sizes) == pytest.approx(timed(model, sizes).charged, rel=1e-9)

    @given(random_blocks(most=6), st.data())
    @settings(max_examples=10, deadline=None)
    def test_gradient_is_that_of_the_block_timed_again(
        self, drawn: RandomBlock, data: st.DataObject
    ) -> None:
        """Central differences of all arcs' delays added up, in the logarithm of each size."""
        model = model_of(drawn.text(), PROCESS, apart=True)
        sizes, step = drawn_sizes(model, data), 1e-5
        delays = problem_of(model).delay
        gradient = delays.gradient(np.log(sizes), np.ones(len(model.graph.arc)))
        for size in range(len(sizes)):
            moved = [
                timed(model, sizes * np.exp(way * step * (np.arange(len(sizes)) == size)))
                for way in (1, -1)
            ]
            slope = (moved[0].charged.sum() - moved[1].charged.sum()) / (2 * step)
            assert gradient[size] == pytest.approx(slope, rel=1e-5, abs=1e-17)


class TestSides:
    def test_an_inverter(self) -> None:
        """Drains add up on the output; the pin is of 1 um n and 2 um p, 1 fF each micron."""
        circuit = circuit_of(block(inverter("i", "a", "y", 1, 2), "a y vdd vss"), plain_process())
        sides = sides_of(circuit)
        rising = circuit.arcs.rising[circuit.arcs.charges.arc]
        assert sides.charge.tolist() == rising.astype(int).tolist()
        assert sides.pin_cap == pytest.approx([2e-15])
        assert sides.term_delay / circuit.arcs.own.today == pytest.approx([2 / 3, 2 / 3])
        assert not sides.mixed.any()

    def test_what_is_fought_is_of_both_sides(self) -> None:
        cards = "mn y a vss vss nx w=4u l=0.1u\nmp y vss vdd vdd px w=1u l=0.1u\ncl y vss 9f"
        circuit = circuit_of(block(cards, "a y vdd vss"), plain_process())
        assert circuit.gate_kind(0) == "ratioed gate"
        assert sides_of(circuit).mixed.tolist() == [True]

    def test_all_or_nothing_but_for_rounding_is_made_so(self) -> None:
        once = np.array([1.0, 1.0, 1.0, 0.0])
        doubled = np.array([2.0 - 1e-15, 1.0 + 1e-15, 1.5, 0.0])
        assert sharing(once, doubled).tolist() == [1.0, 0.0, 0.5, 0.0]
