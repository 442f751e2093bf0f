"""Samples estimated and simulated on equal constants, before and after resizing."""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import combinations
from pathlib import Path
from time import process_time
from typing import TYPE_CHECKING

from evenstage import flow
from evenstage.process.read import read_process
from support.cells import cells

if TYPE_CHECKING:
    from evenstage.simulation.results import SimulatedBlock, SimulatedPath, Simulation

SAMPLES = Path(__file__).parents[2] / "sample_netlists"

#: Simulated delays that differ by less, as shares, are equal.
_ALIKE = 1e-3


@dataclass(frozen=True)
class Simulated:
    """A sample, its three slowest paths before and after; the fit's median error; seconds."""

    name: str
    simulation: Simulation
    fitted: float
    seconds: float

    @property
    def blocks(self) -> dict[str, SimulatedBlock]:
        """The two netlists."""
        assert self.simulation.after is not None
        return {"before": self.simulation.before, "after": self.simulation.after}

    @property
    def paths(self) -> list[SimulatedPath]:
        """All paths simulated."""
        found = []
        for block in self.blocks.values():
            found += [*block.paths, *([block.other_edge] if block.other_edge else [])]
        return found

    @property
    def gains(self) -> tuple[float, float]:
        """By how much the slowest path gets faster, claimed and simulated, as shares."""
        old, new = (block.paths[0] for block in self.blocks.values())
        return (1 - new.estimated_delay / old.estimated_delay, 1 - new.delay / old.delay)

    @property
    def turned(self) -> list[tuple[str, int, int, float, float]]:
        """Pairs of paths that are ranked differently: netlist, numbers from 1, and by how much
        the first is estimated slower, and is simulated faster, as shares.
        """
        found = []
        for when, block in self.blocks.items():
            for (i, one), (j, other) in combinations(enumerate(block.paths, 1), 2):
                claimed = 1 - other.estimated_delay / one.estimated_delay
                if claimed > 0 and other.delay > one.delay * (1 + _ALIKE):
                    found.append((when, i, j, claimed, other.delay / one.delay - 1))
        return found


def simulated(name: str, work: Path) -> Simulated:
    """Fit a sample's process to an inverter, a NAND2 and a NOR2; resize; simulate on it.

    Parameters
    ----------
    name : str
    work : Path
        A folder for files in between.
    """
    folder = SAMPLES / name
    drawn, fitted = work / f"{name}_cells.sp", work / f"{name}.toml"
    drawn.write_text(cells(read_process(folder / "process.toml")))
    fit = flow.fit_simulated(drawn, flow.Question(process=folder / "process.toml"), fitted)
    assert fit.single is not None
    question = flow.Question(process=fitted, brief=folder / "brief.toml", count=3)
    netlist, after = folder / "netlist.sp", work / f"{name}.sp"
    flow.resize(netlist, replace(question, count=1), output=after)
    begun = process_time()
    result = flow.simulate(netlist, question, after=after)
    return Simulated(name, result, fit.single.median, process_time() - begun)
