"""Trials swept side by side against each change swept alone."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.brief import Brief, InputBrief, OutputBrief
from evenstage.pattern import Pattern
from evenstage.timing import trials as module
from evenstage.timing.analyse import time
from evenstage.timing.sweep import sweep
from evenstage.timing.trials import tried
from support.blocks import circuit_of, plain_process
from support.pass_networks import rotator, tree
from support.random_blocks import random_blocks

PROCESS = plain_process(
    slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2, stack=0.7, r_fixed=50.0
)
BRIEF = Brief(
    inputs=(InputBrief(nets=(Pattern("i*"),), arrival=3e-11, drive=2e3),),
    outputs=(OutputBrief(nets=(Pattern("n*"),), required=1e-10),),
)


BLOCKS = st.one_of(
    random_blocks().map(lambda block: block.text()), st.sampled_from([tree(2), rotator(1)])
)


class TestTried:
    @given(BLOCKS, st.data(), st.sampled_from([1, 3_000, 4_000_000]))
    @settings(max_examples=60, deadline=None)
    def test_each_trial_is_the_block_with_only_its_gates_changed(
        self, text: str, data: st.DataObject, side_by_side: int
    ) -> None:
        """Where pass transistors are, one trial may change what others drive through."""
        brief = BRIEF if ".subckt top i" in text else None
        timing = time(circuit_of(text, PROCESS, brief), brief)
        circuit = timing.circuit
        count = data.draw(st.integers(1, 4))
        trial = np.array(
            [data.draw(st.integers(-1, count - 1)) for _ in range(len(circuit))], np.int32
        )
        trial[0] = count - 1
        factor = np.array([data.draw(st.floats(0.3, 4)) for _ in range(len(circuit.devices))])
        nets = np.arange(len(circuit.devices.net_names))
        limit = np.linspace(1, 3, len(circuit.arcs.gate)) * 1e-12
        with pytest.MonkeyPatch.context() as patch:
            patch.setattr(module, "_SIDE_BY_SIDE", side_by_side)
            found = tried(timing, circuit.resized(factor), trial, nets=nets, elmore_limit=limit)
        for number in range(count):
            mine = np.append(trial, -1)[circuit.gate_of_device] == number
            alone = circuit.resized(np.where(mine, factor, 1.0))
            swept = sweep(alone, timing.graph, timing.unit)
            use = (alone.arcs.elmore(alone.net_cap) / limit).max()
            assert found.worst[number] == pytest.approx(swept.worst, rel=1e-12)
            assert found.lateness[number] == pytest.approx(swept.lateness.max(), rel=1e-12)
            charged = swept.charged_arrival[timing.graph.end] - swept.arrival[timing.graph.end]
            assert found.charged_lateness[number] == pytest.approx(
                (swept.lateness + charged).max(), rel=1e-12
            )
            assert found.worst_transition[number] == pytest.approx(
                swept.worst_transition, rel=1e-12
            )
            assert found.net_cap[:, number] == pytest.approx(alone.net_cap, rel=1e-12)
            assert found.elmore_use[number] == pytest.approx(use, rel=1e-12)
