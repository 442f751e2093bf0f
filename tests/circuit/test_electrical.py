"""Resistances and capacitances of transistors against the formulas written out."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.circuit.electrical import electrical
from evenstage.process.process import Junction, Junctions
from support.blocks import circuit_of, devices_of, plain_process

if TYPE_CHECKING:
    from evenstage.netlist.devices import Devices

PROCESS = plain_process(
    r_fixed=40.0, c_gate_fixed=0.1e-15, c_drain_fixed=0.2e-15, stack=0.6, slope=0.3
)
JUNCTION = Junction(area=1e-3, edge=2e-10)
JUNCTIONS = plain_process(c_drain_fixed=0.2e-15, junctions=Junctions(rise=JUNCTION, fall=JUNCTION))


def transistor(parameters: str) -> Devices:
    text = f"* t\nmn y a vss vss nx {parameters}\nmp y a vdd vdd px w=2u l=0.1u\n"
    return devices_of(text, PROCESS)


class TestElectrical:
    def test_each_constant(self) -> None:
        found = electrical(transistor("w=3u l=0.2u"), PROCESS)
        assert found.resistance.scaling[0] == pytest.approx(1e-3 * 2 / 3e-6)
        assert found.resistance.fixed[0] == pytest.approx(40.0)
        assert found.gate.scaling[0] == pytest.approx(1e-9 * 3e-6 * 2)
        assert found.gate.fixed[0] == pytest.approx(0.1e-15)
        assert found.drain.today[0] == pytest.approx(1e-9 * 3e-6 + 0.2e-15)
        assert found.source.today[0] == pytest.approx(1e-9 * 3e-6 + 0.2e-15)
        assert [float(one[0]) for one in (found.stack, found.slope)] == [0.6, 0.3]

    def test_types_are_told_apart(self) -> None:
        found = electrical(transistor("w=2u l=0.1u"), PROCESS)
        assert found.resistance.scaling[1] == pytest.approx(2 * found.resistance.scaling[0])

    def test_copies_in_parallel(self) -> None:
        one = electrical(transistor("w=3u l=0.2u"), PROCESS)
        four = electrical(transistor("w=3u l=0.2u m=4"), PROCESS)
        assert four.resistance.today[0] == pytest.approx(one.resistance.today[0] / 4)
        for name in ("gate", "drain", "source"):
            assert getattr(four, name).today[0] == pytest.approx(4 * getattr(one, name).today[0])

    def test_diffusion_from_area_and_perimeter(self) -> None:
        devices = transistor("w=2u l=0.1u ad=1p pd=5u")
        found = electrical(devices, JUNCTIONS)
        assert found.drain.today[0] == pytest.approx(1e-3 * 1e-12 + 2e-10 * 5e-6)
        # The extent is 0.5 um, so that 1 um of the edge stays whatever the width.
        assert found.drain.fixed[0] == pytest.approx(2e-10 * 1e-6)
        # The source says nothing, so the constants per width count.
        assert found.source.today[0] == pytest.approx(1e-9 * 2e-6 + 0.2e-15)

    def test_each_edge_sees_its_own_part_of_the_swing(self) -> None:
        near = Junction(area=3e-3, edge=5e-10, overlap=7e-10, drain_fixed=11e-16)
        far = Junction(area=1e-3, edge=2e-10, overlap=7e-10, source_fixed=13e-16)
        process = plain_process(junctions=Junctions(rise=near, fall=far))
        found = electrical(transistor("w=2u l=0.1u ad=1p pd=5u as=2p ps=6u m=2"), process)
        rise = 3e-3 * 1e-12 + 5e-10 * 5e-6 + 7e-10 * 2e-6 + 11e-16
        fall = 1e-3 * 1e-12 + 2e-10 * 5e-6 + 7e-10 * 2e-6
        assert found.rise.drain.today[0] == pytest.approx(2 * rise)
        assert found.fall.drain.today[0] == pytest.approx(2 * fall)
        assert found.drain.today[0] == pytest.approx(rise + fall)
        source = 1e-3 * 2e-12 + 2e-10 * 6e-6 + 7e-10 * 2e-6 + 13e-16
        assert found.fall.source.today[0] == pytest.approx(2 * source)

    def test_diffusion_without_junction_constants(self) -> None:
        found = electrical(transistor("w=2u l=0.1u ad=1p pd=5u"), PROCESS)
        assert found.drain.today[0] == pytest.approx(1e-9 * 2e-6 + 0.2e-15)


class TestResized:
    @given(st.floats(0.2, 20), st.sampled_from(["", "ad=1p pd=5u as=0.7p ps=3u", "ad=3p pd=2u"]))
    @settings(max_examples=60, deadline=None)
    def test_what_scales_scales_and_what_stays_stays(self, factor: float, areas: str) -> None:
        text = f"* t\nmn y a vss vss nx w=2u l=0.1u {areas}\nmp y a vdd vdd px w=2u l=0.1u\n"
        process = replace(
            JUNCTIONS,
            transistors=tuple(replace(t, r_fixed=30.0) for t in JUNCTIONS.transistors),
        )
        circuit = circuit_of(text, process)
        today = circuit.electrical
        after = circuit.resized(np.full(2, factor)).electrical
        assert after.resistance.today == pytest.approx(
            today.resistance.scaling / factor + today.resistance.fixed, rel=1e-12
        )
        for name in ("gate", "drain", "source"):
            before = getattr(today, name)
            assert getattr(after, name).today == pytest.approx(
                before.scaling * factor + before.fixed, rel=1e-12
            )


class TestEdges:
    def test_an_output_rises_and_falls_through_its_own_junctions(self) -> None:
        """An inverter: each arc counts what both junctions hold over its part of the swing."""
        near, far = Junction(area=3e-3, edge=0.0), Junction(area=1e-3, edge=0.0)
        process = plain_process()
        n, p = process.transistors
        process = replace(
            process,
            transistors=(
                replace(n, junctions=Junctions(rise=near, fall=far)),
                replace(p, junctions=Junctions(rise=far, fall=near)),
            ),
        )
        areas = "ad=1p as=0 pd=0 ps=0"
        text = (
            f"* t\nmn y a vss vss nx w=1u l=0.1u {areas}\nmp y a vdd vdd px w=2u l=0.1u "
            f"{areas.replace('1p', '2p')}\n"
        )
        arcs = circuit_of(text, process).arcs
        own = dict(zip(arcs.rising.tolist(), arcs.own_today.tolist(), strict=True))
        resistance = 1e-3 / 1e-6
        assert own[True] == pytest.approx(resistance * (3e-15 + 2e-15))
        assert own[False] == pytest.approx(resistance * (1e-15 + 6e-15))
