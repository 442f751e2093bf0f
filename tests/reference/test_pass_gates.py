"""Paths through transmission gates: estimates and simulations on constants of plain cells."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from evenstage import flow
from evenstage.process.read import read_process
from support.cells import cells

if TYPE_CHECKING:
    from evenstage.simulation.results import SimulatedPath

ROTATOR = Path(__file__).parents[2] / "sample_netlists" / "lane_rotator"


@pytest.fixture(scope="module")
def fitted(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A process whose constants are those of a simulated inverter, NAND2 and NOR2."""
    work = tmp_path_factory.mktemp("fit")
    drawn, output = work / "cells.sp", work / "process.toml"
    drawn.write_text(cells(read_process(ROTATOR / "process.toml")))
    flow.fit_simulated(drawn, flow.Question(process=ROTATOR / "process.toml"), output)
    return output


def off(path: SimulatedPath) -> float:
    return abs(path.estimated_delay / path.delay - 1)


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
