"""Wires in the convex programme against blocks really resized and timed again."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.brief import Brief, InputBrief, OutputBrief
from evenstage.pattern import Pattern
from evenstage.sizing import wire_terms as module
from evenstage.sizing.limiting import worst_charged
from evenstage.sizing.model import Limits, Model
from evenstage.sizing.problem import worst_delay
from evenstage.sizing.resize import resize
from evenstage.timing.analyse import analyse
from evenstage.timing.sweep import sweep
from support.blocks import circuit_of, plain_process
from support.models import model_of
from support.wires import wired_block

PROCESS = plain_process(
    r_fixed=60.0, c_gate_fixed=0.2e-15, c_drain_fixed=0.1e-15, stack=0.7,
    slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2,
)  # fmt: skip
BRIEF = Brief(
    inputs=(InputBrief(nets=(Pattern("i*"),), drive=900.0),),
    outputs=(OutputBrief(nets=(Pattern("y"),), load=7e-15),),
)
NO_LIMITS = Limits(ceiling_net=np.zeros(0, np.int32), ceiling=np.zeros(0), transition=np.inf)


def programmed(model: Model, sizes: np.ndarray) -> float:
    count = len(sizes)
    lower, upper = np.full(count, 0.1), np.full(count, 10.0)
    return worst_delay(model.problem(lower, upper, np.ones(count), NO_LIMITS), sizes)


def timed(model: Model, sizes: np.ndarray) -> float:
    circuit = model.circuit.resized(model.variables.factors(sizes))
    return worst_charged(sweep(circuit, model.graph, model.unit))


class TestDelays:
    @pytest.mark.parametrize("seed", range(12))
    def test_at_any_sizes(self, seed: int) -> None:
        """What wires add is linear in all that hangs on them, so the programme has it exactly."""
        model = model_of(wired_block(seed), PROCESS, BRIEF if seed % 2 else None)
        rng = np.random.default_rng(900 + seed)
        for sizes in (np.ones(len(model.variables)), rng.uniform(0.3, 4, len(model.variables))):
            assert_allclose(programmed(model, sizes), timed(model, sizes), rtol=1e-9, atol=0)

    def test_wires_count(self) -> None:
        source = wired_block(5)
        short = "\n".join(
            " ".join([*line.split()[:3], "0"]) if line.startswith("r") else line
            for line in source.split("\n")
        )
        one, other = (model_of(text, PROCESS, BRIEF) for text in (source, short))
        sizes = np.ones(len(one.variables))
        assert programmed(one, sizes) > 1.02 * programmed(other, sizes)

    def test_wide_nets_keep_the_delay_of_today(self, monkeypatch: pytest.MonkeyPatch) -> None:
        monkeypatch.setattr(module, "_SINKS_MOST", 0)
        model = model_of(wired_block(4), PROCESS, BRIEF)
        sizes = np.ones(len(model.variables))
        assert_allclose(programmed(model, sizes), timed(model, sizes), rtol=1e-12, atol=0)


class TestResize:
    @pytest.mark.parametrize("seed", [1, 2, 6])
    def test_a_wired_block_gets_faster_and_keeps_its_promise(self, seed: int) -> None:
        process = plain_process(slope=0.2, shape=1.6, width_min=3e-7, width_step=1e-8)
        analysis = analyse(circuit_of(wired_block(seed), process, BRIEF), BRIEF)
        sizing = resize(analysis, BRIEF)
        assert sizing.after.paths[0].delay < sizing.before.paths[0].delay
        timing = sizing.after.timing
        assert timing is not None
        assert sizing.bound <= timing.worst_charged * (1 + 1e-9)
        assert timing.worst_charged <= sizing.bound * 1.03
