"""Paths of an analysis to their simulation."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from evenstage.errors import Notice, SimulationError
from evenstage.progress import tell
from evenstage.simulation.bench import Bench, counted_paths, steps
from evenstage.simulation.excerpt import route_of
from evenstage.simulation.other_edge import turned_round
from evenstage.simulation.parameters import SCALED, assumption_notices
from evenstage.simulation.results import (
    SimulatedBlock,
    SimulatedPath,
    Simulation,
)
from evenstage.simulation.strength import strength
from evenstage.timing.compare import compare
from evenstage.timing.vectors import CONFLICTS

if TYPE_CHECKING:
    from evenstage.simulation.integrate import Accuracy
    from evenstage.simulation.results import SideBranches
    from evenstage.timing.results import Analysis, Path
    from evenstage.timing.sweep import Timing


def simulate(
    analysis: Analysis,
    after: Analysis | None = None,
    *,
    side_branches: SideBranches = "gates",
    accuracy: Accuracy | None = None,
    conflicts: int = CONFLICTS,
) -> Simulation:
    """Simulate the paths of an analysis, and those of the same design after a change.

    Side inputs are held as the path's vector says; where there is none, at values that let the path
    switch as far as its own gates are concerned, with a notice.

    Parameters
    ----------
    analysis : Analysis
        With its timing.
    after : Analysis, optional
        In the same process, measured by the same unit inverter.
    side_branches : {"gates", "capacitances"}
        Whether what hangs on the path is simulated as gates or as constant capacitances.
    accuracy : Accuracy, optional
    conflicts : int
        For the vectors of paths that carry none: after so many the search for one is given up; 0:
        nothing is searched.

    Raises
    ------
    SimulationError
        Where no path can be simulated.
    ValueError
        Where an analysis carries no timing.
    """
    timing = _timing(analysis)
    process = timing.circuit.process
    bench = Bench(strength(process, timing.unit), side_branches, accuracy, conflicts)
    first, notices = _block(analysis, bench)
    changed = None
    if after is not None:
        changed, more = _block(after, bench)
        same = compare(analysis, after).same_path_after
        if same is None:
            notices.append(_no_same_path(analysis.paths[0], after))
        elif steps(same) != steps(changed.paths[0].estimate):
            try:
                changed = replace(changed, same_path=bench.run(_timing(after), same))
            except SimulationError as error:
                notices.append(_left_out(same, error))
        notices += more
    assumed = assumption_notices(process)
    return Simulation(
        before=first,
        after=changed,
        side_branches=side_branches,
        scaled=any(notice.code == SCALED for notice in assumed),
        notices=tuple(dict.fromkeys([*assumed, *notices, *bench.notices])),
    )


def _timing(analysis: Analysis) -> Timing:
    if analysis.timing is None:
        message = "an analysis without its timing cannot be simulated"
        raise ValueError(message)
    return analysis.timing


def _block(analysis: Analysis, bench: Bench) -> tuple[SimulatedBlock, list[Notice]]:
    """Simulate all paths of an analysis that can be, and the first one's other edges.

    Raises
    ------
    SimulationError
        Where not even one can.
    """
    timing, notices = _timing(analysis), _passed_over(analysis)
    paths: list[SimulatedPath] = []
    for place, path in enumerate(analysis.paths):
        tell("simulating", place / len(analysis.paths))
        try:
            paths.append(bench.run(timing, path))
        except SimulationError as error:
            if not paths and path is analysis.paths[-1]:
                raise
            notices.append(_left_out(path, error))
    other = turned_round(timing, route_of(bench.groups(timing.circuit), paths[0].estimate))
    turned = None
    if other is not None:
        try:
            turned = bench.run(timing, other)
        except SimulationError as error:
            notices.append(_left_out(other, error))
    return SimulatedBlock(analysis=analysis, paths=tuple(paths), other_edge=turned), notices


def _no_same_path(path: Path, after: Analysis) -> Notice:
    return Notice(
        "no-same-path",
        f"the slowest path before, from {path.start} to {path.end}, is not in '{after.source}': the"
        " speed-up compares different paths; check that both are one design, or name the ends with"
        " --from and --to",
        names=(path.start, path.end),
    )


def _passed_over(analysis: Analysis) -> list[Notice]:
    """Say which paths are false."""
    if not analysis.false_paths:
        return []
    return [
        Notice(
            "false-path",
            f"{counted_paths(analysis.false_paths)} that no input vector lets switch left out,"
            " though estimated to be slower than some that follow",
            names=tuple(f"{path.start} to {path.end}" for path in analysis.false_paths),
        )
    ]


def _left_out(path: Path, error: SimulationError) -> Notice:
    words = {"rise": "rising", "fall": "falling"}
    return Notice(
        error.code,
        f"not simulated, from {path.start} {words[path.start_edge]} to {path.end}"
        f" {words[path.edge]}: {error.message}",
        names=(path.start, path.end),
    )
