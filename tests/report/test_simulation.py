"""A simulation as text, as JSON and as a table of waveforms, from made-up numbers."""

from __future__ import annotations

import csv
import io
import json
import re
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest

from evenstage.errors import Notice
from evenstage.report.document.convert import document as document_of
from evenstage.report.document.convert import to_json
from evenstage.report.document.simulation import waveform_table
from evenstage.report.page.parts import Figure
from evenstage.report.page.waveforms import waveform_parts
from evenstage.report.paper import Paper
from evenstage.report.terminal import simulation_report
from evenstage.simulation.results import (
    SimulatedBlock,
    SimulatedPath,
    SimulatedStage,
    Simulation,
    Traces,
)

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from evenstage.report.page.parts import Part
    from evenstage.sizing.results import Sizing
    from evenstage.timing.results import Analysis, Path


def simulated(path: Path, factor: float) -> SimulatedPath:
    """Return a path whose stages take so many times their estimate."""
    stages = tuple(
        SimulatedStage(stage, factor * stage.delay, None if place == 2 else 1.1 * stage.transition)
        for place, stage in enumerate(path.stages)
    )
    nets = (path.start, *(stage.output for stage in path.stages))
    return SimulatedPath(
        estimate=path,
        stages=stages,
        delay=factor * (path.delay - path.start_arrival),
        held=(("b1", True), ("sel", False)),
        by_vector=True,
        devices=42,
        nodes=21,
        steps=160,
        side_gates=7,
        traces=Traces(nets, np.array([0.0, 1e-12]), np.full((len(nets), 2), 0.25)),
    )


def block(analysis: Analysis, factor: float) -> SimulatedBlock:
    paths = tuple(simulated(path, factor) for path in analysis.paths)
    return SimulatedBlock(
        analysis=analysis, paths=paths, other_edge=simulated(analysis.paths[0], 0.9)
    )


@pytest.fixture
def one(analysis: Analysis) -> Simulation:
    return Simulation(
        before=block(analysis, 0.97),
        after=None,
        side_branches="gates",
        scaled=False,
        notices=(Notice("channel-assumed", "thresholds are those of the generic process"),),
    )


@pytest.fixture
def two(sizing: Sizing) -> Simulation:
    return Simulation(
        before=block(sizing.before, 0.97),
        after=block(sizing.after, 0.95),
        side_branches="capacitances",
        scaled=True,
        notices=(),
    )


def _drawn(parts: Sequence[Part]) -> str:
    """Return the markup of all drawings."""
    figures = [part for part in parts if isinstance(part, Figure)]
    return "".join(drawing.__html__() for figure in figures for drawing in figure.drawings)


class TestText:
    @pytest.mark.parametrize("width", [80, 100, 160])
    def test_one_netlist(
        self, one: Simulation, golden: Callable[[str, str], None], width: int
    ) -> None:
        golden(f"simulation_{width}", simulation_report(one, Paper(width)))

    def test_two_netlists(self, two: Simulation, golden: Callable[[str, str], None]) -> None:
        golden("simulation_pair", simulation_report(two, Paper(unicode=True)))

    def test_waveforms_of_two_netlists_share_their_time_axis(self, two: Simulation) -> None:
        assert two.after is not None
        before, after = two.before.paths[0], two.after.paths[0]
        longer = replace(before.traces, time=2 * before.traces.time)
        paths = [("before", replace(before, traces=longer)), ("after", after)]
        first, second = re.findall(r"V over ([\d.]+ \ws)", _drawn(waveform_parts(paths)))
        assert first == second
        (alone,) = re.findall(r"V over ([\d.]+ \ws)", _drawn(waveform_parts(paths[1:])))
        assert alone != second

    def test_fits_any_width(self, one: Simulation, two: Simulation) -> None:
        for width in (80, 97, 160):
            for some in (one, two):
                lines = simulation_report(some, Paper(width)).splitlines()
                assert max(map(len, lines)) <= width

    def test_scaled_currents_are_no_evidence_of_times(
        self, one: Simulation, two: Simulation
    ) -> None:
        told = "absolute times agree by construction"
        assert told in " ".join(simulation_report(two).split())
        assert told not in " ".join(simulation_report(one).split())


class TestRanking:
    def test_is_alike_where_simulated_delays_follow(self, one: Simulation) -> None:
        assert one.before.ranks_alike

    def test_is_not_where_the_second_turns_out_slower(self, one: Simulation) -> None:
        first, *others = one.before.paths
        second = replace(
            first,
            estimate=replace(first.estimate, delay=0.98 * first.estimate.delay),
            delay=1.05 * first.delay,
        )
        swapped = replace(one.before, paths=(first, second, *others[1:]))
        assert not swapped.ranks_alike
        assert "rank 2, 1" in simulation_report(replace(one, before=swapped))


class TestJson:
    def test_holds_estimate_and_simulation_of_every_stage(self, two: Simulation) -> None:
        document = json.loads(to_json(document_of(two)))
        assert document["kind"] == "simulation"
        old, new = document["before"]["paths"][0], document["after"]["paths"][0]
        ratio = old["simulated_delay_s"] / new["simulated_delay_s"]
        assert document["speed_up"]["simulated"] == pytest.approx(ratio, rel=1e-12)
        stage = old["stages"][0]
        assert stage["simulated_delay_s"] == pytest.approx(0.97 * stage["estimated_delay_s"])
        assert old["stages"][2]["simulated_transition_s"] is None
        assert old["held"] == [{"net": "b1", "level": 1}, {"net": "sel", "level": 0}]


class TestWaveforms:
    def test_one_line_for_each_voltage(self, two: Simulation) -> None:
        rows = list(csv.DictReader(io.StringIO(waveform_table(two))))
        stages = len(two.before.paths[0].stages)
        first = [row for row in rows if row["path"] == "1"]
        assert len(first) == 2 * 2 * (stages + 1)
        assert {row["path"] for row in rows} >= {"1", "other edge"}
        assert {float(row["voltage_v"]) for row in rows} == {0.25}
