"""Single gates over a grid of transitions and loads."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.errors import SimulationError
from evenstage.process.process import Channel
from evenstage.simulation.beside import side_by_side
from evenstage.simulation.measure import measure_gates
from evenstage.simulation.simulate import simulate
from evenstage.timing.analyse import analyse
from evenstage.timing.yardstick import yardstick
from support.blocks import block, circuit_of, inverter, nand, nor, plain_process
from support.nonlinear import Bench

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.simulation.measure import GateDelays

CELLS = block(
    "\n".join([
        inverter("i", "a", "x", 1, 2),
        nand("n", ["b", "c"], "y", 2, 2),
        nor("o", ["d", "e"], "z", 1, 4),
    ]),
    "a b c d e",
)  # fmt: skip


def bench() -> Circuit:
    plain = plain_process(p_inv=0.7, slope=0.2, shape=1.8)
    kinds = tuple(
        replace(kind, channel=Channel(current=4e2 / (1 + place), threshold=0.25, alpha=1.3))
        for place, kind in enumerate(plain.transistors)
    )
    some = circuit_of(CELLS, replace(plain, transistors=kinds))
    return replace(some, outside_cap=np.zeros_like(some.outside_cap))


@pytest.fixture(scope="module")
def measured() -> GateDelays:
    some = bench()
    return measure_gates(
        some, yardstick(some.process), range(len(some)), transitions=(0.7, 1.5), loads=(1.0, 4.0)
    )


class TestMeasureGates:
    def test_every_edge_of_every_input(self, measured: GateDelays) -> None:
        some = bench()
        names = some.devices.net_names
        arcs = {
            (names[i], names[o], up)
            for i, o, up in zip(
                measured.input.tolist(),
                measured.output.tolist(),
                measured.rising.tolist(),
                strict=True,
            )
        }
        pins = [("a", "x"), ("b", "y"), ("c", "y"), ("d", "z"), ("e", "z")]
        assert arcs == {(*pin, up) for pin in pins for up in (True, False)}
        assert len(measured.delay) == 4 * len(arcs)
        assert measured.notices == ()

    def test_more_load_and_slower_inputs_take_longer(self, measured: GateDelays) -> None:
        delay = measured.delay.reshape(-1, 2, 2)
        assert (np.diff(delay, axis=2) > 0).all()
        assert (np.diff(delay, axis=1) > 0).all()

    def test_input_takes_the_capacitance_of_the_process(self, measured: GateDelays) -> None:
        # 1 fF per micron, and what the output has moved already.
        inverter_rows = measured.gate == measured.gate[0]
        found = measured.input_cap[inverter_rows]
        assert_allclose(found, 3e-15, rtol=0.03, atol=0)
        assert (found > 3e-15).all()

    def test_agrees_with_a_path_of_one_stage(self, measured: GateDelays) -> None:
        some = bench()
        x = some.net_id("x")
        assert x is not None
        row = int(np.flatnonzero(measured.output == x)[1])
        load = some.outside_cap.copy()
        load[x] = measured.load[row]
        loaded = replace(some, outside_cap=load)
        analysis = analyse(loaded, end="x")
        assert analysis.timing is not None
        graph = analysis.timing.graph
        ramp = np.full(len(graph.start), measured.transition[row])
        timing = replace(analysis.timing, graph=replace(graph, start_transition=ramp))
        found = simulate(replace(analysis, timing=timing)).before
        paths = [path for path in (*found.paths, found.other_edge) if path is not None]
        edge = "rise" if measured.rising[row] else "fall"
        alone = next(path.delay for path in paths if path.estimate.edge == edge)
        assert_allclose(measured.delay[row], alone, rtol=2e-3, atol=0)

    def test_nothing_to_measure_is_an_error(self) -> None:
        some = bench()
        with pytest.raises(SimulationError, match="no input of the gates"):
            measure_gates(some, yardstick(some.process), [])


class TestSideBySide:
    def test_parts_do_not_touch(self) -> None:
        parts = []
        for size in (1.0, 2.0, 3.0):
            part = Bench(["m", "y"], ["0", "vdd", "in"])
            part.inverter("in", "m", size)
            part.inverter("m", "y", 2 * size)
            parts.append(part.equations())
        both = side_by_side(parts)
        unknown = np.random.default_rng(611).uniform(0, 1, 6)
        given, change = np.array([0.0, 1.0, 0.4]), np.array([0.0, 0.0, 0.3])
        together = both.slope(unknown, np.tile(given, 3), np.tile(change, 3))
        alone = [
            part.slope(unknown[2 * i : 2 * i + 2], given, change) for i, part in enumerate(parts)
        ]
        assert_allclose(together, np.concatenate(alone), rtol=1e-9, atol=1e-12)
