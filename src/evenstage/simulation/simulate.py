"""Paths of an analysis to their simulation."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import Notice, SimulationError
from evenstage.progress import tell
from evenstage.simulation.crossings import last_crossing, transition
from evenstage.simulation.excerpt import excerpt, route_of
from evenstage.simulation.groups import Groups
from evenstage.simulation.integrate import integrate
from evenstage.simulation.other_edge import turned_round
from evenstage.simulation.parameters import SCALED, assumption_notices, parameters
from evenstage.simulation.results import (
    SimulatedBlock,
    SimulatedPath,
    SimulatedStage,
    Simulation,
    Traces,
)
from evenstage.simulation.strength import STEEPEST, strength
from evenstage.timing.compare import compare
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray
    from evenstage.simulation.excerpt import Excerpt
    from evenstage.simulation.integrate import Accuracy, Waveforms
    from evenstage.simulation.parameters import Parameters
    from evenstage.simulation.results import SideBranches
    from evenstage.timing.results import Analysis, Path
    from evenstage.timing.sweep import Timing

#: Circuits settle for so many FO4 before the edge.
_SETTLING: Final = 20.0

#: A path has so many times its estimate, and FO4 besides, to arrive.
_PATIENCE: Final = (20.0, 100.0)

#: A voltage this near to where it ends, as a share of the supply, has arrived.
_ARRIVED: Final = 0.04


def simulate(
    analysis: Analysis,
    after: Analysis | None = None,
    *,
    side_branches: SideBranches = "gates",
    accuracy: Accuracy | None = None,
) -> Simulation:
    """Simulate the paths of an analysis, and those of the same design after a change.

    Parameters
    ----------
    analysis : Analysis
        With its timing.
    after : Analysis, optional
        In the same process, measured by the same unit inverter.
    side_branches : {"gates", "capacitances"}
        Whether what hangs on the path is simulated as gates or as constant capacitances.
    accuracy : Accuracy, optional

    Raises
    ------
    SimulationError
        Where no path can be simulated.
    ValueError
        Where an analysis carries no timing.
    """
    timing = _timing(analysis)
    process = timing.circuit.process
    bench = _Bench(strength(process, timing.unit), side_branches, accuracy)
    first, notices = _block(analysis, bench)
    changed = None
    if after is not None:
        changed, more = _block(after, bench)
        same = compare(analysis, after).same_path_after
        if same is not None and _steps(same) != _steps(changed.paths[0].estimate):
            changed = replace(changed, same_path=bench.run(_timing(after), same))
        notices += more
    assumed = assumption_notices(process)
    return Simulation(
        before=first,
        after=changed,
        side_branches=side_branches,
        scaled=any(notice.code == SCALED for notice in assumed),
        notices=tuple(dict.fromkeys([*assumed, *notices])),
    )


def _timing(analysis: Analysis) -> Timing:
    if analysis.timing is None:
        message = "an analysis without its timing cannot be simulated"
        raise ValueError(message)
    return analysis.timing


def _steps(path: Path) -> tuple[object, ...]:
    return path.start, path.start_edge, *((stage.output, stage.edge) for stage in path.stages)


def _block(analysis: Analysis, bench: _Bench) -> tuple[SimulatedBlock, list[Notice]]:
    """Simulate all paths of an analysis that can be, and the first one's other edges.

    Raises
    ------
    SimulationError
        Where not even one can.
    """
    timing, notices = _timing(analysis), []
    paths: list[SimulatedPath] = []
    for place, path in enumerate(analysis.paths):
        tell("simulating", place / len(analysis.paths))
        try:
            paths.append(bench.run(timing, path))
        except SimulationError as error:
            if error.code != "cannot-switch" or (not paths and path is analysis.paths[-1]):
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


def _left_out(path: Path, error: SimulationError) -> Notice:
    words = {"rise": "rising", "fall": "falling"}
    return Notice(
        error.code,
        f"not simulated, from {path.start} {words[path.start_edge]} to {path.end}"
        f" {words[path.edge]}: {error.message}",
        names=(path.start, path.end),
    )


class _Bench:
    """What all simulations of a run share."""

    def __init__(
        self, strength: float, side_branches: SideBranches, accuracy: Accuracy | None
    ) -> None:
        self._strength = strength
        self._with_gates = side_branches == "gates"
        self._accuracy = accuracy
        self._parameters: dict[int, Parameters] = {}
        self._groups: dict[int, Groups] = {}

    def groups(self, circuit: Circuit) -> Groups:
        """Return the groups of a circuit, found once."""
        return self._groups.setdefault(id(circuit), Groups(circuit))

    def run(self, timing: Timing, path: Path) -> SimulatedPath:
        """Simulate one path."""
        circuit, unit = timing.circuit, timing.unit
        if id(circuit) not in self._parameters:
            self._parameters[id(circuit)] = parameters(circuit, self._strength)
        groups = self.groups(circuit)
        route = route_of(groups, path)
        graph = timing.graph
        start = np.flatnonzero(
            (graph.net[graph.start] == route.nets[0])
            & (graph.rising[graph.start] == (path.start_edge == "rise"))
        )[0]
        part = excerpt(
            groups,
            self._parameters[id(circuit)],
            route,
            transition=max(float(graph.start_transition[start]), STEEPEST * unit.fo4),
            # The estimate's resistances hold the ln 2 of an RC response.
            drive=float(graph.start_drive[start]) / math.log(2),
            with_gates=self._with_gates,
        )
        supply, unknown = circuit.process.supply, part.layout.equations.unknown
        on_path = np.array(part.watched)
        moving = on_path[on_path < unknown]
        goal = np.array([route.edges[int(net)][1] for net in part.layout.net[moving]]) * supply

        def arrived(_time: float, voltage: FloatArray) -> bool:
            return bool((np.abs(voltage[moving] - goal) < _ARRIVED * supply).all())

        patience = _PATIENCE[0] * path.delay + _PATIENCE[1] * unit.fo4
        waves = integrate(
            part.layout.equations,
            part.ramps,
            part.initial,
            (-_SETTLING * unit.fo4, patience),
            unit=unit.tau,
            supply=supply,
            accuracy=self._accuracy,
            finished=arrived,
        )
        return _measured(timing, path, part, waves)


def _measured(timing: Timing, path: Path, part: Excerpt, waves: Waveforms) -> SimulatedPath:
    """Read delays and transitions off the waveforms.

    Raises
    ------
    SimulationError
        ``no-edge`` where a stage never crosses half the supply.
    """
    circuit, route, layout = timing.circuit, part.route, part.layout
    supply, unknown = circuit.process.supply, layout.equations.unknown
    nodes = part.watched
    crossings: list[float] = []
    for net, node in zip(route.nets, nodes, strict=True):
        rising = route.edges[net][1]
        if node >= unknown:
            crossings.append(float(part.ramps.duration[node - unknown]) / 2)
            continue
        found = last_crossing(waves, node, supply / 2, rising=rising)
        if found is None:
            raise SimulationError(
                f"net '{circuit.devices.net_names[net]}' has not crossed half the supply by"
                f" {engineering(float(waves.time[-1]), 's')}; its stage does not switch with the"
                " side inputs held as found",
                code="no-edge",
            )
        crossings.append(found)
    stages = tuple(
        SimulatedStage(
            stage,
            crossings[place + 1] - crossings[place],
            transition(waves, nodes[place + 1], supply, rising=stage.edge == "rise"),
        )
        for place, stage in enumerate(path.stages)
    )
    names = circuit.devices.net_names
    return SimulatedPath(
        estimate=path,
        stages=stages,
        delay=crossings[-1] - crossings[0],
        held=tuple((names[net], level) for net, level in sorted(part.held.items())),
        devices=len(layout.devices),
        nodes=unknown,
        steps=len(waves.time) - 1,
        side_gates=part.side_gates,
        traces=_traces([names[net] for net in route.nets], nodes, part, waves),
    )


def _traces(names: Sequence[str], nodes: Sequence[int], part: Excerpt, waves: Waveforms) -> Traces:
    """Return the voltages along the path at the integrator's times, from the edge on."""
    seen = waves.time >= 0
    given = np.array([part.ramps.at(time) for time in waves.time[seen].tolist()]).T
    both = np.concatenate([waves.voltage[:, seen], given])
    return Traces(tuple(names), waves.time[seen], both[list(nodes)])
