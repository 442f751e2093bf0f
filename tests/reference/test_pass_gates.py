"""Paths through transmission gates: estimates and simulations on constants of plain cells."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from evenstage import flow
from evenstage.process.read import read_process
from support.cells import cells

if TYPE_CHECKING:
    from evenstage.simulation.results import SimulatedPath, Simulation

ROTATOR = Path(__file__).parents[2] / "sample_netlists" / "lane_rotator"


@pytest.fixture(scope="module")
def fitted(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A process whose constants are those of a simulated inverter, NAND2 and NOR2."""
    work = tmp_path_factory.mktemp("fit")
    drawn, output = work / "cells.sp", work / "process.toml"
    drawn.write_text(cells(read_process(ROTATOR / "process.toml")))
    flow.fit_simulated(drawn, flow.Question(process=ROTATOR / "process.toml"), output)
    return output


@pytest.fixture(scope="module")
def rotator(fitted: Path) -> Simulation:
    """The rotator before and after resizing."""
    netlist, after = ROTATOR / "netlist.sp", fitted.with_name("after.sp")
    question = flow.Question(process=fitted, brief=ROTATOR / "brief.toml", count=1)
    flow.resize(netlist, question, output=after)
    return flow.simulate(netlist, question, after=after)


def off(path: SimulatedPath) -> float:
    return abs(path.estimated_delay / path.delay - 1)


def test_paths_by_the_select_lines(rotator: Simulation) -> None:
    """Both edges, before and after, within 6 %; the gain in speed within 2 points."""
    assert rotator.after is not None
    for some in (rotator.before, rotator.after):
        assert some.paths[0].estimate.start == "s0"
        assert some.other_edge is not None
        assert off(some.paths[0]) < 0.02
        assert off(some.other_edge) < 0.06
    old, new = rotator.before.paths[0], rotator.after.paths[0]
    claimed, found = (
        1 - after / before
        for before, after in (
            (old.estimated_delay, new.estimated_delay), (old.delay, new.delay),
        )
    )  # fmt: skip
    assert abs(claimed - found) < 0.02


@pytest.mark.parametrize("end", ["q<2>", "q<6>"])
def test_paths_by_the_data(fitted: Path, end: str) -> None:
    """Through three ranks, both edges, within 9 %."""
    question = flow.Question(
        process=fitted, brief=ROTATOR / "brief.toml", count=1, start="d<2>", end=end
    )
    found = flow.simulate(ROTATOR / "netlist.sp", question).before
    assert found.other_edge is not None
    assert len(found.paths[0].estimate.stages[0].through) == 3
    assert off(found.paths[0]) < 0.09
    assert off(found.other_edge) < 0.03
