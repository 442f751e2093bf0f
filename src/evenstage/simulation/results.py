"""What a simulation says: frozen values in SI units, the estimate beside each."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Final, Literal

import numpy as np

from evenstage.tabular import Row, Tabular, row
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.errors import Notice
    from evenstage.netlist.devices import FloatArray
    from evenstage.timing.results import Analysis, Path, Stage

#: Simulated delays that differ by less are equal.
_ALIKE: Final = 1e-3

SideBranches = Literal["gates", "capacitances"]


@dataclass(frozen=True, slots=True)
class SimulatedStage:
    """One stage, estimated and simulated.

    Parameters
    ----------
    estimate : Stage
    delay : float
        s, between the 50 % points of input and output.
    transition : float, optional
        s, 10 to 90 % of the output over 0.8; None where it does not swing so far.
    """

    estimate: Stage
    delay: float
    transition: float | None


@dataclass(frozen=True, slots=True)
class Traces:
    """Voltages along a path; time 0 is where the input's ramp begins.

    Parameters
    ----------
    nets : tuple of str
        The start and each stage's output.
    time : FloatArray, s, shape (times,)
    voltage : FloatArray, V, shape (nets, times)
    """

    nets: tuple[str, ...]
    time: FloatArray
    voltage: FloatArray

    def thinned(self, most: int = 400) -> Traces:
        """Return at most so many times, those between which the voltages move most.

        The first and the last time stay; what is thin enough stays as it is.
        """
        if len(self.time) <= most:
            return self
        span = (self.time[-1] - self.time[0]) or 1.0
        swing = float(np.ptp(self.voltage)) or 1.0
        moves = np.abs(np.diff(self.voltage, axis=1)).max(axis=0) / swing
        along = np.concatenate([[0.0], np.cumsum(np.diff(self.time) / span + moves)])
        wanted = np.linspace(0.0, along[-1], most)
        kept = np.unique(np.minimum(np.searchsorted(along, wanted), len(along) - 1))
        return Traces(self.nets, self.time[kept], self.voltage[:, kept])


@dataclass(frozen=True, slots=True, kw_only=True)
class SimulatedPath:
    """One path, estimated and simulated.

    Parameters
    ----------
    estimate : Path
    stages : tuple of SimulatedStage
    delay : float
        s, from the 50 % point of the start to that of the end.
    held : tuple of (str, bool)
        Side inputs and what they were held at.
    by_vector : bool
        Whether an input vector says so; else they suit the path's own gates, each by itself.
    devices, nodes, steps, side_gates : int
        Sizes: transistors, unknown voltages, time steps, gates off the path.
    traces : Traces
    """

    estimate: Path
    stages: tuple[SimulatedStage, ...]
    delay: float
    held: tuple[tuple[str, bool], ...]
    by_vector: bool
    devices: int
    nodes: int
    steps: int
    side_gates: int
    traces: Traces = field(repr=False, compare=False)

    @property
    def estimated_delay(self) -> float:
        """The estimate from the switching of the input, s."""
        return self.estimate.delay - self.estimate.start_arrival


@dataclass(frozen=True, slots=True, kw_only=True)
class SimulatedBlock:
    """The paths of one netlist.

    Parameters
    ----------
    analysis : Analysis
    paths : tuple of SimulatedPath
        Slowest by estimate first.
    other_edge : SimulatedPath, optional
        The first path with all edges turned round, where the gates have such arcs.
    same_path : SimulatedPath, optional
        After a change: the path that was the slowest before it, where that is another one now.
    """

    analysis: Analysis
    paths: tuple[SimulatedPath, ...]
    other_edge: SimulatedPath | None = None
    same_path: SimulatedPath | None = None

    @property
    def ranks_alike(self) -> bool:
        """Whether no path is simulated slower than one that is estimated slower, to 0.1 %."""
        delays = [path.delay for path in self.paths]
        return all(
            later.estimated_delay == earlier.estimated_delay
            or delays[j] <= delays[i] * (1 + _ALIKE)
            for i, earlier in enumerate(self.paths)
            for j, later in enumerate(self.paths[i:], i)
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Simulation(Tabular):
    """Paths of a netlist simulated, or of two netlists of one design.

    Parameters
    ----------
    before : SimulatedBlock
    after : SimulatedBlock, optional
    side_branches : {"gates", "capacitances"}
        How they were simulated.
    scaled : bool
        Whether currents were chosen so that FO4 agrees: only ratios are evidence then.
    notices : tuple of Notice
    """

    before: SimulatedBlock
    after: SimulatedBlock | None
    side_branches: SideBranches
    scaled: bool
    notices: tuple[Notice, ...]

    @property
    def headline(self) -> str:
        """The first path, estimated and simulated, in one line."""
        path = self.before.paths[0]
        return (
            f"{path.estimate.start} to {path.estimate.end}: estimated "
            f"{engineering(path.estimated_delay, 's')}, simulated {engineering(path.delay, 's')}"
        )

    def tables(self) -> dict[str, list[Row]]:
        """Return the stages of all paths, simulated values beside the estimates; SI units.

        Paths and stages are numbered from 1.
        """
        blocks = {"stages_before": self.before, "stages_after": self.after}
        return {
            name: [
                row(
                    stage.estimate,
                    path=number,
                    stage=place,
                    simulated_delay=stage.delay,
                    simulated_transition=stage.transition,
                )
                for number, path in enumerate(block.paths if block else (), 1)
                for place, stage in enumerate(path.stages, 1)
            ]
            for name, block in blocks.items()
        }
